"""How long a whole cold check takes, as a ratio to importing what it stands on, measured side by side.

    python tests/bench/startup.py [rounds]

Prints a table and asserts nothing: what a ratio means hangs on the machine and on what else it is doing.
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]
GAUGE = ROOT / "cases" / "gauge"
IMPORTS = ["-c", "import z3, pyverilog.vparser.parser, click"]
CHECKS = {
    "a third, ripple": ["tick_by_3_ripple.v", "--ratio", "3", "--output", "tick"],
    "a third, RTL": ["tick_by_3_rtl.v", "--ratio", "3", "--output", "tick"],
    "50 000 000, 26 bits": ["second_26_eq.v", "--ratio", "50000000"],
    "50 000 000, 32 bits": ["second_32_eq.v", "--ratio", "50000000"],
    "50 000 001, both edges": ["second_by_50000001.v", "--ratio", "50000001"],
    "2 147 483 647, both edges": ["season_by_2147483647.v", "--ratio", "2147483647"],
}


def seconds(arguments: list[str], folder: str) -> float:
    """The wall time of one fresh interpreter."""
    began = time.perf_counter()
    # Byte code is kept, as it is where the package is installed, but not in the tree.
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONPYCACHEPREFIX": str(Path(folder) / "cache")}
    environment.pop("PYTHONDONTWRITEBYTECODE", None)
    done = subprocess.run(
        [sys.executable, *arguments], cwd=folder, env=environment, capture_output=True, check=False
    )
    took = time.perf_counter() - began
    if done.returncode not in (0, 3):
        raise SystemExit(f"{' '.join(arguments)}: status {done.returncode}\n{done.stderr.decode()}")
    return took


def main() -> None:
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 7
    commands = {"imports alone": IMPORTS}
    for name, (file, *options) in CHECKS.items():
        commands[name] = ["-m", "prover", "check", str(GAUGE / file), *options]
    times: dict[str, list[float]] = {name: [] for name in commands}
    with tempfile.TemporaryDirectory() as folder:
        # One round after the other, so that a busy spell falls on all alike; the first only warms the disk.
        for count in range(rounds + 1):
            for name, arguments in commands.items():
                took = seconds(arguments, folder)
                if count:
                    times[name].append(took)
    base = statistics.median(times["imports alone"])
    print(f"{'':28}{'median s':>10}{'ratio':>8}{'least':>8}{'most':>8}")
    for name, all_of in times.items():
        middle = statistics.median(all_of)
        ratios = [middle / base, min(all_of) / base, max(all_of) / base]
        print(f"{name:28}{middle:10.3f}" + "".join(f"{ratio:8.2f}" for ratio in ratios))


if __name__ == "__main__":
    main()
