"""What a shell is offered: commands, options, paths, modules and properties, at the cost of a light start."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.shell_completion import ShellComplete
from texts import BY_3, STICKS_AT_7

import prover
from prover import cli

TWO = STICKS_AT_7 + "  module automatic \\a<b> (input clk); endmodule\n// module not_there\n"


def offered(*words: str) -> list[tuple[str, str]]:
    """Kind and text of what is offered for the last word, the others being complete."""
    complete = ShellComplete(cli.main, {}, "subharmonic", "_SUBHARMONIC_COMPLETE")
    return [(item.type, item.value) for item in complete.get_completions(list(words[:-1]), words[-1])]


def texts(*words: str) -> list[str]:
    return [text for _, text in offered(*words)]


def asked(shell: str, words: str, place: str, folder: Path) -> subprocess.CompletedProcess[str]:
    """The program, asked as a shell asks it, and what it had to import for the answer."""
    root = str(Path(prover.__file__).parents[1])
    variables = {"COMP_WORDS": words, "COMP_CWORD": place, "_SUBHARMONIC_COMPLETE": f"{shell}_complete"}
    environment = {**os.environ, "PYTHONPATH": root, **variables}
    code = (
        "import sys\n"
        "from prover.cli import main\n"
        "try:\n    main()\nexcept SystemExit:\n"
        "    print(sorted({'z3', 'numpy', 'rich', 'pyverilog', 'prover.api'} & set(sys.modules)), file=sys.stderr)\n"
        "    raise\n"
    )
    command = [sys.executable, "-c", code]
    return subprocess.run(command, capture_output=True, text=True, check=False, cwd=folder, env=environment)


def test_commands_and_options_are_completed() -> None:
    assert texts("") == sorted(cli.main.commands)
    assert texts("rec") == ["recheck"]
    assert texts("check", "x.v", "--ht") == ["--html"]
    assert texts("check", "x.v", "--start", "") == ["reset", "initial", "any"]


def test_every_path_is_completed_by_the_shell() -> None:
    assert offered("check", "ca") == [("file", "ca")]
    assert offered("check", "a.v", "ca") == [("file", "ca")]
    assert offered("check", "a.v", "--include", "ca") == [("dir", "ca")]
    assert offered("recheck", "ca") == [("file", "ca")]
    assert offered("recheck", "--sources", "ca") == [("dir", "ca")]
    for command in cli.main.commands.values():
        for option in command.params:
            if isinstance(option, click.Option) and option.metavar == "PATH":
                assert offered(command.name or "", option.opts[0], "ca") == [("file", "ca")]


def test_the_modules_of_the_files_are_offered(tmp_path: Path) -> None:
    one, two = tmp_path / "one.v", tmp_path / "two.v"
    one.write_text(BY_3)
    two.write_text(TWO)
    files = [str(one), str(two), str(tmp_path), str(tmp_path / "none.v")]
    assert texts("check", *files, "--module", "") == ["by_3", "stage", "sticks_at_7", "\\a<b>"]
    assert texts("check", *files, "--ratio", "3", "--module", "st") == ["stage", "sticks_at_7"]
    assert texts("check", "--module", "") == []


def test_properties_are_offered_with_a_place_for_the_reason() -> None:
    from properties import ALL

    assert texts("check", "--waive", "") == [f"{name}=" for name in ALL]
    assert texts("check", "--waive", "rec") == ["recovery="]


# The place of the word that is begun, or the word itself: how each shell says where the cursor is.
@pytest.mark.parametrize(
    ("shell", "place", "answer"),
    [("bash", "4", "plain,by_3\n"), ("zsh", "4", "plain\nby_3\n_\n"), ("fish", "by", "plain,by_3\n")],
)
def test_the_program_answers_a_shell(shell: str, place: str, answer: str, tmp_path: Path) -> None:
    (tmp_path / "one.v").write_text(BY_3)
    done = asked(shell, "subharmonic check one.v --module by", place, tmp_path)
    assert (done.returncode, done.stdout, done.stderr) == (0, answer, "[]\n")
