"""Two dividers compared, as the command line and Python callers see it; the pairs of cases/pairs come out as stated."""

from __future__ import annotations

import json
import shlex
from pathlib import Path
from typing import Any

import pytest
from cases_format import CASES, Case, PairGroup, cases
from click.testing import CliRunner, Result
from vcdvcd import VCDVCD

import prover
from prover import Pairing, Spec, cli
from prover.ports import recognise
from prover.trace import Rest
from prover.trace import run as run_trace

STATUS = {"proved": 0, "refuted": 1, "open": 3}
PAIRS = [(case, pair) for case in cases("pairs") for pair in case.pairs]
UP, DOWN = (str(CASES / "pairs" / f"sample_{way}.v") for way in ("up", "down"))
EARLY, LATE = (str(CASES / "pairs" / f"scan_by_8_{when}.v") for when in ("binary", "late"))


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, ["compare", *arguments], catch_exceptions=False)


def report(*arguments: str) -> Any:
    return json.loads(run(*arguments, "--json", "-").stdout)


@pytest.mark.parametrize(
    ("case", "pair"),
    [pytest.param(c, p, id=f"{c.path.stem}: {shlex.join([p.other, *p.options])}") for c, p in PAIRS],
)
def test_a_pair_is_judged_as_it_states(case: Case, pair: PairGroup, tmp_path: Path) -> None:
    wave = tmp_path / "wave.vcd"
    other = str(CASES / pair.other)
    result = run(str(case.path), other, *pair.options, "--json", "-", "--vcd", str(wave))
    found = json.loads(result.stdout)
    assert found["verdict"] == pair.verdict, found["says"]
    assert result.exit_code == STATUS[pair.verdict]
    assert bool(found["obligations"]) == pair.obligation
    assert found["facts"].get("settled_half_cycles") == pair.settled or pair.settled is None
    if pair.verdict == "refuted":
        difference = found["difference"]
        assert pair.differs is None or difference["old_half_cycle"] == pair.differs
        assert difference["levels"][0] != difference["levels"][1]
        check_wave(wave, found)
    else:
        assert found["lag_half_cycles"] == (pair.lag or 0) or pair.settled is not None
        assert found["difference"] is None
        assert not wave.exists()


def check_wave(wave: Path, found: Any) -> None:
    """The dump shows the two levels at the half-cycles at which they are said to differ."""
    difference = found["difference"]
    dump = VCDVCD(str(wave))
    per = 2 if "trace" in difference else 1
    for side, at, level in zip(
        ("old", "new"),
        (difference["old_half_cycle"], difference["new_half_cycle"]),
        difference["levels"],
        strict=True,
    ):
        name = next(n for n in dump.signals if n.endswith(f".{side}.{found[side]['output'].split('[')[0]}"))
        time = per * at + (per == 2 and not difference["at_edge"])
        shown = dump[name][time]
        if "[" not in found[side]["output"]:
            assert shown == str(level)
        if side == "old":
            (marked,) = (n for n in dump.signals if n.endswith(".broken"))
            assert dump[marked][time] == "1"
    # An output that is a register has one trace, not two.
    assert not [n for n in dump.signals if n.endswith("_2")]


def test_what_must_be_shown_is_among_the_pairs() -> None:
    verdicts = {pair.verdict for _, pair in PAIRS}
    assert verdicts == {"proved", "refuted"}
    assert any(pair.lag == 1 for _, pair in PAIRS)
    assert any(pair.differs is not None and pair.differs > 1 << 21 for _, pair in PAIRS)


# Measured on a real part of the published 4018 function table, Q1 to Q5 inverted, one row an input cycle (a maker's
# support forum; the by-4 rows are computed with the gate that the measured by-2 rows tell of).
MEASURED = {
    1: "11111 01111 10111 01111 10111",
    2: "11111 01111 00111 10011 11001 01100 00110 10011",
}


@pytest.mark.parametrize("tap", MEASURED)
def test_the_gated_counter_is_the_one_that_was_measured(tap: int) -> None:
    spec = Spec(parameters={"TAP": tap}, output="q1")
    rows = {name: inverted_rows(f"shift_5_{name}", spec, 8) for name in ("gated", "plain")}
    measured = MEASURED[tap].split()
    assert rows["gated"][: len(measured)] == measured
    # A plain shift register is told from it by the third stage, after the third edge.
    assert rows["plain"][:3] == measured[:3]
    assert (rows["plain"][3] == measured[3]) == (tap == 2)
    if tap == 1:
        assert rows["plain"][3] == "01011"


def inverted_rows(name: str, spec: Spec, count: int) -> list[str]:
    """The five inverted stages, first to last, in each input cycle from all at 0."""
    ports = recognise(prover.read([CASES / "pairs" / f"{name}.v"], spec), spec)
    first = Rest(0, False, {}, {"q": 0, "clk": 0}, {})
    rests = run_trace(ports.design, "clk", {}, first, [None] * (2 * count), 4)
    # q is declared [5:1]: its lowest bit is the first stage.
    words = [rest.registers["q"] for rest in rests[::2]]
    return ["".join(str(1 - (word >> i & 1)) for i in range(5)) for word in words]


# -- what a user sees --------------------------------------------------------------------------------------


def test_equal_dividers_are_told_with_both_and_the_claim() -> None:
    result = run(UP, DOWN, "--moving", "divisor")
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert lines[0].startswith("old  sample_up  ")
    assert any(line.startswith("new  sample_down  ") for line in lines)
    assert "divisor moving at will" in " ".join(line.strip() for line in lines)
    assert "verdict  PROVED" in lines


def test_a_difference_is_drawn_with_both_outputs() -> None:
    result = run(EARLY, LATE)
    assert result.exit_code == 1
    # By hand: released while the clock is low, the fourth rising edge begins half-cycle 7; resampled at the falling
    # edge it is seen in half-cycle 8.
    assert "REFUTED   half-cycle 7: the old output is 1, the new one 0" in result.stdout
    (old,) = [line for line in result.stdout.splitlines() if line.startswith("  old.scan")]
    (new,) = [line for line in result.stdout.splitlines() if line.startswith("  new.scan")]
    assert new.index("|") - old.index("|") == 2


def test_a_lag_is_found_and_told() -> None:
    found = report(EARLY, LATE, "--lag", "any")
    assert (found["verdict"], found["lag_half_cycles"]) == ("proved", 1)
    assert report(LATE, EARLY, "--lag", "any")["lag_half_cycles"] == -1
    assert report(EARLY, LATE, "--lag", "2")["verdict"] == "refuted"


def test_options_for_one_side_and_other_port_names(tmp_path: Path) -> None:
    source = Path(DOWN).read_text(encoding="utf-8")
    for name, other in (("rst", "clear"), ("divisor", "ratio"), ("clk", "osc"), ("sample", "out")):
        source = source.replace(name, other)
    path = tmp_path / "renamed.v"
    path.write_text(source, encoding="utf-8")
    assert run(UP, str(path), "--map", "divisor=ratio", "--moving", "divisor").exit_code == 0
    assert run(UP, str(path), "--hold", "divisor=3", "--new-hold", "ratio=3").exit_code == 0
    assert run(UP, str(path), "--hold", "divisor=3", "--new-hold", "ratio=2").exit_code == 1
    named = ["--new-clock", "osc", "--new-reset", "clear", "--new-output", "out", "--old-output", "sample"]
    assert run(UP, str(path), "--map", "divisor=ratio", *named).exit_code == 0


def test_dividers_in_several_files_and_one_file_for_both(tmp_path: Path) -> None:
    stage = "module stage (input ck, input rst, output reg q); always @(posedge ck)\n  q <= ~q & ~rst; endmodule\n"
    (tmp_path / "stage.v").write_text(stage, encoding="utf-8")
    both = """\
module one (input clk, input rst, output q);
  stage s (clk, rst, q);
endmodule
module two (input clk, input rst, output q);
  reg [1:0] c; always @(posedge clk) if (rst) c <= 0; else c <= c + `STEP; assign q = c[0];
endmodule
"""
    (tmp_path / "both.v").write_text(both, encoding="utf-8")
    path = str(tmp_path / "both.v")
    given = ["--old-module", "one", "--new-module", "two", "--with", str(tmp_path / "stage.v")]
    assert run(path, path, *given, "--define", "STEP=1").exit_code == 0
    assert run(path, path, *given, "--define", "STEP=1", "--new-define", "STEP=2").exit_code == 1


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (["--moving", "clk"], "free to move"),
        (["--moving", "nothing"], "no such input"),
        (["--hold", "nothing=1"], "no such input"),
        (["--map", "divisor=nothing"], "no input nothing"),
        (["--map", "divisor"], "not of the form"),
        (["--map", "divisor=rst"], "bits"),
        (["--old-hold", "divisor=1"], "is held"),
        (["--lag", "soon"], "whole number"),
        (["--after", "any", "--moving", "divisor"], "never settle"),
        (["--after", "any", "--start", "reset"], "power-up"),
        (["--after", "any", "--lag", "2"], "lag"),
        (["--start", "initial"], "initial value"),
        (["--old-module", "none"], "none"),
        (["--set", "V=2"], "V"),
        (["--new-output", "left"], "bits wide"),
        (["--start", "any"], "any"),
        (["--json", UP], "overwritten"),
        (["--json", "-", "--vcd", "-"], "two results"),
    ],
)
def test_nonsense_ends_with_2_and_a_hint(options: list[str], word: str) -> None:
    result = run(UP, DOWN, *options)
    assert result.exit_code == 2, result.stdout
    assert result.stdout == ""
    assert word in result.stderr
    assert "\nhint: " in result.stderr


def test_an_input_of_one_alone_is_named_with_a_remedy(tmp_path: Path) -> None:
    path = tmp_path / "gated.v"
    path.write_text(
        "module gated (input clk, input rst, input test, output reg q);\n"
        "  always @(posedge clk) if (rst) q <= 0; else q <= ~q ^ test;\nendmodule\n",
        encoding="utf-8",
    )
    result = run(str(CASES / "pairs" / "log_by_2.v"), str(path))
    assert result.exit_code == 2
    assert f"{path}:1: " in result.stderr
    assert "--new-hold test=VALUE" in result.stderr
    assert run(str(CASES / "pairs" / "log_by_2.v"), str(path), "--new-hold", "test=0").exit_code == 0


def test_too_little_effort_is_open() -> None:
    result = run(UP, DOWN, "--set", "W=24", "--moving", "divisor", "--effort", "0.02")
    assert result.exit_code == 3
    assert "PROVED" not in result.stdout


def test_the_same_input_gives_the_same_report() -> None:
    first, second = (report(UP, DOWN, "--moving", "divisor") for _ in range(2))
    assert {**first, "seconds": 0} == {**second, "seconds": 0}


# -- inputs that decide nothing, outcomes that nothing decides ---------------------------------------------


def written(folder: Path, name: str, text: str) -> str:
    path = folder / f"{name}.v"
    path.write_text(text, encoding="utf-8")
    return str(path)


def test_what_hangs_on_x_is_left_open(tmp_path: Path) -> None:
    plain = (
        "module a (input clk, input rst, output reg q); always @(posedge clk) q <= rst ? 0 : ~q; endmodule\n"
    )
    unknown = plain.replace("~q", "q === 1'b1 ? 1'b0 : 1'bx")
    old, new = written(tmp_path, "plain", plain), written(tmp_path, "unknown", unknown.replace("===", "=="))
    for options in ([], ["--lag", "any"], ["--start", "reset"]):
        assert report(old, new, *options)["verdict"] == "open"


def test_an_outcome_that_hangs_on_the_order_of_events_is_left_open() -> None:
    chaser = str(CASES / "faulty" / "gate_that_chases_itself.v")
    found = report(chaser, chaser, "--after", "any", "--lag", "any")
    assert found["verdict"] == "open"


def test_registers_that_reset_leaves_alone_take_every_value(tmp_path: Path) -> None:
    text = """\
module a (input clk, input rst, output q);
  reg half, quarter;
  always @(posedge clk) begin
    half <= rst ? 1'b0 : ~half;
    if (half) quarter <= ~quarter;
  end
  assign q = OUT;
endmodule
"""
    one, two = (written(tmp_path, n, text.replace("OUT", n)) for n in ("half", "quarter"))
    assert report(one, one)["verdict"] == "proved"
    # Two of them may power up apart, and stay so.
    found = report(two, two)
    assert found["verdict"] == "refuted"
    states = found["difference"]["states"]
    assert states["old"]["quarter"] != states["new"]["quarter"]


def test_a_power_up_that_matters_only_beyond_its_loop_is_seen(tmp_path: Path) -> None:
    # From 7 on the output is another for one round; then both are the same for ever.
    text = "module a (input clk, output q); reg [2:0] c = INIT; always @(posedge clk) c <= c == LAST ? 0 : c + 1;\n"
    text += "  assign q = c > 3; endmodule\n"
    old = written(tmp_path, "old", text.replace("INIT", "0").replace("LAST", "5"))
    new = written(tmp_path, "new", text.replace("INIT", "6").replace("LAST", "5"))
    assert report(old, new)["verdict"] == "refuted"
    # By hand: 6 and 7 come before 0, high as 4 and 5 are, so the new output is 4 half-cycles late.
    assert report(old, new, "--lag", "any")["lag_half_cycles"] == 4
    found = report(old, new, "--after", "any", "--lag", "any")
    assert found["verdict"] == "proved"


def test_a_lag_is_found_while_inputs_move(tmp_path: Path) -> None:
    text = "module a (input clk, input rst, input en, output tick);\n  reg q, late;\n"
    text += (
        "  always @(posedge clk) if (rst) q <= 0; else if (en) q <= ~q;\n  always @(negedge clk) late <= q;\n"
    )
    old, new = (written(tmp_path, n, f"{text}  assign tick = {n};\nendmodule\n") for n in ("q", "late"))
    for options, lag in ((["--lag", "any"], 1), (["--lag", "1"], 1)):
        found = report(old, new, "--moving", "en", *options)
        assert (found["verdict"], found["lag_half_cycles"]) == ("proved", lag)
    assert report(old, new, "--moving", "en")["verdict"] == "refuted"
    # No lag: what is tried is told, and nothing is claimed of what is not.
    other = written(tmp_path, "other", f"{text}  assign tick = q & late;\nendmodule\n")
    found = report(old, other, "--moving", "en", "--lag", "any")
    assert found["verdict"] == "open"
    assert "-16 to 16" in found["says"]


def test_what_is_compared_with_nothing_is_told(tmp_path: Path) -> None:
    # By hand: the second output is the first one an input cycle late, and 1 before that.
    text = "module a (input clk, input rst, output q); reg one, two;\n  always @(posedge clk) {two, one} <= rst ? 2'b10 : {one, ~one};\n"  # fmt: skip
    old, new = (written(tmp_path, n, f"{text}  assign q = {n};\nendmodule\n") for n in ("one", "two"))
    found = report(old, new, "--lag", "2")
    assert found["verdict"] == "proved"
    assert "what the new output shows before half-cycle 2 is compared with nothing" in found["assumptions"]
    found = report(new, old, "--lag", "-2")
    assert found["verdict"] == "proved"
    assert "what the old output shows before half-cycle 2 is compared with nothing" in found["assumptions"]


def test_each_start_may_have_a_lag_of_its_own() -> None:
    # By hand: toggles on falling edges come one half-cycle after rising ones where reset is released while the clock is
    # low, and one before them where it is released while the clock is high.
    gray = str(CASES / "gauge" / "stage_by_16_gray.v")
    ripple = str(CASES / "gauge" / "sonde_by_8_generate.v")
    found = report(gray, ripple, "--new-set", "STAGES=4", "--lag", "any")
    assert found["verdict"] == "refuted"
    assert "different lags: 1 half-cycles where reset" in found["says"]
    assert "; -1 half-cycles where reset" in found["says"]


def test_what_follows_the_clock_is_equal_from_everywhere(tmp_path: Path) -> None:
    text = "module a (input clk, output o); reg [2:0] c; always @(posedge clk) c <= c SHIFT 1; assign o = OUT; endmodule\n"
    # What is shifted out is gone after three cycles; until then it holds the clock up.
    drained = text.replace("SHIFT", "<<").replace("OUT", "clk & c == 0")
    old, new = written(tmp_path, "plain", "module b (input clk, output o); reg c; always @(posedge clk) c <= c;\n"
                       "  assign o = clk; endmodule\n"), written(tmp_path, "drained", drained)  # fmt: skip
    found = report(old, new, "--after", "any")
    assert found["verdict"] == "proved"
    # By hand: 1 is gone at the third rising edge, six half-cycles after a state with the clock high; the low half-cycle
    # before that edge is right already.
    assert found["facts"]["settled_half_cycles"] == 5
    assert (
        report(old, written(tmp_path, "upside", drained.replace("clk & c", "~clk & c")), "--after", "any")[
            "verdict"
        ]
        == "refuted"
    )


WARMED = """module MODULE (input clk, input rst, PORTSoutput out);
  reg [1:0] count;
  reg [3:0] warm;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      if (warm != 15) warm <= warm + 1;
    end else count <= count + 1;
  assign out = count[1] ^ (warm == COLD && count == 0);
endmodule
"""


def test_reset_is_held_until_no_more_comes_of_it(tmp_path: Path) -> None:
    # By hand: reset lets `warm` rise to 15, which takes 15 input cycles from 0, so that after 30 half-cycles it is neither
    # 12 nor 13; after 24 it may still be either.
    def warmed(name: str, cold: str, ports: str = "") -> str:
        text = WARMED.replace("MODULE", name).replace("COLD", cold).replace("PORTS", ports)
        return written(tmp_path, name, text)

    old, new = warmed("a", "12"), warmed("b", "13")
    certificate = str(tmp_path / "c.json")
    found = report(old, new, "--certificate", certificate)
    assert found["verdict"] == "proved", found["says"]
    assert CliRunner().invoke(cli.main, ["recheck", certificate]).exit_code == 0
    found = report(old, warmed("c", "15"))
    assert (found["verdict"], found["difference"]["old_half_cycle"]) == ("refuted", 0)
    # Neither is a difference shown while inputs move that only a shorter reset allows for.
    old, new = (warmed(f"m{n}", f"{n} && hint", "input hint, ") for n in (12, 13))
    assert report(old, new, "--moving", "hint", "--effort", "5")["verdict"] != "refuted"
    late = warmed("m15", "15 && hint", "input hint, ")
    assert report(old, late, "--moving", "hint")["verdict"] == "refuted"


def test_a_long_shift_register_is_filled_by_reset(tmp_path: Path) -> None:
    # By hand: after 20 cycles of reset all of `gone` is 1. The count starts when the first 0 has come to the end, so
    # an end that is a place later makes it an input cycle later.
    text = """module a (input clk, input rst, output out);
  reg [19:0] gone;
  reg [1:0] count;
  always @(posedge clk) begin
    gone <= {gone[18:0], rst};
    if (rst | gone[END]) count <= 0;
    else count <= count + 1;
  end
  assign out = count[1];
endmodule
"""
    early, late = (written(tmp_path, f"end{n}", text.replace("END", str(n))) for n in (18, 19))
    same = written(tmp_path, "all", text.replace("gone[END]", "|gone[19:18]"))
    assert report(late, same)["verdict"] == "proved"
    assert report(early, late)["verdict"] == "refuted"
    found = report(early, late, "--lag", "any")
    assert (found["verdict"], found["lag_half_cycles"]) == ("proved", 2)


def test_the_clock_and_its_complement_are_two_outputs(tmp_path: Path) -> None:
    # By hand: q keeps what it powered up with, so the output is the clock for ever or its complement for ever. Both
    # loops show the same wave, one half-cycle apart.
    kept = written(tmp_path, "kept", "module a (input clk, output o);\n  reg q; always @(posedge clk) q <= q;\n"
                   "  assign o = clk ^ q;\nendmodule\n")  # fmt: skip
    set_soon = written(tmp_path, "soon", "module b (input clk, output o);\n  reg q; always @(posedge clk) q <= 1'b1;\n"
                       "  assign o = clk & q;\nendmodule\n")  # fmt: skip
    for pair in ((kept, set_soon), (set_soon, kept)):
        found = report(*pair, "--after", "any")
        assert found["verdict"] == "refuted"
        assert sorted(found["difference"]["levels"]) == [0, 1]
    assert report(kept, set_soon, "--after", "any", "--lag", "any")["verdict"] == "proved"
    # Too wide for a state graph, from which alone it would be known of every loop.
    wide = written(tmp_path, "wide", "module c (input clk, output o);\n  reg [31:0] r; always @(posedge clk) r <= r;\n"
                   "  assign o = clk ^ ^r;\nendmodule\n")  # fmt: skip
    assert report(wide, set_soon, "--after", "any", "--effort", "3")["verdict"] != "proved"


# -- Python ------------------------------------------------------------------------------------------------


def test_the_python_interface() -> None:
    pairing = Pairing(moving=("divisor",), old=Spec(parameters={"W": 3}), new=Spec(parameters={"W": 3}))
    told: list[str] = []
    found = prover.compare([UP], [DOWN], pairing, told.append)
    assert found.verdict == "proved"
    assert told
    assert prover.compare([EARLY], [LATE]).verdict == "refuted"
