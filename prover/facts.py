"""Facts that every report carries: launching edges, duty, recovery as a time, and the assumptions."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from fractions import Fraction

from prover.depth import depths
from prover.findings import Fact
from prover.path import Run
from prover.ports import Ports
from prover.release import UNITS, pulses
from prover.rhythm import Orbit, Rhythm, Wave
from prover.spec import Spec
from prover.system import State


def collect(rhythm: Rhythm, spec: Spec) -> dict[str, Fact]:
    """The facts that can be told of this rhythm; keys name their unit."""
    facts: dict[str, Fact] = {}
    for orbit in rhythm.orbits[:1] or _agreed(rhythm):
        facts |= wave_facts(orbit, spec)
    for level, length in shortest(rhythm).items():
        facts[f"shortest_{'high' if level else 'low'}_half_cycles"] = length
    facts["clock_depth"] = dict(depths(rhythm.system))
    worst = rhythm.recovery.worst if rhythm.recovery else None
    if worst is not None:
        facts["worst_recovery_half_cycles"] = worst
        facts["worst_recovery_input_cycles"] = number(Fraction(worst, 2))
        if spec.fin is not None:
            facts["worst_recovery_seconds"] = seconds(Fraction(worst, 2) / spec.fin)
    return facts


def loop_orbits(rhythm: Rhythm, most: int) -> tuple[Orbit, ...]:
    """Orbits that show what the loops do where no start state is singled out: one for each wave that is not
    stuck, good ones first, at most so many."""
    from prover.analyse import follow
    from prover.effort import Effort

    shown: dict[Wave, State] = {}
    for loop in sorted(rhythm.loops, key=lambda loop: not loop.good):
        if len(shown) < most and not loop.stuck:
            shown.setdefault(loop.wave, loop.example)
    return tuple(follow(rhythm.system, example, Effort(10)) for example in shown.values())


def _agreed(rhythm: Rhythm) -> tuple[Orbit, ...]:
    """The good loop, or any loop where all have one wave; none where it is not plain which one to tell of."""
    good = any(loop.good for loop in rhythm.loops)
    return loop_orbits(rhythm, 1) if good or len({loop.wave for loop in rhythm.loops}) == 1 else ()


def shortest(rhythm: Rhythm) -> dict[int, int]:
    """By level, the whole half-cycles of the shortest pulse and gap on the runs from the start states, on those after
    a release of reset, and on good loops; empty where the output never changes, or a run is too long to look through.

    A pulse that begins with the release, between two edges, counts the half-cycles that it has whole."""
    found: dict[int, int] = {}

    def take(level: int, length: int) -> None:
        found[level] = min(length, found.get(level, length))

    released = rhythm.release.on_time if rhythm.release else ()
    waves = [run.wave() for run in rhythm.orbits]
    if None in waves or any(each.wave is None for each in released):
        return {}
    for run, wave in zip(rhythm.orbits, waves, strict=True):
        horizon = run.lead_half_cycles + 2 * (wave.period or 0 if wave else 0)
        for begins, (level, length) in _whole(run.runs(rounds=3)):
            if begins > horizon:
                break
            take(level, length)
    for each in released:
        for pulse in pulses(each):
            take(pulse.level, pulse.length // UNITS)
    for loop in rhythm.loops:
        if loop.good:
            for level, length in loop.wave.runs:
                take(level, length)
    return found


def _whole(runs: Iterable[Run]) -> Iterator[tuple[int, Run]]:
    """The runs that begin and end with an edge, each with the half-cycle that it begins with."""
    at = 0
    pending: tuple[int, Run] | None = None
    for index, run in enumerate(runs):
        if pending is not None:
            yield pending
        pending = (at, run) if index > 0 else None
        at += run[1]


def wave_facts(orbit: Orbit, spec: Spec) -> dict[str, Fact]:
    """Launching edges and duty of the wave that the orbit runs into; none if it has more than one high run."""
    wave = orbit.wave()
    if wave is None or wave.stuck or len(wave.runs) != 2:
        return {}
    period, high = wave.period or 0, wave.high or 0
    rise = _first_rise(orbit)
    both = period % 2 == 1
    # The half-cycle after a rising source edge has the clock high. Where every other period begins on a falling one,
    # the list is that of one that begins on a rising one.
    on_rising = both or orbit.state(rise)[-1] == 1
    first = 1 if on_rising else 2
    facts: dict[str, Fact] = {"source_edges": [first, first + high, first + period]}
    if both:
        facts["source_edges_alternate"] = True
    a, b = (high + 1) // 2, high // 2
    if not on_rising:
        a, b = b, a
    n = Fraction(period, 2)
    if both:
        # The launching edge alternates, so every other period has the source's levels swapped.
        facts["duty"] = (
            f"alternates between ({a}·d + {b}·(1−d))/{number(n)} and ({b}·d + {a}·(1−d))/{number(n)}"
        )
    else:
        facts["duty"] = f"({a}·d + {b}·(1−d))/{number(n)}"
    facts["duty_at_half"] = number(Fraction(high, period))
    if spec.source_duty is not None:
        ends = [d / 100 for d in spec.source_duty]
        pairs = [(a, b), (b, a)] if both else [(a, b)]
        values = [(x * d + y * (1 - d)) / n for x, y in pairs for d in ends]
        facts["duty_range"] = f"{percent(min(values))} to {percent(max(values))}"
    return facts


def _first_rise(orbit: Orbit) -> int:
    """The half-cycle of the first rise within the loop, counted from the start."""
    at, lead = 0, orbit.lead_half_cycles
    for index, (level, length) in enumerate(orbit.runs(rounds=2)):
        if level == 1 and index > 0 and at >= lead:
            return at
        at += length
    return lead


def number(value: Fraction) -> str:
    """A fraction as people read it: 3, 2.5, 1/3."""
    if value.denominator == 1:
        return str(value.numerator)
    if value.denominator not in (2, 4, 5, 8, 10):
        return str(value)
    whole, part = divmod(abs(value.numerator) * 1000 // value.denominator, 1000)
    return f"{'-' * (value < 0)}{whole}.{part:03}".rstrip("0")


def seconds(value: Fraction) -> str:
    """A time in seconds with a fitting unit."""
    for factor, unit in ((1, "s"), (10**3, "ms"), (10**6, "µs"), (10**9, "ns")):
        if value * factor >= 1:
            return f"{float(value * factor):.4g} {unit}"
    return f"{float(value * 10**9):.4g} ns"


def percent(value: Fraction) -> str:
    """A share in per cent."""
    return f"{float(100 * value):.4g} %"


def assumptions(ports: Ports, rhythm: Rhythm) -> tuple[str, ...]:
    """The model under which the verdicts hold, a sentence each."""
    out = [
        f"{ports.clock} toggles without end; nothing else changes at its edges",
        "registers and gates have no delay; what happens at once is ordered as the micro-steps say",
        "registers are two-valued; an unknown stands for both values",
    ]
    if rhythm.glitches is not None:
        out.append(
            "within a half-cycle, what a micro-step changes reaches the output in any order through gates of any "
            "delay, after what caused it"
        )
    if ports.reset:
        out.append(f"{ports.reset.port} stays at {1 - ports.reset.active} after its release")
    fixed = {n: v for n, v in ports.holds.items() if not ports.reset or n != ports.reset.port}
    out += [f"{name} is held at {value}" for name, value in fixed.items()]
    if rhythm.unforced:
        out.append(f"reset never forces {', '.join(rhythm.unforced)}: every value of theirs is followed")
    return tuple(out)


LIMITS = (
    "A proof covers the Verilog under the stated model: not timing closure, metastability, clock quality, power, "
    "analogue behaviour or the netlist after synthesis. Where equipment can hurt people it supports, and does not "
    "replace, independent review, qualified tools, the standards that apply (such as IEC 61508, ISO 26262 or "
    "DO-254) and the judgement of those appointed to sign."
)
