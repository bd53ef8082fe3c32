"""ratio: every rise-to-rise gap is exactly 2N half-cycles, for ever."""

from __future__ import annotations

from properties.runs import gaps, judge_runs
from prover.findings import Fact, Finding
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "ratio"


def claim(spec: Spec) -> str:
    """The claim in words, with a number or a formula."""
    if spec.ratio_formula is not None:
        return f"every rise-to-rise gap is exactly {spec.ratio_formula.text} input cycles"
    return f"every rise-to-rise gap is exactly {spec.period} half-cycles ({spec.ratio_text} input cycles)"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Claimed from reset at either release level, else from initial values, else on every loop."""
    periods = {wave.period for wave in (orbit.wave() for orbit in rhythm.orbits) if wave is not None}
    facts: dict[str, Fact] = {"measured_period_half_cycles": sorted(p for p in periods if p is not None)}
    return judge_runs(rhythm, NAME, claim(spec), spec.period, gaps, "rise-to-rise gap", facts)
