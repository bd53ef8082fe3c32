"""What decides a verdict: what the digest of the sources hangs on, and where their tokens stand."""

from __future__ import annotations

from pathlib import Path

import pytest
from texts import BY_3, STICKS_AT_7

from prover.content import Content, identity, read_content
from prover.errors import Where
from prover.spec import Spec


def content(folder: Path, text: str, name: str = "divider.v") -> Content:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return read_content([path], Spec())


# By IEEE 1364-2005 clauses 3.2 and 3.3 white space and comments separate tokens and do nothing else, clause 3.8 says
# the same of attributes to a reader that knows none; clause 19.3 replaces a macro by its text.
SAME = {
    "a comment before": "// a third of the oscillator\n" + BY_3,
    "a comment within": BY_3.replace("count + 2'd1", "count /* phase */ + 2'd1"),
    "a comment taken for a space": BY_3.replace("reg late", "reg/**/late"),
    "white space between": BY_3.replace("count + 2'd1", "count+2'd1").replace("\n", "\r\n\n"),
    "an attribute": BY_3.replace("reg late", '(* keep = "yes" *) reg late'),
    "a time scale": "`timescale 1ns / 1ps\n" + BY_3,
    "a macro that is not used": "`define UNUSED 5\n" + BY_3,
    "a branch that is not taken": BY_3 + "`ifdef BENCH\nmodule bench; endmodule\n`endif\n",
}
OTHER = {
    "a number": BY_3.replace("count >= 2'd2", "count >= 2'd1"),
    "a name": BY_3.replace("late", "last"),
    "what implicit nets are": "`default_nettype none\n" + BY_3,
    "a string's spaces": BY_3.replace("endmodule", 'wire [15:0] w = "a ";\nendmodule'),
    "a string's spaces again": BY_3.replace("endmodule", 'wire [15:0] w = "a  ";\nendmodule'),
    "an operator in two": BY_3.replace(">=", "> ="),
    "a second module": BY_3 + STICKS_AT_7,
    "a module that only simulates": BY_3 + "module bench; endmodule\n",
    "a part passed over": BY_3 + "// synthesis translate_off\n// synthesis translate_on\n",
}


@pytest.mark.parametrize("text", SAME.values(), ids=SAME)
def test_what_does_not_decide_leaves_the_digest(tmp_path: Path, text: str) -> None:
    assert content(tmp_path, text).digest == content(tmp_path, BY_3, "other.v").digest


def test_what_decides_changes_the_digest(tmp_path: Path) -> None:
    digests = [content(tmp_path, text).digest for text in (BY_3, *OTHER.values())]
    assert len(set(digests)) == len(digests)


def test_a_macros_text_in_place_of_the_macro_moves_places_and_so_counts(tmp_path: Path) -> None:
    body = "always @(posedge clk) q <= ~q; assign tick = q;"
    head, tail = "module half (input clk, output tick);\nreg q;\n", "\nendmodule\n"
    plain = content(tmp_path, head + body + tail)
    used = content(tmp_path, f"`define BODY {body}\n{head}`BODY{tail}")
    assert plain.digest != used.digest


def test_includes_and_defines_count_by_what_comes_of_them(tmp_path: Path) -> None:
    (tmp_path / "limit.vh").write_text("`define LIMIT 2'd2\n")
    text = BY_3.replace("count >= 2'd2", "count >= `LIMIT")
    included = content(tmp_path, '`include "limit.vh"\n' + text)
    assert included.files == (str(tmp_path / "divider.v"), str(tmp_path / "limit.vh"))
    (tmp_path / "divider.v").write_text(text)
    defined = read_content([tmp_path / "divider.v"], Spec(defines={"LIMIT": "2'd2"}))
    assert included.digest == defined.digest
    (tmp_path / "limit.vh").write_text("`define LIMIT 2'd1\n")
    assert content(tmp_path, '`include "limit.vh"\n' + text).digest != included.digest


def test_the_order_of_files_counts(tmp_path: Path) -> None:
    paths = [tmp_path / "a.v", tmp_path / "b.v"]
    for path, text in zip(paths, (BY_3, STICKS_AT_7), strict=True):
        path.write_text(text)
    assert read_content(paths, Spec()).digest != read_content(paths[::-1], Spec()).digest


def test_a_place_is_found_again_where_its_token_has_gone(tmp_path: Path) -> None:
    before = content(tmp_path, BY_3)
    file = str(tmp_path / "divider.v")
    anchor = before.anchor(Where(file, 2, 13))
    assert anchor is not None
    assert before.place(anchor) == Where(file, 2, 13, "  reg [1:0] count;")
    # Column 2 of that line is a space.
    assert before.anchor(Where(file, 2, 2)) is None
    after = content(tmp_path, "// moved\n" + BY_3.replace("reg [1:0] count", "reg [1:0]\n count"), "moved.v")
    assert after.place(anchor) == Where(str(tmp_path / "moved.v"), 4, 2, " count;")


def test_places_that_a_text_names_are_found_in_it(tmp_path: Path) -> None:
    content_ = content(tmp_path, "// by 3\n" + BY_3, "a.v")
    name = str(tmp_path / "a.v")
    head, anchor, middle, other, tail = content_.split(f"late ({name}:3), {name}:10.")
    assert (head, middle, tail) == ("late (", "), ", ".")
    assert isinstance(anchor, int)
    assert isinstance(other, int)
    assert [content_.place(each).line for each in (anchor, other)] == [3, 10]
    assert content_.split(f"{name}: 3 and b{name}:3") == []
    # No token stands on the first line.
    assert content_.split(f"{name}:1") == ["", None, ""]


def test_who_proves_is_named_with_the_version() -> None:
    from prover import __version__

    assert identity().startswith(f"{__version__}+")
