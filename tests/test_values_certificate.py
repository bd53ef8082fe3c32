"""Certificates of claims on each value: right ones are accepted without any engine, altered ones are rejected."""

from __future__ import annotations

import json
import random
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from test_recheck import with_one_alteration

from prover import Spec, check, each, formula, generalise
from prover.certificate import discharge
from prover.domain import Domain
from prover.effort import Effort
from prover.evidence import Malformed
from prover.findings import Report
from prover.rebuild import Rejected
from prover.recheck import derive, recheck
from prover.report.certificate import certify, render
from prover.values_evidence import as_object, read
from prover.values_rebuild import made_of

ROOT = Path(__file__).parents[1]
CASES = ROOT / "cases"

RATIO, ZERO = "2*(div+1)", "2*max(div,1)"

# Name: case, ratio, values, whether all that can be is proved at once.
SUBJECTS: dict[str, tuple[str, str, tuple[tuple[int, int], ...] | None, bool]] = {
    "listed": ("gauge/sample_by_div.v", RATIO, ((3, 6),), False),
    "at once": ("gauge/sample_by_div.v", RATIO, None, True),
    "fails at 0": ("faulty/sample_no_zero.v", ZERO, ((0, 3),), False),
    "fails at once": ("faulty/sample_no_zero.v", ZERO, None, True),
}
_made: dict[str, tuple[Report, str]] = {}


@pytest.fixture(autouse=True)
def _at_root(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    monkeypatch.setattr(generalise, "LEFT", 3)


def made(name: str) -> tuple[Report, str]:
    """The report and the certificate of a subject, made once."""
    if name not in _made:
        case, ratio, values, at_once = SUBJECTS[name]
        files = [f"cases/{case}"]
        spec = Spec(
            ratio_formula=formula.read(ratio, "--ratio"),
            each={"div": values},
            parameters={"W": 6} if case.startswith("gauge") else {},
        )
        with pytest.MonkeyPatch.context() as patch:
            if at_once:
                patch.setattr(each, "ENUMERATED", 0)
            report = check(files, spec)
        assert report.each is not None
        assert (report.each.shapes > 0) == at_once
        _made[name] = report, certify(report, files, Effort(120)).text
    return _made[name]


@pytest.mark.parametrize("name", SUBJECTS)
def test_a_certificate_on_each_value_bears_the_report_and_is_accepted(name: str, tmp_path: Path) -> None:
    report, text = made(name)
    path = tmp_path / "values.json"
    path.write_text(text, encoding="utf-8")
    outcome = recheck(path)
    assert outcome.accepted, outcome.differences or outcome.gave_up
    stated = json.loads(text)
    told = [(p["name"], p["verdict"]) for p in stated["properties"]]
    assert told == [(finding.name, finding.verdict) for finding in report.findings]
    values = SUBJECTS[name][2]
    assert stated["claim"]["each"] == {"div": None if values is None else [list(ends) for ends in values]}
    assert (stated["evidence"]["together"] is not None) == SUBJECTS[name][3]
    refuted = [p["says"] for p in stated["properties"] if p["verdict"] == "refuted"]
    assert all(says.startswith("at div=0: ") for says in refuted)
    assert bool(refuted) == name.startswith("fails")


def test_other_solvers_refute_the_same_obligations(tmp_path: Path) -> None:
    path = tmp_path / "values.json"
    path.write_text(made("at once")[1], encoding="utf-8")
    for solver in ("bitwuzla", "cvc5"):
        assert recheck(path, solver).accepted


def test_no_engine_takes_part_for_values(tmp_path: Path) -> None:
    paths = []
    for number, name in enumerate(("listed", "at once")):
        paths.append(str(tmp_path / f"{number}.json"))
        Path(paths[-1]).write_text(made(name)[1], encoding="utf-8")
    code = (
        "import sys; from prover.recheck import recheck\n"
        f"assert all(recheck(path).accepted for path in {paths})\n"
        "print(sorted(m for m in sys.modules if m.startswith('prover.') and m.count('.') == 1))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    assert "'prover.family'" in done.stdout
    for engine in ("orbit", "graph", "wide", "analyse", "collect", "generalise", "sample", "together"):
        assert f"'prover.{engine}'" not in done.stdout


@pytest.mark.parametrize("name", SUBJECTS)
def test_any_alteration_of_a_certificate_on_values_is_rejected(name: str) -> None:
    document = json.loads(made(name)[1])
    rng = random.Random(3)
    count = 0
    while count < 40:
        other = with_one_alteration(document, rng)
        if json.dumps(other) == json.dumps(document):
            continue
        count += 1
        with pytest.raises(Rejected) as told:
            derive(render(other), [Path()], Effort(60))
        assert str(told.value), other


def test_a_course_with_another_level_is_rejected() -> None:
    # The release of reset would be refuted by it, with a trace that the divider does not run through.
    document = json.loads(made("listed")[1])
    for half_cycle in document["evidence"]["singly"][0]["paths"][0]:
        if isinstance(half_cycle, dict) and "level" in half_cycle:
            half_cycle["level"] ^= 1
            with pytest.raises(Rejected):
                derive(render(document), [Path()], Effort(60))
            half_cycle["level"] ^= 1


def test_evidence_comes_out_of_a_certificate_as_it_went_in() -> None:
    for name in SUBJECTS:
        written = json.loads(made(name)[1])["evidence"]
        assert (
            json.loads(
                json.dumps(as_object(read(written, {"div": 6 if "gauge" in SUBJECTS[name][0] else 4})))
            )
            == written
        )


@pytest.mark.parametrize("name", ["at once", "fails at once"])
def test_evidence_on_values_that_is_altered_to_fit_claims_nothing_false(name: str) -> None:
    """Whoever alters the evidence can write verdicts and obligations that follow. Then these fail, or what is claimed
    is still true: the report's verdicts, and a bound on the recovery that is no lower."""
    report, text = made(name)
    assert report.each is not None
    assert report.each.basis is not None
    basis = report.each.basis
    width = basis.design.inputs["div"]
    original = json.loads(text)["evidence"]
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    worst = next(f.facts["worst_half_cycles"] for f in report.findings if f.name == "recovery")
    rng = random.Random(5)
    rejected = 0
    for _ in range(40):
        other: dict[str, Any] = with_one_alteration({"evidence": original["together"]}, rng)
        changed = {**original, "together": other.get("evidence")}
        if changed == original:
            continue
        try:
            again = made_of(basis.design, basis.spec, read(changed, {"div": width}), Effort(60))
        except (Malformed, Rejected):
            rejected += 1
            continue
        if not all(discharge(each_one, Effort(60)) for each_one in again.obligations):
            rejected += 1
            continue
        for finding in again.report.findings:
            assert finding.verdict in (verdicts[finding.name], "open")
            if finding.name == "recovery" and finding.verdict == "proved":
                found = finding.facts["worst_half_cycles"]
                assert isinstance(found, int)
                assert isinstance(worst, int)
                assert found >= worst
    assert rejected > 20


def test_values_that_are_missing_from_a_certificate_are_left_open() -> None:
    report, text = made("listed")
    assert report.each is not None
    assert report.each.basis is not None
    basis = report.each.basis
    assert Domain.of(basis.design, basis.spec).count == 4
    found = read(json.loads(text)["evidence"], {"div": 6})
    fewer = made_of(basis.design, basis.spec, type(found)(found.singly[1:], None), Effort(60))
    assert {finding.verdict for finding in fewer.report.findings} == {"open"}
    with pytest.raises(Rejected):
        made_of(basis.design, basis.spec, type(found)(tuple(reversed(found.singly)), None), Effort(60))


FREE = """\
module free #(parameter W = 7) (input clk, input rst, input [W-1:0] div, output reg tick);
  reg [W-1:0] left;
  INITIAL
  always @(posedge clk)
    RESET if (left == 0) begin left <= div; tick <= ~tick; end
    else left <= left - 1'b1;
endmodule
"""


@pytest.mark.parametrize("start", ["initial", "any", "reset"])
def test_the_claim_may_begin_anywhere(start: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    initial = "initial begin left = 0; tick = 0; end" if start == "initial" else ""
    cleared = "if (rst) begin left <= 0; tick <= 0; end else" if start == "reset" else ""
    text = FREE.replace("INITIAL", initial).replace("RESET", cleared)
    (tmp_path / "free.v").write_text(text, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    holds = {} if start == "reset" else {"rst": 0}
    ratio = formula.read(RATIO, "--ratio")
    report = check(["free.v"], Spec(ratio_formula=ratio, each={"div": None}, holds=holds))
    assert report.verdict == "proved"
    assert report.each is not None
    assert report.each.shapes > 0
    assert report.rhythm.scope == start
    (tmp_path / "free.json").write_text(certify(report, ["free.v"], Effort(60)).text, encoding="utf-8")
    assert recheck(tmp_path / "free.json").accepted
