"""Fuzzed sources: a verdict or status 2 with a hint, never a fault of ours, a hang, or a file left behind.

These are the first of the 2 000 that tests/agreement/test_fuzz_long.py runs.
"""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from click.testing import CliRunner
from fuzzing import fuzzed, sources

from prover import cli

FEW = 200
EFFORT = 1.0
"""Seconds of --effort; a run may last ten times that, reading and a slow machine included, before it is a hang."""

TEXTS = [path.read_bytes() for path in sources()]


@pytest.mark.parametrize("batch", range(10))
def test_a_fuzzed_source_ends_in_a_verdict_or_an_error(
    batch: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    for seed in range(batch * FEW // 10, (batch + 1) * FEW // 10):
        survives(seed, tmp_path)


def survives(seed: int, folder: Path) -> int:
    """Check one fuzzed source; its exit status."""
    path = folder / "fuzzed.v"
    path.write_bytes(fuzzed(seed, TEXTS))
    arguments = [
        "check",
        "fuzzed.v",
        "--ratio",
        "4",
        "--effort",
        str(EFFORT),
        "--json",
        "out.json",
        "--vcd",
        "out.vcd",
    ]
    result = CliRunner().invoke(cli.main, arguments)
    about = f"seed {seed}: {result.output[-2000:]}"
    assert result.exit_code in (0, 1, 2, 3), about
    left = sorted(os.listdir(folder))
    if result.exit_code == 2:
        assert result.stdout == "", about
        assert result.stderr.startswith("error: "), about
        assert "\nhint: " in result.stderr, about
        assert "\x1b" not in result.output, about
        assert left == ["fuzzed.v"], about
    else:
        assert {name for name in left if not name.startswith("out")} == {"fuzzed.v"}, about
        # Where the time is out before anything is known there is nothing to report.
        assert "out.json" in left or (result.exit_code == 3 and result.stderr.startswith("open: ")), about
    for name in left:
        os.remove(folder / name)
    return result.exit_code
