"""Certificates of comparisons: right ones are accepted by every solver, altered ones are rejected, none is believed."""

from __future__ import annotations

import json
import random
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from test_recheck import run, with_one_alteration, written

from prover import Pairing, Spec, compare, pair_evidence
from prover.certificate import discharge
from prover.compared import Comparison
from prover.effort import Effort
from prover.evidence import Malformed
from prover.pair_rebuild import rebuild
from prover.rebuild import Rejected
from prover.recheck import derive, recheck
from prover.report.certificate import render
from prover.report.pair_certificate import certify

ROOT = Path(__file__).parents[1]
TAPPED = Spec(parameters={"TAP": 1}, output="q3")

# A name, two files of cases/pairs, what is asked, and what the evidence is made of.
SUBJECTS: dict[str, tuple[str, str, Pairing, str]] = {
    "runs": ("scan_by_8_binary", "scan_by_8_gray", Pairing(), "runs"),
    "lag": ("scan_by_8_binary", "scan_by_8_late", Pairing(lag=None), "runs"),
    "values": ("valve_latched", "valve_bare", Pairing(), "runs"),
    "far": ("second_up", "second_down", Pairing(new=Spec(parameters={"FROM": 24999998})), "runs"),
    "apart": ("shift_5_plain", "shift_5_gated", Pairing(TAPPED, TAPPED), "runs"),
    "relations": ("sample_up", "sample_down", Pairing(moving=("divisor",)), "relations"),
    "states": ("valve_latched", "valve_gates", Pairing(moving=("enable",)), "states"),
    "run": ("valve_latched", "valve_falling", Pairing(moving=("enable",)), "run"),
    "settled": ("scan_by_8_binary", "scan_by_8_gray", Pairing(lag=None, settled=True), "settled"),
}
_made: dict[str, tuple[Comparison, str]] = {}


@pytest.fixture(autouse=True)
def _at_root(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)


def files(name: str) -> tuple[list[str], list[str]]:
    old, new, _, _ = SUBJECTS[name]
    return [f"cases/pairs/{old}.v"], [f"cases/pairs/{new}.v"]


def made(name: str) -> tuple[Comparison, str]:
    """The comparison and its certificate, made once."""
    if name not in _made:
        found = compare(*files(name), SUBJECTS[name][2])
        text = certify(found, *files(name), Effort(60))
        assert text is not None
        _made[name] = found, text
    return _made[name]


@pytest.mark.parametrize("name", SUBJECTS)
def test_a_certificate_bears_the_verdict_and_every_solver_accepts_it(name: str, tmp_path: Path) -> None:
    found, text = made(name)
    document = json.loads(text)
    assert document["evidence"]["kind"] == SUBJECTS[name][3]
    assert (document["verdict"], document["lag_half_cycles"]) == (found.verdict, found.outcome.lag)
    outcome = recheck(written(tmp_path, text), "all")
    assert outcome.accepted, outcome
    assert outcome.ways == tuple((each, outcome.obligations) for each in ("z3", "bitwuzla", "cvc5"))
    assert [finding.verdict for finding in outcome.findings] == [found.verdict]


def test_the_commands_write_one_and_check_it(tmp_path: Path) -> None:
    path = str(tmp_path / "scan.json")
    old, new = (of[0] for of in files("lag"))
    assert run("compare", old, new, "--lag", "1", "--certificate", path).exit_code == 0
    result = run("recheck", path)
    assert result.exit_code == 0
    assert result.stdout.startswith("certificate for scan_by_8_binary and scan_by_8_late\nPROVED    compare")
    Path(path).write_text(Path(path).read_text().replace('"lag": 1', '"lag": 2'))
    assert run("recheck", path).exit_code == 1


def test_where_there_is_none_that_is_said(tmp_path: Path) -> None:
    path = tmp_path / "none.json"
    old, new = (of[0] for of in files("runs"))
    result = run("compare", old, new, "--after", "any", "--certificate", str(path))
    assert result.exit_code == 1
    assert "note: no certificate" in result.stderr
    assert not path.exists()


def test_the_same_input_gives_the_same_bytes() -> None:
    for name in ("relations", "values"):
        again = compare(*files(name), SUBJECTS[name][2])
        assert certify(again, *files(name), Effort(60)) == made(name)[1]


def test_no_engine_takes_part(tmp_path: Path) -> None:
    paths = []
    for name in ("runs", "relations", "states", "run", "settled"):
        path = tmp_path / name
        path.write_text(made(name)[1], encoding="utf-8", newline="\n")
        paths.append(str(path))
    code = (
        "import sys; from prover.recheck import recheck\n"
        f"assert all(recheck(path).accepted for path in {paths})\n"
        "print(sorted(m for m in sys.modules if m.startswith('prover.') and m.count('.') == 1))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True)
    assert "'prover.pair_rebuild'" in done.stdout
    for engine in (
        "orbit",
        "graph",
        "wide",
        "analyse",
        "lockstep",
        "relations",
        "comparison",
        "pair_collect",
    ):
        assert f"'prover.{engine}'" not in done.stdout


def test_alterations_are_rejected() -> None:
    rng = random.Random(7)
    names = [name for name in SUBJECTS if name != "values"]
    count = 0
    while count < 240:
        name = names[count % len(names)]
        document = json.loads(made(name)[1])
        other = with_one_alteration(document, rng)
        if json.dumps(other) == json.dumps(document):
            continue
        count += 1
        with pytest.raises(Rejected) as told:
            derive(render(other), [Path()], Effort(60))
        assert str(told.value), other


def altered_at(name: str, *places: str | int) -> tuple[Any, Any, Any]:
    """A subject's certificate; in it what holds the value at a place; and the place there."""
    document = holder = json.loads(made(name)[1])
    for place in places[:-1]:
        holder = holder[place]
    return document, holder, places[-1]


@pytest.mark.parametrize(
    ("name", "place", "change"),
    [
        # A value that a variable of one bit can't have, though its lowest bit is right.
        ("states", ("evidence", "states", -1, -1), lambda x: x + 2),
        ("relations", ("evidence", "parts"), lambda parts: [*parts, parts[0]]),
        ("relations", ("evidence", "kind"), lambda _: ["relations"]),
        ("run", ("schema",), lambda _: []),
        ("run", ("evidence", "half_cycle"), lambda _: 10**30),
        # What plays no part, and moves after the end.
        ("run", ("evidence", "values"), lambda values: {**values, "some": 0}),
        ("run", ("evidence", "moves"), lambda moves: [*moves, moves[0]]),
        ("run", ("evidence", "moves"), lambda moves: moves[:-1]),
    ],
)
def test_what_stands_for_the_same_is_rejected_too(
    name: str, place: tuple[str | int, ...], change: Callable[[Any], Any]
) -> None:
    document, holder, last = altered_at(name, *place)
    derive(render(document), [Path()], Effort(60))
    holder[last] = change(holder[last])
    with pytest.raises(Rejected):
        derive(render(document), [Path()], Effort(60))


def test_a_certificate_is_of_the_run_that_it_names() -> None:
    # Whatever the divisor moves to, as long as it is not 0, shows the difference in half-cycle 1.
    paths = (["cases/pairs/sample_up.v"], ["cases/pairs/sample_live.v"])
    text = certify(compare(*paths, Pairing(moving=("divisor",))), *paths, Effort(60))
    document = json.loads(text or "")
    moves = document["evidence"]["moves"]
    shown = set()
    for value in range(8):
        document["evidence"]["moves"] = [[value], *moves[1:]]
        try:
            derive(render(document), [Path()], Effort(60))
            shown.add(value)
        except Rejected:
            pass
    assert shown == {moves[0][0]}


@pytest.mark.parametrize("name", ["runs", "lag", "relations", "states", "run", "settled"])
def test_altered_evidence_with_all_else_made_to_fit_claims_nothing_false(name: str) -> None:
    """Whoever alters the evidence can write a verdict and obligations that follow from it. Then an obligation must
    fail, or the verdict still be the one that holds: that of the report, which cases/ states."""
    found, text = made(name)
    original = json.loads(text)["evidence"]
    rng = random.Random(11)
    rejected = tried = 0
    while tried < 60:
        other: Any = with_one_alteration(original, rng)
        if json.dumps(other) == json.dumps(original):
            continue
        tried += 1
        try:
            again = rebuild(found.pair, found.pairing, pair_evidence.read(other), Effort(60))
        except (Malformed, Rejected):
            rejected += 1
            continue
        if not all(discharge(each, Effort(60)) for each in again.obligations):
            rejected += 1
            continue
        assert again.outcome.verdict in ("open", found.verdict), other
        assert again.outcome.lag == found.outcome.lag
    assert rejected > 30


def test_changed_sources_are_rejected_by_name(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for of in files("runs"):
        (tmp_path / Path(of[0]).name).write_text(Path(of[0]).read_text(encoding="utf-8"), encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    old, new = (Path(of[0]).name for of in files("runs"))
    assert run("compare", old, new, "--certificate", "scan.json").exit_code == 0
    assert run("recheck", "scan.json").exit_code == 0
    with Path(new).open("a", encoding="utf-8") as source:
        source.write("// harmless\n")
    result = run("recheck", "scan.json")
    assert result.exit_code == 1
    assert f"rejected: {new}: not the file that the certificate is about" in result.stdout
