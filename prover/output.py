"""Where results go: texts made harmless for a terminal, and files written whole or not at all.

Every result is rendered before any is written. Each is then written under a temporary name in the folder of
its target and renamed; when one can't be, none is left behind.
"""

from __future__ import annotations

import errno
import os
import stat
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

from prover.errors import UserError

STANDARD_OUTPUT = "-"


def harmless(text: str) -> str:
    """The text with control characters, direction marks and stray surrogates as escapes; newlines stay."""
    return "\n".join(_escaped(line) for line in text.split("\n"))


def _escaped(line: str) -> str:
    if line.isprintable():
        return line
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in line)


@dataclass(frozen=True, slots=True)
class Result:
    """A rendered text and the path that it is meant for (`-` is standard output)."""

    path: str
    text: str


def check_targets(paths: Iterable[str], sources: Sequence[str] = ()) -> None:
    """Raise UserError if results can't all go where they are asked to: called before the work begins."""
    seen: set[str] = set()
    for path in paths:
        real = path if path == STANDARD_OUTPUT else os.path.realpath(path)
        if real in seen:
            told = "standard output" if path == STANDARD_OUTPUT else path
            raise UserError(f"two results are to be written to {told}", hint="give each a path of its own")
        seen.add(real)
        if path == STANDARD_OUTPUT:
            continue
        if real in {os.path.realpath(source) for source in sources}:
            raise UserError(f"{path} is a source file and would be overwritten", hint="give another path")
        if os.path.isdir(real):
            raise UserError(f"{path} is a folder", hint="give the path of a file")
        folder = os.path.dirname(real)
        if not os.path.isdir(folder):
            raise UserError(f"{path}: there is no folder {folder}", hint="make the folder first")


def write_files(results: Sequence[Result]) -> None:
    """Write every result that goes to a file, all or none. Raises UserError if one can't be written."""
    waiting: list[tuple[str, str]] = []
    made: list[str] = []
    path = ""
    try:
        for result in results:
            path = result.path
            target = os.path.realpath(path)
            if _is_special(target):
                with open(target, "w", encoding="utf-8", newline="\n") as file:
                    file.write(result.text)
            else:
                waiting.append((_written_beside(target, result.text), target))
        while waiting:
            temporary, target = waiting[0]
            fresh = not os.path.exists(target)
            os.replace(temporary, target)
            waiting.pop(0)
            if fresh:
                made.append(target)
    except OSError as fault:
        for left in [temporary for temporary, _ in waiting] + made:
            Path(left).unlink(missing_ok=True)
        reason = fault.strerror or str(fault)
        raise UserError(f"can't write {path}: {reason}", hint="give a path that can be written") from fault
    except BaseException:
        for temporary, _ in waiting:
            Path(temporary).unlink(missing_ok=True)
        raise


def _is_special(path: str) -> bool:
    """A device or a pipe: written to, never replaced."""
    try:
        return not stat.S_ISREG(os.stat(path).st_mode)
    except FileNotFoundError:
        return False


def _written_beside(target: str, text: str) -> str:
    """A new file in the target's folder with the text in it, and the target's permissions if it exists."""
    folder, name = os.path.split(target)
    if os.path.exists(target) and not os.access(target, os.W_OK):
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES), target)
    temporary = os.path.join(folder, f".{name[:100]}.{os.getpid()}.part")
    descriptor = os.open(temporary, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
    try:
        with open(descriptor, "w", encoding="utf-8", newline="\n") as file:
            file.write(text)
        if os.path.exists(target):
            os.chmod(temporary, stat.S_IMODE(os.stat(target).st_mode))
    except BaseException:
        Path(temporary).unlink(missing_ok=True)
        raise
    return temporary
