"""high-time: every high run is exactly H half-cycles."""

from __future__ import annotations

from properties.runs import high_runs, judge_runs
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
    return f"every high run is exactly {spec.high_half_cycles} half-cycles of {spec.period}"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Claimed in the same scope as the ratio; a run that is already high at the start is no whole run."""
    high = spec.high_half_cycles
    highs = {wave.high for wave in (orbit.wave() for orbit in rhythm.orbits) if wave is not None}
    facts: dict[str, Fact] = {"measured_high_half_cycles": sorted(h for h in highs if h is not None)}
    return judge_runs(rhythm, NAME, claim(spec), high, high_runs, "high run", facts)
