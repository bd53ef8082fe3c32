"""Sources that strangers might send: each ends in an error with its place, or is read, in bounded time and memory; and
names with control bytes in them are shown harmlessly in every report."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from hostile import READ, REFUSED

import prover
from prover import cli

MEGABYTES = 600
"""Address space that reading all of them, one after the other, has to do with; the interpreter's own is in it."""

CPU_SECONDS = 120
"""Processor time after which a run of all of them is a hang; they take ten seconds or so."""


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


@pytest.mark.parametrize("name", REFUSED)
def test_a_hostile_source_is_refused_with_its_place(name: str, tmp_path: Path) -> None:
    source, words = REFUSED[name]
    path = tmp_path / "divider.v"
    path.write_bytes(source.encode())
    result = run("check", str(path), "--ratio", "4")
    assert result.exit_code == 2
    assert words in result.stderr
    assert result.stderr.startswith(f"error: {path}:")
    assert "\nhint: " in result.stderr
    assert "\x1b" not in result.stderr
    assert len(result.stderr) < 5_000
    assert os.listdir(tmp_path) == ["divider.v"]


def test_what_is_huge_and_legal_is_read_in_bounded_memory(tmp_path: Path) -> None:
    for i, text in enumerate(READ.values()):
        (tmp_path / f"{i}.v").write_bytes(text.encode())
    code = f"""
import resource, sys
resource.setrlimit(resource.RLIMIT_CPU, ({CPU_SECONDS}, {CPU_SECONDS}))
resource.setrlimit(resource.RLIMIT_AS, ({MEGABYTES << 20}, {MEGABYTES << 20}))
from prover import read
for i in range({len(READ)}):
    read([f"{{i}}.v"])
    print(i)
"""
    root = str(Path(prover.__file__).parents[1])
    environment = {**os.environ, "PYTHONPATH": root}
    done = subprocess.run(
        [sys.executable, "-c", code],
        cwd=tmp_path,
        env=environment,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr[-2000:]
    assert done.stdout.split() == [str(i) for i in range(len(READ))]


# -- include -----------------------------------------------------------------------------------------------


def test_files_that_include_each_other(tmp_path: Path) -> None:
    for here, there in (("a", "b"), ("b", "c"), ("c", "a")):
        (tmp_path / f"{here}.v").write_text(f'`include "{there}.v"\n')
    result = run("check", str(tmp_path / "a.v"), "--ratio", "4")
    assert result.exit_code == 2
    assert f"error: {tmp_path / 'c.v'}:1: " in result.stderr
    assert "includes itself" in result.stderr


def test_files_that_include_one_another_ever_more_often(tmp_path: Path) -> None:
    for i in range(40):
        (tmp_path / f"f{i}.v").write_text(f'`include "f{i + 1}.v"\n`include "f{i + 1}.v"\n')
    (tmp_path / "f40.v").write_text("wire w;\n" * 1000)
    result = run("check", str(tmp_path / "f0.v"), "--ratio", "4")
    assert result.exit_code == 2
    assert "\nhint: " in result.stderr


@pytest.mark.parametrize(
    "name", ["../secret.vh", "/etc/hostname", "inner/../../secret.vh", "link.vh", "folder/secret.vh"]
)
def test_nothing_outside_the_folders_is_read(name: str, tmp_path: Path) -> None:
    inside = tmp_path / "inside"
    (inside / "inner").mkdir(parents=True)
    (tmp_path / "secret.vh").write_text("`define SECRET 42\n")
    (inside / "link.vh").symlink_to(tmp_path / "secret.vh")
    (inside / "folder").symlink_to(tmp_path, target_is_directory=True)
    path = inside / "divider.v"
    path.write_text(f'`include "{name}"\nmodule m (input clk, output q); assign q = `SECRET; endmodule\n')
    result = run("check", str(path), "--ratio", "4")
    assert result.exit_code == 2
    assert f"{path}:1: " in result.stderr
    assert "42" not in result.output


# -- names -------------------------------------------------------------------------------------------------

# An escaped name may hold any printable character; what isn't printable is no Verilog, but may be in a file's name.
ESCAPED = """\
module \\<script>alert(1)</script> (input clk, output \\<b>tick</b> );
  reg [2:0] \\count"';--$(rm) ;
  always @(posedge clk) \\count"';--$(rm) <= \\count"';--$(rm) == 5 ? 0 : \\count"';--$(rm) + 1;
  assign \\<b>tick</b> = \\count"';--$(rm) [2];
endmodule
"""


def test_escaped_names_are_shown_as_they_are_and_do_nothing(tmp_path: Path) -> None:
    path, report, wave = (tmp_path / name for name in ("\x1b[31mdivider\x07.v", "out.json", "out.vcd"))
    path.write_text(ESCAPED)
    result = run("check", str(path), "--ratio", "4", "--json", str(report), "--vcd", str(wave))
    assert result.exit_code == 1
    assert all(c.isprintable() or c == "\n" for c in result.output)
    assert r"\x1b[31mdivider\x07.v" in result.stdout
    assert "<script>alert(1)</script>" in result.stdout
    told = json.loads(report.read_text(encoding="utf-8"))
    assert told["design"]["top"] == r"\<script>alert(1)</script>"
    assert told["design"]["files"] == [str(path)]
    assert all(c.isprintable() or c == "\n" for c in report.read_text(encoding="utf-8"))
    dump = wave.read_text(encoding="utf-8")
    assert all(c.isprintable() or c in "\n\t" for c in dump)
    assert "$enddefinitions" in dump


@pytest.mark.parametrize("byte", ["\x00", "\x07", "\x1b", "\x7f", "\x9b", "\u202e", "\u2066"])
def test_control_bytes_in_a_source_reach_no_terminal(byte: str, tmp_path: Path) -> None:
    path = tmp_path / "divider.v"
    for text in (
        f"module m{byte} (input clk);",
        f"module \\m{byte}x (input clk); assign;",
        f'module m; wire w = "{byte}',
    ):
        path.write_text(text)
        result = run("check", str(path), "--ratio", "4")
        assert result.exit_code == 2
        assert byte not in result.output
