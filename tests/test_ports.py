"""Which port is the clock, the reset, the output: by what the code does with it, not by its name.

What is expected follows from the sources by reading them; names are chosen to mislead.
"""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from texts import checked, measured, written

from prover import Spec, cli, read
from prover.errors import UserError
from prover.ports import Ports, recognise

CASES = Path(__file__).parents[1] / "cases"


def ports(folder: Path, text: str, **options: object) -> Ports:
    spec = Spec(**options)  # type: ignore[arg-type]
    return recognise(read([written(folder, text)]), spec)


def refused(folder: Path, text: str, **options: object) -> UserError:
    with pytest.raises(UserError) as caught:
        ports(folder, text, **options)
    assert caught.value.hint
    return caught.value


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


# -- the clock ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "body",
    [
        "always @(posedge a) q <= ~q;",
        "always @(negedge a) q <= ~q;",
        "wire k; not (k, a); always @(posedge k) q <= ~q;",
        "wire k = a ^ 1'b1; always @(posedge k) q <= ~q;",
        "always @(posedge a or negedge a) q <= ~q;",
        "reg e; always @(negedge a) e <= clk; wire g = a & e; always @(posedge g) q <= ~q;",
        "reg p; always @(posedge a) p <= ~p; always @(posedge p) q <= ~q;",
        "always @(posedge a or posedge clk) if (clk) q <= 0; else q <= ~q;",
        "reg l; always @* if (a) l = ~q; always @* if (!a) q = l;",
        "reg l; always @* if (clk) l = 0; else if (a) l = ~q; always @* if (clk) q = 0; else if (!a) q = l;",
        "wire k, n, s, r, t, b; nand (t, b, s), (s, t, a), (r, s, a, b), (b, r, n), (k, s, n), (n, r, k);\n"
        "always @* q = k;",
    ],
)
def test_the_clock_is_what_clocks_registers(tmp_path: Path, body: str) -> None:
    text = f"module m (input clk, input a, output reg q); {body} endmodule"
    assert ports(tmp_path, text, holds={"clk": 0} if "e <= clk" in body else {}).clock == "a"


def test_a_name_breaks_a_tie_and_no_more(tmp_path: Path) -> None:
    text = "module m (input x, input {}, output q); reg a, b; always @(posedge x) a <= ~a;\n"
    text += "always @(posedge {}) b <= ~b; assign q = a ^ b; endmodule"
    assert ports(tmp_path, text.replace("{}", "clk_in"), holds={"x": 0}).clock == "clk_in"
    error = refused(tmp_path, text.replace("{}", "y"))
    assert "x, y" in error.message
    assert "--clock" in error.hint


def test_a_clock_of_one_bit_of_a_vector_has_no_port_of_its_own(tmp_path: Path) -> None:
    text = "module m (input [1:0] ck, output reg q); always @(posedge ck[0]) q <= ~q; endmodule"
    assert "no input of m clocks a register" in refused(tmp_path, text).message


# -- the reset ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("block", "active", "kind"),
    [
        ("always @(posedge clk or posedge r) if (r) q <= 0; else q <= ~q;", 1, "asynchronous"),
        ("always @(posedge clk or negedge r) if (!r) q <= 1; else q <= ~q;", 0, "asynchronous"),
        ("wire n = ~r; always @(posedge clk or posedge n) if (n) q <= 0; else q <= ~q;", 0, "asynchronous"),
        ("always @(posedge clk) if (r) q <= 0; else q <= ~q;", 1, "synchronous"),
        (
            "reg l; always @* if (!r) l = 0; else if (!clk) l = ~q; always @* if (!r) q = 0; else if (clk) q = l;",
            0,
            "asynchronous",
        ),
        (
            "wire k, n, s, g, t, b; nand (t, b, s), (s, t, clk, r), (g, s, clk, b), (b, g, n, r), (k, s, n);\n"
            "nand (n, g, k, r); always @* q = k;",
            0,
            "asynchronous",
        ),
        ("always @(posedge clk) q <= ~q & r;", 0, "synchronous"),
        ("always @(posedge clk) q <= r ? ~q : 1'b1;", 0, "synchronous"),
    ],
)
@pytest.mark.parametrize("name", ["rst", "rst_n", "mode"])
def test_polarity_comes_from_the_code(tmp_path: Path, name: str, block: str, active: int, kind: str) -> None:
    text = f"module m (input clk, input r, output reg q); {block} endmodule"
    found = ports(tmp_path, re.sub(r"\br\b", name, text)).reset
    assert found is not None
    assert (found.port, found.active, found.kind) == (name, active, kind)


def test_an_input_that_only_loads_data_is_no_reset(tmp_path: Path) -> None:
    text = "module m (input clk, input rst, output q); reg a, b; always @(posedge clk) begin a <= ~a; b <= rst ^ a; end\n"
    error = refused(tmp_path, text + "assign q = b; endmodule")
    assert "rst is neither clock, reset nor held" in error.message
    assert "--hold rst=" in error.hint
    assert "--reset rst=0" in error.hint


def test_several_resets_are_listed_and_one_can_be_named(tmp_path: Path) -> None:
    text = "module m (input clk, input s, input r, output reg q); always @(posedge clk or posedge s or posedge r)\n"
    text += "if (s) q <= 1; else if (r) q <= 0; else q <= ~q; endmodule"
    error = refused(tmp_path, text)
    assert "several inputs could be the reset: s, r" in error.message
    assert "--reset" in error.hint
    found = ports(tmp_path, text, reset="r", holds={"s": 0})
    assert found.reset is not None
    assert (found.reset.port, found.reset.active) == ("r", 1)
    # What is held takes no part: the other one is plain then.
    assert ports(tmp_path, text, holds={"s": 0}).reset == found.reset


def test_both_levels_of_the_clock_at_which_reset_is_released_are_told_apart() -> None:
    path = str(CASES / "faulty" / "release_level.v")
    result = run("check", path, "--ratio", "3", "--high", "1", "--json", "-")
    starts = json.loads(result.stdout)["measured"]["starts"]
    waves = {start["cause"]: start["period_half_cycles"] for start in starts}
    # By hand: released low the two counts meet once in three cycles; released high they never do.
    assert waves == {
        "reset released while the clock is low": 6,
        "reset released while the clock is high": None,
    }
    said = run("check", path, "--ratio", "3", "--high", "1").stdout
    assert "reset released while the clock is high: the output stays 0" in said
    assert "from: reset released while the clock is low" in said


# -- the output --------------------------------------------------------------------------------------------

COUNT = "module m (input clk, output [3:0] cnt); stage u (clk, cnt); endmodule\n"
COUNT += "module stage (input ck, output reg [3:0] n); wire carry = &n; always @(posedge ck) n <= n + 1; endmodule\n"


@pytest.mark.parametrize(
    ("output", "period", "high"), [("cnt[0]", 4, 2), ("cnt[3]", 32, 16), ("u.n[1]", 8, 4), ("u.carry", 32, 2)]
)
def test_bits_and_nets_inside_can_be_the_output(tmp_path: Path, output: str, period: int, high: int) -> None:
    report = measured(tmp_path, COUNT, output=output)
    assert {(loop.wave.period, loop.wave.high) for loop in report.rhythm.loops} == {(period, high)}
    # A decode such as the carry may pulse on the way, which is no matter of where the output is.
    waivers = {"glitch-free": "not what this is about"}
    report = checked(tmp_path, COUNT, str(period // 2), high=high, output=output, waivers=waivers)
    assert report.verdict == "proved"


@pytest.mark.parametrize(
    ("declared", "output", "period"),
    [("[0:3]", "cnt[0]", 32), ("[0:3]", "cnt[3]", 4), ("[5:2]", "cnt[2]", 4), ("[-1:-4]", "cnt[-4]", 4)],
)
def test_bits_are_counted_as_they_are_declared(
    tmp_path: Path, declared: str, output: str, period: int
) -> None:
    text = f"module m (input clk, output reg {declared} cnt); always @(posedge clk) cnt <= cnt + 1; endmodule"
    report = measured(tmp_path, text, output=output)
    assert {loop.wave.period for loop in report.rhythm.loops} == {period}


def test_a_bit_of_a_register_in_a_generate_block(tmp_path: Path) -> None:
    text = "module m (input clk, output q); genvar i; for (i = 0; i < 2; i = i + 1) begin : s reg t;\n"
    text += "always @(posedge clk) t <= ~t; end assign q = 0; endmodule"
    report = measured(tmp_path, text, output="s[1].t")
    assert {loop.wave.period for loop in report.rhythm.loops} == {4}


@pytest.mark.parametrize(
    ("output", "words", "hint"),
    [
        (None, "several outputs could be the divided clock: a, b", "--output"),
        ("c", "has no such port or net", "a, b, v"),
        ("v", "4 bits wide", "v[0]"),
        ("v[4]", "the bits are 3 to 0", "v[0]"),
        ("v[x]", "the bits are 3 to 0", "v[0]"),
        ("u.nothing", "has no such port or net", "a, b, v"),
    ],
)
def test_candidates_are_listed(tmp_path: Path, output: str | None, words: str, hint: str) -> None:
    text = "module m (input clk, output a, b, output reg [3:0] v); always @(posedge clk) v <= v + 1;\n"
    text += "assign a = v[0], b = v[1]; endmodule"
    error = refused(tmp_path, text, output=output)
    assert words in error.message
    assert hint in error.hint


def test_a_lone_vector_is_listed_with_its_bits(tmp_path: Path) -> None:
    text = "module m (input clk, output reg [3:0] v); always @(posedge clk) v <= v + 1; endmodule"
    assert "v[3:0]" in refused(tmp_path, text).message


# -- the rest ----------------------------------------------------------------------------------------------


def test_what_nothing_hangs_on_needs_no_hold(tmp_path: Path) -> None:
    text = "module m (input clk, input spare, output reg q); always @(posedge clk) q <= ~q; endmodule"
    assert ports(tmp_path, text).holds == {"spare": 0}


def test_a_held_input_may_be_negative_and_has_to_fit(tmp_path: Path) -> None:
    text = "module m (input clk, input [2:0] n, output reg q); always @(posedge clk) q <= ~q ^ (n == 7); endmodule"
    assert ports(tmp_path, text, holds={"n": -1}).holds == {"n": 7}
    assert "3 bits" in refused(tmp_path, text, holds={"n": 8}).message
