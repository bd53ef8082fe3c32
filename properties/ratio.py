"""ratio: every rise-to-rise gap is exactly 2N half-cycles, for ever, or next to that and so on average."""

from __future__ import annotations

from dataclasses import replace
from math import ceil, floor

from properties.runs import Exactly, OnAverage, Rule, gaps, judge_runs, spans_of
from prover.findings import Fact, Finding
from prover.rhythm import Mean, Rhythm
from prover.spec import Spec

NAME = "ratio"


def claim(spec: Spec) -> str:
    """The claim in words, with a number or a formula."""
    ratio = spec.ratio_formula.text if spec.ratio_formula is not None else spec.ratio_text
    if spec.mean:
        lengths = "one of the two next whole numbers"
        if spec.ratio is not None and spec.ratio_formula is None:
            lengths = " or ".join(dict.fromkeys(str(near(spec.ratio)) for near in (floor, ceil)))
        return (
            f"every rise-to-rise gap is {lengths} input cycles (half-cycles next to that where rises fall on both "
            f"edges), and their mean is exactly {ratio} input cycles"
        )
    if spec.ratio_formula is not None:
        return f"every rise-to-rise gap is exactly {ratio} input cycles"
    return f"every rise-to-rise gap is exactly {spec.period} half-cycles ({ratio} input cycles)"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Claimed from reset at either release level, else from initial values, else on every loop."""
    waves = [wave for wave in (orbit.wave() for orbit in rhythm.orbits) if wave is not None]
    facts: dict[str, Fact] = {"measured_period_half_cycles": sorted({w.period for w in waves if w.period})}
    rule: Rule
    if spec.ratio is not None and spec.mean:
        rule = OnAverage(Mean(spec.ratio))
        rounds = [replace(orbit, lead=()) for orbit in rhythm.orbits if orbit.closed]
        lengths = {span.length for orbit in rounds for span in spans_of(orbit, gaps)}
        if rhythm.accumulator is not None:
            lengths = {2 * near(spec.ratio) for near in (floor, ceil)}
        facts["measured_gaps_half_cycles"] = sorted(lengths)
    else:
        rule = Exactly("rise-to-rise gap", gaps, spec.period)
    return judge_runs(rhythm, NAME, claim(spec), rule, facts)
