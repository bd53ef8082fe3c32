"""Inputs that move: claims proved and refuted, what the options refuse, and certificates with a fault put in."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from cases_format import CASES
from click.testing import CliRunner, Result

from prover import (
    certificate,
    cli,
    inductive,
    mine,
    monitor,
    moves,
    moving,
    observer,
    questions,
    trace,
    watch,
)
from prover.api import read
from prover.effort import Effort
from prover.moves import Question
from prover.moving import Machine
from prover.ports import Ports, recognise_open
from prover.watch import Line

WRAP = CASES / "gauge/sample_wrap.v"
AT_LEAST = CASES / "gauge/sample_at_least.v"
OVERTAKEN = CASES / "faulty/sample_overtaken.v"
BY_DIV = CASES / "gauge/sample_by_div.v"
LATCH = CASES / "gauge/pump_gated_latch.v"


def run(path: Path, *options: str) -> Result:
    return CliRunner().invoke(cli.main, ["check", str(path), *options], catch_exceptions=False)


def asked(path: Path, *options: str) -> tuple[Ports, Question]:
    """The question that the options ask, with nothing known of the divider that stands still."""
    context = cli.check.make_context("check", [str(path), *options])
    spec = cli._spec({n: v for n, v in context.params.items() if n != "files" and not n.endswith("_path")})
    design = read([path], spec)
    spec = questions.named_ports(design, spec)
    ports = recognise_open(design, spec, [*spec.moving])
    varying = [name for name in spec.moving if spec.ratio_formula and name in spec.ratio_formula.names]
    claimed = questions.nominal_of(design, spec, varying, Effort(10))
    held = dict(ports.running.values)
    return ports, Question(tuple(spec.moving), (), held, claimed, bool(varying), "reset")


def machine_of(ports: Ports, question: Question) -> Machine:
    return moving.machine_of(ports, question.moving, (), question.held, "reset", Effort(10))


# -- wide machines -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("path", "width"), [(WRAP, 24), (AT_LEAST, 24), (BY_DIV, 8)])
def test_a_safe_divider_is_proved_for_every_value_at_any_width(path: Path, width: int) -> None:
    # By hand: the pulse at hand runs out, and the next one is right. The longest has 2·2^W half-cycles.
    ports, question = asked(path, "--set", f"W={width}", "--moving", "div", "--ratio", "2*(div+1)")
    found = moves.answer(ports, question, Effort(120))
    assert (found.proved, found.back) == (True, 2 << width), found.open


@pytest.mark.parametrize("width", [8, 24])
def test_a_count_that_is_overtaken_runs_round_its_register(width: int) -> None:
    # By hand: a count that has just passed the limit comes to it again after 2^W input cycles.
    ports, question = asked(OVERTAKEN, "--set", f"W={width}", "--moving", "div", "--ratio", "2*(div+1)")
    found = moves.answer(ports, question, Effort(60))
    assert found.trace is not None
    assert found.trace.half_cycles == 6
    lasts = int(found.trace.text.partition("it lasts ")[2].split()[0])
    assert lasts in range(2 << width, (2 << width) + 6)
    outputs = {ports.output: ports.output_value}
    assert not trace.faults(ports.design, ports.clock, outputs, found.trace, 8)


def test_what_no_line_shows_is_left_open(tmp_path: Path) -> None:
    # A count in Gray code: no linear relation holds of it.
    source = tmp_path / "gray.v"
    source.write_text(
        "module gray (input clk, rst, input [7:0] div, output reg out);\n"
        "  reg [7:0] code, limit; wire [7:0] n;\n"
        "  assign n = code ^ (code >> 1) ^ (code >> 2) ^ (code >> 3) ^ (code >> 4) ^ (code >> 5) ^ (code >> 6)\n"
        "    ^ (code >> 7);\n"
        "  wire [7:0] more = n + 8'd1;\n"
        "  always @(posedge clk)\n"
        "    if (rst) begin code <= 0; out <= 0; limit <= div; end\n"
        "    else if (n == limit) begin code <= 0; out <= ~out; limit <= div; end\n"
        "    else code <= more ^ (more >> 1);\n"
        "endmodule\n"
    )
    ports, question = asked(source, "--moving", "div", "--ratio", "2*(div+1)")
    found = moves.answer(ports, question, Effort(3))
    assert (found.proved, found.trace) == (False, None)
    assert found.open


# -- the checks of claims ----------------------------------------------------------------------------------


def test_a_table_of_dangers_with_a_fault_is_rejected() -> None:
    ports, question = asked(WRAP, "--set", "W=2", "--moving", "div", "--ratio", "2*(div+1)")
    machine = machine_of(ports, question)
    limits = moves.limits_of(machine, question)
    found = monitor.search(machine, observer.tables(machine), limits, Effort(10))
    assert found.broken is None
    assert not observer.danger_faults(machine, limits, found.danger)
    reached = np.argwhere(found.danger >= 0)
    for row, value, state in reached[:: len(reached) // 40]:
        wrong = found.danger.copy()
        wrong[row, value, state] -= 1
        assert observer.danger_faults(machine, limits, wrong), (row, value, state)


def test_a_rank_with_a_fault_is_rejected() -> None:
    ports, question = asked(WRAP, "--set", "W=2", "--moving", "div", "--ratio", "2*(div+1)")
    machine = machine_of(ports, question)
    table, limits = observer.tables(machine), moves.limits_of(machine, question)
    reached = monitor.search(machine, table, limits, Effort(10)).reached
    high, low = observer.everywhere(machine, [question.nominal.high, question.nominal.low])
    held = monitor.held(table, reached, high + low, high, Effort(10))
    assert not observer.rank_faults(table, reached, held.phase, held.rank, high + low, high)
    for value, state in np.argwhere(reached & (held.rank > 0))[::5]:
        wrong = held.rank.copy()
        wrong[value, state] = 0
        assert observer.rank_faults(table, reached, held.phase, wrong, high + low, high), (value, state)
    for value, state in np.argwhere(reached & (held.rank == 0))[::5]:
        wrong = held.phase.copy()
        wrong[value, state] += 1
        assert observer.rank_faults(table, reached, wrong, held.rank, high + low, high), (value, state)


def test_a_level_that_the_output_does_not_come_to_is_rejected() -> None:
    ports, question = asked(LATCH, "--moving", "run", "--ratio", "6")
    machine = machine_of(ports, question)
    table, limits = observer.tables(machine), moves.limits_of(machine, question)
    reached = monitor.search(machine, table, limits, Effort(10)).reached
    high, low = observer.everywhere(machine, [question.nominal.high, question.nominal.low])
    held = monitor.held(table, reached, high + low, high, Effort(10))
    parks = reached.copy()
    parks[1] = False
    assert not observer.still_faults(table, parks, held.level, held.still)
    assert observer.still_faults(table, parks, 1 - held.level, held.still)
    assert observer.still_faults(table, parks, held.level, np.minimum(held.still, 1))
    assert observer.still_faults(table, reached, held.level, held.still)


def lines_of(path: Path, width: int) -> tuple[watch.Watch, tuple[Line, ...]]:
    ports, question = asked(path, "--set", f"W={width}", "--moving", "div", "--ratio", "2*(div+1)")
    system = watch.watch(machine_of(ports, question), question.nominal, "range")
    found = inductive.proof(
        system, mine.candidates(system, mine.sampled(system, Effort(20)), False), Effort(30)
    )
    assert found is not None
    return system, inductive.shortened(system, found, Effort(30))


def upheld(system: watch.Watch, lines: tuple[Line, ...]) -> bool:
    return all(
        certificate.discharge(each, Effort(20)) for each in watch.obligations(system, lines, "a claim")
    )


def test_invariants_with_a_fault_are_rejected() -> None:
    system, lines = lines_of(AT_LEAST, 6)
    assert upheld(system, lines)
    rejected = 0
    for number, line in enumerate(lines):
        # Stronger than it is: an offset one lower holds no more where the line is tight, or is not kept.
        wrong = (*lines[:number], replace(line, offset=line.offset - 1), *lines[number + 1 :])
        rejected += not upheld(system, wrong)
    assert rejected >= len(lines) - 2
    assert not upheld(system, ())


def test_a_claim_that_is_false_has_no_invariants() -> None:
    # Both dividers have the same registers, so that the lines of the one can be put to the other.
    _, lines = lines_of(AT_LEAST, 6)
    ports, question = asked(OVERTAKEN, "--set", "W=6", "--moving", "div", "--ratio", "2*(div+1)")
    system = watch.watch(machine_of(ports, question), question.nominal, "range")
    assert inductive.proof(system, lines, Effort(30)) is None
    assert not upheld(system, lines)


# -- options -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--ratio", "6", "--moving", "gone"], "no such input"),
        (["--ratio", "6", "--moving", "div"], "nothing is claimed of the ratio"),
        (["--ratio", "2*(div+1)", "--moving", "div", "--hold", "div=1"], "named both"),
        (["--ratio", "2*(div+1)", "--moving", "div", "--each", "div"], "named both"),
        (["--ratio", "2*(div+1)", "--moving", "div", "--clock", "div"], "clock or the reset"),
        (["--ratio", "2*(div+1)", "--moving", "div=0..99"], "4 bits"),
        (["--ratio", "2*(div+1)", "--moving", "div="], "no values"),
        (["--ratio", "2*(div+1)", "--moving", "div", "--moving", "div"], "given twice"),
        (["--ratio", "div", "--moving", "div"], "div=0"),
        (["--ratio", "16/3", "--mean", "--moving", "div"], "mean"),
    ],
)
def test_a_move_of_which_nothing_can_be_claimed_is_refused(
    options: list[str], words: str, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.chdir(tmp_path)
    result = run(WRAP, *options)
    assert result.exit_code == 2, result.output
    assert words in result.stderr
    assert "\nhint: " in result.stderr
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize(
    ("path", "options", "left"),
    [
        (LATCH, ["--ratio", "6", "--moving", "run"], "enable"),
        (WRAP, ["--set", "W=2", "--ratio", "2*(div+1)", "--moving", "div"], "ratio-change"),
    ],
)
def test_a_certificate_says_what_it_leaves_open(
    path: Path, options: list[str], left: str, tmp_path: Path
) -> None:
    made = tmp_path / "made.json"
    result = run(path, *options, "--certificate", str(made))
    assert result.exit_code == 0
    assert f"it bears out nothing of {left}" in result.stderr
    again = CliRunner().invoke(cli.main, ["recheck", str(made)], catch_exceptions=False)
    assert again.exit_code == 0, again.output


def test_an_enable_may_keep_the_divider_stopped_at_1(tmp_path: Path) -> None:
    source = tmp_path / "stop.v"
    source.write_text(
        "module stop (input clk, rst, halt, output reg out);\n"
        "  always @(posedge clk) if (rst) out <= 0; else if (!halt) out <= ~out;\n"
        "endmodule\n"
    )
    result = run(source, "--ratio", "2", "--moving", "halt")
    assert result.exit_code == 0
    assert "the output parks at the level that it has when it is stopped" in " ".join(result.stdout.split())


def test_a_divider_that_never_comes_back_is_refuted(tmp_path: Path) -> None:
    # Once the enable has been low the output is half as fast, for ever.
    source = tmp_path / "never.v"
    source.write_text(
        "module never (input clk, rst, run, output reg out);\n"
        "  reg lame, slow;\n"
        "  always @(posedge clk)\n"
        "    if (rst) {out, lame, slow} <= 3'd0;\n"
        "    else begin\n"
        "      if (!run) lame <= 1; else slow <= ~slow;\n"
        "      if (run & (!lame | slow)) out <= ~out;\n"
        "    end\n"
        "endmodule\n"
    )
    result = run(source, "--ratio", "2", "--moving", "run")
    assert result.exit_code == 1
    assert "the output has period 8 and is high 4" in " ".join(result.stdout.split())


def test_waivers_name_properties_of_moves() -> None:
    result = run(
        OVERTAKEN, "--ratio", "2*(div+1)", "--moving", "div=0..3", "--waive", "ratio-change=set while halted"
    )
    assert result.exit_code == 0, result.output


def test_few_values_of_a_wide_port_are_searched_whole(tmp_path: Path) -> None:
    """By hand: a new count is loaded as a pulse ends. From 16 half-cycles of the old count, just begun, to 2 of the new
    one: right from the last 2 of the old pulse on."""
    path = tmp_path / "top_bits.v"
    path.write_text(
        "module top_bits (input clk, rst, input [7:0] div, output reg q);\n  reg [2:0] count;\n"
        "  always @(posedge clk)\n    if (rst) {q, count} <= 0;\n"
        "    else if (count == 0) begin count <= div[7:5]; q <= ~q; end\n    else count <= count - 1;\nendmodule\n"
    )
    values = ",".join(str(32 * i) for i in range(8))
    ports, question = asked(path, "--moving", f"div={values}", "--ratio", "2*(div//32+1)")
    found = moves.answer(ports, question, Effort(60))
    assert (found.proved, found.back, found.exact) == (True, 14, True), found.open
