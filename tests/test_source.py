"""Directives, comments, and where each character came from."""

from __future__ import annotations

from pathlib import Path

import pytest

from prover.errors import UserError
from prover.verilog.source import Source, read_source


def source(tmp_path: Path, text: str | bytes, **options: object) -> Source:
    path = tmp_path / "main.v"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read_source([path], **options)  # type: ignore[arg-type]


def expanded(tmp_path: Path, text: str | bytes, **options: object) -> str:
    return " ".join(source(tmp_path, text, **options).text.split())


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("a // note\nb", "a b"),
        ("a /* x\n y */ b", "a b"),
        ("a // the end", "a"),
        ("`define N 5\n`N+`N", "5 + 5"),
        ("`define N 5 // five\n`N;", "5 ;"),
        ("`define ADD(x, y) x + y\n`ADD(1, (2, 3))", "1 + (2, 3)"),
        ("`define F(x=7) x\n`F() `F(2)", "7 2"),
        ("`define A `B\n`define B 3\n`A", "3"),
        ("`define TWO one \\\n two\n`TWO", "one two"),
        ("`define F(x) `G(x)\n`define G(x) <x>\n`F(`F(1))", "< < 1 > >"),
        ("`define CAT(x) r_``x\n`CAT(q)", "r_q"),
        ('`define S(x) "x" x\n`S(1)', '"x" 1'),
        ("`define N 5\n`undef N\n`ifdef N\nyes\n`else\nno\n`endif", "no"),
        ("`ifdef A\na\n`elsif B\nb\n`else\nc\n`endif", "b"),
        ("`ifndef A\na\n`ifdef B\nb\n`endif\n`endif", "a b"),
        ("`ifdef A\n`ifdef B\nx\n`else\ny\n`endif\n`NOT_DEFINED\n`endif z", "z"),
        ("`timescale 1ns / 10ps\nmodule m;", "module m;"),
        ("`timescale 1ns/1ps module m;", "module m;"),
        ('`celldefine\nx\n`endcelldefine\n`resetall\n`line 3 "f" 0\ny', "x y"),
        ('"// no comment" x', '"// no comment" x'),
        ('"a \\" // b" x', '"a \\" // b" x'),
        ("\\a//b x", "\\a//b x"),
        ("a // synthesis translate_off\n b `NOPE\n// synthesis translate_on\nc", "a c"),
    ],
)
def test_expansion(tmp_path: Path, text: str, expected: str) -> None:
    found = expanded(tmp_path, text, defines={"B": "1"})
    assert found.replace(" ", "") == expected.replace(" ", "")


def test_bytes_that_are_no_utf8_do_no_harm_in_a_comment(tmp_path: Path) -> None:
    assert expanded(tmp_path, b"a // \xb5s \xff\nb") == "a b"


def test_places_survive_directives_comments_and_macros(tmp_path: Path) -> None:
    text = "/* one\n two */ alpha\n`define M beta gamma\n\tx `M delta\n"
    made = source(tmp_path, text)
    for word, line, column in [("alpha", 2, 9), ("beta", 4, 4), ("gamma", 4, 4), ("delta", 4, 7)]:
        where = made.where(made.text.index(word))
        assert (where.line, where.column) == (line, column), word
        assert where.text == text.splitlines()[line - 1]


def test_include_and_its_places(tmp_path: Path) -> None:
    (tmp_path / "sub").mkdir()
    (tmp_path / "sub" / "inner.vh").write_text("`define DEEP 9\nfrom_inner\n")
    (tmp_path / "outer.vh").write_text('`include "sub/inner.vh"\nfrom_outer `DEEP\n')
    made = source(tmp_path, '`include "outer.vh"\nmine\n')
    assert made.text.split() == ["from_inner", "from_outer", "9", "mine"]
    assert made.where(made.text.index("from_inner")).file == str(tmp_path / "sub" / "inner.vh")
    assert made.files == tuple(str(tmp_path / f) for f in ("main.v", "outer.vh", "sub/inner.vh"))


def test_include_beside_the_source_from_a_file_elsewhere(tmp_path: Path) -> None:
    # A relative path starts from where the tool is run (IEEE 1364-2005 clause 19.5 leaves it open), so that files
    # in a folder of headers name each other by that folder (common practice).
    (tmp_path / "inc").mkdir()
    (tmp_path / "inc" / "a.vh").write_text('`include "inc/b.vh"\n')
    (tmp_path / "inc" / "b.vh").write_text("found")
    assert expanded(tmp_path, '`include "inc/a.vh"') == "found"


def test_include_from_a_named_folder(tmp_path: Path) -> None:
    (tmp_path / "lib").mkdir()
    (tmp_path / "lib" / "r.vh").write_text("found")
    assert expanded(tmp_path, "`include <r.vh>", include=[tmp_path / "lib"]) == "found"


def test_digest_ignores_comments_and_layout_only(tmp_path: Path) -> None:
    one = source(tmp_path, "module m;\nendmodule").sha256
    assert source(tmp_path, "module  m ; // x\n\n endmodule\n".replace(" ;", ";")).sha256 == one
    assert source(tmp_path, "module n;\nendmodule").sha256 != one


def test_default_net_type_by_place(tmp_path: Path) -> None:
    made = source(
        tmp_path, "a\n`default_nettype none\nb\n`default_nettype wire\nc\n`default_nettype none\n`resetall\nd"
    )
    assert [made.net_type(made.text.index(x)) for x in "abcd"] == ["wire", "none", "wire", "wire"]


@pytest.mark.parametrize(
    ("text", "line", "message"),
    [
        ("a\n/* b", 2, "comment never ends"),
        ('a\n"b\n"', 2, "string never ends"),
        ("\n`MISSING", 2, "neither a directive nor a macro"),
        ("`ifdef A\n", 1, "no `endif"),
        ("`endif", 1, "without `ifdef"),
        ("`ifdef A\n`else\n`else\n`endif", 3, "after `else"),
        ("`define", 1, "needs a name"),
        ("`define F(x) x\n`F", 2, "needs arguments"),
        ("`define F(x) x\n`F(1", 2, "never ends"),
        ("`define F(x) x\n`F(1, 2)", 2, "takes 1 arguments"),
        ("`define A `B\n`define B `A\n`A", 3, "expands to itself"),
        ('`include "nothing.vh"', 1, "no such file"),
        ('`include "/etc/passwd"', 1, "absolute path"),
        ('`include "../outside.vh"', 1, "outside the folders"),
        ('`include "main.v"', 1, "includes itself"),
        ("// synthesis translate_off\n", 1, "without translate_on"),
        ("`define define x", 1, "can't be defined"),
    ],
)
def test_refusals_name_the_place(tmp_path: Path, text: str, line: int, message: str) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    (tmp_path / "outside.vh").write_text("secret")
    with pytest.raises(UserError, match=message.replace("(", r"\(")) as caught:
        source(inner, text)
    assert caught.value.where is not None
    assert caught.value.where.line == line
    assert "secret" not in str(caught.value)


def test_a_link_out_of_the_folder_is_refused(tmp_path: Path) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    (tmp_path / "outside.vh").write_text("secret")
    (inner / "link.vh").symlink_to(tmp_path / "outside.vh")
    with pytest.raises(UserError, match="outside the folders"):
        source(inner, '`include "link.vh"')


def test_missing_file_and_folder(tmp_path: Path) -> None:
    for path in (tmp_path / "none.v", tmp_path):
        with pytest.raises(UserError, match=path.name):
            read_source([path])


@pytest.mark.parametrize(
    "text",
    [
        "`define A0 x x\n" + "".join(f"`define A{i + 1} `A{i} `A{i}\n" for i in range(40)) + "`A40",
        "`define A0\n" + "".join(f"`define A{i + 1} `A{i} `A{i}\n" for i in range(40)) + "`A40",
        "`define D(x) x x x x x x x x\n" + "`D(" * 20 + "a" + ")" * 20,
        "`define A0 1\n" + "".join(f"`define A{i + 1} `A{i}\n" for i in range(3000)) + "`A3000",
    ],
    ids=["doubling", "empty", "arguments", "deep"],
)
def test_macro_bombs_end_in_an_error(tmp_path: Path, text: str) -> None:
    with pytest.raises(UserError, match=r"without measure|too deeply"):
        source(tmp_path, text)


def test_very_long_lines_and_names_are_not_shown_whole(tmp_path: Path) -> None:
    with pytest.raises(UserError) as caught:
        source(tmp_path, "`" + "x" * 100_000)
    assert len(str(caught.value)) < 2_000


def test_what_a_terminal_would_act_on_is_not_shown(tmp_path: Path) -> None:
    with pytest.raises(UserError) as caught:
        source(tmp_path, "x \x1b[31m \u202e /* ")
    assert "\x1b" not in str(caught.value)
    assert "\u202e" not in str(caught.value)
