"""high-time: every high run is exactly H half-cycles."""

from __future__ import annotations

from properties.runs import Exactly, high_runs, judge_runs
from prover.findings import Fact, Finding
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "high-time"


def claim(spec: Spec) -> str:
    """The claim in words, with a number or a formula."""
    if spec.high_formula is not None:
        return f"every high run is exactly {spec.high_formula.text} half-cycles"
    if spec.ratio_formula is not None:
        return f"every high run is exactly {spec.high or 'half a period'}" + " half-cycles" * bool(spec.high)
    of = "" if spec.mean else f" of {spec.period}"
    return f"every high run is exactly {spec.high_half_cycles} half-cycles{of}"


def judge(rhythm: Rhythm, spec: Spec) -> Finding | None:
    """Claimed in the same scope as the ratio; a run that is already high at the start is no whole run.

    A mean ratio fixes no high time: without --high there is no claim."""
    if spec.mean and spec.high is None:
        return None
    highs = {wave.high for wave in (orbit.wave() for orbit in rhythm.orbits) if wave is not None}
    facts: dict[str, Fact] = {"measured_high_half_cycles": sorted(h for h in highs if h is not None)}
    rule = Exactly("high run", high_runs, spec.high_half_cycles)
    return judge_runs(rhythm, NAME, claim(spec), rule, facts)
