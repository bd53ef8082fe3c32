"""Reports as plain data: that they come back as they were, in other surroundings too, and that nothing else does."""

from __future__ import annotations

import dataclasses
import json
import re
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from cases_format import cases
from texts import BY_3, RING, SECOND, SPINS, STICKS_AT_7, checked, measured

from prover import cli, formula
from prover import expr as e
from prover.content import read_content
from prover.effort import Effort
from prover.errors import Where
from prover.findings import Report
from prover.plain import Unreadable, freeze, thaw
from prover.report import json as told
from prover.report import look, terminal, vcd
from prover.report.certificate import certify
from prover.spec import Spec


def through_text(value: object, content: Any = None, then: Any = None) -> Any:
    data, anchored = freeze(value, content)
    assert anchored or content is None
    return thaw(json.loads(json.dumps(data)), then or content)


def rendered(report: Report) -> list[str]:
    """What people and machines get to see of a report, but for the time it took."""
    report = dataclasses.replace(report, seconds=0.0)
    return [
        told.render(report),
        terminal.render(report, look.Look(True, True), ()),
        *(dump.text for dump in vcd.dumps(report)),
    ]


@pytest.mark.parametrize("text", [BY_3, STICKS_AT_7, SPINS, SECOND, RING])
def test_a_report_comes_back_as_it_was(tmp_path: Path, text: str) -> None:
    report = checked(tmp_path, text, "3", source_duty=(Fraction(45), Fraction(55)))
    content = read_content([tmp_path / "divider.v"], Spec())
    back = through_text(report, content)
    assert back == report
    assert rendered(back) == rendered(report)
    # Expressions are the very same objects.
    assert all(a is b for a, b in zip(back.rhythm.system.step, report.rhythm.system.step, strict=True))


def test_a_report_that_came_back_is_certified_alike(tmp_path: Path) -> None:
    report = checked(tmp_path, STICKS_AT_7, "5", high=4)
    files = [tmp_path / "divider.v"]
    back = through_text(report, read_content(files, Spec()))
    assert certify(back, files, Effort(60)).text == certify(report, files, Effort(60)).text


def test_a_measurement_comes_back_as_it_was(tmp_path: Path) -> None:
    report = measured(tmp_path, RING)
    assert through_text(report, read_content([tmp_path / "divider.v"], Spec())) == report


def test_kept_reports_name_the_places_in_sources_with_more_lines(tmp_path: Path) -> None:
    """A comment above every line: line 7 is line 14 now, and nothing else may change."""
    for case in cases("faulty"):
        text = case.path.read_text(encoding="utf-8")
        if "`include" in text or "\\\n" in text:
            continue
        path = tmp_path / case.path.name
        path.write_text(text, encoding="utf-8")
        context = cli.check.make_context("check", [str(path), *case.groups[0].options])
        spec = cli._spec(context.params)
        report = _checked(path, spec)
        data, anchored = freeze(report, read_content([path], spec))
        assert anchored, case.name
        path.write_text("".join(f"// line\n{line}\n" for line in text.splitlines()), encoding="utf-8")
        kept = thaw(data, read_content([path], spec))
        assert told.render(kept) == _with_lines_doubled(told.render(report), path.name), case.name


def _with_lines_doubled(text: str, name: str) -> str:
    """Numbers of lines stand after the key "line" and after the file's name."""
    return re.sub(
        rf"""((?:"line": |{re.escape(name)}:))(\d+)""", lambda found: f"{found[1]}{2 * int(found[2])}", text
    )


def _checked(path: Path, spec: Spec) -> Report:
    from prover.api import check

    return check([path], spec)


def test_small_things_of_different_kinds_stay_apart() -> None:
    value = [True, 1, 1.0, "1", None, (1, 2), (True, 2), [1, 2], [], (), {"a": (0,)}, frozenset({2, 1})]
    back = through_text(value)
    assert back == value
    assert [type(x) for x in back] == [type(x) for x in value]
    assert type(back[6][0]) is bool


def test_numbers_of_any_length() -> None:
    value = [1 << 100_000, -(1 << 70), (1 << 62, 0), Fraction(1, 3**5000), float("inf")]
    assert through_text(value) == value


def test_formulas_are_read_again() -> None:
    spec = Spec(ratio_formula=formula.read("2*(div + 1)", "--ratio"), each={"div": ((1, 3), (5, 5))})
    back = through_text(spec)
    assert back == spec
    assert back.ratio_formula.value({"div": 2}) == 6


def test_expressions_are_taken_as_they_are_however_deep() -> None:
    deep = e.var("a", 4)
    for i in range(20_000):
        deep = e.bvxor(e.bvadd(deep, e.var("b", 4)), e.const(i % 7 + 1, 4))
    # Nothing would build this today: it would be simplified.
    plain = e.node("bvand", 1, (e.TRUE, e.TRUE), ())
    back = through_text((deep, plain))
    assert back[0] is deep
    assert back[1] is plain


def test_a_place_without_an_anchor_is_told(tmp_path: Path) -> None:
    (tmp_path / "divider.v").write_text(BY_3)
    content = read_content([tmp_path / "divider.v"], Spec())
    where = Where("elsewhere.v", 1, 1, "text")
    data, anchored = freeze((where,), content)
    assert not anchored
    assert thaw(data, content) == (where,)


def test_a_thing_without_a_plain_form_is_refused() -> None:
    for thing in (object(), Path("a"), print, Report, b"bytes"):
        with pytest.raises(TypeError):
            freeze(thing)


@pytest.mark.parametrize(
    "data",
    [
        None,
        [],
        {},
        [["is", []]],
        [["is"]],
        [["tuple", 0]],
        [["is", 1], ["tuple", -1]],
        [["is", 1], ["dict", 0]],
        [["frozen", 0]],
        [["anchor", 0]],
        [["hex", "ten"]],
        [["fraction", "0x1", "0x0"]],
        [["where", "a.v"]],
        [["of", "prover.errors.Where"]],
        [["of", "prover.pool.Worker"]],
        [["of", "prover.errors.UserError"]],
        [["of", "prover.spec.re"]],
        [["of", "prover.nowhere.Where"]],
        [["of", "os.path.join"]],
        [["of", "dataclasses.Field"]],
        [["is", 1], ["of", "prover.rhythm.Goal", 0]],
        [["is", "a"], ["expr", "var", 0, 1, 0]],
        [["is", "a"], ["expr", "system", 1, 1, 0]],
        [["is", "a"], ["expr", "var", 1, 1, 0], ["expr", "bvadd", 1, 0, 1]],
    ],
)
def test_data_that_stands_for_nothing_is_refused(data: object) -> None:
    with pytest.raises(Unreadable):
        thaw(data)
