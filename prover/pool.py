"""Many tasks at once, over processes on this machine: one that crashes or hangs costs only itself.

Each process is fed by a thread of ours, one task at a time, and lives until the last. One that ends, or that is still
at a task past its limit and is ended, is replaced when there is more to do.
"""

from __future__ import annotations

import json
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from queue import Empty, SimpleQueue
from typing import Protocol

from prover.task import OUT_OF_MEMORY, Answer, Message, Task, collected

Tell = Callable[[str], None]

START = "import json, sys; place, sys.path[:] = sys.argv[1], json.loads(sys.argv[2])"
MAIN = "from prover.task import main; main(place)"


class Crew(Protocol):
    """Whoever does tasks; `apart` if this machine's files can't be seen there, so that tasks have to bring them."""

    @property
    def apart(self) -> bool: ...

    def run(self, tasks: Sequence[Task], tell: Tell) -> Iterator[tuple[int, Answer]]:
        """Each task's number and answer, in the order in which they are done; `tell` hears of progress."""


def cores() -> int:
    """How many processes this machine runs at once."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


@dataclass
class Worker:
    """A process that does tasks, started when it gets one. `code` is what it runs."""

    code: str = field(default_factory=lambda: MAIN)
    _process: subprocess.Popen[str] | None = None
    _place: str = ""
    _closed: bool = False
    _guard: threading.Lock = field(default_factory=threading.Lock)

    def ask(self, task: Task, hear: Tell) -> Answer:
        """What came of the task, whatever becomes of the process."""
        process = self._running()
        if process is None:
            return Answer(open="stopped")
        over = threading.Event()
        late = threading.Event()
        watch = threading.Thread(target=self._watch, args=(process, task.limit, over, late), daemon=True)
        watch.start()
        heard, ended = _conversation(process, task, hear)
        over.set()
        watch.join()
        if ended:
            return collected(heard)
        self._end(process)
        answer = collected(heard)
        if answer.report is not None and not answer.fault:
            # What was lost is only the certificate.
            return answer
        if late.is_set():
            return Answer(
                open=f"no answer after {task.limit:g} seconds, past its effort: its process was ended"
            )
        if process.returncode == -signal.SIGKILL:
            # Nothing of ours sends this one: that is how a system gets memory back.
            return Answer(open=f"its process was killed from outside, as where a system is {OUT_OF_MEMORY}")
        return Answer(fault=f"its process {_how_it_ended(process.returncode)}")

    def close(self) -> None:
        """End the process, whatever it is doing. It is not started again."""
        with self._guard:
            self._closed = True
            process = self._process
        if process is not None:
            self._end(process)
        if self._place:
            shutil.rmtree(self._place, ignore_errors=True)

    def _running(self) -> subprocess.Popen[str] | None:
        with self._guard:
            if self._closed:
                return None
            if self._process is None or self._process.poll() is not None:
                self._place = self._place or tempfile.mkdtemp(prefix="subharmonic-")
                path = [os.path.abspath(entry) for entry in sys.path]
                self._process = subprocess.Popen(
                    [sys.executable, "-c", f"{START}\n{self.code}", self._place, json.dumps(path)],
                    stdin=subprocess.PIPE,
                    stdout=subprocess.PIPE,
                    stderr=None if os.environ.get("SUBHARMONIC_TRACEBACK") else subprocess.DEVNULL,
                    encoding="utf-8",
                )
            return self._process

    @staticmethod
    def _watch(
        process: subprocess.Popen[str], limit: float, over: threading.Event, late: threading.Event
    ) -> None:
        if not over.wait(limit):
            late.set()
            process.kill()

    @staticmethod
    def _end(process: subprocess.Popen[str]) -> None:
        process.kill()
        process.wait()
        for stream in (process.stdin, process.stdout):
            try:
                if stream is not None:
                    stream.close()
            except OSError:
                pass


def _conversation(process: subprocess.Popen[str], task: Task, hear: Tell) -> tuple[list[Message], bool]:
    """What the process said of the task, and whether it said that this was all."""
    heard: list[Message] = []
    if process.stdin is None or process.stdout is None:
        return heard, False
    try:
        process.stdin.write(task.as_json() + "\n")
        process.stdin.flush()
        for line in process.stdout:
            message = json.loads(line)
            if "doing" in message:
                hear(str(message["doing"]))
            else:
                heard.append(message)
            if message.get("end"):
                return heard, True
    except (OSError, ValueError):
        # It ended before it took all, or in the middle of a line.
        pass
    return heard, False


def _how_it_ended(status: int) -> str:
    if status >= 0:
        return f"ended with status {status}"
    try:
        name = signal.Signals(-status).name
    except ValueError:
        name = str(-status)
    return f"was ended by signal {name}"


@dataclass(frozen=True)
class Local:
    """Processes on this machine, `workers` of them at most."""

    workers: int
    apart: bool = False

    def run(self, tasks: Sequence[Task], tell: Tell) -> Iterator[tuple[int, Answer]]:
        """Each task's number and answer, in the order in which they are done."""
        waiting: SimpleQueue[int] = SimpleQueue()
        done: SimpleQueue[tuple[int, Answer | BaseException]] = SimpleQueue()
        for number in range(len(tasks)):
            waiting.put(number)
        count = 0

        def serve(worker: Worker) -> None:
            while True:
                try:
                    number = waiting.get_nowait()
                except Empty:
                    return
                name = tasks[number].title or tasks[number].files[0]

                def hear(doing: str, name: str = name) -> None:
                    tell(f"{count} of {len(tasks)} done; {name}: {doing}")

                try:
                    done.put((number, worker.ask(tasks[number], hear)))
                except BaseException as fault:
                    done.put((number, fault))

        workers = [Worker() for _ in range(min(self.workers, len(tasks)))]
        threads = [threading.Thread(target=serve, args=(worker,), daemon=True) for worker in workers]
        for thread in threads:
            thread.start()
        try:
            while count < len(tasks):
                number, answer = done.get()
                if isinstance(answer, BaseException):
                    raise answer
                count += 1
                yield number, answer
        finally:
            for worker in workers:
                worker.close()
            for thread in threads:
                thread.join()
