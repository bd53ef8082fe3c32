"""One divider's task as plain data, and the process that does such tasks one after the other.

A task says what to read, what to claim and what is wanted. Where it holds the sources' bytes, they are laid out in a
folder of its own and nothing else is read, so it can be done anywhere and no file can change under it. What comes of
it is said in messages, one after the other: progress, the report, the certificate, and the end. So a process that is
killed while it makes a certificate has given its report before.
"""

from __future__ import annotations

import base64
import json
import os
import shutil
import signal
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from queue import SimpleQueue
from typing import Any

from prover.content import Content, identity, read_content
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError, UserError
from prover.findings import Report
from prover.plain import Data, Unreadable, freeze, thaw
from prover.spec import Spec

Message = dict[str, Any]

OUT_OF_MEMORY = "out of memory: fewer --workers leave more to each"

BETWEEN = 0.2
"""Seconds between two messages of progress."""

GRACE = 60.0
"""Seconds beyond the efforts of search and certificate after which a task is given up from outside."""


@dataclass(frozen=True, slots=True)
class Task:
    """What is to be done for one divider.

    files, spec  what to read and to claim; without a ratio it is measured
    certify      whether a certificate is wanted
    recheck      a certificate to be checked again, in place of all else
    sources      the sources' bytes by name; None: they are read where they are
    folder       with `sources`: the folder to work in, below the one they are laid out in
    title        what it is called while it is done, here and nowhere else
    """

    files: tuple[str, ...]
    spec: Spec
    certify: bool = False
    recheck: str | None = None
    sources: Mapping[str, bytes] | None = None
    folder: str = "."
    title: str = ""

    @property
    def limit(self) -> float:
        """Seconds after which it is given up from outside: it may need its effort twice, and some time besides."""
        return 2 * self.spec.effort + GRACE

    def as_json(self) -> str:
        sources = self.sources
        data = {
            "files": self.files,
            "spec": freeze(self.spec)[0],
            "certify": self.certify,
            "recheck": self.recheck,
            "sources": None
            if sources is None
            else {name: base64.b64encode(text).decode("ascii") for name, text in sources.items()},
            "folder": self.folder,
        }
        return json.dumps(data)

    @staticmethod
    def from_json(text: str) -> Task:
        """The task that the text says. Raises ValueError for any other text."""
        try:
            data = json.loads(text)
            sources = data.pop("sources")
            if sources is not None:
                sources = {name: base64.b64decode(each) for name, each in sources.items()}
            spec = thaw(data.pop("spec"))
            return Task(files=tuple(data.pop("files")), spec=spec, sources=sources, **data)
        except (KeyError, TypeError, AttributeError, Unreadable) as fault:
            raise ValueError(f"no task: {fault}") from None


@dataclass(frozen=True, slots=True)
class Answer:
    """What came of a task.

    report       the report as plain data, its places anchors where the task brought its sources
    content      digest of the content that it is about
    anchored     every place in it is an anchor
    certificate  the certificate's text, "" where none was wanted or none could be made
    left_open    verdicts of the report that the certificate does not bear out, by property
    rechecked    what a recheck came to
    error        the user's error as plain data: message, place, hint
    open, fault  why there is no answer: out of effort or time; a fault of this program
    prover       who answers
    """

    report: Data | None = None
    content: str = ""
    anchored: bool = False
    certificate: str = ""
    left_open: tuple[str, ...] = ()
    rechecked: Rechecked | None = None
    error: Data | None = None
    open: str = ""
    fault: str = ""
    prover: str = ""

    def user_error(self, content: Content | None = None) -> UserError | None:
        """The user's error with its place in the content."""
        if self.error is None:
            return None
        message, where, hint = thaw(self.error, content)
        return UserError(message, where, hint)

    def thawed(self, content: Content | None = None) -> Report | None:
        """The report with its places in the content."""
        if self.report is None:
            return None
        report = thaw(self.report, content)
        if not isinstance(report, Report):
            raise Unreadable("no report")
        return report


@dataclass(frozen=True, slots=True)
class Rechecked:
    """What a certificate came to when it was checked again: the verdicts that it bears, by property; why it is
    rejected, a sentence each; what a solver gave up on."""

    verdicts: tuple[tuple[str, str], ...]
    differences: tuple[str, ...]
    gave_up: tuple[str, ...]


def collected(messages: Sequence[Message]) -> Answer:
    """The answer that the messages add up to."""
    known = {name for name in Answer.__slots__ if name != "rechecked"}
    fields: dict[str, Any] = {}
    for message in messages:
        fields |= {name: value for name, value in message.items() if name in known}
        if "rechecked" in message:
            fields["rechecked"] = rechecked(message["rechecked"])
    if "left_open" in fields:
        fields["left_open"] = tuple(fields["left_open"])
    return Answer(**fields)


def rechecked(told: Mapping[str, Sequence[Any]]) -> Rechecked:
    """What a recheck came to, from plain data."""
    verdicts = tuple((name, verdict) for name, verdict in told["verdicts"])
    return Rechecked(verdicts, tuple(told["differences"]), tuple(told["gave_up"]))


# -- doing it ----------------------------------------------------------------------------------------------


def work(task: Task, say: Callable[[Message], None]) -> None:
    """Do the task in the present folder; `say` is given each message. Places are told as anchors where the task
    brings its sources, since what they are called here means nothing elsewhere."""
    content = None
    try:
        content = read_content(task.files, task.spec) if task.sources is not None else None
        if task.recheck is not None:
            _recheck(task, task.recheck, say)
            return
        report = _asked(task, _teller(say))
        data, anchored = freeze(report, content)
        say(
            {
                "report": data,
                "content": content.digest if content else "",
                "anchored": anchored,
                "prover": identity(),
            }
        )
        if task.certify:
            _certify(report, task, say)
    except UserError as error:
        told = error.message, error.where, error.hint
        say({"error": freeze(told, content)[0], "content": content.digest if content else ""})
    except OutOfEffort as out:
        say({"open": str(out)})
    except MemoryError:
        say({"open": OUT_OF_MEMORY})
    except Exception as fault:
        if os.environ.get("SUBHARMONIC_TRACEBACK"):
            import traceback

            traceback.print_exc()
        say({"fault": f"{type(fault).__name__}: {fault}"})


def _asked(task: Task, tell: Callable[[str], None]) -> Report:
    from prover.api import check, measure

    return (check if task.spec.claims else measure)(task.files, task.spec, tell)


def _teller(say: Callable[[Message], None]) -> Callable[[str], None]:
    """Progress as messages, not too many of them."""
    last = 0.0

    def tell(doing: str) -> None:
        nonlocal last
        if time.monotonic() - last >= BETWEEN:
            last = time.monotonic()
            say({"doing": doing})

    return tell


def _certify(report: Report, task: Task, say: Callable[[Message], None]) -> None:
    """The certificate, or why there is none: then the report stands without."""
    from prover.report.certificate import certify

    try:
        made = certify(report, task.files, Effort(task.spec.effort, _teller(say)))
    except OutOfEffort:
        return
    say({"certificate": made.text, "left_open": made.left_open})


def _recheck(task: Task, certificate: str, say: Callable[[Message], None]) -> None:
    from prover.recheck import recheck_kept

    outcome = recheck_kept(certificate, task.files, task.spec, task.spec.effort, _teller(say))
    verdicts = [(finding.name, finding.verdict) for finding in outcome.findings]
    say({"rechecked": asdict(Rechecked(tuple(verdicts), outcome.differences, outcome.gave_up))})


# -- the process that does them ----------------------------------------------------------------------------


def main(place: str) -> None:
    """Do the tasks that come in on standard input, a line each, and say on standard output what comes of them, a line
    a message; sources are laid out below the folder `place`. The end of the input ends the process at once, whatever
    it is doing: whoever wanted it is gone."""
    # What ends its master's whole group, such as the end of a terminal, leaves it time to tidy up.
    for name in ("SIGINT", "SIGTERM", "SIGHUP"):
        if hasattr(signal, name):
            signal.signal(getattr(signal, name), signal.SIG_IGN)
    out = os.fdopen(os.dup(1), "w", encoding="utf-8")
    # What libraries print may not come between the messages.
    os.dup2(2, 1)
    tasks: SimpleQueue[str] = SimpleQueue()
    threading.Thread(target=_listen, args=(tasks, place), daemon=True).start()
    home = os.getcwd()

    def say(message: Message) -> None:
        out.write(json.dumps(message) + "\n")
        out.flush()

    while True:
        line = tasks.get()
        os.chdir(home)
        try:
            task = Task.from_json(line)
            if task.sources is None:
                work(task, say)
            else:
                _laid_out(task, place, say)
        except OSError as fault:
            say({"fault": f"the sources can't be laid out: {fault.strerror or fault}"})
        say({"end": True, "prover": identity()})


def _listen(tasks: SimpleQueue[str], place: str) -> None:
    for line in sys.stdin:
        tasks.put(line)
    shutil.rmtree(place, ignore_errors=True)
    os._exit(0)


def _laid_out(task: Task, place: str, say: Callable[[Message], None]) -> None:
    """Do a task that brings its sources, in a folder that is gone afterwards."""
    with tempfile.TemporaryDirectory(dir=place) as root:
        folder = Path(root, task.folder)
        folder.mkdir(parents=True, exist_ok=True)
        for name, text in (task.sources or {}).items():
            path = folder / name
            path.parent.mkdir(parents=True, exist_ok=True)
            if not path.resolve().is_relative_to(Path(root).resolve()):
                raise InternalError(f"{name} lies outside its folder")
            path.write_bytes(text)
        for name in task.spec.include:
            (folder / name).mkdir(parents=True, exist_ok=True)
        os.chdir(folder)
        try:
            work(task, say)
        finally:
            os.chdir(root)


def packed(task: Task, content: Content, base: str) -> Task:
    """The task with its sources' bytes, all names relative to the folder `base`, as they are named in the content.
    Raises UserError where a source can't be read any more."""
    files = tuple(_relative(name, base) for name in task.files)
    include = tuple(_relative(name, base) for name in task.spec.include)
    sources: dict[str, bytes] = {}
    for name in content.files:
        try:
            sources[_relative(name, base)] = Path(name).read_bytes()
        except OSError as fault:
            raise UserError(f"{name}: {fault.strerror or fault}", hint="name a Verilog source file") from None
    ups = max(_ups(name) for name in (*sources, *include))
    return replace(
        task,
        files=files,
        spec=replace(task.spec, include=include),
        sources=sources,
        folder="/".join(["in"] * ups) or ".",
    )


def _relative(name: str, base: str) -> str:
    """The name as seen from the folder; one that lies below it by its text keeps its text."""
    prefix = os.path.join(base, "")
    if name.startswith(prefix):
        return name[len(prefix) :]
    if base in ("", ".") and not os.path.isabs(name):
        return name
    return os.path.relpath(name, base or ".")


def _ups(name: str) -> int:
    """How many folders above its own the name may reach."""
    depth = lowest = 0
    for part in Path(name).parts:
        depth += -1 if part == ".." else 1
        lowest = min(lowest, depth)
    return -lowest
