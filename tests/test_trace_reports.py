"""Traces whose inputs move, as reports show them: drawn, dumped, and as JSON."""

from __future__ import annotations

import random
from dataclasses import replace
from pathlib import Path

import pytest
from machines import random_design, resettable
from small import toggle
from test_trace import released_at
from test_vcd import levels, read_back
from texts import BY_3, checked

from prover.expr import var
from prover.findings import Finding, Report
from prover.report import json, terminal, vcd
from prover.report.figures import Extent
from prover.report.look import Look
from prover.report.trace import Columns, drawing
from prover.report.wave import ASCII, draw
from prover.trace import Rest, Trace, run


def report_of(folder: Path, trace: Trace) -> tuple[Report, Finding]:
    """A report on the design of `released_at` that is refuted with that trace."""
    report = checked(folder, BY_3, "3")
    finding = Finding("reset", "refuted", "claimed", "seen", "replayed", trace=trace)
    ports = replace(report.ports, design=toggle(1, 1), output="tick")
    return replace(report, ports=ports, findings=(finding,)), finding


def test_a_release_in_the_middle_of_a_half_cycle_is_drawn_there(tmp_path: Path) -> None:
    # The run is worked out by hand in test_trace: two columns a half-cycle, the release in the second one of
    # half-cycle 2.
    trace = replace(released_at(2, 10), begins=5, ends=9, text="a high run", cause="held")
    report, _ = report_of(tmp_path, trace)
    text = terminal.render(report, Look(unicode=False))
    assert "counterexample to reset: a high run\n  start: held\n    rst=1  count=1  tick=1  clk=0\n" in text
    drawn = text[text.index("  half-cycle") :].splitlines()
    assert drawn[:6] == [
        "  half-cycle  0               4               8",
        "  clk         ____|~~~|___|~~~|___|~~~|___|~~~|___|~~~",
        "  rst         ~~~~~~~~~~|_____________________________",
        "  tick        ~~~~|_______________|~~~~~~~~~~~~~~~|___",
        "                                  ^^^^^^^^^^^^^^^^",
        "  count       ~~~~|_______|~~~~~~~|_______|~~~~~~~|___",
    ]


def test_a_trace_without_moves_takes_one_column_a_half_cycle() -> None:
    trace = released_at(99, 12)
    assert Columns(trace).per == 1
    made, left = drawing(toggle(1, 1), "clk", trace, Extent())
    assert [row.name for row in made.rows] == ["clk", "tick", "count"]
    assert left == 0


def test_a_long_trace_is_folded_at_half_cycles() -> None:
    trace = replace(released_at(100, 400), begins=110, ends=112)
    made, _ = drawing(toggle(1, 1), "clk", trace, Extent())
    assert sum(piece.length for piece in made.pieces) == 800
    assert any(piece.folded for piece in made.pieces)
    assert all(piece.begins % 2 == piece.ends % 2 == 0 for piece in made.pieces)
    shown = {c for p in made.pieces if not p.folded for c in range(p.begins, p.ends)}
    assert {0, 201, 220, 223, 799} <= shown
    folds = [p.length // 2 for p in made.pieces if p.folded]
    clock = next(line for line in draw(made, ASCII, 98) if line.startswith("clk"))
    assert f".. {folds[0]} half-cycles .." in clock


def test_the_dump_of_a_trace_shows_moves_between_edges(tmp_path: Path) -> None:
    trace = replace(released_at(2, 12), begins=5, ends=9)
    report, finding = report_of(tmp_path, trace)
    text = vcd.render(report, finding)
    assert text is not None
    dump = read_back(tmp_path, text)
    assert dump.endtime == 24
    assert levels(dump, "small.rst", 24) == ["1"] * 5 + ["0"] * 19
    assert levels(dump, "small.clk", 24) == [str(time // 2 % 2) for time in range(24)]
    tick = ["1", "0", "0", "0", "0", "1", "1", "1", "1", "0", "0", "0"]
    assert levels(dump, "small.tick", 24) == [level for level in tick for _ in (0, 1)]


@pytest.mark.parametrize("seed", range(6))
def test_all_reports_tell_the_rests_of_a_random_run(tmp_path: Path, seed: int) -> None:
    rng = random.Random(seed)
    design = resettable(rng, random_design(rng, 6))
    names = [n for n in design.inputs if n != "clk"]
    first = Rest(
        0, False, dict.fromkeys(names, 0), {r.name: 0 for r in design.registers} | {"clk": 0}, {"z": 0}
    )
    moves = [{n: rng.getrandbits(design.inputs[n]) for n in names} for _ in range(40)]
    rests = run(design, "clk", {"z": var("clk", 1)}, first, moves, 40)
    report, finding = report_of(tmp_path, Trace(rests, 0, 40, "", ""))
    report = replace(report, ports=replace(report.ports, design=design))
    told = json.as_object(report)["properties"][0]["trace"]
    assert [Rest(**rest) for rest in told["rests"]] == list(rests)
    text = vcd.render(report, finding)
    assert text is not None
    dump = read_back(tmp_path, text)
    for rest in rests:
        time = 2 * rest.half_cycle + rest.moved
        for register in design.registers:
            values = levels(dump, f"{design.top}.{register.name}", 80)
            assert int(values[time], 2) == rest.registers[register.name]


def test_a_trace_in_json_is_cut_where_it_is_long(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(json, "MOST_RESTS", 5)
    report, _ = report_of(tmp_path, released_at(2, 12))
    told = json.as_object(report)["properties"][0]["trace"]
    assert len(told["rests"]) == 5
    # Twelve half-cycles and one move.
    assert told["rests_cut"] == 13
    assert told["half_cycles"] == 12
