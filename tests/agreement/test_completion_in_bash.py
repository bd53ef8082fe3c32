"""Completion in a real shell, set up by the line that the README gives."""

from __future__ import annotations

import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]

ASK = """
{line}
complete -p subharmonic
COMP_WORDS=({words})
COMP_CWORD=$((${{#COMP_WORDS[@]}} - 1))
_subharmonic_completion subharmonic
printf '%s\\n' "${{COMPREPLY[@]}}"
"""


def test_no_blank_comes_after_a_property_that_waits_for_its_reason(tmp_path: Path) -> None:
    """As a user sees it: Tab is pressed in an interactive bash, and the rest is typed."""
    program = tmp_path / "subharmonic"
    program.write_text(f'#!/bin/sh\nPYTHONPATH="{ROOT}" exec "{sys.executable}" -m prover "$@"\n')
    program.chmod(0o755)
    (tmp_path / "rc").write_text(
        f'PATH="{tmp_path}:$PATH"\nPS1="ready> "\neval "$(_SUBHARMONIC_COMPLETE=bash_source subharmonic)"\n'
    )
    ours, theirs = pty.openpty()
    shell = subprocess.Popen(
        ["bash", "--noprofile", "--rcfile", str(tmp_path / "rc"), "-i"],
        stdin=theirs,
        stdout=theirs,
        stderr=theirs,
        cwd=tmp_path,
        env={**os.environ, "TERM": "dumb"},
        start_new_session=True,
    )
    os.close(theirs)
    seen = ""

    def until(wanted: str) -> None:
        nonlocal seen
        while wanted not in seen:
            seen += os.read(ours, 4096).decode()

    until("ready> ")
    os.write(ours, b"subharmonic check --waive no\t")
    until("no-stuck=")
    os.write(ours, b"because\n")
    until("because")
    assert "no-stuck=because" in seen
    os.write(ours, b"exit\n")
    shell.wait(60)
    os.close(ours)


@pytest.mark.parametrize(
    ("words", "offered"),
    [
        ("subharmonic m", ["measure"]),
        ("subharmonic check two.v --module b", ["by_two", "by_four"]),
        ("subharmonic measure two.v --start in", ["initial"]),
    ],
)
def test_bash_completes_what_the_program_offers(tmp_path: Path, words: str, offered: list[str]) -> None:
    (tmp_path / "two.v").write_text(
        "module by_two (input c); endmodule\nmodule by_four (input c); endmodule\n"
    )
    program = tmp_path / "subharmonic"
    program.write_text(f'#!/bin/sh\nPYTHONPATH="{ROOT}" exec "{sys.executable}" -m prover "$@"\n')
    program.chmod(0o755)
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    (line,) = re.findall(r"`(eval [^`]*bash_source[^`]*)`", readme)
    script = f'PATH="{tmp_path}:$PATH"\n{ASK.format(line=line, words=words)}'
    done = subprocess.run(["bash", "-c", script], capture_output=True, text=True, check=True, cwd=tmp_path)
    assert done.stdout.splitlines() == ["complete -o nosort -F _subharmonic_completion subharmonic", *offered]
