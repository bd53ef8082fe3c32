"""What ratio and high-time share: finding the first span of output that breaks a claim about runs."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

from prover.findings import Counterexample, Fact, Finding, Verdict
from prover.path import Run
from prover.rhythm import Orbit, Rhythm


@dataclass(frozen=True, slots=True)
class Span:
    """A measured stretch of output: `length` half-cycles from half-cycle `begins` on."""

    begins: int
    length: int


Measure = Callable[[Iterable[Run]], Iterator[Span]]


def gaps(runs: Iterable[Run]) -> Iterator[Span]:
    """The gaps between neighbouring rises; what comes before the first rise is no gap."""
    last_rise: int | None = None
    at = 0
    for index, (level, length) in enumerate(runs):
        if level == 1 and index > 0:
            if last_rise is not None:
                yield Span(last_rise, at - last_rise)
            last_rise = at
        at += length


def high_runs(runs: Iterable[Run]) -> Iterator[Span]:
    """The high runs that begin with a rise and end with a fall."""
    at = 0
    pending: Span | None = None
    for index, (level, length) in enumerate(runs):
        if pending is not None:
            yield pending
        pending = Span(at, length) if level == 1 and index > 0 else None
        at += length


def judge_runs(
    rhythm: Rhythm, name: str, claim: str, wanted: int, measure: Measure, noun: str, facts: dict[str, Fact]
) -> Finding:
    """Whether every measured span is `wanted` half-cycles long, on the orbits of the rhythm's scope.

    Without start states the scope is every loop of every power-up state."""
    if rhythm.scope == "any":
        return _on_loops(rhythm, name, claim, wanted, measure, noun, facts)
    found: Verdict = "proved" if rhythm.orbits else "open"
    says = [] if rhythm.orbits else [rhythm.open or "no start state is known"]
    for start, orbit in zip(rhythm.starts, rhythm.orbits, strict=True):
        broken = _broken(orbit, wanted, measure, noun, start.cause)
        if broken:
            says = [f"{start.cause}: {broken.text}"]
            method = "counterexample replayed on the machine"
            return Finding(name, "refuted", claim, says[0], method, facts=facts, counterexample=broken)
        if not orbit.closed:
            found = "open"
            says.append(orbit.why)
    text = f"every {noun} is {wanted} half-cycles" if found == "proved" else "; ".join(dict.fromkeys(says))
    bound = "" if found == "proved" else f"covered: {_covered(rhythm)}"
    return Finding(name, found, claim, text, rhythm.methods.get("orbit", ""), bound, facts)


def _covered(rhythm: Rhythm) -> str:
    if not rhythm.orbits:
        return "nothing"
    lengths = [orbit.lead_half_cycles + orbit.loop_half_cycles for orbit in rhythm.orbits]
    return f"{min(lengths)} half-cycles from each start state"


def _on_loops(
    rhythm: Rhythm, name: str, claim: str, wanted: int, measure: Measure, noun: str, facts: dict[str, Fact]
) -> Finding:
    for loop in rhythm.loops:
        # Twice round the wave shows every span of it whole.
        spans = list(measure([*loop.wave.runs, *loop.wave.runs, *loop.wave.runs]))
        if loop.stuck or any(span.length != wanted for span in spans):
            orbit = rhythm.orbit_from(loop.example)
            broken = _broken(orbit, wanted, measure, noun, "power-up state on a loop")
            if broken:
                method = "counterexample replayed on the machine"
                return Finding(
                    name, "refuted", claim, broken.text, method, facts=facts, counterexample=broken
                )
    method = rhythm.methods.get("power-up", "")
    if rhythm.complete:
        count = len(rhythm.loops)
        where = f"each of {count} loops" if count != 1 else "the only loop"
        text = f"every {noun} is {wanted} half-cycles on {where}"
        return Finding(name, "proved", claim, text, method, facts=facts)
    return Finding(name, "open", claim, rhythm.open or "not all loops are known", method, facts=facts)


def _broken(orbit: Orbit, wanted: int, measure: Measure, noun: str, cause: str) -> Counterexample | None:
    """The first span of another length, or a round in which there is none."""
    seen = False
    for span in measure(orbit.runs(rounds=3)):
        seen = True
        if span.length != wanted:
            text = f"a {noun} of {span.length} half-cycles, not {wanted}, from half-cycle {span.begins} on"
            return Counterexample(orbit, span.begins, span.begins + span.length, text, cause)
    wave = orbit.wave()
    if wave is not None and wave.stuck:
        lead = orbit.lead_half_cycles
        text = f"the output stays {wave.runs[0][0]} from half-cycle {lead} on"
        return Counterexample(orbit, lead, lead + (orbit.loop_half_cycles or 2), text, cause)
    if orbit.closed and not seen:
        return Counterexample(orbit, 0, orbit.lead_half_cycles, f"no {noun} at all", cause)
    return None
