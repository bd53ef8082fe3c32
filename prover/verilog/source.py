"""Files to one text: directives carried out, comments blanked, every character traced back to its file.

The text that comes out holds no comment and no directive. A character that was copied keeps its place; one
that a macro produced has the place where the macro was used. IEEE 1364-2005 clause 19 describes the
directives; those that change nothing here (`timescale and its kin) are dropped.
"""

from __future__ import annotations

import hashlib
import os
import re
import sys
from bisect import bisect_right
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from prover.errors import UserError, Where

# A merge gate reads what strangers send: each of these ends in an error, never in a hang.
MAX_FILE_BYTES = 8_000_000
MAX_TEXT = 8_000_000
MAX_EXPANSIONS = 100_000
MAX_EXPANDED = 4_000_000
MAX_DEPTH = 60
MAX_SHOWN = 1_000

# What may not reach a terminal: control characters other than tab, and those that turn the reading direction.
_UNPRINTABLE = re.compile("[\x00-\x08\x0a-\x1f\x7f-\x9f\u200e\u200f\u202a-\u202e\u2066-\u2069\ufeff]")

_LEXEME = re.compile(
    r"""(?P<comment>//[^\n]*|/\*.*?\*/)
      | (?P<opened>/\*)
      | (?P<string>"(?:[^"\\\n]|\\.)*")
      | (?P<quote>")
      | (?P<escaped>\\[^\s]+)
      | (?P<tick>`(?:``|[A-Za-z_][\w$]*|\\[^\s]+)?)""",
    re.VERBOSE | re.DOTALL | re.ASCII,
)
_NAME = re.compile(r"[ \t]*(\\[^\s]+|[A-Za-z_][\w$]*)", re.ASCII)
_WORD = re.compile(r'"(?:[^"\\\n]|\\.)*"|``|\\[^\s]+|`?[A-Za-z_][\w$]*', re.ASCII | re.DOTALL)
_PRAGMA = re.compile(r"(?://|/\*)\s*(?:synthesis|synopsys|pragma)\s+(?:translate_|synthesis_)(off|on)\b")
_TIMESCALE = re.compile(r"\s*\d+\s*[munpf]?s\s*/\s*\d+\s*[munpf]?s")
_STRING = re.compile(r'\s*"[^"\n]*"')

_NO_ARGUMENT = {
    "celldefine", "endcelldefine", "nounconnected_drive", "end_keywords", "delay_mode_distributed",
    "delay_mode_path", "delay_mode_unit", "delay_mode_zero",
}  # fmt: skip
_WHOLE_LINE = {"line", "pragma", "default_decay_time", "default_trireg_strength", "unconnected_drive"}
_CONDITIONALS = {"ifdef", "ifndef", "elsif", "else", "endif"}
_DIRECTIVES = _NO_ARGUMENT | _WHOLE_LINE | _CONDITIONALS
_DIRECTIVES |= {"define", "undef", "include", "timescale", "default_nettype", "resetall", "begin_keywords"}


def printable(text: str, most: int = 200) -> str:
    """The text with everything replaced that could act on a terminal, and cut where it is very long."""
    shown = _UNPRINTABLE.sub("?", text[: most + 1])
    return shown if len(shown) <= most else shown[:most] + "…"


@dataclass(frozen=True, slots=True)
class _File:
    """A file that was read: its name as the user gave it, its text, where its lines begin, and lines that
    were shown before, because one line may hold all remarks."""

    name: str
    text: str
    lines: list[int]
    shown: dict[int, str] = field(default_factory=dict)

    def where(self, offset: int) -> Where:
        line = bisect_right(self.lines, offset) - 1
        start = self.lines[line]
        text = self.shown.get(line)
        if text is None:
            end = self.text.find("\n", start)
            end = end if end >= 0 else len(self.text)
            # A line that fills screens is no help, and its column would point nowhere.
            text = printable(self.text[start:end], MAX_SHOWN) if end - start <= MAX_SHOWN else ""
            self.shown[line] = text
        return Where(printable(self.name, MAX_SHOWN), line + 1, offset - start + 1, text)


@dataclass(frozen=True, slots=True)
class Source:
    """The expanded text; what stands at an offset in it was written `where`, under which `net_type`."""

    text: str
    files: tuple[str, ...]
    sha256: str
    notes: tuple[tuple[str, Where], ...]
    _starts: list[int]
    _origins: list[tuple[_File, int, bool]]
    _net_types: list[tuple[int, str]]

    def where(self, offset: int) -> Where:
        """The place in a file that the character at the offset came from."""
        file, start, fixed = self._origins[max(0, bisect_right(self._starts, offset) - 1)]
        piece = self._starts[max(0, bisect_right(self._starts, offset) - 1)]
        return file.where(min(start if fixed else start + offset - piece, len(file.text)))

    def net_type(self, offset: int) -> str:
        """`wire`, or what the last `default_nettype before the offset says."""
        before = [kind for start, kind in self._net_types if start <= offset]
        return before[-1] if before else "wire"


@dataclass(slots=True)
class _Macro:
    """Text of a macro; `parameters` is None where it takes none, and a parameter may have a default."""

    text: str
    parameters: list[tuple[str, str | None]] | None


@dataclass(slots=True)
class _Branch:
    """An open `ifdef: does its present part count, has one counted, has `else come, and where it opened."""

    active: bool
    taken: bool
    finished: bool
    where: Where


def read_source(
    files: Sequence[Path | str],
    *,
    defines: Mapping[str, str] | None = None,
    include: Sequence[Path | str] = (),
) -> Source:
    """Read the files in order, as one compilation unit, and carry out their directives.

    `include looks beside the including file, beside the source, then in the `include` folders, and reads nothing
    outside those and the folders of the files given. Raises UserError for what can't be read or carried out.
    """
    return _Preprocessor(files, defines or {}, include).run()


def _check_name(name: str) -> None:
    """Raise UserError where no file can be called so here. A manifest has names that no system has given."""
    try:
        encoded = os.fsencode(name)
    except UnicodeEncodeError:
        where = sys.getfilesystemencoding()
        raise UserError(
            f"{printable(name)}: file names are in {where} here, which lacks a character of it",
            None,
            "set a locale of UTF-8, such as LC_ALL=C.UTF-8",
        ) from None
    if b"\0" in encoded:
        raise UserError(f"{printable(name)}: no name of a file", None, "name a Verilog source file")


def _load(path: Path, name: str, where: Where | None) -> _File:
    try:
        with path.open("rb") as handle:
            data = handle.read(MAX_FILE_BYTES + 1)
    except OSError as error:
        reason = error.strerror or "can't be read"
        raise UserError(f"{printable(name)}: {reason}", where, "name a Verilog source file") from None
    if len(data) > MAX_FILE_BYTES:
        raise UserError(
            f"{printable(name)}: more than {MAX_FILE_BYTES} bytes", where, "is this a source file?"
        )
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    text = text.replace("\r\n", "\n")
    return _File(name, text, [0, *(m.end() for m in re.finditer("\n", text))])


@dataclass(slots=True)
class _Preprocessor:
    files: Sequence[Path | str]
    defines: Mapping[str, str]
    include: Sequence[Path | str]
    macros: dict[str, _Macro] = field(default_factory=dict)
    out: list[str] = field(default_factory=list)
    length: int = 0
    starts: list[int] = field(default_factory=list)
    origins: list[tuple[_File, int, bool]] = field(default_factory=list)
    net_types: list[tuple[int, str]] = field(default_factory=list)
    read: list[str] = field(default_factory=list)
    notes: list[tuple[str, Where]] = field(default_factory=list)
    roots: list[Path] = field(default_factory=list)
    opened: list[Path] = field(default_factory=list)
    expansions: int = 0
    expanded: int = 0
    folder: Path = Path()

    def run(self) -> Source:
        if not self.files:
            raise UserError("no source file", None, "name at least one Verilog file")
        for name, text in self.defines.items():
            if not re.fullmatch(r"[A-Za-z_][\w$]*", name, re.ASCII):
                raise UserError(f"{printable(name)} is no macro name", None, "write --define NAME=TEXT")
            self.macros[name] = _Macro(text, None)
        for named in (*self.files, *self.include):
            _check_name(str(named))
        paths = [Path(file) for file in self.files]
        self.roots = [Path(folder).resolve() for folder in (*(p.parent for p in paths), *self.include)]
        for path in paths:
            self.folder = path.parent
            self._file(path, str(path), None)
        text = "".join(self.out)
        digest = hashlib.sha256(" ".join(text.split()).encode()).hexdigest()
        if not self.starts:
            self.starts, self.origins = [0], [(_File(self.read[0], "", [0]), 0, True)]
        return Source(
            text, tuple(self.read), digest, tuple(self.notes), self.starts, self.origins, self.net_types
        )

    def _emit(self, text: str, file: _File, offset: int, fixed: bool = False) -> None:
        if not text:
            return
        last = self.origins[-1] if self.origins else None
        follows = (
            last is not None
            and not fixed
            and not last[2]
            and last[0] is file
            and last[1] + self.length - self.starts[-1] == offset
        )
        if not follows:
            self.starts.append(self.length)
            self.origins.append((file, offset, fixed))
        self.out.append(text)
        self.length += len(text)
        if self.length > MAX_TEXT:
            raise UserError(
                f"more than {MAX_TEXT} characters after directives",
                file.where(offset),
                "is this one divider?",
            )

    def _file(self, path: Path, name: str, where: Where | None) -> None:
        real = path.resolve()
        if real in self.opened:
            raise UserError(f"{printable(name)} includes itself", where, "guard it with `ifndef")
        if len(self.opened) >= MAX_DEPTH:
            raise UserError("include files nest too deeply", where, "include less deeply")
        file = _load(path, name, where)
        if name not in self.read:
            self.read.append(name)
        self.opened.append(real)
        self._scan(file, path.parent)
        self.opened.pop()
        self._emit("\n", file, len(file.text), fixed=True)

    def _scan(self, file: _File, folder: Path) -> None:
        text, position = file.text, 0
        branches: list[_Branch] = []
        off: Where | None = None
        while True:
            found = _LEXEME.search(text, position)
            end = found.start() if found else len(text)
            live = off is None and all(b.active for b in branches)
            if live:
                self._emit(text[position:end], file, position)
            if not found:
                break
            kind, lexeme, start = found.lastgroup, found.group(), found.start()
            position = found.end()
            if kind == "comment":
                pragma = _PRAGMA.match(lexeme)
                if pragma and pragma.group(1) == "off" and live:
                    off = file.where(start)
                    self.notes.append(("simulation-only part passed over", off))
                elif pragma and pragma.group(1) == "on":
                    off = None
                if live:
                    self._emit(re.sub(r"[^\n]", " ", lexeme), file, start)
            elif kind == "tick" and off is None:
                position = self._tick(file, folder, lexeme, start, position, branches)
            elif live:
                if kind == "opened":
                    raise UserError("this comment never ends", file.where(start), "close it with */")
                if kind == "quote":
                    raise UserError(
                        "this string never ends", file.where(start), 'close it with " on its line'
                    )
                self._emit(lexeme, file, start)
        if branches:
            raise UserError("this conditional has no `endif", branches[-1].where, "close it with `endif")
        if off is not None:
            raise UserError("translate_off without translate_on", off, "close it with a translate_on comment")

    def _tick(
        self, file: _File, folder: Path, lexeme: str, start: int, position: int, branches: list[_Branch]
    ) -> int:
        name = lexeme[1:]
        live = all(b.active for b in branches)
        if name in _CONDITIONALS:
            return self._conditional(file, name, start, position, branches)
        if not live:
            # What isn't compiled isn't carried out either, but a macro's text may hold an `endif.
            return self._logical_line(file, position)[1] if name == "define" else position
        if name not in _DIRECTIVES:
            use = file.where(start)
            replaced, position = self._expand(name, file.text, position, use, ())
            self._emit(f" {replaced} ", file, start, fixed=True)
            return position
        self._emit(" ", file, start, fixed=True)
        return self._directive(file, folder, name, start, position)

    def _directive(self, file: _File, folder: Path, name: str, start: int, position: int) -> int:
        where = file.where(start)
        if name in _NO_ARGUMENT:
            return position
        if name in _WHOLE_LINE:
            return self._logical_line(file, position)[1]
        if name == "define":
            return self._define(file, start, position)
        if name == "include":
            return self._include(file, folder, start, position)
        if name == "resetall":
            self.net_types.append((self.length, "wire"))
            return position
        if name == "begin_keywords":
            found = _STRING.match(file.text, position)
        elif name == "timescale":
            found = _TIMESCALE.match(file.text, position)
        else:
            found = _NAME.match(file.text, position)
        if not found:
            raise UserError(f"`{name} needs an argument", where, "complete the directive")
        if name == "undef":
            self.macros.pop(found.group(1), None)
        elif name == "default_nettype":
            self.net_types.append((self.length, found.group(1)))
        return found.end()

    def _conditional(self, file: _File, name: str, start: int, position: int, branches: list[_Branch]) -> int:
        where = file.where(start)
        if name in ("ifdef", "ifndef", "elsif"):
            found = _NAME.match(file.text, position)
            if not found:
                raise UserError(f"`{name} needs a macro name", where, "name the macro")
            position = found.end()
            holds = (found.group(1) in self.macros) != (name == "ifndef")
        else:
            holds = True
        if name in ("ifdef", "ifndef"):
            branches.append(_Branch(holds, holds, False, where))
            return position
        if not branches:
            raise UserError(f"`{name} without `ifdef", where, "remove it, or open the conditional")
        branch = branches[-1]
        if name == "endif":
            branches.pop()
            return position
        if branch.finished:
            raise UserError(f"`{name} after `else", where, "an `ifdef has one `else, and it comes last")
        branch.finished = name == "else"
        branch.active = holds and not branch.taken
        branch.taken = branch.taken or holds
        return position

    def _logical_line(self, file: _File, position: int) -> tuple[str, int]:
        """The rest of the line without comments, and where the next one begins; a backslash joins lines."""
        text, parts = file.text, []
        while True:
            found = re.compile(r'\\\n|\n|//[^\n]*|/\*.*?\*/|"(?:[^"\\\n]|\\.)*"', re.DOTALL).search(
                text, position
            )
            if not found:
                parts.append(text[position:])
                return "".join(parts), len(text)
            parts.append(text[position : found.start()])
            lexeme, position = found.group(), found.end()
            if lexeme == "\n":
                return "".join(parts), found.start()
            if lexeme.startswith("//"):
                # A comment that ends in a backslash still joins the next line to the macro.
                parts.append(" ")
                if lexeme.endswith("\\"):
                    position = min(position + 1, len(text))
            else:
                parts.append(lexeme if lexeme.startswith('"') else " ")

    def _define(self, file: _File, start: int, position: int) -> int:
        where = file.where(start)
        found = _NAME.match(file.text, position)
        if not found:
            raise UserError("`define needs a name", where, "write `define NAME text")
        name, position = found.group(1), found.end()
        if name in _DIRECTIVES:
            raise UserError(f"`{name} is a directive and can't be defined", where, "choose another name")
        body, end = self._logical_line(file, position)
        parameters: list[tuple[str, str | None]] | None = None
        if body.startswith("("):
            listed, rest = _arguments(body, 0, where)
            parameters = []
            for item in listed if listed != [""] else []:
                word, _, default = item.partition("=")
                if not re.fullmatch(r"[A-Za-z_][\w$]*", word.strip(), re.ASCII):
                    raise UserError(
                        f"`{name}: {printable(item)!r} is no parameter name", where, "list plain names"
                    )
                parameters.append((word.strip(), default.strip() if "=" in item else None))
            body = body[rest:]
        self.macros[name] = _Macro(body.strip(), parameters)
        return end

    def _include(self, file: _File, folder: Path, start: int, position: int) -> int:
        where = file.where(start)
        line, end = self._logical_line(file, position)
        if "`" in line:
            line = self._rescan(line, where, ())
        found = re.match(r'\s*(?:"([^"]+)"|<([^>]+)>)\s*$', line)
        if not found:
            raise UserError(
                "`include needs a file name", where, 'write `include "name.vh" on a line of its own'
            )
        name = found.group(1) or found.group(2)
        if Path(name).is_absolute():
            raise UserError("`include of an absolute path", where, "give its folder with --include")
        for base in dict.fromkeys((folder, self.folder, *map(Path, self.include))):
            candidate = base / name
            try:
                present = candidate.is_file()
            except (OSError, ValueError):
                present = False
            if not present:
                continue
            if not any(candidate.resolve().is_relative_to(root) for root in self.roots):
                raise UserError(
                    f"`include {printable(name)} lies outside the folders that may be read",
                    where,
                    "give its folder with --include",
                )
            self._file(candidate, str(candidate), where)
            return end
        raise UserError(f"`include {printable(name)}: no such file", where, "give its folder with --include")

    def _expand(
        self, name: str, text: str, position: int, use: Where, within: tuple[str, ...]
    ) -> tuple[str, int]:
        """The text that stands for a macro whose arguments, if it has any, stand at the position."""
        macro = self.macros.get(name)
        if macro is None:
            shown = printable(name)
            raise UserError(
                f"`{shown} is neither a directive nor a macro", use, f"define it: --define {shown}=TEXT"
            )
        if name in within:
            raise UserError(f"macro {printable(name)} expands to itself", use, "break the circle")
        if len(within) >= MAX_DEPTH:
            raise UserError("macros nest too deeply", use, "nest macros less deeply")
        self.expansions += 1
        body = macro.text
        if macro.parameters is not None:
            opening = re.compile(r"\s*\(").match(text, position)
            if not opening:
                raise UserError(
                    f"macro {printable(name)} needs arguments", use, "give it as many as its definition has"
                )
            given, position = _arguments(text, opening.end() - 1, use)
            body = self._fill(name, macro, [self._rescan(g, use, within) for g in given], use)
        replaced = self._rescan(body, use, (*within, name))
        self.expanded += len(replaced)
        if self.expanded > MAX_EXPANDED or self.expansions > MAX_EXPANSIONS:
            raise UserError("macros expand without measure", use, "use fewer macros in each other")
        return replaced, position

    def _fill(self, name: str, macro: _Macro, given: list[str], use: Where) -> str:
        parameters = macro.parameters or []
        if len(given) > len(parameters) and given != [""]:
            raise UserError(
                f"macro {printable(name)} takes {len(parameters)} arguments",
                use,
                "give it as many as its definition has",
            )
        values: dict[str, str] = {}
        for i, (parameter, default) in enumerate(parameters):
            if i < len(given) and (given[i] or default is None):
                values[parameter] = given[i]
            elif default is not None:
                values[parameter] = default
            else:
                raise UserError(
                    f"macro {printable(name)} takes {len(parameters)} arguments",
                    use,
                    "give it as many as its definition has",
                )
        size = sum(len(values.get(m.group(), "")) for m in _WORD.finditer(macro.text))
        if size > MAX_EXPANDED:
            raise UserError("macros expand without measure", use, "use fewer macros in each other")
        return _WORD.sub(lambda m: values.get(m.group(), m.group()), macro.text).replace("``", "")

    def _rescan(self, text: str, use: Where, within: tuple[str, ...]) -> str:
        if "`" not in text:
            return text
        parts: list[str] = []
        position = 0
        while True:
            found = _LEXEME.search(text, position)
            if not found:
                parts.append(text[position:])
                return "".join(parts)
            parts.append(text[position : found.start()])
            position = found.end()
            if found.lastgroup != "tick":
                parts.append(found.group())
                continue
            name = found.group()[1:]
            if name in _DIRECTIVES or not name:
                raise UserError(f"directive `{name} inside a macro", use, "write it on a line of its own")
            replaced, position = self._expand(name, text, position, use, within)
            parts.append(f" {replaced} ")


def _arguments(text: str, opening: int, where: Where) -> tuple[list[str], int]:
    """The pieces between the bracket at `opening` and its partner, at commas, and the place after that."""
    pieces, depth, start = [], 0, opening + 1
    for found in re.compile(r'"(?:[^"\\\n]|\\.)*"|\\\S+|[()\[\]{},]').finditer(text, opening):
        lexeme = found.group()
        if lexeme in ("(", "[", "{"):
            depth += 1
        elif lexeme in (")", "]", "}"):
            depth -= 1
            if depth == 0:
                pieces.append(text[start : found.start()].strip())
                return pieces, found.end()
        elif lexeme == "," and depth == 1:
            pieces.append(text[start : found.start()].strip())
            start = found.end()
    raise UserError("the list of macro arguments never ends", where, "close the bracket")
