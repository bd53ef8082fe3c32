"""SARIF logs, read back as JSON and held against the verdicts and against rules of the standard that its schema does
not check (clauses of SARIF 2.1.0, from memory). The schema itself is applied in tests/agreement."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator
from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any
from urllib.parse import unquote

import pytest
from click.testing import CliRunner, Result
from small import toggle
from texts import BY_3, RING, SECOND, SPINS, STICKS_AT_7, checked, written

from properties import ALL, NAMES
from prover import Spec, check, cli
from prover.errors import UserError, Where
from prover.expr import var
from prover.findings import Report
from prover.report import sarif
from prover.several import Outcome
from prover.trace import Rest, Trace
from prover.trace import run as replay

CASES = Path(__file__).parents[1] / "cases"


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def of(report: Report) -> Outcome:
    return Outcome(report.ports.design.files, report)


def log_of(*found: Outcome) -> dict[str, Any]:
    """The only run of the log, after what has to hold of every log."""
    log = json.loads(sarif.render(found))
    assert log["version"] == "2.1.0"
    (made,) = log["runs"]
    assert isinstance(made, dict)
    rules = [rule["id"] for rule in made["tool"]["driver"]["rules"]]
    assert len(set(rules)) == len(rules)
    assert all(rule["shortDescription"]["text"] for rule in made["tool"]["driver"]["rules"])
    for result in made["results"]:
        assert rules[result["ruleIndex"]] == result["ruleId"]
    for place in places(made):
        file = made["artifacts"][place["artifactLocation"]["index"]]["location"]
        assert file == place["artifactLocation"]
        assert place["region"]["startLine"] >= 1
        assert place["region"]["startColumn"] >= 1
    return made


def places(node: Any) -> Iterator[dict[str, Any]]:
    """Every place that a log names."""
    if isinstance(node, dict):
        if "artifactLocation" in node:
            yield node
        for child in node.values():
            yield from places(child)
    elif isinstance(node, list):
        for child in node:
            yield from places(child)


def verdicts(made: dict[str, Any]) -> dict[str, str]:
    """The kind of each property's result."""
    judged = [r for r in made["results"] if r["kind"] in ("pass", "fail", "open")]
    assert len({r["ruleId"] for r in judged}) == len(judged)
    return {r["ruleId"]: r["kind"] for r in judged}


def reports(folder: Path) -> dict[str, Outcome]:
    """Outcomes of every sort."""
    ripple = CASES / "gauge" / "ping_by_7_ripple.v"
    waivers = {"no-stuck": "reset is always applied", "recovery": "the same"}
    return {
        "proved": of(checked(folder, BY_3, "3")),
        "obliged": of(check([ripple], Spec(ratio=Fraction(7), output="ping"))),
        "refuted": of(checked(folder, RING, "3")),
        "waived": of(checked(folder, STICKS_AT_7, "5", high=4, waivers=waivers)),
        "unsettled": of(checked(folder, SPINS, "2")),
        "unreadable": Outcome(("a.v",), error=UserError("no", Where("a.v", 6, 3, "text"), "mend it")),
        "fault": Outcome(("b.v",), fault="InternalError: at odds"),
        "left open": Outcome(("c.v",), open="the effort ran out"),
    }


def test_only_what_fails_has_a_level(tmp_path: Path) -> None:
    # Clause 3.27.10: where kind is other than "fail", level shall be "none".
    found = reports(tmp_path)
    made = log_of(*found.values())
    seen = {(result["kind"], result["level"]) for result in made["results"]}
    assert seen == {
        ("fail", "error"),
        ("pass", "none"),
        ("open", "none"),
        ("review", "none"),
        ("notApplicable", "none"),
        ("informational", "none"),
    }


def test_a_result_is_what_the_verdict_is(tmp_path: Path) -> None:
    for name, outcome in reports(tmp_path).items():
        made = log_of(outcome)
        if outcome.report is None:
            assert verdicts(made) == (dict.fromkeys(NAMES, "open") if name == "left open" else {})
            continue
        meant = {"proved": "pass", "refuted": "fail", "open": "open"}
        assert verdicts(made) == {f.name: meant[f.verdict] for f in outcome.report.findings}, name
        unclaimed = {r["ruleId"] for r in made["results"] if r["kind"] == "notApplicable"}
        assert unclaimed == set(ALL) - set(verdicts(made))
        waived = {r["ruleId"]: r["suppressions"] for r in made["results"] if "suppressions" in r}
        assert {name: each[0]["justification"] for name, each in waived.items()} == {
            f.name: f.waived for f in outcome.report.findings if f.waived is not None
        }
        reviewed = [r["locations"][0]["physicalLocation"] for r in made["results"] if r["kind"] == "review"]
        obligations = [o for f in outcome.report.findings for o in f.obligations]
        assert [place["region"]["startLine"] for place in reviewed] == [o.where.line for o in obligations]


def test_a_run_succeeds_where_every_divider_has_a_report_or_is_left_open(tmp_path: Path) -> None:
    for name, outcome in reports(tmp_path).items():
        (invocation,) = log_of(outcome)["invocations"]
        bad = name in ("unreadable", "fault")
        assert invocation["executionSuccessful"] == (not bad), name
        levels = [n["level"] for n in invocation["toolExecutionNotifications"]]
        assert levels.count("error") == bad
    made = log_of(reports(tmp_path)["unreadable"])
    (told,) = made["invocations"][0]["toolExecutionNotifications"]
    assert told["message"]["text"] == "no; mend it"
    assert told["locations"][0]["physicalLocation"]["region"] == {"startLine": 6, "startColumn": 3}


def test_a_result_stands_on_the_line_that_decides(tmp_path: Path) -> None:
    lines = STICKS_AT_7.splitlines()
    made = log_of(of(checked(tmp_path, STICKS_AT_7, "5", high=4)))
    (stuck,) = [r for r in made["results"] if r["ruleId"] == "no-stuck"]
    place = stuck["locations"][0]["physicalLocation"]
    assert "count <= 3'd0" in lines[place["region"]["startLine"] - 1]
    assert place["contextRegion"]["snippet"]["text"] == lines[place["region"]["startLine"] - 1]
    # The wave by 6 of the pinger is launched by the top stage and ended by the delay: the run that is too short ends
    # where the delay falls, the gap that is too short where the stage rises.
    source = (CASES / "faulty" / "by_7_clears_at_6.v").read_text()
    made = log_of(of(checked(tmp_path, source, "7")))
    at = {
        r["ruleId"]: r["locations"][0]["physicalLocation"]["contextRegion"]["snippet"]["text"]
        for r in made["results"]
    }
    assert "negedge ck) q <= d" in at["high-time"]
    assert "if (!clear_n) q" in at["ratio"]
    # A note of the reader is a notification at its own line.
    source = (CASES / "faulty" / "truncated_limit.v").read_text()
    (note,) = log_of(of(checked(tmp_path, source, "600")))["invocations"][0]["toolExecutionNotifications"]
    assert note["level"] == "note"
    assert (
        "LAST = 299"
        in source.splitlines()[note["locations"][0]["physicalLocation"]["region"]["startLine"] - 1]
    )


def flow(made: dict[str, Any], name: str) -> list[dict[str, Any]]:
    (result,) = [r for r in made["results"] if r["ruleId"] == name and r["kind"] == "fail"]
    (code_flow,) = result["codeFlows"]
    (thread,) = code_flow["threadFlows"]
    steps: list[dict[str, Any]] = thread["locations"]
    assert [step["executionOrder"] for step in steps] == list(range(len(steps)))
    return steps


def test_a_counterexample_is_a_flow_of_half_cycles(tmp_path: Path) -> None:
    source = (CASES / "faulty" / "by_7_clears_at_6.v").read_text()
    report = checked(tmp_path, source, "7")
    steps = flow(log_of(of(report)), "ratio")
    # By hand: six input cycles round, so the output rises every 12 half-cycles; the README draws the same run.
    ping = [int(step["state"]["ping"]["text"]) for step in steps]
    rises = [t for t in range(1, len(ping)) if ping[t] > ping[t - 1]]
    assert rises[1] - rises[0] == 12
    essential = [t for t, step in enumerate(steps) if step["importance"] == "essential"]
    assert essential == rises[:2]
    (finding,) = [f for f in report.findings if f.name == "ratio"]
    assert finding.counterexample is not None
    for at, step in enumerate(steps):
        state = report.rhythm.system.describe(finding.counterexample.orbit.state(at))
        assert {name: step["state"][name]["text"] for name in state} == {n: str(v) for n, v in state.items()}


def test_a_run_of_billions_is_folded(tmp_path: Path) -> None:
    text = SECOND.replace("24999999;", "25000001;")
    made = log_of(of(checked(tmp_path, text, "50_000_000")))
    steps = flow(made, "high-time")
    assert 8 < len(steps) <= sarif.MOST_STEPS + 16
    folds = [step["location"]["message"]["text"] for step in steps if step["importance"] == "unimportant"]
    assert any("half-cycles …" in text for text in folds)
    assert len(json.dumps(made)) < 400_000


def test_what_never_settles_is_a_flow_of_micro_steps(tmp_path: Path) -> None:
    steps = flow(log_of(of(checked(tmp_path, SPINS, "2"))), "settling")
    spin = [step["state"]["spin"]["text"] for step in steps[:-1]]
    assert spin in (["0", "1"], ["1", "0"])
    assert steps[-1]["location"]["message"]["text"] == "and again from micro-step 0"


def test_a_run_whose_inputs_move_is_a_flow_of_rests(tmp_path: Path) -> None:
    report = checked(tmp_path, RING, "3")
    first = Rest(0, False, {"rst": 1}, {"count": 1, "tick": 1, "clk": 0}, {"tick": 1})
    rests = replay(
        toggle(1, 1), "clk", {"tick": var("tick", 1)}, first, [None, None, {"rst": 0}, *[None] * 9], 4
    )
    finding = replace(report.findings[0], counterexample=None, trace=Trace(rests, 2, 5, "a pulse", "reset"))
    made = log_of(of(replace(report, findings=(finding,))))
    steps = flow(made, finding.name)
    assert [int(step["state"]["output tick"]["text"]) for step in steps] == [r.outputs["tick"] for r in rests]
    assert any("inputs: rst=0" in step["location"]["message"]["text"] for step in steps)


# -- files and texts ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["plain.v", "a b#c?d%20e:f[g].v", "été 時.v", "back\\slash\x1b[2J.v"])
def test_files_are_named_from_the_working_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    monkeypatch.chdir(tmp_path)
    path = Path("sub") / name
    path.parent.mkdir()
    path.write_text(RING)
    out = tmp_path / "out.sarif"
    assert run("check", str(path), "--ratio", "3", "--sarif", str(out)).exit_code == 1
    made = json.loads(out.read_text(encoding="utf-8"))["runs"][0]
    (artifact,) = made["artifacts"]
    location = artifact["location"]
    assert location["uri"].isascii()
    assert not set(location["uri"]) & set(' #?[]\\"<>{}|^`')
    assert unquote(location["uri"]) == str(path)
    assert location["uriBaseId"] in made["originalUriBaseIds"]
    assert artifact["hashes"]["sha-256"] == hashlib.sha256(path.read_bytes()).hexdigest()


def test_a_file_from_elsewhere_has_its_whole_address(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    inside = tmp_path / "inside"
    inside.mkdir()
    monkeypatch.chdir(inside)
    report = checked(tmp_path, BY_3, "3")
    (artifact,) = log_of(of(report))["artifacts"]
    assert artifact["location"]["uri"] == (tmp_path / "divider.v").as_uri()
    assert "uriBaseId" not in artifact["location"]


def prints(folder: Path, *arguments: str) -> dict[str, tuple[str, str, int]]:
    """Of each result by its fingerprint: rule, kind, and line."""
    path = folder / "out.sarif"
    CliRunner().invoke(cli.main, ["check", *arguments, "--sarif", str(path)], catch_exceptions=False)
    results = json.loads(path.read_text(encoding="utf-8"))["runs"][0]["results"]
    found = {
        r["partialFingerprints"]["claim/v1"]: (
            r["ruleId"],
            r["kind"],
            r["locations"][0]["physicalLocation"]["region"]["startLine"],
        )
        for r in results
    }
    # No two results of a run have one print.
    assert len(found) == len(results)
    return found


def test_fingerprints_stay_while_lines_move_and_verdicts_change(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("a.v").write_text(STICKS_AT_7)
    asked = ("a.v", "--ratio", "5", "--high", "4")
    first = prints(tmp_path, *asked)
    Path("a.v").write_text("// two\n// lines\n" + STICKS_AT_7)
    moved = prints(tmp_path, *asked)
    assert {name: (rule, kind, line + 2) for name, (rule, kind, line) in first.items()} == moved
    # The count that held itself goes on: what was refuted is proved under the print that it had.
    Path("a.v").write_text(STICKS_AT_7.replace("count == 3'd4", "count >= 3'd4"))
    mended = prints(tmp_path, *asked)
    assert mended.keys() == first.keys()
    assert {name: (first[name][1], mended[name][1]) for name in first if first[name][0] == "no-stuck"} == {
        name: ("fail", "pass") for name in first if first[name][0] == "no-stuck"
    }
    # Another claim, another file and another working folder: another print, another print, the same.
    claimed = {name for name, (rule, _, _) in first.items() if rule == "ratio"}
    assert not claimed & prints(tmp_path, "a.v", "--ratio", "6", "--high", "4").keys()
    Path("b.v").write_text(Path("a.v").read_text())
    assert not claimed & prints(tmp_path, "b.v", *asked[1:]).keys()
    inner = tmp_path / "elsewhere"
    inner.mkdir()
    (inner / "a.v").write_text(STICKS_AT_7)
    monkeypatch.chdir(inner)
    assert prints(inner, *asked).keys() == first.keys()


def test_hostile_texts_stay_plain_text(tmp_path: Path) -> None:
    hostile = "[click](http:0) {0} \x1b[2J\x00 \ud800 \u202e é <b>"
    report = checked(tmp_path, RING, "3")
    finding = replace(report.findings[0], says=hostile, waived=hostile)
    text = sarif.render([of(replace(report, findings=(finding,)))])
    assert text.isascii()
    result = json.loads(text)["runs"][0]["results"][0]
    said = result["message"]["text"]
    # Clauses 3.11.5 and 3.11.6: braces stand for arguments and brackets before a bracket for links.
    assert "[click\\](http:0) {{0}} \\x1b[2J\\x00 \\ud800 \\u202e é <b>" in said
    assert (
        result["suppressions"][0]["justification"]
        == "[click](http:0) {0} \\x1b[2J\\x00 \\ud800 \\u202e é <b>"
    )


def test_escaped_names_are_read_back_as_they_are(tmp_path: Path) -> None:
    text = RING.replace("tick", '\\"]]>--\\{0}<&%s ')
    made = log_of(of(checked(tmp_path, text, "3")))
    steps = flow(made, "no-stuck")
    assert '\\"]]>--\\{0}<&%s' in steps[0]["state"]


def test_the_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    text = written(tmp_path, STICKS_AT_7)
    logs = [run("check", text, "--ratio", "5", "--high", "4", "--sarif", "-").stdout for _ in range(2)]
    assert logs[0] == logs[1]
    assert json.loads(logs[0])["version"] == "2.1.0"


def test_several_dividers_are_in_one_run_with_what_could_not_be_read(tmp_path: Path) -> None:
    for name, text in (("a", BY_3), ("b", RING), ("c", BY_3.replace("(rst)", "rst"))):
        (tmp_path / f"{name}.v").write_text(text)
    result = run("check", str(tmp_path), "--ratio", "3", "--sarif", "-")
    assert result.exit_code == 2
    (made,) = json.loads(result.stdout)["runs"]
    assert len(made["artifacts"]) == 3
    assert [(r["ruleId"], r["kind"]) for r in made["results"]].count(("ratio", "pass")) == 1
    assert [(r["ruleId"], r["kind"]) for r in made["results"]].count(("ratio", "fail")) == 1
    assert made["invocations"][0]["executionSuccessful"] is False
    alone = run("check", str(tmp_path / "c.v"), "--ratio", "3", "--sarif", "-")
    assert alone.exit_code == 2
    (made,) = json.loads(alone.stdout)["runs"]
    assert made["results"] == []
    assert made["invocations"][0]["executionSuccessful"] is False
