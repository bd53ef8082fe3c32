"""The README's rule for make, as make carries it out: the gate runs when something is newer than its last success."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

from texts import BY_3

ROOT = Path(__file__).parents[2]
MANIFEST = '[divider.third]\nfiles = "rtl/third.v"\nratio = 3\n'


def test_the_rule_for_make(tmp_path: Path) -> None:
    (rule,) = re.findall(r"^```make\n((?:.*\n)*?)```", (ROOT / "README.md").read_text(), re.MULTILINE)
    (tmp_path / "Makefile").write_text(rule)
    (tmp_path / "subharmonic.toml").write_text(MANIFEST)
    for folder in ("bin", "rtl"):
        (tmp_path / folder).mkdir()
    command = tmp_path / "bin" / "subharmonic"
    command.write_text(f'#!/bin/sh\nexec {shlex.quote(sys.executable)} -m prover "$@"\n')
    command.chmod(0o755)
    source = tmp_path / "rtl" / "third.v"
    source.write_text(BY_3.replace("count >= 2'd2", "count >= 2'd3"))
    path = os.pathsep.join([str(tmp_path / "bin"), os.environ["PATH"]])
    environment = {**os.environ, "PATH": path, "PYTHONPATH": str(ROOT)}

    def make() -> tuple[int, str]:
        done = subprocess.run(
            ["make", "gate"], cwd=tmp_path, env=environment, capture_output=True, text=True, check=False
        )
        return done.returncode, done.stdout

    for _ in range(2):
        status, text = make()
        assert status != 0
        assert "1 divider: 1 refuted" in text
    source.write_text(BY_3)
    status, text = make()
    assert (status, "1 divider: 1 proved" in text) == (0, True)
    assert "subharmonic gate" not in make()[1]
    os.utime(source)
    os.utime(tmp_path / "build" / "gate.xml", (0, 0))
    status, text = make()
    assert (status, "1 proved (1 kept" in text) == (0, True)
