"""What ratio and high-time share: finding the first span of output that breaks a claim about runs."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import accumulate
from typing import Protocol

from prover import path
from prover.findings import Counterexample, Fact, Finding, Verdict
from prover.path import Run
from prover.rhythm import Mean, Orbit, Rhythm


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


@dataclass(frozen=True, slots=True)
class Round:
    """Once round a loop that is entered at half-cycle `since`: half-cycles, and rises of the output."""

    half_cycles: int
    rises: int
    since: int = 0

    @staticmethod
    def of(orbit: Orbit) -> Round | None:
        """That of an orbit, or of its wave where that is known; None for one that did not close, or is stuck."""
        wave = orbit.wave()
        if not orbit.closed or (wave is not None and wave.stuck):
            return None
        if wave is not None:
            return Round(wave.period or 0, len(wave.runs) // 2, orbit.lead_half_cycles)
        return Round(orbit.loop_half_cycles, path.rises(orbit.loop), orbit.lead_half_cycles)


class Rule(Protocol):
    """What measured spans have to be."""

    @property
    def noun(self) -> str:
        """What a span is called."""

    @property
    def holds(self) -> str:
        """What is said where every span is as it has to be."""

    def measure(self, runs: Iterable[Run]) -> Iterator[Span]:
        """The spans of the output's runs."""

    def broken(self, spans: Sequence[Span], once: Round | None) -> tuple[Span, str] | None:
        """The first span that is otherwise, and what is wrong with it. The spans are those of a lead-in and some
        rounds of a loop, which is None for a run that did not close."""


@dataclass(frozen=True, slots=True)
class Exactly:
    """Every span is `wanted` half-cycles long."""

    noun: str
    measure: Measure
    wanted: int

    @property
    def holds(self) -> str:
        return f"every {self.noun} is {self.wanted} half-cycles"

    def broken(self, spans: Sequence[Span], once: Round | None) -> tuple[Span, str] | None:
        for span in spans:
            if span.length != self.wanted:
                return span, f"a {self.noun} of {span.length} half-cycles, not {self.wanted}"
        return None


@dataclass(frozen=True, slots=True)
class OnAverage:
    """Gaps have the mean, every one of them being one of the two lengths next to it."""

    mean: Mean
    noun: str = "rise-to-rise gap"

    @property
    def holds(self) -> str:
        ratio = self.mean.ratio
        return f"every {self.noun} is next to {ratio} input cycles, which is the mean of those once round the wave"

    def measure(self, runs: Iterable[Run]) -> Iterator[Span]:
        return gaps(runs)

    def broken(self, spans: Sequence[Span], once: Round | None) -> tuple[Span, str] | None:
        low, high = self.mean.lengths(span.length for span in spans)
        for span in spans:
            if span.length not in (low, high):
                either = f"{low}" if low == high else f"{low} or {high}"
                return span, f"a {self.noun} of {span.length} half-cycles, not {either}"
        if once is None or not spans or once.half_cycles == 2 * self.mean.ratio * once.rises:
            return None
        begins = next((span.begins for span in spans if span.begins >= once.since), once.since)
        many = f"{once.rises} {self.noun}s take" if once.rises != 1 else f"a {self.noun} takes"
        wanted = 2 * self.mean.ratio * once.rises
        return Span(begins, once.half_cycles), f"{many} {once.half_cycles} half-cycles, not {wanted}"


def spans_of(orbit: Orbit, measure: Measure) -> list[Span]:
    """What is measured on the lead-in and the loop of an orbit; of spans that recur with a repeat the first ones."""
    skips: list[tuple[int, int]] = []
    found = list(measure(orbit.abridged(skips)))
    ends = [at for at, _ in skips]
    gone = list(accumulate((size for _, size in skips), initial=0))
    # A span within which, or at the end of which, something is left out is that of the last round.
    return [Span(s.begins + gone[bisect_right(ends, s.begins + s.length)], s.length) for s in found]


def judge_runs(rhythm: Rhythm, name: str, claim: str, rule: Rule, facts: dict[str, Fact]) -> Finding:
    """Whether every measured span follows the rule, on the orbits of the rhythm's scope.

    Without start states the scope is every loop of every power-up state."""
    if rhythm.accumulator is not None:
        # It was found for this claim, and shows it of every run.
        return Finding(name, "proved", claim, rule.holds, rhythm.methods["orbit"], facts=facts)
    if rhythm.scope == "any":
        return _on_loops(rhythm, name, claim, rule, facts)
    found: Verdict = "proved" if rhythm.orbits else "open"
    says = [] if rhythm.orbits else [rhythm.open or "no start state is known"]
    for start, orbit in zip(rhythm.starts, rhythm.orbits, strict=True):
        broken = _broken(orbit, rule, start.cause)
        if broken:
            says = [f"{start.cause}: {broken.text}"]
            method = "counterexample replayed on the machine"
            return Finding(name, "refuted", claim, says[0], method, facts=facts, counterexample=broken)
        if not orbit.closed:
            found = "open"
            says.append(orbit.why)
    text = rule.holds if found == "proved" else "; ".join(dict.fromkeys(says))
    bound = "" if found == "proved" else f"covered: {_covered(rhythm)}"
    return Finding(name, found, claim, text, rhythm.methods.get("orbit", ""), bound, facts)


def _covered(rhythm: Rhythm) -> str:
    if not rhythm.orbits:
        return "nothing"
    lengths = [orbit.lead_half_cycles + orbit.loop_half_cycles for orbit in rhythm.orbits]
    return f"{min(lengths)} half-cycles from each start state"


def _on_loops(rhythm: Rhythm, name: str, claim: str, rule: Rule, facts: dict[str, Fact]) -> Finding:
    for loop in rhythm.loops:
        # Thrice round the wave shows every span of it whole.
        spans = list(rule.measure([*loop.wave.runs, *loop.wave.runs, *loop.wave.runs]))
        once = None if loop.stuck else Round(loop.wave.period or 0, len(loop.wave.runs) // 2)
        if loop.stuck or rule.broken(spans, once):
            orbit = rhythm.orbit_from(loop.example)
            broken = _broken(orbit, rule, "power-up state on a loop")
            if broken:
                method = "counterexample replayed on the machine"
                return Finding(
                    name, "refuted", claim, broken.text, method, facts=facts, counterexample=broken
                )
    method = rhythm.methods.get("power-up", "")
    if rhythm.complete:
        count = len(rhythm.loops)
        where = f"each of {count} loops" if count != 1 else "the only loop"
        return Finding(name, "proved", claim, f"{rule.holds} on {where}", method, facts=facts)
    return Finding(name, "open", claim, rhythm.open or "not all loops are known", method, facts=facts)


def _broken(orbit: Orbit, rule: Rule, cause: str) -> Counterexample | None:
    """The first span that breaks the rule, or a round in which there is none."""
    wave = orbit.wave()
    spans = spans_of(orbit, rule.measure)
    broken = rule.broken(spans, Round.of(orbit))
    if broken is not None:
        span, says = broken
        text = f"{says}, from half-cycle {span.begins} on"
        return Counterexample(orbit, span.begins, span.begins + span.length, text, cause)
    if wave is not None and wave.stuck:
        lead = orbit.lead_half_cycles
        text = f"the output stays {wave.runs[0][0]} from half-cycle {lead} on"
        return Counterexample(orbit, lead, lead + (orbit.loop_half_cycles or 2), text, cause)
    if orbit.closed and not spans:
        return Counterexample(orbit, 0, orbit.lead_half_cycles, f"no {rule.noun} at all", cause)
    return None
