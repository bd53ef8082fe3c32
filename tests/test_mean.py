"""Ratios on average: published accumulators, the general law by brute force, and random machines enumerated."""

from __future__ import annotations

import random
from fractions import Fraction
from itertools import pairwise, product
from pathlib import Path

import pytest
from agreement import brute
from cases_format import CASES
from click.testing import CliRunner
from machines import random_design

from properties import judge_all
from properties.runs import gaps, high_runs, spans_of
from prover import Spec, analyse, check, cli, path
from prover import expr as e
from prover.effort import Effort
from prover.errors import UserError
from prover.findings import Report
from prover.ports import recognise
from prover.rhythm import Orbit, Wave
from prover.settling import settle
from prover.system import State

ACCUMULATOR = """\
module accumulator #(parameter W = 4, parameter M = 3) (input clk, input rst, output reg carry);
  reg [W-1:0] sum;
  always @(posedge clk)
    if (rst) {carry, sum} <= {W+1{1'b0}};
    else {carry, sum} <= {1'b0, sum} + M;
endmodule
"""


def verdicts(report: Report) -> dict[str, str]:
    return {finding.name: finding.verdict for finding in report.findings}


def test_the_published_accumulator_has_three_pulses_in_sixteen_cycles() -> None:
    # References, fractional dividers: addend 3 of 4 bits makes 16/3, with gaps of 5 and 6 [R].
    report = check([CASES / "published" / "accumulator_3_of_16.v"], Spec(ratio=Fraction(16, 3), mean=True))
    assert report.verdict == "proved"
    assert "high-time" not in verdicts(report)
    facts = report.findings[0].facts
    assert facts["measured_period_half_cycles"] == [32]
    assert facts["measured_gaps_half_cycles"] == [10, 12]
    (loop,) = report.rhythm.loops
    assert sum(level for level, _ in loop.wave.runs) == 3


def test_two_and_a_half_runs_two_three_two_three() -> None:
    # References, fractional dividers: 2.5 runs 2, 3, 2, 3 [R].
    report = check([CASES / "gauge" / "cell_by_2_5_mean.v"], Spec(ratio=Fraction(5, 2), mean=True))
    assert report.verdict == "proved"
    wave = report.rhythm.orbits[0].wave()
    assert wave is not None
    assert [a + b for (_, a), (_, b) in zip(wave.runs[::2], wave.runs[1::2], strict=True)] in ([4, 6], [6, 4])


@pytest.mark.parametrize("seed", range(12))
def test_an_accumulator_divides_by_two_to_the_w_over_m_on_average(seed: int, tmp_path: Path) -> None:
    # References: every gap is the whole number below or above 2^W/M [M]; here seen in the running sum itself.
    rng = random.Random(seed)
    width = rng.randint(2, 7)
    addend = rng.randrange(1, 1 << width)
    total, carries = 0, []
    for cycle in range(1, 4 << width):
        total += addend
        if total >> width:
            total -= 1 << width
            carries.append(cycle)
    gaps = {b - a for a, b in pairwise(carries)}
    ratio = Fraction(1 << width, addend)
    assert gaps <= {ratio.numerator // ratio.denominator, -(-ratio.numerator // ratio.denominator)}
    path = tmp_path / "accumulator.v"
    path.write_text(ACCUMULATOR, encoding="utf-8")
    spec = Spec(ratio=ratio, mean=True, parameters={"W": width, "M": addend})
    found = verdicts(check([path], spec))
    # With a gap of one cycle the carry stays up through the next one: rises are fewer than carries.
    assert (found["ratio"] == "proved") == (1 not in gaps)
    assert found["settling"] == "proved"
    if 1 not in gaps:
        assert set(found.values()) == {"proved"}
        other = Fraction((1 << width) + 1, addend)
        assert (
            verdicts(check([path], Spec(ratio=other, mean=True, parameters=spec.parameters)))["ratio"]
            == "refuted"
        )


@pytest.mark.parametrize("seed", range(30))
def test_random_machines_have_the_mean_that_enumeration_finds(seed: int) -> None:
    rng = random.Random(1000 + seed)
    design = random_design(rng, rng.randint(3, 7))
    ports = recognise(design, Spec(start="any"))
    system, settling = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(60))
    if settling.depth is None:
        assert settling.unsettled is not None
        return
    after: dict[State, State] = {}
    output: dict[State, int] = {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        values = dict(zip(system.names, state, strict=True))
        *step, level, rest = e.evaluate([*system.step, system.output, system.settled], values)
        if rest:
            after[state], output[state] = tuple(step), level
    waves = [tuple(output[s] for s in loop) for loop in brute.find_loops(after)]
    # Claim the mean of some loop, or that of none.
    means = [Fraction(len(w), 2 * len(brute.rises(w))) for w in waves if brute.rises(w)]
    ratio = rng.choice([mean for mean in means if mean >= 1] or [Fraction(7, 3)])
    spec = Spec(ratio=ratio, mean=True, start="any")
    found = {f.name: f for f in judge_all(analyse.rhythm_of(ports, spec, Effort(60)), spec)}
    right = [brute.has_mean(wave, ratio) for wave in waves]
    assert found["ratio"].verdict == ("proved" if all(right) else "refuted")
    meant = [wave for wave, fits in zip(waves, right, strict=True) if fits]
    results = [brute.analyse_wave(after, output, wave) for wave in meant] or [
        brute.analyse_wave(after, output, (2,))
    ]
    worst = [result.worst_half_cycles for result in results]
    told = found["recovery"]
    if told.verdict == "proved":
        assert told.facts["worst_half_cycles"] in worst
    else:
        assert told.verdict == "refuted"
        assert None in worst


@pytest.mark.parametrize("seed", range(40))
def test_a_wave_reads_the_same_from_anywhere(seed: int) -> None:
    rng = random.Random(seed)
    lengths = [rng.randint(1, 3) for _ in range(2 * rng.randint(1, 8))]
    runs = [(1 - i % 2, n) for i, n in enumerate(lengths)]
    turned = [runs[i:] + runs[:i] for i in range(0, len(runs), 2)]
    assert Wave.of_round(runs).runs == min(Wave.of_round(each).runs for each in turned)
    assert len({Wave.of_round(each).runs for each in turned}) == 1
    # The one that sorts first of those of the smallest period.
    size = next(
        n
        for n in range(2, len(runs) + 1, 2)
        if runs == (runs[:n] * len(runs))[: len(runs)] and len(runs) % n == 0
    )
    assert Wave.of_round(runs).runs == tuple(min(each[:size] for each in turned))


def test_a_wide_accumulator_is_left_open_or_proved_never_refuted(tmp_path: Path) -> None:
    path = tmp_path / "accumulator.v"
    path.write_text(ACCUMULATOR, encoding="utf-8")
    options = [
        "--set",
        "W=24",
        "--set",
        "M=5000001",
        "--ratio",
        "16777216/5000001",
        "--mean",
        "--effort",
        "3",
    ]
    result = CliRunner().invoke(cli.main, ["check", str(path), *options], catch_exceptions=False)
    assert result.exit_code in (0, 3)
    assert "REFUTED" not in result.stdout


@pytest.mark.parametrize(
    ("spec", "words"),
    [
        ({"ratio": Fraction(16, 3)}, "--mean"),
        ({"ratio": Fraction(2, 3), "mean": True}, "one input cycle"),
        ({"ratio": Fraction(16, 3), "mean": True, "high": 11}, "between 1 and 10"),
        ({"ratio": Fraction(16, 3), "mean": True, "high": 0}, "between 1 and 10"),
    ],
)
def test_a_mean_that_means_nothing_is_refused(spec: dict[str, object], words: str) -> None:
    with pytest.raises(UserError) as error:
        Spec(**spec)  # type: ignore[arg-type]
    assert words in str(error.value)


def test_the_mean_may_be_a_formula_of_each_addend(tmp_path: Path) -> None:
    path = tmp_path / "accumulator.v"
    path.write_text(
        ACCUMULATOR.replace("parameter M = 3) (", "parameter K = 0) (input [W-1:0] M, "), encoding="utf-8"
    )
    options = ["--each", "M=1..8", "--ratio", "2**W / M", "--mean"]
    result = CliRunner().invoke(cli.main, ["check", str(path), *options], catch_exceptions=False)
    assert result.exit_code == 0, result.stdout
    assert "ratio 2 to 16" in result.stdout


def test_a_mean_is_counted_where_the_round_is_too_long_to_write_out(tmp_path: Path) -> None:
    # By the general law 24 bits and an odd addend M make M carries in 2^24 cycles, all gaps next to 2^24/M. Gaps of
    # 48 and 49 have 48.3 as a mean as little as 48.
    source = tmp_path / "accumulator.v"
    source.write_text(ACCUMULATOR)
    found = {}
    for ratio in (Fraction(1 << 24, 349525), Fraction(483, 10)):
        spec = Spec(ratio=ratio, mean=True, parameters={"W": 24, "M": 349525})
        report = check([source], spec)
        found[ratio] = report.findings[0]
        assert report.findings[0].facts["measured_gaps_half_cycles"] == [96, 98]
    assert [finding.verdict for finding in found.values()] == ["proved", "refuted"]
    broken = found[Fraction(483, 10)].counterexample
    assert broken is not None
    assert broken.ends - broken.begins == 1 << 25


@pytest.mark.parametrize("seed", range(50))
def test_abridged_paths_have_the_same_spans_as_whole_ones(seed: int) -> None:
    rng = random.Random(seed)

    def items(depth: int) -> tuple[path.Item, ...]:
        out: list[path.Item] = []
        for _ in range(rng.randint(1, 4)):
            if depth and rng.random() < 0.4:
                out.append(path.Repeat(rng.randint(2, 7), (1,), items(depth - 1)))
            else:
                out.append(path.Beat((0,), rng.randint(0, 1)))
        return tuple(out)

    def written(items: tuple[path.Item, ...]) -> list[int]:
        levels: list[int] = []
        for item in items:
            if isinstance(item, path.Repeat):
                levels += item.times * written(item.body)
            else:
                levels.append(item.steady or 0)
        return levels

    orbit = Orbit(items(2), items(2), (32,))
    loop = written(orbit.loop)
    levels = written(orbit.lead) + 3 * loop
    changes = [i for i in range(1, len(levels)) if levels[i] != levels[i - 1]]
    by_hand = {
        gaps: {(a, b - a) for a, b in pairwise(i for i in changes if levels[i])},
        high_runs: {(a, b - a) for a, b in pairwise(changes) if levels[a]},
    }
    for measure, spans in by_hand.items():
        found = {(span.begins, span.length) for span in spans_of(orbit, measure)}
        assert found <= spans
        assert {length for _, length in found} == {length for _, length in spans}
        firsts = {n: min(at for at, m in spans if m == n) for _, n in spans}
        assert firsts == {n: min(at for at, m in found if m == n) for _, n in found}
    assert path.rises(orbit.loop) == sum(now > was for was, now in pairwise([loop[-1], *loop]))
