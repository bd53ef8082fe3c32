"""What decides a verdict: the sources as the reader's tokens, digested, and the places of these tokens.

Comments, white space and the names of files decide nothing, so they are no part of the digest. They decide where
things stand, so a place is kept as the number of its token, an anchor, and looked up in the sources as they are now.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path
from typing import Any

from prover import __version__
from prover.errors import Where
from prover.spec import Spec
from prover.verilog.source import MAX_SHOWN, Source, printable, read_source
from prover.verilog.tokens import tokenize

FOUNDATIONS = ("numpy", "pyverilog", "z3-solver")
"""Packages whose versions may decide a verdict."""


@dataclass(frozen=True)
class Content:
    """The content of a divider's files.

    digest   SHA-256 of all in the sources that decides what they mean, in hexadecimal
    files    every file read, in order
    sha256   digest of the text after directives, as a report tells it
    offsets  where each token stands in the text after directives, then where each remark points at
    source   that text
    """

    digest: str
    files: tuple[str, ...]
    sha256: str
    offsets: tuple[int, ...]
    source: Source

    def place(self, anchor: int) -> Where:
        """Where that token stands. Raises IndexError where there is no such token."""
        if not 0 <= anchor < len(self.offsets) + len(self.source.notes):
            raise IndexError(anchor)
        if anchor < len(self.offsets):
            return self.source.where(self.offsets[anchor])
        return self.source.notes[anchor - len(self.offsets)][1]

    def anchor(self, where: Where) -> int | None:
        """The first token that stands there, None where none does."""
        return self._anchors.get((where.file, where.line, where.column))

    def split(self, text: str) -> list[str | int | None]:
        """A text that names places as FILE:LINE, cut into what stands between them and the first token of each one's
        line, None where there is no token; empty for a text that names none."""
        if not any(name in text for name in self._names):
            return []
        parts: list[str | int | None] = []
        at = 0
        for found in self._places.finditer(text):
            parts += [text[at : found.start()], self._lines.get((found[1], int(found[2])))]
            at = found.end()
        return [*parts, text[at:]] if parts else []

    @cached_property
    def _names(self) -> list[str]:
        """The files' names as places bear them."""
        return [printable(name, MAX_SHOWN) for name in self.files]

    @cached_property
    def _places(self) -> re.Pattern[str]:
        names = "|".join(map(re.escape, sorted(self._names, key=len, reverse=True)))
        return re.compile(rf"(?<![\w./\\-])({names}):(\d{{1,9}})(?!\d)")

    @cached_property
    def _lines(self) -> dict[tuple[str, int], int]:
        """The first token of each line, or what is remarked on where the line has none."""
        found: dict[tuple[str, int], int] = {}
        for number in range(len(self.offsets) + len(self.source.notes)):
            where = self.place(number)
            found.setdefault((where.file, where.line), number)
        return found

    @cached_property
    def _anchors(self) -> dict[tuple[str, int, int], int]:
        found: dict[tuple[str, int, int], int] = {}
        for number in range(len(self.offsets) + len(self.source.notes)):
            where = self.place(number)
            found.setdefault((where.file, where.line, where.column), number)
        return found


def read_content(files: Sequence[str | Path], spec: Spec) -> Content:
    """The content of the files as the spec has them read. Raises UserError where they can't be read."""
    source = read_source(files, defines=spec.defines, include=[Path(folder) for folder in spec.include])
    remarks: list[tuple[str, int]] = []
    tokens = tokenize(source, remarks)
    offsets = (*(token.lineno for token in tokens), *(at for _, at in remarks))
    digest = hashlib.sha256()
    for part in _told(source, tokens, remarks):
        digest.update(f"{len(part)}:{part}".encode())
    return Content(digest.hexdigest(), source.files, source.sha256, offsets, source)


def _told(source: Source, tokens: Sequence[Any], remarks: Sequence[tuple[str, int]]) -> Iterator[str]:
    """All that decides, text by text: the tokens, whether a name may stand for a wire, what is remarked on."""
    at = None
    for token in tokens:
        before, at = at, source.where(token.lineno)
        # Tokens that one use of a macro made share a place.
        yield f"{token.type} {'same' if at == before else 'next'} {source.net_type(token.lineno)}"
        yield " ".join(token.value.split()) if token.type == "TABLETEXT" else token.value
    for message, offset in remarks:
        yield f"{message} after {sum(token.lineno < offset for token in tokens)}"
    for message, _ in source.notes:
        yield message


@cache
def identity() -> str:
    """Who proves: the version, and a digest of this program's code and of the versions of what it builds on."""
    from importlib.metadata import PackageNotFoundError, version

    digest = hashlib.sha256()
    root = Path(__file__).parents[1]
    for folder in ("prover", "properties"):
        for path in sorted((root / folder).rglob("*")):
            if path.suffix in (".py", ".json") and path.is_file():
                digest.update(path.relative_to(root).as_posix().encode() + b"\0" + path.read_bytes() + b"\0")
    for name in FOUNDATIONS:
        try:
            digest.update(f"{name} {version(name)}\0".encode())
        except PackageNotFoundError:
            digest.update(f"{name} unknown\0".encode())
    return f"{__version__}+{digest.hexdigest()[:16]}"
