"""JUnit XML, read back with the standard library's reader and held against the verdicts.

The form asserted here is that of the strict schema (its order of elements, its required attributes and outputs); the
schema itself is applied in tests/agreement.
"""

from __future__ import annotations

import re
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import pytest
from click.testing import CliRunner, Result
from texts import BY_3, RING, SPINS, STICKS_AT_7, checked, written

from properties import NAMES
from prover import cli
from prover.errors import UserError, Where
from prover.findings import Report
from prover.report import junit
from prover.several import Outcome

WHEN = datetime(2031, 5, 6, 7, 8, 9, tzinfo=UTC)
# Clause 2.2 of XML 1.0: what a document may hold.
LEGAL = re.compile("[\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]*")
HOSTILE = "]]> --> & < \" ' \x00\x1b[2J\x7f\ud800\ufffe\uffff\u202e é 時 end"


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def read_back(*found: Outcome) -> list[Element]:
    """The suites of a document, after what the schema wants of every one of them."""
    text = junit.render(found, WHEN)
    assert LEGAL.fullmatch(text)
    root = ElementTree.fromstring(text)
    assert root.tag == "testsuites"
    suites = list(root)
    for number, suite in enumerate(suites):
        assert suite.get("id") == str(number)
        tags = [child.tag for child in suite]
        cases = suite.findall("testcase")
        assert tags == ["properties", *["testcase"] * len(cases), "system-out", "system-err"]
        for tag, name in (("failure", "failures"), ("error", "errors"), ("skipped", "skipped")):
            assert suite.get(name) == str(len(suite.findall(f"testcase/{tag}")))
        assert suite.get("tests") == str(len(cases))
        assert suite.get("timestamp") == "2031-05-06T07:08:09"
        assert suite.get("hostname")
        assert suite.get("package")
        assert float(suite.get("time") or "") >= 0
        for case in cases:
            assert len(case) <= 1
            assert case.get("classname") == suite.get("name")
            assert float(case.get("time") or "") == 0
            for said in case:
                assert (said.get("type") is None) == (said.tag == "skipped")
                assert said.get("message")
    return suites


def of(report: Report) -> Outcome:
    return Outcome(report.ports.design.files, report)


def kinds(suite: Element) -> dict[str, str]:
    return {
        case.get("name") or "": case[0].tag if len(case) else "passed" for case in suite.findall("testcase")
    }


@pytest.mark.parametrize(
    ("text", "ratio", "high"), [(BY_3, "3", None), (STICKS_AT_7, "5", 4), (SPINS, "2", None)]
)
def test_a_case_is_what_the_verdict_is(tmp_path: Path, text: str, ratio: str, high: int | None) -> None:
    report = checked(tmp_path, text, ratio, high=high)
    (suite,) = read_back(of(report))
    meant = {"proved": "passed", "refuted": "failure", "open": "error"}
    assert kinds(suite) == {finding.name: meant[finding.verdict] for finding in report.findings}
    for finding in report.findings:
        (case,) = [case for case in suite.findall("testcase") if case.get("name") == finding.name]
        if finding.verdict != "proved":
            assert case[0].get("type") == finding.verdict
            assert finding.claim in (case[0].text or "")
            assert case[0].get("message") == finding.says


def test_a_waived_property_is_skipped_for_the_reason_given(tmp_path: Path) -> None:
    reasons = {"no-stuck": "reset is always applied", "recovery": "the same", "ratio": "proved anyway"}
    report = checked(tmp_path, STICKS_AT_7, "5", high=4, waivers=reasons)
    (suite,) = read_back(of(report))
    skipped = {
        c.get("name"): c[0].get("message") for c in suite.findall("testcase") if c.find("skipped") is not None
    }
    assert skipped == {"no-stuck": "waived: reset is always applied", "recovery": "waived: the same"}


def test_what_has_no_report_passes_no_gate() -> None:
    error = UserError("syntax error", Where("a.v", 6, 3, "if rst"), "mend it")
    suites = read_back(
        Outcome(("a.v", "b.v"), error=error),
        Outcome(("c.v",), fault="InternalError: at odds"),
        Outcome(("d.v",), open="the effort ran out"),
    )
    assert [set(kinds(suite).values()) for suite in suites] == [{"error"}] * 3
    assert [suite[1][0].get("type") for suite in suites] == ["unusable", "fault", "open"]
    assert suites[0][1][0].get("message") == "a.v:6: syntax error"
    assert "hint: mend it" in (suites[0][1][0].text or "")
    # A property that was not judged is not left out: a gate would take it for one that holds.
    assert tuple(kinds(suites[2])) == NAMES


def test_hostile_texts_are_read_back_as_the_terminal_shows_them(tmp_path: Path) -> None:
    report = checked(tmp_path, STICKS_AT_7, "5", high=4, waivers={"recovery": HOSTILE})
    finding = replace(report.findings[0], verdict="refuted", says=HOSTILE, claim=HOSTILE)
    report = replace(report, findings=(finding, *report.findings[1:]), notes=(HOSTILE,))
    error = UserError(HOSTILE, Where(HOSTILE, 1, 1, HOSTILE), HOSTILE)
    suite, other = read_back(of(report), Outcome((HOSTILE,), error=error))
    shown = "]]> --> & < \" ' \\x00\\x1b[2J\\x7f\\ud800\\ufffe\\uffff\\u202e é 時 end"
    assert suite.findall("testcase")[0][0].get("message") == shown
    assert f"claimed: {shown}" in (suite.findall("testcase")[0][0].text or "")
    assert f"note: {shown}" in (suite.findtext("system-out") or "")
    assert suite.findall("testcase/skipped")[0].get("message") == f"waived: {shown}"
    assert (other.get("name"), other.get("package")) == (shown, shown)
    assert other[1][0].get("message") == f"{shown}:1: {shown}"


def test_the_command_writes_one_also_where_the_source_is_unusable(tmp_path: Path) -> None:
    out = tmp_path / "out.xml"
    result = run("check", written(tmp_path, BY_3), "--ratio", "3", "--junit", str(out))
    assert (result.exit_code, "verdict  PROVED" in result.stdout) == (0, True)
    assert kinds(ElementTree.parse(out).getroot()[0]).keys() == set(NAMES)
    result = run(
        "check", written(tmp_path, BY_3.replace("(rst)", "rst")), "--ratio", "3", "--junit", str(out)
    )
    assert (result.exit_code, "syntax error" in result.stderr) == (2, True)
    assert kinds(ElementTree.parse(out).getroot()[0]) == {"readable": "error"}
    result = run("check", written(tmp_path, BY_3), "--ratio", "3", "--effort", "1e-9", "--junit", "-")
    assert result.exit_code == 3
    assert "error" in kinds(ElementTree.fromstring(result.stdout)[0]).values()
    assert "passed" not in kinds(ElementTree.fromstring(result.stdout)[0]).values()


def test_several_dividers_are_a_suite_each(tmp_path: Path) -> None:
    for name, text in (("a", BY_3), ("b", RING), ("c", BY_3.replace("(rst)", "rst"))):
        (tmp_path / f"{name}.v").write_text(text)
    result = run("check", str(tmp_path), "--ratio", "3", "--junit", "-")
    assert result.exit_code == 2
    suites = list(ElementTree.fromstring(result.stdout))
    assert [suite.get("package") for suite in suites] == [str(tmp_path / f"{x}.v") for x in "abc"]
    assert [(suite.get("failures"), suite.get("errors")) for suite in suites][0::2] == [
        ("0", "0"),
        ("0", "1"),
    ]
    assert int(suites[1].get("failures") or "0") > 0
