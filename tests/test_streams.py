"""What goes to a terminal and what into a pipe: colour, progress, width, and nothing that a terminal would obey."""

from __future__ import annotations

import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.testing import CliRunner, Result
from texts import BY_3, SPINS, STICKS_AT_7, written

import prover
from prover import cli

ROOT = str(Path(prover.__file__).parents[1])
COLOUR = re.compile(r"\x1b\[[\d;]*m")
EVIL = "x\x1b[31m\x07\x9b2J\u202e\u2066"
"""Escapes that colour, ring, clear the screen, and turn the direction of what follows."""


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def environment(**variables: str) -> dict[str, str]:
    kept = {name: value for name, value in os.environ.items() if name not in ("NO_COLOR", "TERM", "COLUMNS")}
    return {**kept, "PYTHONPATH": ROOT, "PYTHONIOENCODING": "utf-8", **variables}


def piped(*arguments: str, **variables: str) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "prover", *arguments]
    return subprocess.run(
        command, capture_output=True, encoding="utf-8", check=False, env=environment(**variables)
    )


def on_terminal(*arguments: str, **variables: str) -> str:
    """What a terminal is sent as standard output, its line ends as they were. The line of progress, which a slow
    machine sees, goes elsewhere."""
    ours, theirs = pty.openpty()
    command = [sys.executable, "-m", "prover", *arguments]
    process = subprocess.Popen(
        command,
        stdin=theirs,
        stdout=theirs,
        stderr=subprocess.DEVNULL,
        env=environment(**variables),
        start_new_session=True,
    )
    os.close(theirs)
    sent = b""
    while True:
        try:
            part = os.read(ours, 1 << 16)
        except OSError:
            # That is how the end of a terminal is told.
            break
        if not part:
            break
        sent += part
    os.close(ours)
    process.wait(60)
    return sent.decode().replace("\r\n", "\n")


def without_time(text: str) -> str:
    return re.sub(r"(took|in) [\d.]+ s", r"\1", text)


def test_a_terminal_gets_colour_unless_it_is_asked_not_to(tmp_path: Path) -> None:
    command = ["check", written(tmp_path, BY_3), "--ratio", "3", "--high", "2"]
    plain = piped(*command)
    assert (plain.returncode, plain.stderr) == (1, "")
    assert "\x1b" not in plain.stdout
    coloured = on_terminal(*command, TERM="xterm-256color")
    assert "\x1b[1;31mREFUTED" in coloured
    assert without_time(COLOUR.sub("", coloured)) == without_time(plain.stdout)
    for quiet in ({"TERM": "xterm", "NO_COLOR": "1"}, {"TERM": "dumb"}):
        assert without_time(on_terminal(*command, **quiet)) == without_time(plain.stdout)


def test_the_tables_of_a_gate_are_coloured_likewise(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    written(tmp_path, BY_3)
    name = next(tmp_path.glob("*.v")).name
    manifest = (
        f'[divider.sound]\nfiles = "{name}"\nratio = 3\n[divider.unknown]\nfiles = "none.v"\nratio = 3\n'
    )
    (tmp_path / "subharmonic.toml").write_text(manifest, encoding="utf-8")
    piped("gate")
    plain = piped("gate").stdout
    coloured = on_terminal("gate", TERM="xterm")
    assert "\x1b" not in plain
    assert "\x1b[1;32mPROVED\x1b[0m" in coloured
    assert "\x1b[1;31mERROR\x1b[0m" in coloured
    assert without_time(COLOUR.sub("", coloured)) == without_time(plain)
    assert without_time(on_terminal("gate", TERM="xterm", NO_COLOR="1")) == without_time(plain)
    assert on_terminal("history", name, TERM="xterm") == piped("history", name).stdout


def test_a_report_does_not_hang_on_the_width_of_a_window(tmp_path: Path) -> None:
    command = ["check", written(tmp_path, STICKS_AT_7), "--ratio", "5", "--high", "4"]
    texts = {without_time(piped(*command, COLUMNS=width).stdout) for width in ("20", "80", "500")}
    assert len(texts) == 1


def test_forms_for_machines_are_the_same_on_a_terminal(tmp_path: Path) -> None:
    command = ["check", written(tmp_path, BY_3), "--ratio", "3", "--html", "-"]
    assert on_terminal(*command, TERM="xterm") == piped(*command).stdout


# -- what a terminal would obey ----------------------------------------------------------------------------


def assert_harmless(result: Result) -> None:
    assert all(c.isprintable() or c == "\n" for c in result.output), ascii(result.output)


OPTIONS = sorted(
    {option.opts[0] for option in cli.check.params if isinstance(option, click.Option) and not option.is_flag}
)


@pytest.mark.parametrize("option", OPTIONS)
def test_no_option_reaches_a_terminal_as_it_is(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, option: str
) -> None:
    # Some of these are names of files that can be written.
    monkeypatch.chdir(tmp_path)
    file = written(tmp_path, BY_3)
    given = [] if option == "--ratio" else ["--ratio", "3"]
    for value in (EVIL, f"a={EVIL}", f"{EVIL}=1", f"ratio={EVIL}", str(tmp_path / EVIL / "out")):
        assert_harmless(run("check", file, *given, option, value))


def test_no_name_of_a_file_reaches_a_terminal_as_it_is(tmp_path: Path) -> None:
    folder = tmp_path / EVIL
    folder.mkdir()
    for name, text in {"good": BY_3, "bad": STICKS_AT_7, "spins": SPINS, "none": "module ("}.items():
        (folder / f"{name}{EVIL}.v").write_text(text, encoding="utf-8")
    (folder / "waves").mkdir()
    together = run("check", str(folder), "--ratio", "3", "--vcd", str(folder / "waves"))
    assert together.exit_code == 2
    assert_harmless(together)
    # Twice for each that has a report, once for the one that has none.
    assert together.stdout.count(r"x\x1b[31m\x07\x9b2J\u202e\u2066.v") >= 7
    for path in sorted(folder.glob("*.v")):
        assert_harmless(run("check", str(path), "--ratio", "3", "--vcd", str(folder / "out.vcd")))
        assert_harmless(run("measure", str(path), "--html", str(folder / "none" / "out.html")))
    assert_harmless(run("recheck", str(folder / f"good{EVIL}.v")))
