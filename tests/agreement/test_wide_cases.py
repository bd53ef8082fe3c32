"""Every wide case is judged as its comment states: figures that were worked out by hand, as the comment says how.

They take seconds each, so they stand here and not among the tests of the other cases."""

from __future__ import annotations

import json

import pytest
from cases_format import CASES, Case, Group, read_case
from test_cases import check_moves, check_starts, named, run

ALL = [
    (case, group)
    for path in sorted((CASES / "wide").glob("*.v"))
    for case in [read_case(path)]
    for group in case.groups
]


@pytest.mark.parametrize(("case", "group"), named(ALL))
def test_a_wide_case_is_judged_as_it_states(case: Case, group: Group) -> None:
    result = run(case, *group.options, "--effort", "300", "--json", "-")
    report = json.loads(result.stdout)
    assert {report["verdict"]} == group.verdicts
    found = {each["name"]: each for each in report["properties"]}
    for name, stated in group.properties.items():
        assert found[name]["verdict"] in stated.verdicts, found[name]
        if stated.worst is not None:
            assert (found[name]["facts"]["worst_half_cycles"], found[name]["facts"]["exact"]) == (
                stated.worst,
                stated.exact,
            )
    for name, moves in group.moves.items():
        check_moves(found[name], moves)
    assert "recovery" in group.properties
    if group.from_reset is not None:
        check_starts(report["measured"], group.from_reset)
