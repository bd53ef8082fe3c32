"""Certificates of all cases: three solvers and a verified checker of clausal proofs accept what is proved, and no
alteration passes."""

from __future__ import annotations

import json
import random
from pathlib import Path

import drup
import pytest
from cases_format import Case, Group, cases
from click.testing import CliRunner
from long_runs import LONG
from test_recheck import ROOT, with_one_alteration

from prover import clausal, cli
from prover import expr as e
from prover.effort import Effort
from prover.rebuild import Rejected
from prover.recheck import derive, recheck
from prover.report.certificate import render

FOLDERS = ("gauge", "faulty", "published", "wide")
MOST_BITS = 64
"""Register bits up to which the clausal road is taken."""

ALTERATIONS = 8
"""Alterations tried of each certificate; there are some two hundred certificates."""

"""All of them, which takes half an hour; else every eighth, and of the wide ones those that take seconds."""

SLOW = ("cascade_three", "cascade_three_eq", "ring_64_twisted_fixed")

# A claim for each value of an input or for one that moves has a certificate of another form or none: other tests are
# about these.
EVERY = [
    (case, group)
    for case in cases(*FOLDERS)
    for group in case.groups
    if not group.error and not {"--each", "--moving"} & set(group.options)
]
ALL = EVERY if LONG else [pair for pair in EVERY[::12] if pair[0].path.stem not in SLOW]


@pytest.fixture(autouse=True)
def _at_root(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)


@pytest.mark.parametrize(("case", "group"), ALL, ids=[f"{c.name}: {' '.join(g.options)}" for c, g in ALL])
def test_a_case_has_a_certificate_that_all_accept_and_no_alteration_passes(
    case: Case, group: Group, tmp_path: Path
) -> None:
    path = tmp_path / "certificate.json"
    arguments = [str(case.path.relative_to(ROOT)), *group.options, "--effort", "300", "--json", "-"]
    arguments += ["--certificate", str(path)]
    result = CliRunner().invoke(cli.main, ["check", *arguments], catch_exceptions=False)
    report = json.loads(result.stdout)
    document = json.loads(path.read_text(encoding="utf-8"))
    if report["verdict"] == "proved":
        assert document["verdict"] == "proved", result.stderr
    outcome = recheck(path, "all")
    assert outcome.accepted, outcome
    if report["design"]["state_bits"] <= MOST_BITS:
        outcome = recheck(path, by_clauses=True)
        assert outcome.accepted, outcome
        assert outcome.ways == (("clausal", len(document["obligations"])),)
    rng = random.Random(case.name)
    for _ in range(ALTERATIONS):
        other = with_one_alteration(document, rng)
        if json.dumps(other) != json.dumps(document):
            with pytest.raises(Rejected):
                derive(render(other), [Path()], Effort(60))


def test_the_checker_rejects_what_does_not_follow() -> None:
    a, b = e.var("a", 6), e.var("b", 6)
    goal = e.bvnot(e.eq(e.bvsub(a, e.bvneg(b)), e.bvadd(b, a)))
    assert clausal.refute(goal) is not None
    assert clausal.refute(e.eq(a, b)) is None
    clauses = [(1, 2), (-1, 2), (1, -2), (-1, -2)]
    assert clausal.check(clauses, [(2,), ()]) == 2
    assert clausal.check(clauses[:3], [(2,), ()]) is None
    assert clausal.check(clauses, [(2,)]) is None


def test_premises_that_do_not_suffice_are_invalid_to_the_package_itself() -> None:
    # With only the empty clause to show, nothing but propagation counts: a lemma on a variable of its own, which a
    # checker of stronger steps would let pass, has no part here.
    assert drup.check_proof([[1, 2], [-1, 2], [-2]], [[]]).outcome is drup.Outcome.VALID
    assert drup.check_proof([[1, 2], [-2]], [[]]).outcome is drup.Outcome.INVALID
    assert drup.check_proof([[1, 2], [-3]], [[]]).outcome is drup.Outcome.INVALID
