"""reset: held long enough it forces one known state, and every release of it starts the specified wave."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction

from prover.facts import number
from prover.findings import Counterexample, Fact, Finding, Obligation
from prover.release import (
    UNITS,
    Freed,
    Pulse,
    Release,
    edge_after,
    pulses,
    same_output,
    trace_of,
)
from prover.rhythm import NOWHERE, Goal, Rhythm, goal_of
from prover.spec import Spec

NAME = "reset"

METHOD = "reset held from every state at rest; the orbit after each release; every step checked"
REPLAYED = "trace replayed on the machine"


def judge(rhythm: Rhythm, spec: Spec) -> Finding | None:
    """Refuted by a release that leads to a wrong wave, to a pulse or gap shorter than the specified one, or to
    another output than some other power-up state; by a reset that the user holds too short; and by a flip-flop that
    must not be released an edge after the others. None for a divider without a reset: nothing is claimed of it."""
    release = rhythm.release
    if release is None:
        return None
    said = claim(spec)
    adds = rhythm.accumulator
    goal = adds.goal if adds is not None else goal_of(spec, [each.wave for each in release.runs])
    facts = _facts(release)
    late = {freed.flop.register: freed for freed in _that_matter(release, goal) if freed.flop}
    if late:
        facts["if_late"] = [_if_late(freed, goal) for freed in late.values()]
    for search in (_wrong_wave, _short_pulse, _several_outputs, _never_right_if_late):
        broken = search(release, goal)
        if broken is not None:
            return _refuted(release, said, facts, *broken)
    short = _held_too_short(release, goal, spec.reset_cycles)
    if short is not None:
        return _refuted(release, said, facts, *short)
    obligations = tuple(_obligations(release, goal))
    why = _open(release, spec, adds is not None)
    if why:
        return Finding(NAME, "open", said, why, METHOD, facts=facts, obligations=obligations)
    held = release.held
    bound = f"{'' if held.exact else 'at most '}{_count(held.half_cycles, 'half-cycle')} of reset"
    return Finding(NAME, "proved", said, _says(release, goal), METHOD, bound, facts, obligations)


def claim(spec: Spec) -> str:
    """What is claimed."""
    cycles = spec.reset_cycles
    long = "long enough" if cycles is None else f"for {_count(cycles, 'input cycle')}"
    return (
        f"reset held {long} forces one known state, and its release at either level of the clock starts the "
        "specified wave, with no pulse or gap that is shorter"
    )


Broken = tuple[Freed, int, int, str]
"""A release, the clock edges after it between which the claim is broken, and what is seen there."""


def _refuted(
    release: Release, said: str, facts: dict[str, Fact], freed: Freed, begins: int, ends: int, text: str
) -> Finding:
    trace = trace_of(release, freed, begins, ends, text)
    shown = None
    if trace is None and freed.orbit is not None:
        # The run from the release on; what comes before a late flip-flop is released is not part of it.
        gone = len(freed.early) // UNITS
        shown = Counterexample(freed.orbit, max(begins - gone, 0), max(ends - gone, 1), text, freed.cause)
    return Finding(NAME, "refuted", said, text, REPLAYED, facts=facts, counterexample=shown, trace=trace)


# -- what refutes ------------------------------------------------------------------------------------------


def _wrong_wave(release: Release, goal: Goal) -> Broken | None:
    for freed in release.on_time:
        if _is_wrong(freed, goal):
            begins, ends, seen = _first_wrong(freed, goal)
            return freed, begins, ends, f"{freed.cause}{_left_free(release, freed)}: {seen}"
    return None


def _is_wrong(freed: Freed, goal: Goal) -> bool:
    return freed.wave is not None and not goal.fits(freed.wave)


def _first_wrong(freed: Freed, goal: Goal) -> tuple[int, int, str]:
    """The first pulse or gap of a wrong length, or the last edge where the output then stays as it is."""
    last = 0
    for pulse in pulses(freed) if goal is not NOWHERE else ():
        if pulse.length not in _nominal(pulse.level, goal):
            return edge_after(pulse.begins), edge_after(pulse.begins + pulse.length), _told(pulse, goal)
        last = pulse.begins + pulse.length
    run, wave = freed.orbit, freed.wave
    begins = max(edge_after(last), run.lead_half_cycles if run else 0)
    ends = begins + ((run.loop_half_cycles if run else 0) or 2)
    if wave is None or not wave.stuck:
        return begins, ends, "not the specified wave"
    return begins, ends, f"the output stays {wave.runs[0][0]} for ever"


def _nominal(level: int, goal: Goal) -> list[int]:
    """The lengths that pulses or gaps have in the specified wave, in halves of a half-cycle, the shortest first."""
    return sorted({UNITS * length for value, length in goal.pulses if value == level})


def _told(pulse: Pulse, goal: Goal) -> str:
    noun = "high pulse" if pulse.level else "low gap"
    wanted = " or ".join(map(_half_cycles, _nominal(pulse.level, goal)))
    begins = edge_after(pulse.begins)
    since = f"clock edge {begins}" if begins else "the release"
    return f"a {noun} of {_half_cycles(pulse.length)} half-cycles, not {wanted}, from {since} on"


def _half_cycles(units: int) -> str:
    return number(Fraction(units, UNITS))


def _short_pulse(release: Release, goal: Goal) -> Broken | None:
    for freed in release.on_time:
        for pulse in pulses(freed):
            if pulse.length < _nominal(pulse.level, goal)[0]:
                begins, ends = edge_after(pulse.begins), edge_after(pulse.begins + pulse.length)
                text = f"{freed.cause}{_left_free(release, freed)}: {_told(pulse, goal)}"
                return freed, begins, ends, text
    return None


def _left_free(release: Release, freed: Freed) -> str:
    """The values of registers that reset does not force, where there are any."""
    return f" with {_values(release, freed)}, which it does not force" if release.held.unforced else ""


def _values(release: Release, freed: Freed) -> str:
    """What the registers are that reset does not force."""
    values = dict(zip(release.held.names, freed.under, strict=True))
    return ", ".join(f"{name}={values[name]}" for name in release.held.unforced)


def _several_outputs(release: Release, goal: Goal) -> Broken | None:
    """Two states that reset leaves alike possible, and after which the output differs."""
    for level in (0, 1):
        here = [freed for freed in release.on_time if freed.clock == level]
        for freed in here[1:]:
            if same_output(here[0], freed) is False:
                at = _edges_differ(here[0], freed)
                names = ", ".join(release.held.unforced)
                text = (
                    f"reset does not force {names}, and the output hangs on it: {freed.cause} "
                    f"with {_values(release, freed)}, {_first_edges_text(freed)}; "
                    f"with {_values(release, here[0])}, {_first_edges_text(here[0])}"
                )
                return freed, at, at + 1, text
    return None


def _edges_differ(a: Freed, b: Freed) -> int:
    """The first clock edge after the release that one of the outputs changes at and the other does not."""
    edges = [{edge_after(pulse.begins) for pulse in pulses(each)} for each in (a, b)]
    return min(edges[0] ^ edges[1], default=0)


def _held_too_short(release: Release, goal: Goal, cycles: int | None) -> Broken | None:
    freed = release.short
    if freed is None or cycles is None:
        return None
    long = next((each for each in release.on_time if each.clock == freed.clock), freed)
    begins, ends, seen = 0, 1, ""
    if _is_wrong(freed, goal):
        begins, ends, seen = _first_wrong(freed, goal)
    else:
        begins = _edges_differ(freed, long)
        ends = begins + 1
        seen = f"{_first_edges_text(freed)}, and held long enough {_first_edges_text(long)}"
    needs = release.held.half_cycles
    text = (
        f"{_count(cycles, 'input cycle')} of reset are too short: it needs {needs} half-cycles, and "
        f"{freed.cause.removeprefix('reset ')} {seen}"
    )
    return freed, begins, ends, text


def _never_right_if_late(release: Release, goal: Goal) -> Broken | None:
    for freed in release.late:
        if _is_wrong(freed, goal):
            begins, ends, seen = _first_wrong(freed, goal)
            return freed, begins, ends, f"{freed.cause}: {seen}, and the wave is never right again"
    return None


# -- what is open, owed, and told --------------------------------------------------------------------------


def _open(release: Release, spec: Spec, adds: bool) -> str:
    """Why nothing is claimed, "" if there is no reason. With an accumulator every late release ends well."""
    if release.open:
        return release.open
    if not release.on_time:
        return "no state that reset leaves is known"
    for freed in release.on_time if adds else release.runs:
        if freed.orbit is None or (freed.wave is None and not freed.right):
            return f"{freed.cause}: {_unknown(freed)}"
    for level in (0, 1):
        here = [freed for freed in release.on_time if freed.clock == level]
        if any(same_output(here[0], freed) is None for freed in here[1:]):
            return "whether the output hangs on what reset does not force is not known"
    if spec.reset_cycles is not None and release.held.half_cycles > 2 * spec.reset_cycles:
        return (
            f"reset needs {release.held.half_cycles} half-cycles, and no state was found of which the output shows "
            f"that {_count(spec.reset_cycles, 'input cycle')} are too few"
        )
    return ""


def _unknown(freed: Freed) -> str:
    """Why the wave after a release is not known."""
    if freed.orbit is None:
        return "not followed"
    return freed.orbit.why or "a round of too many pulses to be written out"


def _obligations(release: Release, goal: Goal) -> Iterator[Obligation]:
    """The registers of which some flip-flop has to be released before the same edge as all the others."""
    wheres = {register.name: register.where for register in release.ports.design.registers}
    port = release.ports.reset.port if release.ports.reset else ""
    for register in dict.fromkeys(freed.flop.register for freed in _that_matter(release, goal) if freed.flop):
        text = (
            f"the release of {port} has to meet recovery and removal at every flip-flop of {register} before the "
            "same clock edge as elsewhere: where one sees it an edge later, the first pulse or gap has another length"
        )
        yield Obligation(text, wheres[register], register)


def _if_late(freed: Freed, goal: Goal) -> str:
    return f"{freed.cause}: {_told(next(_blemishes(freed, goal)), goal)}"


def _that_matter(release: Release, goal: Goal) -> Iterator[Freed]:
    """The late releases after which some pulse or gap has another length than after the one on time."""

    def off(freed: Freed) -> list[tuple[int, int]]:
        return [(pulse.level, pulse.length) for pulse in _blemishes(freed, goal)]

    usual = [(each.clock, off(each)) for each in release.on_time]
    for freed in release.late:
        found = off(freed)
        if found and (freed.clock, found) not in usual:
            yield freed


def _blemishes(freed: Freed, goal: Goal) -> Iterator[Pulse]:
    for pulse in pulses(freed) if goal is not NOWHERE else ():
        if pulse.length not in _nominal(pulse.level, goal):
            yield pulse


def _says(release: Release, goal: Goal) -> str:
    held = release.held
    if held.half_cycles == 0:
        text = "reset forces one state at once"
    else:
        text = f"{_count(held.half_cycles, 'half-cycle')} of reset force one state"
    if held.unforced:
        text = f"{text} but for {', '.join(held.unforced)}, on which the output does not hang"
    long = [pulse for freed in release.on_time for pulse in _blemishes(freed, goal)]
    if long:
        return f"{text}; after its release the output has {_told(long[0], goal)}, and then the specified wave"
    return f"{text}; from the first edge after its release the wave is right"


def _facts(release: Release) -> dict[str, Fact]:
    """Times in half-cycles where the key doesn't say otherwise; edges count those of the clock after the release."""
    held, ports = release.held, release.ports
    facts: dict[str, Fact] = {}
    if held.states:
        low, high = held.needs
        facts["shortest_reset_half_cycles"] = held.half_cycles
        facts["shortest_reset_input_cycles"] = number(Fraction(held.half_cycles, 2))
        facts["shortest_reset_by_clock_level"] = {"low": low, "high": high}
        facts["shortest_reset_is_exact"] = held.exact
    wheres = {register.name: register.where for register in ports.design.registers}
    facts["never_forced"] = [f"{name} ({wheres[name]})" for name in held.unforced if name in wheres]
    if release.on_time:
        levels = release.levels
        facts["output_in_reset"] = str(levels[0]) if len(levels) == 1 else "not constant"
        for freed in reversed(release.on_time):
            facts[f"first_edges_released_{'high' if freed.clock else 'low'}"] = _first_edges(freed)
        facts["flip_flops_released_late"] = release.flops
    return facts


def _first_edges(freed: Freed) -> dict[str, int]:
    """The clock edges, counted from the release, at which the output first rises and falls; 0 is the release."""
    found: dict[str, int] = {}
    for pulse in pulses(freed):
        found.setdefault("rise" if pulse.level else "fall", edge_after(pulse.begins))
        if len(found) == 2:
            break
    return dict(sorted(found.items(), key=lambda pair: pair[1]))


def _first_edges_text(freed: Freed) -> str:
    edges = _first_edges(freed)
    told = [f"{verb}s at edge {edge}" for verb, edge in edges.items()]
    return f"the output first {' and '.join(told)}" if told else "the output never changes"


def _count(count: int, noun: str) -> str:
    return f"{count} {noun}{'s' * (count != 1)}"
