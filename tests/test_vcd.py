"""Dumps, read back by an independent reader (vcdvcd) and compared with a run of the machine on values."""

from __future__ import annotations

import dataclasses
import io
import itertools
from pathlib import Path
from typing import Any

import pytest
from texts import BY_3, SECOND, SHIFT, SPINS, STICKS_AT_7, checked
from vcd.reader import TokenKind, tokenize
from vcdvcd import VCDVCD

from prover.findings import Finding, Report
from prover.report import vcd
from prover.report.wave import Timeline


def read_back(folder: Path, text: str) -> Any:
    path = folder / "read_back.vcd"
    path.write_text(text)
    return VCDVCD(str(path))


def levels(dump: Any, name: str, ends: int) -> list[str]:
    """The value at every time before `ends`."""
    out: list[str] = []
    changes = dump[name].tv
    for (begins, value), after in zip(changes, [*changes[1:], (ends, "")], strict=True):
        out += [value] * (after[0] - begins)
    return out


def found(report: Report, name: str) -> Finding:
    return next(finding for finding in report.findings if finding.name == name)


def stepped(report: Report, finding: Finding, count: int) -> list[tuple[int, ...]]:
    """States from the counterexample's start on, by stepping the machine."""
    assert finding.counterexample is not None
    states = [finding.counterexample.orbit.start]
    while len(states) < count:
        states.append(report.rhythm.system.next(states[-1]))
    return states


def test_every_register_the_clock_and_the_output_are_as_stepped(tmp_path: Path) -> None:
    report = checked(tmp_path, BY_3, "3", high=2)
    finding = found(report, "high-time")
    text = vcd.render(report, finding)
    assert text is not None
    dump = read_back(tmp_path, text)
    ends = dump.endtime
    states = stepped(report, finding, ends)
    for index, (name, _) in enumerate(report.rhythm.system.variables):
        values = [int(v, 2) for v in levels(dump, f"by_3.{name}", ends)]
        assert values == [state[index] for state in states]
    output = [int(v, 2) for v in levels(dump, "by_3.tick", ends)]
    assert output == [report.rhythm.system.out(state) for state in states]
    assert set(levels(dump, "by_3.rst", ends)) == {"0"}


def test_the_claimed_run_is_seen_in_the_dump(tmp_path: Path) -> None:
    # A third at 50 % is high for three half-cycles, where two were asked for.
    report = checked(tmp_path, BY_3, "3", high=2)
    broken = found(report, "high-time").counterexample
    assert broken is not None
    text = vcd.render(report, found(report, "high-time"))
    assert text is not None
    changes = read_back(tmp_path, text)["by_3.tick"].tv
    rises = [(begins, after[0] - begins) for (begins, v), after in itertools.pairwise(changes) if v == "1"]
    assert (broken.begins, 3) in rises
    assert broken.ends - broken.begins == 3


def test_a_refuted_ratio_shows_its_gap(tmp_path: Path) -> None:
    report = checked(tmp_path, BY_3, "4")
    broken = found(report, "ratio").counterexample
    assert broken is not None
    text = vcd.render(report, found(report, "ratio"))
    assert text is not None
    rises = [time for time, value in read_back(tmp_path, text)["by_3.tick"].tv if value == "1" and time > 0]
    assert {b - a for a, b in itertools.pairwise(rises)} == {6}
    assert broken.begins in rises
    assert broken.ends in rises
    # A viewer shows from which rise to which.
    marked = read_back(tmp_path, text)["by_3.broken"].tv
    assert marked == [(0, "0"), (broken.begins, "1"), (broken.ends, "0")]


def test_what_is_broken_within_what_is_elided_is_marked_where_it_is(tmp_path: Path) -> None:
    report = checked(tmp_path, SECOND, "50000000")
    finding = found(report, "high-time")
    assert finding.counterexample is not None
    moved = dataclasses.replace(finding.counterexample, begins=1_000_000, ends=1_000_003)
    text = vcd.render(report, dataclasses.replace(finding, counterexample=moved))
    assert text is not None
    assert read_back(tmp_path, text)["second.broken"].tv == [(0, "0"), (1_000_000, "1"), (1_000_003, "0")]


def test_a_pulse_is_marked_from_its_first_arrival_to_its_second(tmp_path: Path) -> None:
    report = checked(tmp_path, STICKS_AT_7, "5", high=4)
    text = vcd.render(report, found(report, "glitch-free"))
    assert text is not None
    dump = read_back(tmp_path, text)
    tick = dump["sticks_at_7.tick"].tv
    assert [time for time, _ in dump["sticks_at_7.broken"].tv[1:]] == [time for time, _ in tick[1:3]]


def test_a_broken_of_the_design_keeps_its_name(tmp_path: Path) -> None:
    text = BY_3.replace("late", "broken")
    report = checked(tmp_path, text, "4")
    made = vcd.render(report, found(report, "ratio"))
    assert made is not None
    names = [t.var.reference for t in tokenize(io.BytesIO(made.encode())) if t.kind is TokenKind.VAR]
    assert names.count("broken") == 1
    assert names[-1] == "broken_2"
    assert "late" not in names


def test_registers_stand_in_the_scope_of_their_module(tmp_path: Path) -> None:
    report = checked(tmp_path, STICKS_AT_7, "5", high=4)
    text = vcd.render(report, found(report, "no-stuck"))
    assert text is not None
    dump = read_back(tmp_path, text)
    assert levels(dump, "sticks_at_7.stage0.count", dump.endtime)[-1] == "111"
    assert levels(dump, "sticks_at_7.tick", dump.endtime)[-1] == "0"


def test_what_is_elided_is_x_and_what_is_shown_is_true(tmp_path: Path) -> None:
    report = checked(tmp_path, SECOND, "50000000")
    finding = found(report, "high-time")
    assert finding.counterexample is not None
    timeline = Timeline(finding.counterexample.orbit)
    text = vcd.render(report, finding)
    assert text is not None
    assert len(text) < 20_000
    assert "elided: " in text
    dump = read_back(tmp_path, text)
    # Where it is high is plain arithmetic: counts below 24 999 999 of 50 000 000, two half-cycles each.
    rises = [time for time, value in dump["second.tick"].tv if value == "1"]
    falls = [time for time, value in dump["second.tick"].tv if value == "0"]
    assert 49_999_998 in [fall - rise for rise in rises for fall in falls]
    assert "x" not in [value for _, value in dump["second.tick"].tv]
    counts = [(time, value) for time, value in dump["second.count"].tv if value != "x"]
    assert counts
    for time, value in counts:
        assert int(value, 2) == timeline.state(time)[0]
    assert any(value == "x" for _, value in dump["second.count"].tv)


def test_a_dump_is_capped(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(vcd, "MOST_SHOWN", 1000)
    report = checked(tmp_path, SHIFT, "2")
    finding = found(report, "ratio")
    assert finding.counterexample is not None
    timeline = Timeline(finding.counterexample.orbit)
    assert timeline.once > 60_000
    text = vcd.render(report, finding)
    assert text is not None
    assert text.count("\n#") < 1100
    dump = read_back(tmp_path, text)
    assert dump.endtime == timeline.once + 2
    shown = {time: value for time, value in dump["shift.q"].tv if value != "x"}
    assert finding.counterexample.begins in shown or finding.counterexample.begins - 1 in shown
    for time, value in shown.items():
        assert int(value, 2) == timeline.state(time)[0]


def test_the_round_that_never_settles_is_dumped_a_micro_step_a_unit(tmp_path: Path) -> None:
    report = checked(tmp_path, SPINS, "2")
    finding = found(report, "settling")
    assert finding.unsettled is not None
    text = vcd.render(report, finding)
    assert text is not None
    dump = read_back(tmp_path, text)
    values = levels(dump, "spins.spin", dump.endtime)
    # An inverter fed by itself changes at every step, for ever.
    assert all(a != b for a, b in itertools.pairwise(values))
    assert len(values) == 2 * len(finding.unsettled.cycle) >= 4


def test_the_same_report_gives_the_same_bytes(tmp_path: Path) -> None:
    reports = [checked(tmp_path, STICKS_AT_7, "5", high=4) for _ in range(2)]
    first, second = ([dump.text for dump in vcd.dumps(report)] for report in reports)
    assert first == second
    # no-stuck, recovery and glitch-free are refuted.
    assert len(first) == 3
    assert "$date" not in first[0]


@pytest.mark.parametrize(
    ("name", "word"), [("a b", "a_b"), ("$end", "_end"), ("q\x1b[3:0]", "q_[3:0]"), ("", "_")]
)
def test_names_that_a_dump_cannot_hold_are_spelt_otherwise(name: str, word: str) -> None:
    assert vcd._word(name) == word


def test_a_comment_cannot_be_ended_from_within() -> None:
    assert vcd._plain("waits $end\nfor µ") == "waits end for \\xb5"


# Escaped names, and what a dump makes of them: blanks end words and dollars begin keywords, so neither stays.
HOSTILE = """\
module \\$end (input \\clk"]]>-- , output \\#0 );
  \\a.b \\u.$scope (\\clk"]]>-- , \\#0 );
endmodule
module \\a.b (input clk, output out);
  reg [2:0] \\$var[0] , \\x.y ;
  reg \\$end , b0;
  always @(posedge clk) begin
    \\$var[0] <= \\$var[0] + 3'd1;
    \\x.y [2] <= \\$var[0] [0];
    \\x.y [1:0] <= \\$var[0] [2:1];
    \\$end <= b0;
    b0 <= \\$var[0] [2];
  end
  assign out = \\$var[0] == 3'd2;
endmodule
"""
NAMES = {
    "\\u.$scope .\\$var[0]": "\\u._scope.\\_var[0]",
    "\\u.$scope .\\x.y": "\\u._scope.\\x.y",
    "\\u.$scope .\\$end": "\\u._scope.\\_end",
    "\\u.$scope .b0": "\\u._scope.b0",
    '\\clk"]]>--': '\\clk"]]>--',
}


def test_hostile_names_are_read_back_by_every_reader(tmp_path: Path) -> None:
    report = checked(tmp_path, HOSTILE, "8", high=4, start="any")
    finding = found(report, "high-time")
    assert finding.counterexample is not None
    hostile = "$end $enddefinitions \n #7 1! \x1b[2J"
    broken = dataclasses.replace(finding.counterexample, text=hostile, cause=hostile)
    text = vcd.render(report, dataclasses.replace(finding, counterexample=broken))
    assert text is not None
    # Two readers: a strict one, token by token, and the one that the other tests use.
    tokens = list(tokenize(io.BytesIO(text.encode())))
    found_here = {t.var.reference: t.var.size for t in tokens if t.kind is TokenKind.VAR}
    assert set(found_here.values()) == {1, 3}
    assert sum(t.kind is TokenKind.CHANGE_TIME for t in tokens) > 16
    dump = read_back(tmp_path, text)
    ends = dump.endtime
    states = stepped(report, finding, ends)
    names = [name for name, _ in report.rhythm.system.variables]
    assert set(names) == set(NAMES)
    for index, name in enumerate(names):
        (path,) = [p for p in dump.references_to_ids if p.partition("[2:0]")[0].endswith(f".{NAMES[name]}")]
        values = [int(v, 2) for v in levels(dump, path, ends)]
        assert values == [state[index] for state in states], name
