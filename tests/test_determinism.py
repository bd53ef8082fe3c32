"""The same input gives the same bytes: whatever was asked before in the process, and in another process."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from cases_format import CASES
from click.testing import CliRunner

import prover
from prover import cli

ROOT = str(Path(prover.__file__).parents[1])
SHIFT = str(CASES / "published" / "shift_full.v")
# A shift register whose decode may pulse, the same at another length, a wide counter covered by traced paths.
ASKED = {
    "shift 5": ("check", SHIFT, "--set", "STAGES=5", "--set", "TAPS=20", "--ratio", "32", "--high", "2"),
    "shift 8": ("check", SHIFT, "--set", "STAGES=8", "--set", "TAPS=184", "--ratio", "256", "--high", "2"),
    "second": ("check", str(CASES / "gauge" / "second_32_ge.v"), "--ratio", "50000000"),
}
FILES = {"--json": "report.json", "--certificate": "proof.json", "--html": "page.html", "--vcd": "wave.vcd"}


def options(folder: Path) -> list[str]:
    folder.mkdir()
    return [part for option, name in FILES.items() for part in (option, str(folder / name))]


def read(folder: Path) -> dict[str, str]:
    """The files by name, but for how long it took."""
    texts = {path.name: path.read_text(encoding="utf-8") for path in folder.iterdir()}
    return {name: re.sub(r'"seconds": [\d.]+', "", text) for name, text in texts.items()}


@pytest.fixture(scope="module")
def first(tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, str]]:
    folder = tmp_path_factory.mktemp("first")
    for name, asked in ASKED.items():
        CliRunner().invoke(cli.main, [*asked, *options(folder / name)], catch_exceptions=False)
    return {name: read(folder / name) for name in ASKED}


def test_what_was_asked_before_in_the_process_changes_nothing(
    first: dict[str, dict[str, str]], tmp_path: Path
) -> None:
    for name, asked in reversed(ASKED.items()):
        CliRunner().invoke(cli.main, [*asked, *options(tmp_path / name)], catch_exceptions=False)
        assert read(tmp_path / name) == first[name]


@pytest.mark.parametrize(("name", "seed"), [("shift 8", "1"), ("second", "4711")])
def test_another_process_with_other_hashes_says_the_same(
    first: dict[str, dict[str, str]], name: str, seed: str, tmp_path: Path
) -> None:
    command = [sys.executable, "-m", "prover", *ASKED[name], *options(tmp_path / name)]
    environment = {**os.environ, "PYTHONPATH": ROOT, "PYTHONHASHSEED": seed}
    done = subprocess.run(command, capture_output=True, check=False, env=environment)
    assert done.returncode in (0, 1, 3), done.stderr
    assert read(tmp_path / name) == first[name]
