"""Findings: what a property says of a divider, and the report that collects them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Literal

from prover.errors import Where

if TYPE_CHECKING:
    from prover.arrival import Glitch
    from prover.design import Design
    from prover.each import Each
    from prover.ports import Ports
    from prover.rhythm import Orbit, Rhythm
    from prover.settling import Unsettled
    from prover.spec import Spec
    from prover.trace import Trace

Verdict = Literal["proved", "refuted", "open"]
Fact = str | int | bool | None | list[int] | list[str] | dict[str, int]


@dataclass(frozen=True, slots=True)
class Obligation:
    """A timing inequality that the proof needs and that only timing analysis can discharge.

    `via` are further places on the path that it is about, each with what is there."""

    text: str
    where: Where
    register: str
    via: tuple[tuple[str, Where], ...] = ()


@dataclass(frozen=True, slots=True)
class Counterexample:
    """A trace that breaks a claim.

    orbit   the run of the machine from its start
    begins, ends  half-cycles after the start between which the claim is broken (ends exclusive)
    text    what is seen there
    cause   how the start state comes about
    """

    orbit: Orbit
    begins: int
    ends: int
    text: str
    cause: str


@dataclass(frozen=True, slots=True)
class Finding:
    """One property's verdict.

    claim   what is claimed, in words with its numbers
    says    what was found, in words
    method  how it was decided
    bound   what the verdict is bounded by, "" where it holds without bound
    facts   numbers for machines; names say their unit
    witness  where the counterexample is a run of another machine than the report's (another value of an input of
            --each): the report on that one
    counterexample, unsettled, trace, glitch  what shows a refutation: an orbit, a step without end, a run whose
            inputs move, an order of arrival by which the output pulses within a half-cycle
    """

    name: str
    verdict: Verdict
    claim: str
    says: str
    method: str
    bound: str = ""
    facts: dict[str, Fact] = field(default_factory=dict)
    obligations: tuple[Obligation, ...] = ()
    counterexample: Counterexample | None = None
    unsettled: Unsettled | None = None
    trace: Trace | None = None
    glitch: Glitch | None = None
    waived: str | None = None
    witness: Report | None = field(default=None, repr=False)


@dataclass(frozen=True, slots=True)
class Report:
    """All findings on one divider, with what they rest on.

    facts        edges, duty, recovery time: carried by every report
    assumptions  the model that the verdicts hold under, a sentence each
    notes        remarks on the sources that accompany the verdict
    seconds      how long it took
    standing     where inputs move: the report with them held, on which all rests that is not about moves
    each         for a claim on each value of some inputs: what it covers. Rhythm and facts are then about one value
    """

    ports: Ports
    spec: Spec
    rhythm: Rhythm
    findings: tuple[Finding, ...]
    facts: dict[str, Fact]
    assumptions: tuple[str, ...]
    notes: tuple[str, ...]
    seconds: float
    each: Each | None = None
    standing: Report | None = field(default=None, repr=False)

    @property
    def verdict(self) -> Verdict:
        return overall(self.findings)


def remarks(design: Design) -> tuple[str, ...]:
    """The remarks on a design's sources, with their places, as a report tells them."""
    return tuple(f"{note.where}: {note.message}" for note in design.notes)


def overall(findings: Sequence[Finding]) -> Verdict:
    """Refuted if any property that isn't waived is, open if any is open, else proved."""
    verdicts = {finding.verdict for finding in findings if finding.waived is None}
    if "refuted" in verdicts:
        return "refuted"
    return "open" if "open" in verdicts else "proved"


def with_waivers(findings: Sequence[Finding], spec: Spec) -> tuple[Finding, ...]:
    """The findings with the user's waivers on those that are not proved."""
    return tuple(
        replace(f, waived=spec.waivers[f.name]) if f.name in spec.waivers and f.verdict != "proved" else f
        for f in findings
    )
