"""high-time: every high run is exactly H half-cycles."""

from __future__ import annotations

from properties.runs import high_runs, judge_runs
from prover.findings import Fact, Finding
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "high-time"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Claimed in the same scope as the ratio; a run that is already high at the start is no whole run."""
    high = spec.high_half_cycles
    claim = f"every high run is exactly {high} half-cycles of {spec.period}"
    highs = {wave.high for wave in (orbit.wave() for orbit in rhythm.orbits) if wave is not None}
    facts: dict[str, Fact] = {"measured_high_half_cycles": sorted(h for h in highs if h is not None)}
    return judge_runs(rhythm, NAME, claim, high, high_runs, "high run", facts)
