"""Every group of every case: verdicts, figures and refusals are those that the case's comment states.

The figures were computed outside this program when the cases were written, by an event simulator, by enumeration, or
taken from the published table that the case names; tests/agreement computes those of up to 12 register bits anew.
"""

from __future__ import annotations

import json
import re
import shlex
from pathlib import Path
from typing import Any

import pytest
from cases_format import (
    CASES,
    FOLDERS,
    PROPERTIES,
    Case,
    Group,
    Stated,
    StatedMoves,
    StatedWave,
    cases,
)
from click.testing import CliRunner, Result
from pages import page

from prover import cli

STATUS = {"proved": 0, "refuted": 1, "open": 3}

ALL = [(case, group) for case in cases() for group in case.groups]


def named(pairs: list[tuple[Case, Group]]) -> list[Any]:
    return [pytest.param(c, g, id=f"{c.name}: {shlex.join(g.options)}") for c, g in pairs]


def run(case: Case, *options: str) -> Result:
    return CliRunner().invoke(cli.main, ["check", str(case.path), *options], catch_exceptions=False)


@pytest.mark.parametrize(("case", "group"), named([pair for pair in ALL if not pair[1].error]))
def test_a_case_is_judged_as_it_states(case: Case, group: Group, tmp_path: Path) -> None:
    html = tmp_path / "report.html"
    result = run(case, *group.options, "--json", "-", "--html", str(html))
    assert result.exit_code in STATUS.values(), result.stderr
    report = json.loads(result.stdout)
    assert report["verdict"] in group.verdicts
    assert result.exit_code == STATUS[report["verdict"]]
    assert page(html.read_text(encoding="utf-8")).of("overall")[0].text.startswith(report["verdict"])
    found = {each["name"]: each for each in report["properties"]}
    # A mean fixes no high time, so that there may be no claim about it; nor is there one about a reset that is not there.
    unclaimed = {"high-time"} if "--mean" in group.options and "--high" not in group.options else set()
    unclaimed |= {"reset"} if report["design"]["reset"] is None else set()
    judged = tuple(name for name in PROPERTIES if name not in unclaimed)
    assert tuple(found) == (*judged, *group.moves)
    shown = report["each"]["shown"] if report["each"] else {}
    assert ", ".join(f"{name}={value}" for name, value in shown.items()) == group.at
    for line, words in group.notes:
        assert any(f"{case.path}:{line}: " in note and words in note for note in report["notes"]), report[
            "notes"
        ]
    if set(group.properties) == {"settling"}:
        # Of a machine that never settles nothing else is known, and nothing else may be said.
        assert found["settling"]["verdict"] == "refuted"
        assert {found[name]["verdict"] for name in judged if name != "settling"} == {"open"}
        return
    assert (*group.properties, *group.moves) == tuple(found)
    for name, stated in group.properties.items():
        check_property(found[name], stated)
    for name, moves in group.moves.items():
        check_moves(found[name], moves)
    check_measured(report["measured"], found, group)


def check_property(found: dict[str, Any], stated: Stated) -> None:
    verdict, facts = found["verdict"], found["facts"]
    assert verdict in stated.verdicts, found
    assert bool(found["obligations"]) == stated.obligation, found
    if verdict == "refuted" and found["name"] == "glitch-free":
        assert found["glitch"] is not None
    elif verdict == "refuted" and found["name"] != "settling":
        assert found["counterexample"] is not None or found["trace"]["rests"]
    if found["name"] == "reset":
        assert facts.get("shortest_reset_half_cycles") == stated.held
    if verdict != "open" and found["name"] == "recovery":
        assert facts["worst_half_cycles"] == stated.worst
        assert facts["exact"] == stated.exact


def check_moves(found: dict[str, Any], stated: StatedMoves) -> None:
    verdict, facts, trace = found["verdict"], found["facts"], found.get("trace")
    assert verdict in stated.verdicts, found
    assert (trace is None) == (verdict != "refuted")
    assert (trace["rests"][-1]["half_cycle"] + 1 if trace else None) == stated.run
    assert (facts.get("back_half_cycles"), facts.get("exact", False)) == (stated.back, stated.exact)
    assert tuple(facts.get("parked", ())) == stated.parked


def check_measured(measured: dict[str, Any], found: dict[str, Any], group: Group) -> None:
    loops = measured["loops"]
    if group.loops is not None:
        assert measured["complete"]
        assert (len(loops), sum(not loop["good"] for loop in loops)) == (group.loops, group.false_loops)
        assert any(loop["stuck"] for loop in loops) == group.stuck
    assert (found["no-stuck"]["verdict"] == "refuted") == group.stuck
    for scope, stated in (("reset", group.from_reset), ("initial", group.from_initial)):
        if stated is not None:
            assert measured["scope"] == scope
            check_starts(measured, stated)


def check_starts(measured: dict[str, Any], stated: StatedWave) -> None:
    """Every start state runs into the stated wave, at whichever clock level it begins."""
    starts = measured["starts"]
    assert starts
    for start in starts:
        assert start["period_half_cycles"] == stated.period
        assert start["loop_half_cycles"] > 0
        if stated.high is not None:
            assert start["high_half_cycles"] == stated.high
            assert start["wave"] == [[1, stated.high], [0, (stated.period or 0) - stated.high]]
    first = measured["from_reset"]
    assert (first["period_half_cycles"] if first else None) == stated.period


@pytest.mark.parametrize(("case", "group"), named([pair for pair in ALL if pair[1].error]))
def test_a_refused_case_names_the_place_and_a_remedy_and_writes_nothing(
    case: Case, group: Group, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    before = sorted(CASES.rglob("*"))
    result = run(case, *group.options, "--json", "report.json", "--vcd", "wave.vcd")
    assert result.exit_code == 2, result.stdout
    assert result.stdout == ""
    message, hint, remedy = result.stderr.partition("\nhint: ")
    assert hint
    assert remedy.strip()
    for word in group.error:
        assert word in result.stderr
    if group.line is not None:
        assert re.match(rf"error: {re.escape(str(case.path))}:{group.line}: ", message), message
        assert case.path.read_text(encoding="utf-8").splitlines()[group.line - 1].strip() in message
    assert list(tmp_path.iterdir()) == []
    assert sorted(CASES.rglob("*")) == before


def test_every_folder_has_the_cases_it_is_for() -> None:
    assert {case.path.parent.name for case, _ in ALL} == set(FOLDERS)
    for case, group in ALL:
        if case.path.parent.name == "refused":
            assert group.error
        if case.path.parent.name == "gauge":
            assert "refuted" not in group.verdicts
    for case in cases("faulty"):
        assert "refuted" in case.groups[0].verdicts


# A burst of seven counts for every edge: it settles, and takes more micro-steps than are looked at.
BURST = """\
module burst (input clk, output tick);
  reg [2:0] count, target;
  wire osc, more;
  assign more = count != target;
  assign osc = more & ~osc;
  always @(posedge clk) target <= target + 3'd7;
  always @(posedge osc) count <= count + 3'd1;
  assign tick = count[2];
endmodule
"""


def test_a_chain_that_is_too_long_to_bound_is_left_open(tmp_path: Path) -> None:
    source = tmp_path / "burst.v"
    source.write_text(BURST, encoding="utf-8")
    result = CliRunner().invoke(cli.main, ["check", str(source), "--ratio", "2"], catch_exceptions=False)
    assert result.exit_code == STATUS["open"]
    assert "REFUTED" not in result.stdout
    assert "PROVED" not in result.stdout
