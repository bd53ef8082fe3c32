"""What came of a recheck, as people read it."""

from __future__ import annotations

from collections.abc import Iterator

from prover.recheck import Outcome
from prover.report.look import PLAIN, Look, finished


def render(outcome: Outcome, look: Look = PLAIN) -> str:
    """The outcome as text: the verdicts that the certificate bears, who refuted its obligations, what is wrong."""
    return finished(_lines(outcome), look)


def _lines(outcome: Outcome) -> Iterator[str]:
    if outcome.findings:
        widest = max(len(finding.name) for finding in outcome.findings)
        yield f"certificate for {outcome.top}"
        for finding in outcome.findings:
            bound = f", {finding.bound}" if finding.bound and finding.verdict == "proved" else ""
            waived = f" (waived: {finding.waived})" if finding.waived is not None else ""
            yield f"{finding.verdict.upper():8}  {finding.name:{widest}}  {finding.claim}{bound}{waived}"
        yield ""
        yield "the sources are those it names, and all that it states follows from them and its evidence"
    for name, count in outcome.ways:
        whole = "all" if count == outcome.obligations else f"{count} of"
        how = f", in {outcome.steps} steps that were checked" if name == "clausal" else ""
        yield f"{name} refutes {whole} {outcome.obligations} obligations{how}"
    if outcome.trusted:
        yield "still trusted:"
        yield from (f"  {each}" for each in outcome.trusted)
    yield from (f"given up: {each}" for each in outcome.gave_up)
    yield from (f"rejected: {each}" for each in outcome.differences)
    if outcome.ways or outcome.differences or outcome.gave_up:
        yield ""
    yield "REJECTED" if outcome.differences else "GIVEN UP" if outcome.gave_up else "ACCEPTED"
