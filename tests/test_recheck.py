"""Certificates: right ones are accepted by every solver, altered ones are rejected, none is believed."""

from __future__ import annotations

import json
import random
import shutil
import subprocess
import sys
from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from cases_format import CASES
from click.testing import CliRunner, Result

from properties import judge_all
from prover import Spec, check, cli, evidence, solvers, tables
from prover.certificate import discharge
from prover.effort import Effort
from prover.errors import UserError
from prover.findings import Report
from prover.rebuild import Rejected, rebuild
from prover.recheck import derive, differences, recheck
from prover.release import Release
from prover.report.certificate import Certificate, certify, render

ROOT = Path(__file__).parents[1]

# A name, the case, the claim, and what its evidence is made of.
SUBJECTS: dict[str, tuple[str, Spec, str]] = {
    "ranks": ("gauge/ping_by_7_ripple.v", Spec(ratio=Fraction(7), output="ping"), "ranking"),
    "reset": ("gauge/tick_by_3_rtl.v", Spec(ratio=Fraction(3), output="tick"), "ranking"),
    "cover": ("gauge/second_26_eq.v", Spec(ratio=Fraction(50_000_000)), "cover"),
    "stages": ("wide/resample_chain.v", Spec(ratio=Fraction(800_000_000)), "cover"),
    "loops": ("faulty/by_7_clears_at_6.v", Spec(ratio=Fraction(7)), "loops"),
    "initial": ("faulty/onehot_ring_4_initial.v", Spec(ratio=Fraction(4), high=2), "loops"),
    "matrix": ("wide/noise_24_xnor.v", Spec(ratio=Fraction(16777215), high=2), "null"),
    "word": ("wide/ripple_24.v", Spec(ratio=Fraction(2**24)), "cover"),
    "lost": ("wide/two_counters_odd.v", Spec(ratio=Fraction(50_000_001)), "null"),
    "mean": (
        "published/accumulator_3_of_16.v",
        Spec(ratio=Fraction(16, 3), mean=True, start="any"),
        "ranking",
    ),
    "short": ("faulty/reset_filtered.v", Spec(ratio=Fraction(8), reset="rst=1", reset_cycles=2), "ranking"),
    "unforced": ("faulty/prescaler_off_reset.v", Spec(ratio=Fraction(6)), "ranking"),
    "released late": ("faulty/onehot_ring_5_reset.v", Spec(ratio=Fraction(5), high=2), "loops"),
    "restless": ("faulty/inverter_loop.v", Spec(ratio=Fraction(2)), "null"),
    "pulse": ("faulty/pulses_same_edge.v", Spec(ratio=Fraction(2), high=1), "ranking"),
    "gates": ("faulty/stage_by_8_unbridged.v", Spec(ratio=Fraction(8), high=4), "ranking"),
    "regions": ("wide/pump_by_ring_20m.v", Spec(ratio=Fraction(20_000_000)), "cover"),
    "ordered": ("gauge/heater_by_4_gated.v", Spec(ratio=Fraction(2), high=1, output="pulses"), "ranking"),
}
_made: dict[str, tuple[Report, Certificate]] = {}


@pytest.fixture(autouse=True)
def _at_root(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)


def made(name: str) -> tuple[Report, Certificate]:
    """The report and the certificate of a subject, made once."""
    if name not in _made:
        case, spec, _ = SUBJECTS[name]
        files = [f"cases/{case}"]
        report = check(files, spec)
        _made[name] = report, certify(report, files, Effort(60))
    return _made[name]


def written(folder: Path, text: str) -> Path:
    path = folder / "certificate.json"
    path.write_text(text, encoding="utf-8", newline="\n")
    return path


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


# -- what is written is accepted ---------------------------------------------------------------------------


@pytest.mark.parametrize("name", SUBJECTS)
def test_a_certificate_bears_the_report_and_every_solver_accepts_it(name: str, tmp_path: Path) -> None:
    report, certificate = made(name)
    kind = json.loads(certificate.text)["evidence"]["everywhere"]
    assert (kind["kind"] if kind else "null") == SUBJECTS[name][2]
    outcome = recheck(written(tmp_path, certificate.text), "all")
    assert outcome.accepted, outcome
    assert outcome.ways == tuple((each, outcome.obligations) for each in ("z3", "bitwuzla", "cvc5"))
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    assert certificate.left_open == ()
    assert {finding.name: finding.verdict for finding in outcome.findings} == verdicts


def test_recovery_is_as_long_in_the_certificate_as_in_the_report() -> None:
    # Worked out by hand: from 25 000 000 just after a rising edge up to 2^26, and on from there to the wave.
    (recovery,) = [each for each in derived("cover").findings if each.name == "recovery"]
    assert recovery.facts["exact"] is True
    assert recovery.bound == "84217728 half-cycles"


def derived(name: str) -> Any:
    return derive(made(name)[1].text, [Path()], Effort(60))


@pytest.mark.parametrize("name", ["ranks", "cover"])
def test_the_same_input_gives_the_same_bytes(name: str) -> None:
    case, spec, _ = SUBJECTS[name]
    again = check([ROOT / "cases" / case], spec)
    assert certify(again, [ROOT / "cases" / case], Effort(60)).text == made(name)[1].text


def test_no_engine_takes_part(tmp_path: Path) -> None:
    paths = [str(shutil.move(written(tmp_path, made(n)[1].text), tmp_path / n)) for n in ("cover", "loops")]
    code = (
        "import sys; from prover.recheck import recheck\n"
        f"assert all(recheck(path).accepted for path in {paths})\n"
        "print(sorted(m for m in sys.modules if m.startswith('prover.') and m.count('.') == 1))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    assert "'prover.rebuild'" in done.stdout
    for engine in ("orbit", "graph", "wide", "analyse", "collect"):
        assert f"'prover.{engine}'" not in done.stdout


def test_a_script_is_read_by_each_solver_and_a_fulfillable_one_is_told() -> None:
    script = (
        "(set-logic QF_BV)\n(declare-const |t0| (_ BitVec 4))\n(assert (= |t0| (_ bv3 4)))\n(check-sat)\n"
    )
    for name in solvers.SOLVERS:
        assert solvers.refutes(name, script, 10) is False
        assert solvers.refutes(name, script.replace("(= |t0| (_ bv3 4))", "(distinct |t0| |t0|)"), 10) is True


# -- what was altered is rejected --------------------------------------------------------------------------


def places(value: Any, path: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """Where every value in a document stands, containers before what is in them."""
    if path:
        yield path
    inner = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, part in inner:
        yield from places(part, (*path, key))


def altered(value: Any, rng: random.Random) -> Any:
    """Another value of the same kind, or null in its place."""
    if isinstance(value, bool):
        return not value
    if isinstance(value, int):
        return value ^ 1 << rng.randrange(max(value.bit_length(), 1)) if rng.random() < 0.6 else value + 1
    if isinstance(value, str) and value:
        at = rng.randrange(len(value))
        return value[:at] + chr(ord(value[at]) ^ 1) + value[at + 1 :] if rng.random() < 0.7 else value[:at]
    if isinstance(value, list) and value:
        at, other = rng.randrange(len(value)), rng.randrange(len(value))
        out = list(value)
        out[at], out[other] = out[other], out[at]
        return out if out != value else [*value[:at], *value[at + 1 :]]
    if isinstance(value, dict) and value:
        gone = rng.choice(list(value))
        return {key: part for key, part in value.items() if key != gone}
    return 0 if value is None or rng.random() < 0.5 else [value]


def with_one_alteration(document: dict[str, Any], rng: random.Random) -> dict[str, Any]:
    """The document with one value in it altered: an entry first, so that long lists don't take all the turns."""
    out: dict[str, Any] = json.loads(json.dumps(document))
    key = rng.choice(list(out))
    path = rng.choice(list(places(out[key])) or [()])
    holder: Any = out
    for step in (key, *path)[:-1]:
        holder = holder[step]
    last = (key, *path)[-1]
    holder[last] = altered(holder[last], rng)
    return out


def test_alterations_are_rejected() -> None:
    names = [
        "reset",
        "ranks",
        "loops",
        "initial",
        "matrix",
        "lost",
        "restless",
        "cover",
        "short",
        "unforced",
        "pulse",
        "gates",
    ]
    rng = random.Random(7)
    count = 0
    while count < 560:
        name = names[count % len(names)]
        document = json.loads(made(name)[1].text)
        other = with_one_alteration(document, rng)
        if other == document and json.dumps(other) == json.dumps(document):
            continue
        count += 1
        with pytest.raises(Rejected) as told:
            derive(render(other), [Path()], Effort(60))
        assert str(told.value), other


def test_a_changed_byte_is_rejected_even_where_json_means_the_same(tmp_path: Path) -> None:
    text = made("reset")[1].text
    for other in (text.replace(": ", ":", 1), text + "\n", text.replace('"machine"', '"mach\\u0069ne"', 1)):
        assert json.loads(other) == json.loads(text)
        assert not recheck(written(tmp_path, other)).accepted
    assert recheck(written(tmp_path, text[:-40])).differences[0].startswith("no JSON")
    kinds = ("certificate-1", "values-certificate-1", "comparison-certificate-1")
    told = f"schema: not {' or '.join(f'subharmonic/{kind}' for kind in kinds)}"
    assert recheck(written(tmp_path, "[]")).differences == (told,)


def test_the_difference_is_named(tmp_path: Path) -> None:
    document = json.loads(made("reset")[1].text)
    document["properties"][0]["verdict"] = "refuted"
    document["machine"]["micro_steps"] = 3
    number, script = next((i, s) for i, s in enumerate(scripts(document)) if "bvand" in s)
    document["obligations"][number]["script"] = script.replace("bvand", "bvor", 1)
    told = recheck(written(tmp_path, render(document))).differences
    assert told[0] == "machine/micro_steps: 3, which should be 1"
    assert told[1] == 'properties/0/verdict: "refuted", which should be "proved"'
    assert told[2].startswith(f"obligations/{number}/script, line ")


def scripts(document: dict[str, Any]) -> list[str]:
    return [each["script"] for each in document["obligations"]]


@pytest.mark.parametrize(
    "name", ["ranks", "loops", "reset", "initial", "short", "unforced", "ordered", "pulse"]
)
def test_altered_evidence_with_all_else_made_to_fit_claims_nothing_false(name: str) -> None:
    """Whoever alters the evidence can write verdicts and obligations that follow from it. Then the obligations must
    fail, or what it claims must still be true: the verdicts of the report, which cases/ states and `test_cases`
    holds against figures from outside, and a bound on the recovery no lower than its."""
    report, certificate = made(name)
    original = json.loads(certificate.text)["evidence"]
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    worst = report.rhythm.recovery.worst if report.rhythm.recovery else None
    rng = random.Random(11)
    rejected = 0
    for _ in range(60):
        other = with_one_alteration(original, rng)
        if other == original:
            continue
        try:
            found = evidence.read(other)
            again = rebuild(report.ports, report.spec, found, Effort(60))
        except (evidence.Malformed, Rejected):
            rejected += 1
            continue
        if not all(discharge(each, Effort(60)) for each in again.obligations):
            rejected += 1
            continue
        for finding in judge_all(again.rhythm, report.spec):
            assert finding.verdict in ("open", verdicts[finding.name]), other
        recovery = again.rhythm.recovery
        if recovery is not None and recovery.worst is not None:
            assert worst is not None
            assert recovery.worst >= worst
            assert not recovery.exact or recovery.worst == worst
        check_held(again.rhythm.release, report.rhythm.release)
    assert rejected > 30


def check_held(claimed: Release | None, true: Release | None) -> None:
    """No shorter reset is claimed than is needed, and no longer one is claimed to be needed."""
    if claimed is None or not claimed.held.states:
        return
    assert true is not None
    for level in (0, 1):
        assert claimed.held.needs[level] >= true.held.needs[level]
    assert not claimed.held.exact or claimed.held.needs == true.held.needs


@pytest.mark.parametrize("name", ["pulse", "gates", "matrix"])
def test_a_glitch_cannot_be_denied(name: str) -> None:
    """Answers that there is no pulse, in place of those that show one, have to fail as obligations."""
    report, certificate = made(name)
    original = json.loads(certificate.text)["evidence"]
    shows = [i for i, answer in enumerate(original["glitches"]) if answer is not None]
    assert shows
    for denied in shows:
        other = {
            **original,
            "glitches": [None if i == denied else a for i, a in enumerate(original["glitches"])],
        }
        for kept in range(denied + 1, len(other["glitches"]) + 1):
            cut = {**other, "glitches": other["glitches"][:kept]}
            try:
                again = rebuild(report.ports, report.spec, evidence.read(cut), Effort(60))
            except Rejected:
                continue
            (finding,) = [f for f in judge_all(again.rhythm, report.spec) if f.name == "glitch-free"]
            assert finding.verdict != "proved" or not all(discharge(o, Effort(60)) for o in again.obligations)


# The loop of 000 and 001 is clean. Other codes but 111 lock up. From 111, which is good and on no loop, the output may
# go to 1 at 011, back at 010, and to 1 again.
ON_THE_WAY = """\
module on_the_way (input clk, output tick);
  reg [2:0] code;
  always @(posedge clk)
    case (code)
      3'b000: code <= 3'b001;
      3'b001, 3'b111: code <= 3'b000;
      default: code <= 3'b110;
    endcase
  assign tick = code == 3'b000 | code == 3'b011;
endmodule
"""


def test_a_glitch_of_a_good_state_that_no_loop_leads_to_is_certified(tmp_path: Path) -> None:
    path = tmp_path / "on_the_way.v"
    path.write_text(ON_THE_WAY, encoding="utf-8")
    report = check([path], Spec(ratio=Fraction(2)))
    (found,) = [f.glitch for f in report.findings if f.name == "glitch-free"]
    assert found is not None
    assert found.state["code"] == 7
    certificate = certify(report, [path], Effort(60))
    assert certificate.left_open == ()
    outcome = recheck(written(tmp_path, certificate.text), sources=Path())
    assert outcome.accepted, outcome
    verdicts = {finding.name: finding.verdict for finding in outcome.findings}
    assert (verdicts["recovery"], verdicts["glitch-free"]) == ("refuted", "refuted")


def test_differences_are_told_of_every_kind() -> None:
    told = list(differences({"a": 1, "b": [1, 2], "c": "x\ny"}, {"a": True, "b": [1], "c": "x\nz", "d": 0}))
    assert told == [
        "a: 1, which should be true",
        "b: 2 entries, which should be 1",
        'c, line 2: "y", which should be "z"',
        "d: missing",
    ]


# -- sources, options, effort ------------------------------------------------------------------------------


@pytest.fixture
def moved(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A folder with a source and a certificate for it, which is the working folder."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "cells").mkdir()
    shutil.copy(CASES / "gauge" / "clocks_by_define.v", tmp_path / "top.v")
    shutil.copy(CASES / "gauge" / "rates.vh", tmp_path / "cells" / "rates.vh")
    result = run(
        "check", "top.v", "--ratio", "12", "--include", "cells", "--certificate", "top.json", "--waive",
        "recovery=not asked for",
    )  # fmt: skip
    assert result.exit_code == 0, result.stderr
    return tmp_path


def test_the_sources_are_found_from_the_certificate_or_where_told(
    moved: Path, tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert run("recheck", "top.json").exit_code == 0
    elsewhere = tmp_path_factory.mktemp("elsewhere")
    monkeypatch.chdir(elsewhere)
    result = run("recheck", str(moved / "top.json"))
    assert result.exit_code == 0
    assert result.stdout.endswith("\nACCEPTED\n")
    shutil.copy(moved / "top.json", elsewhere / "copy.json")
    result = run("recheck", "copy.json")
    assert result.exit_code == 2
    assert "top.v: no such file" in result.stderr
    assert "hint: " in result.stderr
    assert run("recheck", "copy.json", "--sources", str(moved)).exit_code == 0


@pytest.mark.parametrize("file", ["top.v", "cells/rates.vh"])
def test_changed_sources_are_rejected_by_name(moved: Path, file: str) -> None:
    with (moved / file).open("a", encoding="utf-8") as source:
        source.write("// harmless\n")
    result = run("recheck", "top.json")
    assert result.exit_code == 1
    assert f"rejected: {file}: not the file that the certificate is about" in result.stdout
    assert result.stdout.endswith("\nREJECTED\n")


def test_unusable_input_is_an_error_with_a_hint(moved: Path) -> None:
    for arguments in (
        ["none.json"],
        ["."],
        ["top.json", "--sources", "cells"],
        ["top.json", "--effort", "x"],
    ):
        result = run("recheck", *arguments)
        assert result.exit_code == 2, arguments
        assert "hint: " in result.stderr


def test_out_of_time_is_neither_accepted_nor_rejected(moved: Path) -> None:
    result = run("recheck", "top.json", "--effort", "0.000001")
    assert result.exit_code == 3
    assert result.stdout.endswith("\nGIVEN UP\n")


def test_a_solver_that_is_not_there_is_named(moved: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(solvers, "find_spec", lambda name: None if name == "cvc5" else name)
    assert solvers.chosen("all") == ("z3", "bitwuzla")
    with pytest.raises(UserError, match="cvc5: not installed"):
        recheck("top.json", "cvc5")


def test_what_is_too_large_to_write_is_left_open_and_said(
    moved: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(tables, "MOST_BITS", 2)
    monkeypatch.setattr(tables, "MOST_BITS_IF_REGULAR", 2)
    shutil.copy(CASES / "faulty" / "by_7_clears_at_6.v", moved / "bad.v")
    result = run("check", "bad.v", "--ratio", "7", "--certificate", "bad.json")
    assert result.exit_code == 1
    assert "note: the certificate leaves no-stuck open" in result.stderr
    verdicts = {p["name"]: p["verdict"] for p in json.loads((moved / "bad.json").read_text())["properties"]}
    assert verdicts == {
        "ratio": "refuted", "high-time": "refuted", "no-stuck": "open", "recovery": "refuted", "settling": "proved",
        "glitch-free": "proved",
    }  # fmt: skip
    assert run("recheck", "bad.json").exit_code == 0
