"""A Dask cluster of two workers on this machine against processes of our own: the same verdicts, whoever dies."""

from __future__ import annotations

import json
import os
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from texts import BY_3, RING, STICKS_AT_7

import prover
from prover import cluster as module
from prover.errors import UserError
from prover.spec import Spec
from prover.task import Task

ROOT = Path(prover.__file__).parents[1]
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT)}


@dataclass
class Dask:
    """A scheduler and workers without nannies: a worker that is killed stays away."""

    folder: Path
    scheduler: subprocess.Popen[bytes] = field(init=False)
    workers: list[subprocess.Popen[bytes]] = field(default_factory=list)

    def __post_init__(self) -> None:
        file = self.folder / "scheduler.json"
        options = ["--host", "127.0.0.1", "--port", "0", "--no-dashboard", "--no-show"]
        self.scheduler = self._started("dask_scheduler", *options, "--scheduler-file", str(file))
        _until(lambda: file.exists() and file.read_text().endswith("}"), self.scheduler)
        self.address = json.loads(file.read_text())["address"]

    def add(self) -> subprocess.Popen[bytes]:
        options = ["--nworkers", "1", "--nthreads", "1", "--no-nanny", "--no-dashboard"]
        worker = self._started("dask_worker", self.address, *options, "--host", "127.0.0.1")
        self.workers.append(worker)
        return worker

    def close(self) -> None:
        for process in (*self.workers, self.scheduler):
            process.kill()
            process.wait()

    def _started(self, what: str, *options: str) -> subprocess.Popen[bytes]:
        command = [sys.executable, "-m", f"distributed.cli.{what}", *options]
        return subprocess.Popen(
            command, cwd=self.folder, env=ENVIRONMENT, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
        )


def _until(holds: Any, process: subprocess.Popen[bytes]) -> None:
    for _ in range(3000):
        if holds():
            return
        assert process.poll() is None
        time.sleep(0.02)
    raise AssertionError("it did not come about")


@pytest.fixture
def cluster(tmp_path: Path) -> Iterator[Dask]:
    (tmp_path / "dask").mkdir()
    started = Dask(tmp_path / "dask")
    try:
        yield started
    finally:
        started.close()


@pytest.fixture
def sources(tmp_path: Path) -> Path:
    """Dividers of every outcome, one of them with a file to include, in a folder that no worker works in."""
    folder = tmp_path / "sources"
    folder.mkdir()
    (folder / "limit.vh").write_text("`define LIMIT 2'd2\n")
    texts = {
        "third": BY_3,
        "third_by_include": '`include "limit.vh"\n' + BY_3.replace("count >= 2'd2", "count >= `LIMIT"),
        "ring": RING,
        "sticks": STICKS_AT_7,
        "broken": BY_3.replace("if (rst)", "if rst"),
        "floating": BY_3.replace("assign tick", "wire lost; assign tick = lost | ").replace("|  =", "| "),
    }
    for name, text in texts.items():
        (folder / f"{name}.v").write_text(text)
    return folder


def started(sources: Path, *options: str) -> subprocess.Popen[str]:
    command = [sys.executable, "-m", "prover", "check", "sources", "--ratio", "3", "--json", "out.json"]
    return subprocess.Popen(
        [*command, *options], cwd=sources.parent, env=ENVIRONMENT, stdout=subprocess.PIPE, text=True
    )


def outcome(process: subprocess.Popen[str], sources: Path) -> tuple[int, list[str], Any]:
    """Status, text and JSON of a run, without the times it took."""
    text, _ = process.communicate()
    told = json.loads((sources.parent / "out.json").read_text())
    for report in told["reports"]:
        del report["seconds"]
    lines = [line for line in text.splitlines() if not line.startswith("took ")]
    return process.returncode, lines, told


def test_a_cluster_says_what_one_process_says(cluster: Dask, sources: Path) -> None:
    for _ in range(2):
        cluster.add()
    here = outcome(started(sources, "--workers", "1"), sources)
    assert here[0] == 2
    assert here[1][-1] == "2 error, 2 refuted, 2 proved"
    assert outcome(started(sources, "--cluster", cluster.address), sources) == here


MANIFEST = """\
[divider.third]
files = "sources/third_by_include.v"
ratio = 3
[divider.ring]
files = "sources/ring.v"
ratio = 4
high = 2
[divider.broken]
files = "sources/broken.v"
ratio = 3
[divider.sticks]
files = "sources/sticks.v"
ratio = 5
high = 4
"""


def test_a_gate_finds_and_keeps_on_a_cluster_what_it_does_here(cluster: Dask, sources: Path) -> None:
    for _ in range(2):
        cluster.add()
    (sources.parent / "subharmonic.toml").write_text(MANIFEST)

    def gate(*options: str) -> tuple[int, Any, list[Any]]:
        command = [sys.executable, "-m", "prover", "gate", "--json", "out.json", *options]
        done = subprocess.run(command, cwd=sources.parent, env=ENVIRONMENT, capture_output=True, check=False)
        told = json.loads((sources.parent / "out.json").read_text())
        for report in told["reports"]:
            del report["seconds"]
        rows = told.pop("gate")["dividers"]
        return done.returncode, told, [(row["name"], row["verdict"], row["source"]) for row in rows]

    here = gate("--workers", "1", "--ledger", "here.sqlite")
    assert here[0] == 2
    assert gate("--cluster", cluster.address) == here
    # What the cluster found is kept, and its certificates hold here, and the other way round.
    rechecked = gate("--recheck", "--workers", "1")
    assert rechecked[:2] == here[:2]
    assert [source for *_, source in rechecked[2]] == ["rechecked", "rechecked", "new", "rechecked"]
    assert gate("--recheck", "--cluster", cluster.address, "--ledger", "here.sqlite") == rechecked


def test_a_worker_killed_in_the_middle_changes_nothing(cluster: Dask, sources: Path) -> None:
    here = outcome(started(sources, "--workers", "1"), sources)
    victim = cluster.add()
    running = started(sources, "--cluster", cluster.address)
    # A task on a worker has a process of its own below the worker's.
    children = Path(f"/proc/{victim.pid}/task/{victim.pid}/children")

    def busy() -> bool:
        return any(path.read_text().strip() for path in children.parent.parent.glob("*/children"))

    _until(busy, victim)
    victim.send_signal(signal.SIGKILL)
    victim.wait()
    assert running.poll() is None
    cluster.add()
    assert outcome(running, sources) == here


def test_without_a_worker_the_run_ends_with_an_error_and_what_is_known(cluster: Dask, sources: Path) -> None:
    (sources.parent / "subharmonic.toml").write_text(MANIFEST)
    command = [sys.executable, "-m", "prover", "gate", "--cluster", cluster.address, "--wait", "1"]
    done = subprocess.run(
        command, cwd=sources.parent, env=ENVIRONMENT, capture_output=True, check=False, text=True
    )
    assert done.returncode == 2
    assert done.stderr.startswith(f"error: --cluster {cluster.address}: no worker for 1 s")
    assert done.stdout.splitlines()[-2:] == [
        "OPEN  third and 3 more    not judged",
        "4 dividers: 4 open",
    ]


@pytest.mark.parametrize("address", ["127.0.0.1:{}", "foo://127.0.0.1:{}", "127.0.0.1", "127.0.0.1:x"])
def test_what_is_no_scheduler_is_told_soon(monkeypatch: pytest.MonkeyPatch, address: str) -> None:
    """Something that listens and says nothing, a scheme that is none, no port: a client of Dask hangs on some."""
    monkeypatch.setattr(module, "PATIENCE", 1)
    with socket.create_server(("127.0.0.1", 0)) as silent:
        crew = module.Cluster(address.format(silent.getsockname()[1]))
        task = Task(("a.v",), Spec(ratio=Fraction(3)))
        with pytest.raises(UserError, match="no scheduler answers"):
            next(crew.run([task], lambda doing: None))


def test_where_no_scheduler_answers_or_it_dies_the_run_ends_with_an_error(
    cluster: Dask, sources: Path
) -> None:
    running = started(sources, "--cluster", cluster.address)
    time.sleep(3)
    cluster.close()
    assert running.communicate()[0] == ""
    assert running.returncode == 2
