"""Claims for each value of an input, against every value enumerated by hand; formulas against Python's arithmetic."""

from __future__ import annotations

import json
import random
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from agreement import brute
from click.testing import CliRunner, Result
from programmable import Plan, State, drawn

from prover import cli, formula
from prover.api import check
from prover.errors import UserError
from prover.findings import Report
from prover.spec import Spec, read_each

BY_DIV = """\
module by_div #(parameter STEP = 1) (input clk, input rst, input [3:0] div, input spare, output reg tick);
  reg [3:0] left;
  always @(posedge clk)
    if (rst) begin left <= 4'd0; tick <= 1'b0; end
    else if (left == 4'd0) begin left <= div; tick <= ~tick; end
    else left <= left - STEP;
endmodule
"""


def written(folder: Path, text: str) -> str:
    path = folder / "divider.v"
    path.write_text(text, encoding="utf-8")
    return str(path)


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


# -- formulas ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "2*(a+1)",
        "a - b*3 + 7",
        "(a + b) // 2 * 2 + a % (b + 1)",
        "a**2 + 2**b",
        "min(a, b, 5) + max(a, 3)",
        "a if a > b else b",
        "-a + (not a) + +b",
        "(a < b) + (a <= b) + (a == b) + (a != b) + (a >= b) + (1 < a < b)",
        "(a > 2 or b > 2) + (a > 2 and b > 2)",
    ],
)
def test_a_formula_means_what_it_means_in_python(text: str) -> None:
    made = formula.read(text, "--ratio")
    assert set(made.names) <= {"a", "b"}
    for a in range(5):
        for b in range(5):
            assert made.value({"a": a, "b": b}) == eval(text, {"a": a, "b": b, "min": min, "max": max})


def test_numbers_are_exact() -> None:
    assert formula.read("0.1 + 0.2", "--ratio").value({}) == Fraction(3, 10)
    assert formula.read("1/3 + a/6", "--ratio").value({"a": 1}) == Fraction(1, 2)
    assert formula.read("(2**64 + 1)/2", "--ratio").value({}) == Fraction(2**64 + 1, 2)


@pytest.mark.parametrize(
    "text",
    ["", "2*", "a.real", "a[0]", "f(a)", "[a]", "lambda: 1", "a := 1", "'x'", "1e5", "1j", "min()", "min(a=1)",
     "a & 1", "a << 1", "~a", "__import__('os')", "max(*a)", "a if b", "(" * 150, "-" * 300, "1\n2", "True",
     "2*a # + 1", "(2\n*a)", "2*\\\na"],
)  # fmt: skip
def test_what_is_no_formula_is_refused_with_a_hint(text: str) -> None:
    with pytest.raises(UserError) as error:
        formula.read(text, "--ratio")
    assert error.value.hint


@pytest.mark.parametrize("text", ["1/a", "5 % a", "5 // a", "0**(a-1)", "9**9**9", "2**5000"])
def test_a_formula_without_a_value_is_refused(text: str) -> None:
    with pytest.raises(UserError):
        formula.read(text, "--ratio").value({"a": 0})


def test_values_are_read_as_they_are_written() -> None:
    assert read_each("div") == ("div", None)
    assert read_each("div=1..15") == ("div", ((1, 15),))
    assert read_each("s=8..0xf,0,2,1") == ("s", ((0, 2), (8, 15)))
    for text in ("", "=3", "div=", "div=5..3", "div=1..", "div=a", "div=-1", "div=1,,2"):
        with pytest.raises(UserError):
            read_each(text)


# -- every value -------------------------------------------------------------------------------------------


def enumerated(plan: Plan, div: int, period: int, high: int) -> brute.BruteResult[State]:
    after = {state: plan.step(state, div) for state in plan.states()}
    levels = {state: plan.output(state, div) for state in after}
    return brute.analyse(after, levels, period, high)


def wave_from_reset(plan: Plan, div: int) -> tuple[int, ...]:
    """The output once round the loop that the plan runs into after its reset."""
    after = {state: plan.step(state, div) for state in plan.states()}
    seen: dict[State, int] = {}
    state: State = (0, 0, 0)
    while state not in seen:
        seen[state] = len(seen)
        state = after[state]
    return tuple(plan.output(s, div) for s, at in seen.items() if at >= seen[state])


@pytest.mark.parametrize("seed", range(25))
def test_a_random_programmable_divider_is_judged_as_enumeration_says(seed: int, tmp_path: Path) -> None:
    rng = random.Random(seed)
    plan = drawn(rng, rng.randint(2, 3))
    path = written(tmp_path, plan.verilog())
    # Claim what some value does, for all of them: a straight line through it.
    period = brute.least_period(wave_from_reset(plan, rng.randrange(1 << plan.width)))
    period = max(4, period + period % 2)
    slope = rng.choice((0, 1, 2))
    ratio = formula.read(f"max(2, {period // 2} + {slope}*(div - 2))", "--ratio")
    high = formula.read("2", "--high")
    reset: dict[str, Any] = {"reset": "rst=1"} if plan.reset else {"holds": {"rst": 0}}
    report = check([path], Spec(ratio_formula=ratio, high_formula=high, each={"div": None}, **reset))
    assert report.each is not None
    found = {}
    for div in range(1 << plan.width):
        period = int(2 * ratio.value({"div": div}))
        found[div] = enumerated(plan, div, period, 2)
    agrees(report, found)


def agrees(report: Report, found: dict[int, brute.BruteResult[State]]) -> None:
    """Recovery and freedom from stuck outputs of every value, their rows, and the value that fails first."""
    assert report.each is not None
    verdicts = {finding.name: finding for finding in report.findings}
    lost = {div for div, result in found.items() if result.worst_half_cycles is None}
    stuck = {div for div, result in found.items() if result.stuck}
    for name, failing in (("recovery", lost), ("no-stuck", stuck)):
        finding = verdicts[name]
        assert finding.verdict == ("refuted" if failing else "proved")
        if failing:
            assert finding.facts["at"] == {"div": min(failing)}
            assert f"refuted at {len(failing)} of {len(found)} values" in finding.says
            assert finding.counterexample is not None
    if not lost:
        worst = max(result.worst_half_cycles or 0 for result in found.values())
        assert verdicts["recovery"].facts["worst_half_cycles"] == worst
    for row in report.each.rows:
        ((_, (low, last)),) = row.values
        for div in range(low, last + 1):
            assert ("recovery" in row.refuted) == (div in lost)
            assert ("no-stuck" in row.refuted) == (div in stuck)
    listed = [div for row in report.each.rows for div in range(row.values[0][1][0], row.values[0][1][1] + 1)]
    assert listed == sorted(found)


def test_every_value_of_eight_bits_is_proved() -> None:
    path = Path(__file__).parents[1] / "cases" / "gauge" / "sample_by_div.v"
    spec = Spec(ratio_formula=formula.read("2*(div+1)", "--ratio"), each={"div": None}, parameters={"W": 8})
    report = check([path], spec)
    assert report.verdict == "proved"
    assert report.each is not None
    assert report.each.count == 256
    assert report.each.shapes > 0
    # From all ones the counter runs down to 0, 255 cycles, with the clock just risen.
    recovery = next(finding for finding in report.findings if finding.name == "recovery")
    assert (recovery.facts["worst_half_cycles"], recovery.facts["exact"]) == (510, True)


def test_a_counterexample_is_of_the_machine_at_its_own_value(tmp_path: Path) -> None:
    # The ratio fails at 0 only (counted in the formula as 3), the high time at 2 only.
    options = [
        "--ratio",
        "2*(div+1) if div else 3",
        "--high",
        "2*(div+1) if div != 2 else 5",
        "--each",
        "div=0..3",
    ]
    path = written(tmp_path, BY_DIV)
    (tmp_path / "waves").mkdir()
    result = run("check", path, *options, "--json", "-", "--vcd", str(tmp_path / "waves"))
    report = json.loads(result.stdout)
    assert report["each"]["shown"] == {"div": 0}
    at = {p["name"]: p["facts"].get("at") for p in report["properties"] if p["verdict"] == "refuted"}
    assert at == {"ratio": {"div": 0}, "high-time": {"div": 2}, "recovery": {"div": 0}, "reset": {"div": 0}}
    # High for 6 half-cycles at 2: three cycles from the load to the toggle.
    high = next(p for p in report["properties"] if p["name"] == "high-time")
    assert "a high run of 6 half-cycles, not 5" in high["says"]
    assert high["counterexample"]["ends"] - high["counterexample"]["begins"] == 6
    wave = (tmp_path / "waves" / "high-time.vcd").read_text()
    assert "b10 " in wave
    # The other reports follow the finding to its own machine, too.
    others = ["--junit", str(tmp_path / "j.xml"), "--sarif", str(tmp_path / "s.json")]
    assert run("check", path, *options, *others).exit_code == 1
    assert "broken from half-cycle" in (tmp_path / "j.xml").read_text()
    (flows,) = [
        r["codeFlows"]
        for r in json.loads((tmp_path / "s.json").read_text())["runs"][0]["results"]
        if r["ruleId"] == "high-time"
    ]
    assert flows
    assert "counterexample to high-time, at div=2" in run("check", path, *options).stdout


def test_names_of_parameters_and_held_inputs_may_be_used_without_any_value_tried(tmp_path: Path) -> None:
    path = written(tmp_path, BY_DIV)
    options = ["--hold", "div=4", "--set", "STEP=1", "--ratio", "2*(div + STEP)"]
    report = json.loads(run("check", path, *options, "--json", "-").stdout)
    assert report["verdict"] == "proved"
    assert report["spec"]["ratio"] == "10"
    assert report["each"] is None


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--each", "dvi", "--ratio", "4"], "no such input"),
        (["--each", "div=0..16", "--ratio", "4"], "4 bits"),
        (["--each", "div", "--hold", "div=3", "--ratio", "4"], "both"),
        (["--each", "clk", "--ratio", "4", "--clock", "clk"], "clock"),
        (["--each", "div", "--each", "div=3", "--ratio", "4"], "twice"),
        (["--each", "div", "--ratio", "2*(dvi+1)"], "neither an input nor a parameter"),
        (["--hold", "div=2", "--ratio", "2*spare"], "no value"),
        (["--each", "div", "--ratio", "2*div"], "at div=0: ratio 0"),
        (["--each", "div", "--ratio", "2*(div+1)", "--high", "(div+3)/2"], "not a whole number"),
        (["--each", "div", "--ratio", "4/div"], "divides by zero at div=0"),
        (["--each", "div", "--ratio", "4", "--where", "div > 20"], "no value"),
        (["--hold", "div=2", "--ratio", "6", "--where", "div > 2"], "--where without --each"),
    ],
)
def test_a_claim_that_means_nothing_is_refused(options: list[str], words: str, tmp_path: Path) -> None:
    result = run("check", written(tmp_path, BY_DIV), *options)
    assert result.exit_code == 2
    assert words in result.stderr
    assert "hint: " in result.stderr
    assert not (tmp_path / "c.json").exists()


def test_values_far_from_the_first_are_found() -> None:
    # Two of 2^24 values meet the conditions, far behind as many as are gone through one by one.
    divider = str(Path(__file__).parents[1] / "cases" / "gauge" / "sample_by_div.v")
    options = ("--set", "W=24", "--each", "div", "--ratio", "2*(div+1)")
    far = ("--where", "div > 9000000", "--where", "div < 9000003")
    found = json.loads(
        run("check", divider, *options, *far, "--high", "2*(div+1)-(div==9000002)", "--json", "-").stdout
    )
    judged = {each["name"]: each for each in found["properties"]}
    assert judged["ratio"]["verdict"] == "proved"
    assert judged["high-time"]["verdict"] == "refuted"
    assert judged["high-time"]["facts"]["at"] == {"div": 9000002}
    none = run("check", divider, *options, "--where", "div > 9000000", "--where", "div < 9000001")
    assert (none.exit_code, "leaves no values" in none.stderr) == (2, True)
    hard = run("check", divider, *options, "--where", "div % 100000 == 99999")
    assert (hard.exit_code, "hint: " in hard.stderr, "leaves no" in hard.stderr) == (2, True, False)


def test_what_was_not_judged_for_want_of_effort_is_not_claimed(tmp_path: Path) -> None:
    path = written(tmp_path, BY_DIV)
    result = run("check", path, "--each", "div", "--ratio", "2*(div+1)", "--effort", "1e-9")
    assert result.exit_code == 3
    assert "PROVED " not in result.stdout


def test_a_measurement_takes_no_values(tmp_path: Path) -> None:
    from prover.api import measure

    with pytest.raises(UserError):
        measure([written(tmp_path, BY_DIV)], Spec(each={"div": None}))
