"""Test benches as text: what is written for which finding, and where there is none. Whether they do what they should
is for tests/agreement, with a simulator."""

from __future__ import annotations

import os
import re
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result
from texts import BY_3, RING, SPINS, STICKS_AT_7, checked, written

from prover import cli
from prover.design import components, element, ended
from prover.report import testbench
from prover.report.checks import MOST_HALF_CYCLES
from prover.report.dut import RESERVED

CASES = Path(__file__).parents[1] / "cases"

# A divider whose state is that of a primitive, which can't be set from outside.
KEEP = """\
primitive keep (q, c, d);
  output reg q;
  input c, d;
  table
    r 0 : ? : 0;
    r 1 : ? : 1;
    f ? : ? : -;
    ? * : ? : -;
  endtable
endprimitive
module m (input clk, output q);
  keep one (q, clk, ~q);
endmodule
"""


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def declared(text: str) -> set[str]:
    """The names that a bench declares for itself; those of the inputs come before the instance."""
    own = text.partition(" dut (")[2]
    names = re.findall(r"^  (?:reg|wire|integer)(?: \[\d+:0\])? (.*);$", own, re.MULTILINE)
    found = {name.partition(" ")[0] for line in names for name in line.partition(" = ")[0].split(", ")}
    found |= set(re.findall(r"^  task (\w+);", text, re.MULTILINE))
    return found | set(re.findall(r"parameter \[63:0\] (\w+)", text)) | {"dut"}


def test_each_refuted_property_has_a_bench_that_names_claim_and_finding(tmp_path: Path) -> None:
    report = checked(tmp_path, STICKS_AT_7, "5", high=4)
    made, notes = testbench.benches(report)
    refuted = [f for f in report.findings if f.verdict == "refuted"]
    assert [bench.name for bench in made] == [f.name for f in refuted]
    assert {"no-stuck", "recovery"} <= {bench.name for bench in made}
    assert not notes
    for bench, finding in zip(made, refuted, strict=True):
        assert f"claimed   {finding.claim}\n" in bench.text
        assert f"reported  {finding.says.replace('→', '->')}\n" in bench.text
        # Count 7 holds itself; first the complement of it is forced.
        if bench.name in ("no-stuck", "recovery"):
            assert re.findall(r"force dut.stage0.count = (.*);", bench.text) == ["3'h0", "3'h7"]


def test_what_is_proved_has_none(tmp_path: Path) -> None:
    assert testbench.benches(checked(tmp_path, BY_3, "3")) == ([], [])


def test_the_names_that_benches_have_are_those_that_inputs_are_kept_from(tmp_path: Path) -> None:
    reports = [checked(tmp_path, RING, "3"), checked(tmp_path, SPINS, "2")]
    others: list[tuple[str, str, dict[str, Any]]] = [
        ("late_for_its_limit", "20", {"within": 50}),
        ("cell_loses_remainder", "16/3", {"mean": True}),
        ("prescaler_off_reset", "6", {}),
        ("latch_behind_a_decode", "8", {}),
        ("pump_gated_bare", "6", {"moving": {"run": None}}),
    ]
    for name, ratio, more in others:
        text = (CASES / "faulty" / f"{name}.v").read_text()
        reports.append(checked(tmp_path, text, ratio, **more))
    texts = [bench.text for report in reports for bench in testbench.benches(report)[0]]
    assert set.union(*map(declared, texts)) == RESERVED
    text = RING.replace("clk,", "clk, input t, input t_, input [1:0] out,").replace(
        "q[3]}", "q[3] & t & t_ & |out}"
    )
    report = checked(tmp_path, text, "4", holds={"t": 1, "t_": 1, "out": 2})
    bench = testbench.benches(report)[0][0]
    assert "ring dut (.clk(clk), .t(t__), .t_(t_), .out(out_));" in bench.text
    assert "wire [1:0] out_ = 2'h2;" in bench.text


def test_the_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    first, second = (testbench.benches(checked(tmp_path, RING, "3")) for _ in range(2))
    assert first == second
    assert all(bench.text.isascii() for bench in first[0])


def test_why_there_is_none_is_told(tmp_path: Path) -> None:
    made, notes = testbench.benches(checked(tmp_path, KEEP, "4"))
    assert not made
    assert notes
    assert all("q is the state of a user-defined primitive" in note for note in notes)
    # A loop of a hundred million half-cycles on which the high time is wrong only once round.
    long = (
        "module m (input clk, input rst, output q); reg [25:0] n; always @(posedge clk) if (rst) n <= 0;\n"
        "else n <= n >= 49999999 ? 0 : n + 1; assign q = n < 24999998; endmodule\n"
    )
    made, notes = testbench.benches(checked(tmp_path, long, "50_000_000"))
    assert not {"high-time", "recovery"} & {bench.name for bench in made}
    long_ones = [note for note in notes if f"benches end at {MOST_HALF_CYCLES}" in note]
    told = [note.partition(":")[0] for note in long_ones]
    assert told == ["no test bench for high-time", "no test bench for recovery"]


def test_texts_that_would_end_a_comment_or_a_string_do_not(tmp_path: Path) -> None:
    report = checked(tmp_path, RING, "3")
    hostile = 'no */ `define \n endmodule " \\ %d \x1b[2J é'
    finding = replace(report.findings[0], claim=hostile, says=hostile)
    (bench, *_), _ = testbench.benches(replace(report, findings=(finding,)))
    before = testbench.benches(report)[0][0].text
    assert len(bench.text.splitlines()) == len(before.splitlines())
    assert all(" " <= c <= "~" or c == "\n" for c in bench.text)
    plain = r"no */ `define \n endmodule \" \\ %%d \\x1b[2J \\xe9".replace(r"\n", r"\\n")
    assert f'$display("claimed: {plain}");' in bench.text


def test_hierarchical_names_fall_into_their_identifiers() -> None:
    # IEEE 1364-2005 clause 3.7.1: an escaped identifier ends with white space.
    assert components("u1.g[0].q[3]") == [("u1", ""), ("g", "[0]"), ("q", "[3]")]
    assert components(r"\a.b[1] .q") == [(r"\a.b[1]", ""), ("q", "")]
    assert components(r"u.\x [2][1]") == [("u", ""), (r"\x", "[2][1]")]
    assert ended(r"u.\x") == r"u.\x "
    assert ended(r"\a.b .q") == r"\a.b .q"
    assert element(r"\x", "7:4") == r"\x [7:4]"


# -- the command -------------------------------------------------------------------------------------------


def test_benches_go_into_a_folder(tmp_path: Path) -> None:
    out = tmp_path / "out"
    source = written(tmp_path, RING)
    missing = run("check", source, "--ratio", "4", "--high", "2", "--testbench", str(out))
    assert (missing.exit_code, out.exists()) == (2, False)
    assert "make the folder first" in missing.stderr
    out.mkdir()
    assert run("check", source, "--ratio", "4", "--high", "2", "--testbench", str(out)).exit_code == 1
    names = ["high-time_tb.v", "no-stuck_tb.v", "ratio_tb.v", "recovery_tb.v"]
    assert sorted(os.listdir(out)) == names
    assert run("check", written(tmp_path, BY_3), "--ratio", "3", "--testbench", str(out)).exit_code == 0
    assert sorted(os.listdir(out)) == names


def test_several_dividers_have_benches_of_their_own(tmp_path: Path) -> None:
    sources, out = tmp_path / "sources", tmp_path / "out"
    sources.mkdir()
    out.mkdir()
    (sources / "a.v").write_text(RING)
    (sources / "b.v").write_text(SPINS)
    (sources / "c.v").write_text(KEEP)
    (sources / "d.v").write_text((CASES / "faulty" / "prescaler_off_reset.v").read_text())
    result = run("check", str(sources), "--ratio", "4", "--high", "2", "--testbench", str(out))
    assert result.exit_code == 1
    found = os.listdir(out)
    assert {name.partition("-")[0] for name in found} >= {"a", "b", "d"}
    assert "c.v: note: no test bench for ratio: q is the state of a user-defined primitive" in result.stderr
    # What one divider alone is given is the same.
    alone = tmp_path / "alone"
    alone.mkdir()
    assert (
        run("check", str(sources / "d.v"), "--ratio", "4", "--high", "2", "--testbench", str(alone)).exit_code
        == 1
    )
    for name in os.listdir(alone):
        assert (alone / name).read_text() == (out / f"d-{name}").read_text()
    modules = [re.findall(r"^module (\w+);", (out / name).read_text(), re.MULTILINE) for name in found]
    assert len({module for one in modules for module in one}) == len(found)
    # A bench is no divider: a folder that holds both is read as before.
    for name in found:
        (out / name).rename(sources / name)
    again = run("check", str(sources), "--ratio", "4", "--high", "2")
    assert "4 dividers\n" in again.stdout


@pytest.mark.parametrize("place", ["file", "source"])
def test_nothing_is_overwritten(tmp_path: Path, place: str) -> None:
    source = tmp_path / "ratio_tb.v"
    source.write_text(RING)
    folder = source if place == "file" else tmp_path
    result = run("check", str(source), "--ratio", "4", "--high", "2", "--testbench", str(folder))
    assert result.exit_code == 2
    assert source.read_text() == RING
