"""Several dividers in one run: which files of a list or a folder make a divider of their own.

A file with a module with ports that no other module contains holds a divider. Files of which one only is such are one
divider, read together. Of more than one, and of everything below a folder, each is a divider by itself, read together
with the files that define the modules it contains.
"""

from __future__ import annotations

import os
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from prover.content import Content, read_content
from prover.effort import OutOfEffort
from prover.errors import UserError, Where
from prover.findings import Report
from prover.output import harmless
from prover.plain import Unreadable
from prover.pool import Crew
from prover.spec import Spec
from prover.task import Answer, Task, packed

SUFFIXES = (".v", ".sv")

MOST_FILES = 10_000
"""Files looked at below one folder; more are a mistake, or an attack."""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of one divider: its report, or why there is none. A `fault` is this program's own, and one that is
    `open` ran out of effort. The `title` is the name that a manifest gives it."""

    files: tuple[str, ...]
    report: Report | None = None
    error: UserError | None = None
    fault: str = ""
    open: str = ""
    title: str = ""

    @property
    def name(self) -> str:
        """The first file, which holds the divider's top."""
        return self.files[0]


@dataclass(frozen=True, slots=True)
class Lapse:
    """A waiver of a gate that has expired: whose it is and of which property, what to say of it, and where it stands
    in the manifest."""

    name: str
    says: str
    where: Where


@dataclass(frozen=True, slots=True)
class _Content:
    """The modules of a file: those with ports, and what all of them contain. Unreadable: None in place of both."""

    path: str
    ported: frozenset[str] | None
    defined: frozenset[str]
    used: frozenset[str]


def groups(paths: Sequence[str], spec: Spec) -> list[tuple[str, ...]] | None:
    """The files of each divider, or None where all paths are one divider, as a single file always is.

    Raises UserError for a folder that holds no divider or can't be read.
    """
    if not any(os.path.isdir(path) for path in paths) and (len(paths) < 2 or spec.module is not None):
        return None
    listed: list[_Content] = []
    for path in paths:
        listed += _below(path, spec) if os.path.isdir(path) else [_content(path, spec)]
    once = list({os.path.realpath(content.path): content for content in listed}.values())
    # A module that a file both defines and contains is its own: another file's of that name is no part of it.
    used = {name for content in once for name in content.used - content.defined}
    tops = [c for c in once if c.ported is None or c.ported - c.used - used]
    folders = any(os.path.isdir(path) for path in paths)
    if not folders and (len(tops) < 2 or sum(content.ported is not None for content in tops) < 2):
        return None
    if not tops:
        raise UserError(f"{paths[0]}: no divider below", hint="name a folder with .v or .sv files in it")
    return [tuple(_with_modules(content, once)) for content in tops]


def _below(folder: str, spec: Spec) -> Iterator[_Content]:
    """The Verilog files below a folder, in order, but for those without a module with ports."""
    found: list[str] = []
    for place, inner, names in os.walk(folder):
        inner[:] = sorted(name for name in inner if not name.startswith("."))
        found += (os.path.join(place, name) for name in names if name.endswith(SUFFIXES))
        if len(found) > MOST_FILES:
            raise UserError(f"{folder}: more than {MOST_FILES} files", hint="name a smaller folder")
    for path in sorted(found):
        content = _content(path, spec)
        if content.ported is None or content.ported:
            yield content


def _content(path: str, spec: Spec) -> _Content:
    from prover.verilog.elaborate import Library, users
    from prover.verilog.source import read_source
    from prover.verilog.tree import Module

    none: frozenset[str] = frozenset()
    try:
        source = read_source([path], defines=spec.defines, include=[Path(folder) for folder in spec.include])
        library = Library.of(source)
        chunks = library.chunks.values()
        # A test bench isn't parsed: it need not be anything that is read, and what it contains may be a top.
        modules = [library.get(chunk.name) for chunk in chunks if not chunk.portless]
    except UserError:
        return _Content(path, None, none, none)
    ported = frozenset(module.name for module in modules if isinstance(module, Module))
    inside = frozenset(name for m in modules if isinstance(m, Module) for name in users(m))
    return _Content(path, ported, frozenset(library.chunks), inside)


def _with_modules(content: _Content, listed: Sequence[_Content]) -> Iterator[str]:
    """The file, and those that define what it contains and doesn't define itself."""
    taken, wanted = [content], set(content.used - content.defined)
    while wanted:
        name = min(wanted)
        wanted.discard(name)
        holder = next((c for c in listed if name in c.defined and c not in taken), None)
        if holder is not None and not any(name in c.defined for c in taken):
            taken.append(holder)
            wanted |= holder.used - holder.defined
    for each in taken:
        yield each.path


def outcomes(
    dividers: Sequence[tuple[str, ...]], spec: Spec, crew: Crew, tell: Callable[[str], None]
) -> list[Outcome]:
    """Each divider's outcome, in order. One that can't be read, or a fault of ours, doesn't stop the others. Raises
    UserError where none could be judged."""
    found: dict[int, Outcome] = {}
    tasks: dict[int, Task] = {}
    contents: dict[int, Content] = {}
    for number, files in enumerate(dividers):
        tasks[number] = Task(files, spec)
        if crew.apart:
            try:
                contents[number] = read_content(files, spec)
                tasks[number] = packed(tasks[number], contents[number], ".")
            except UserError as error:
                del tasks[number]
                found[number] = Outcome(files, error=error)
    numbers = list(tasks)
    judged = 0
    try:
        for at, answer in crew.run(list(tasks.values()), tell):
            number = numbers[at]
            found[number] = outcome(dividers[number], answer, contents.get(number))
            judged += 1
    except UserError as error:
        if not judged:
            raise
        # What is known is told, and of the others why it is not.
        found |= {number: Outcome(dividers[number], error=error) for number in numbers if number not in found}
    return [found[number] for number in range(len(dividers))]


def outcome(files: tuple[str, ...], answer: Answer, content: Content | None = None) -> Outcome:
    """What a task's answer comes to, its places those in the content."""
    if answer.fault:
        return Outcome(files, fault=harmless(answer.fault))
    try:
        report, error = answer.thawed(content), answer.user_error(content)
    except Unreadable as fault:
        return Outcome(files, fault=f"an answer that can't be read: {harmless(str(fault))}")
    if report is None and error is None:
        return Outcome(files, open=answer.open or "no answer")
    return Outcome(files, report, error)


def failed(files: tuple[str, ...], fault: Exception) -> Outcome:
    """The outcome of a divider that has no report for that reason."""
    if isinstance(fault, UserError):
        return Outcome(files, error=fault)
    if isinstance(fault, OutOfEffort):
        return Outcome(files, open=str(fault))
    return Outcome(files, fault=f"{type(fault).__name__}: {harmless(str(fault))}")


def labels(found: Sequence[Outcome]) -> list[str]:
    """A name for each divider's files of results, all of them different: its title or the stem of its file, and a
    number."""
    seen: dict[str, int] = {}
    out = []
    for outcome in found:
        stem = re.sub(r"[^\w.,=\[\]-]", "_", outcome.title) or Path(outcome.name).stem
        seen[stem] = seen.get(stem, 0) + 1
        out.append(stem if seen[stem] == 1 else f"{stem}-{seen[stem]}")
    return out
