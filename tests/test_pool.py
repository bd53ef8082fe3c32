"""Tasks over processes: what they say, and that one that crashes or hangs costs only itself."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path

import pytest
from texts import BY_3, RING

import prover
from prover.content import identity, read_content
from prover.errors import UserError
from prover.pool import Local
from prover.several import outcome
from prover.spec import Spec
from prover.task import Answer, Task, packed

SPEC = Spec(ratio=Fraction(3))

# What a worker's process runs, with something done to it at files named b.v, before or after the report.
BAD = """
import os, time
from prover import api, task
from prover.report import certificate
ask, certify = api.check, certificate.certify
def check(files, *rest):
    if {when!r} == "before" and files[0].endswith("b.v"):
        {how}
    return ask(files, *rest)
def certified(report, files, *rest):
    if {when!r} == "after" and files[0].endswith("b.v"):
        {how}
    return certify(report, files, *rest)
api.check, certificate.certify = check, certified
task.main(place)
"""


def tasks(folder: Path, certify: bool = False) -> list[Task]:
    """Three dividers by 3, of which the second is called b.v."""
    paths = [folder / f"{name}.v" for name in "abc"]
    for path in paths:
        path.write_text(BY_3, encoding="utf-8")
    return [Task((str(path),), SPEC, certify=certify) for path in paths]


def answers(asked: list[Task], workers: int = 2) -> list[Answer]:
    """In the order of the tasks."""
    return [answer for _, answer in sorted(Local(workers).run(asked, lambda doing: None))]


def told(answer: Answer) -> str:
    found = outcome(("x.v",), answer)
    return found.report.verdict if found.report else found.fault or found.open or str(found.error)


def test_every_task_is_answered_with_who_answers(tmp_path: Path) -> None:
    heard: list[str] = []
    found = dict(Local(2).run(tasks(tmp_path), heard.append))
    assert [told(found[number]) for number in range(3)] == ["proved"] * 3
    assert {answer.prover for answer in found.values()} == {identity()}
    assert any("reading the sources" in doing for doing in heard)


@pytest.mark.parametrize(
    ("how", "says"),
    [
        ("os.kill(os.getpid(), 11)", "its process was ended by signal SIGSEGV"),
        ("os._exit(3)", "its process ended with status 3"),
        ("raise ValueError('no more')", "ValueError: no more"),
        ("print('noise', flush=True)", "proved"),
    ],
)
def test_one_that_crashes_or_prints_costs_only_itself(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, how: str, says: str
) -> None:
    monkeypatch.setattr("prover.pool.MAIN", BAD.format(when="before", how=how))
    found = [told(answer) for answer in answers(tasks(tmp_path))]
    assert found == ["proved", says, "proved"]


@pytest.mark.parametrize("how", ["os.kill(os.getpid(), 9)", "raise MemoryError"])
def test_one_that_memory_runs_out_for_is_left_open(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, how: str
) -> None:
    """By signal 9 a system ends what has taken too much."""
    monkeypatch.setattr("prover.pool.MAIN", BAD.format(when="before", how=how))
    found = answers(tasks(tmp_path))
    assert [told(found[0]), told(found[2])] == ["proved", "proved"]
    assert (found[1].fault, found[1].report) == ("", None)
    assert "out of memory: fewer --workers leave more to each" in found[1].open


def test_one_that_hangs_costs_only_itself(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("prover.pool.MAIN", BAD.format(when="before", how="time.sleep(1000)"))
    limit = property(lambda task: 2.0 if task.files[0].endswith("b.v") else 300.0)
    monkeypatch.setattr(Task, "limit", limit)
    found = answers(tasks(tmp_path), workers=1)
    assert [told(found[0]), told(found[2])] == ["proved", "proved"]
    assert (found[1].fault, found[1].report) == ("", None)
    assert found[1].open == "no answer after 2 seconds, past its effort: its process was ended"


def test_a_report_stands_where_only_its_certificate_is_lost(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("prover.pool.MAIN", BAD.format(when="after", how="os._exit(3)"))
    found = answers(tasks(tmp_path, certify=True))
    assert [told(answer) for answer in found] == ["proved"] * 3
    assert [bool(answer.certificate) for answer in found] == [True, False, True]


def test_leaving_early_ends_the_processes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    script = "import os; open(os.path.join({folder!r}, str(os.getpid())), 'w').close(); time.sleep(1000)"
    monkeypatch.setattr(
        "prover.pool.MAIN", BAD.format(when="before", how=script.format(folder=str(tmp_path / "ran")))
    )
    (tmp_path / "ran").mkdir()
    running = Local(1).run(tasks(tmp_path), lambda doing: None)
    assert isinstance(running, Iterator)
    assert told(next(running)[1]) == "proved"
    (pid,) = _wait_for(tmp_path / "ran")
    running.close()  # type: ignore[attr-defined]
    assert not _lives(pid)


@pytest.mark.parametrize(
    ("number", "whole"), [(signal.SIGKILL, False), (signal.SIGHUP, True), (signal.SIGTERM, True)]
)
def test_a_process_whose_master_was_killed_goes_and_leaves_nothing(
    tmp_path: Path, number: signal.Signals, whole: bool
) -> None:
    """Also where all its group is told to end, as by a terminal that goes."""
    (tmp_path / "ran").mkdir()
    (tmp_path / "temporary").mkdir()
    script = f"import os; open(os.path.join({str(tmp_path / 'ran')!r}, str(os.getpid())), 'w').close(); time.sleep(1000)"
    master = f"""
from fractions import Fraction
from prover import pool
from prover.spec import Spec
from prover.task import Task
pool.MAIN = {BAD.format(when="before", how=script)!r}
list(pool.Local(1).run([Task(({str(tmp_path / "b.v")!r},), Spec(ratio=Fraction(3)))], print))
"""
    environment = {
        **os.environ,
        "PYTHONPATH": str(Path(prover.__file__).parents[1]),
        "TMPDIR": str(tmp_path / "temporary"),
    }
    process = subprocess.Popen(
        [sys.executable, "-c", master],
        env=environment,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )
    (pid,) = _wait_for(tmp_path / "ran")
    assert os.listdir(tmp_path / "temporary")
    if whole:
        os.killpg(process.pid, number)
    else:
        process.send_signal(number)
    process.wait()
    _until(lambda: not _lives(pid))
    assert os.listdir(tmp_path / "temporary") == []


def _wait_for(folder: Path) -> list[int]:
    """The processes that have left their number in the folder."""
    _until(lambda: bool(os.listdir(folder)))
    return [int(name) for name in os.listdir(folder)]


def _until(holds: object) -> None:
    assert callable(holds)
    for _ in range(3000):
        if holds():
            return
        time.sleep(0.02)
    raise AssertionError("it did not come about")


def _lives(pid: int) -> bool:
    """Whether there is such a process, zombies aside."""
    try:
        state = Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0]
    except OSError:
        return False
    return state != "Z"


# -- tasks that bring their sources ------------------------------------------------------------------------


def test_a_packed_task_needs_none_of_the_files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Names above the folder, in folders to include from, and includes of includes."""
    monkeypatch.chdir(tmp_path)
    for folder in ("top/gate", "shared/inc", "shared/deep"):
        (tmp_path / folder).mkdir(parents=True)
    (tmp_path / "shared/inc/rates.vh").write_text('`include "../deep/limit.vh"\n')
    (tmp_path / "shared/deep/limit.vh").write_text("`define LIMIT 2'd2\n")
    text = '`include "rates.vh"\n' + BY_3.replace("count >= 2'd2", "count >= `LIMIT")
    (tmp_path / "top/by_3.v").write_text(text)
    monkeypatch.chdir(tmp_path / "top/gate")
    spec = Spec(ratio=Fraction(3), include=("../../shared/inc", "../../shared/deep"))
    content = read_content(["../by_3.v"], spec)
    task = packed(Task(("../by_3.v",), spec, certify=True), content, ".")
    monkeypatch.chdir(tmp_path)
    for name in content.files:
        (tmp_path / "top/gate" / name).unlink()
    (answer,) = answers([Task.from_json(task.as_json())], workers=1)
    assert answer.anchored
    report = outcome(("x",), answer, content).report
    assert report is not None
    assert report.verdict == "proved"
    assert report.ports.design.files == content.files
    assert answer.content == content.digest
    assert '"../by_3.v"' in answer.certificate


def test_places_come_back_as_the_files_are_named_here(tmp_path: Path) -> None:
    path = tmp_path / "broken.v"
    path.write_text(RING.replace("endmodule", "  assign tick = clk;\nendmodule"))
    content = read_content([path], Spec())
    task = packed(Task((str(path),), Spec(ratio=Fraction(4))), content, str(tmp_path))
    assert task.files == ("broken.v",)
    (answer,) = answers([task], workers=1)
    error = answer.user_error(content)
    assert isinstance(error, UserError)
    assert error.where is not None
    assert (error.where.file, error.where.line) == (str(path), 5)


@pytest.mark.parametrize("text", ["", "{}", "[]", '{"sources": {"a": 1}}', '{"sources": null, "spec": []}'])
def test_what_is_no_task_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match=r"no task|Expecting"):
        Task.from_json(text)
