"""The manifest: which dividers a gate is about and what is claimed of them, as TOML.

    [defaults]                          # options of every divider that doesn't have its own
    effort = 30

    [divider.ping]
    files = "ping.v"                    # from the manifest's folder, or a list of them
    ratio = 7                           # any option of `check`, by its name
    set = { WIDTH = 4 }                 # one that is given as NAME=VALUE there is a table here

    [divider.tick]
    files = ["tick.v", "stage.v"]
    set = { N = "2..512" }              # a range: an entry for each value
    ratio = "N"

    [divider.tick.waive.recovery]
    reason = "the supply monitor holds reset until the oscillator is up"
    until = 2027-01-31                  # the last day on which it counts

Whatever is not understood is an error with its line: a claim that is passed over would pass for a proof.
"""

from __future__ import annotations

import difflib
import itertools
import math
import os
import re
import tomllib
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import date, datetime
from decimal import Decimal
from pathlib import Path
from typing import Any, Literal

from prover.errors import UserError, Where
from prover.spec import Ranges, Spec, read_each
from prover.verilog.source import printable

NAME = "subharmonic.toml"

MOST_BYTES = 4_000_000
MOST_DIVIDERS = 20_000
"""Values of ranges and entries together: beyond that a range is a mistake."""

LONGEST_KEY = 500
"""Characters of a line in which its key is looked for."""

OF_THE_COMMAND = (
    *("afresh", "certificate", "cluster", "html", "json", "junit", "ledger"),
    *("recheck", "sarif", "testbench", "vcd", "wait", "workers"),
)
"""Options that a run has and a claim hasn't."""

A_DATE = "until = 2027-01-31"
FORM = 'a manifest is TOML: [divider.NAME], and below it files = "divider.v" and ratio = 3'

Options = Mapping[str, Literal["one", "many", "flag"]]
"""The options of `check` that an entry takes: name, without dashes, to whether it has a value, or may have many."""

SpecOf = Callable[[Sequence[str]], Spec]
"""The claim that the arguments of a command line make, files aside."""


@dataclass(frozen=True, slots=True)
class Waiver:
    """A property that is excused until the end of a day, and why. `where` is its place in the manifest. It is
    `shared` if it is every divider's."""

    name: str
    reason: str
    until: date
    where: Where
    shared: bool = False

    def expired(self, today: date) -> bool:
        return today > self.until

    @property
    def text(self) -> str:
        """The reason as reports repeat it."""
        return f"{self.reason} (until {self.until.isoformat()})"


@dataclass(frozen=True, slots=True)
class Divider:
    """One divider and what is claimed of it.

    entry       its name in the manifest
    parameters  the values of its ranges, none of them where it has no range
    files       from the manifest's folder
    spec        the claim, include folders from the manifest's folder; without waivers
    waivers     these
    where       its place in the manifest
    places      the places of its keys
    """

    entry: str
    parameters: Mapping[str, int]
    files: tuple[str, ...]
    spec: Spec
    waivers: tuple[Waiver, ...]
    where: Where
    places: Mapping[str, Where] = field(default_factory=dict)

    @property
    def name(self) -> str:
        """The entry's name with the values of its ranges: tick[N=5]."""
        told = ",".join(f"{name}={value}" for name, value in self.parameters.items())
        return f"{self.entry}[{told}]" if told else self.entry

    def placed(self, error: UserError) -> UserError:
        """The error with a place: where it has none, that of the option that it speaks of, or of the entry."""
        if error.where is not None:
            return error
        named = [name for name in re.findall(r"--([a-z]+(?:-[a-z]+)*)", error.message) if name in self.places]
        if not named and any(error.message.startswith(printable(file)) for file in self.files):
            named = ["files"]
        if not named:
            named = [name for name in re.findall(r"[a-z]+", error.message) if name in self.places]
        return UserError(error.message, self.places[named[0]] if named else self.where, error.hint)


@dataclass(frozen=True, slots=True)
class Manifest:
    """The dividers of a manifest, in order, and its path."""

    path: Path
    dividers: tuple[Divider, ...]

    @property
    def folder(self) -> Path:
        return self.path.parent


def find_manifest(folder: Path) -> Path:
    """The manifest in the folder or in the nearest one above. Raises UserError where there is none."""
    # As it is named: a link to a folder elsewhere leaves its own folder's manifest in force.
    here = Path(os.path.abspath(folder))
    for place in (here, *here.parents):
        if (place / NAME).is_file():
            return Path(os.path.relpath(place / NAME))
    raise UserError(
        f"there is no {NAME} here nor in a folder above",
        hint=f"write one, or name a manifest's path; {FORM}",
    )


def read_manifest(path: Path, options: Options, spec_of: SpecOf) -> Manifest:
    """The manifest in a file, or right in a folder. Raises UserError, with the line, for what is not understood."""
    if path.is_dir():
        path = path / NAME
    try:
        with path.open("rb") as file:
            data = file.read(MOST_BYTES + 1)
        # Some editors begin a file with a mark of its encoding.
        text = data.decode("utf-8-sig")
    except OSError as fault:
        raise UserError(
            f"can't read {path}: {fault.strerror or fault}", hint="give the path of a manifest"
        ) from None
    except UnicodeDecodeError:
        raise UserError(f"{path} is no text in UTF-8", hint="is this a manifest?") from None
    if len(data) > MOST_BYTES:
        raise UserError(f"{path}: more than {MOST_BYTES} bytes", hint="is this a manifest?")
    return _Reader(path, text, options, spec_of).manifest()


@dataclass
class _Reader:
    path: Path
    text: str
    options: Options
    spec_of: SpecOf
    lines: list[tuple[tuple[str, ...], int]] = field(default_factory=list)

    def manifest(self) -> Manifest:
        try:
            data = tomllib.loads(self.text)
        except tomllib.TOMLDecodeError as fault:
            raise self._syntax_error(fault) from None
        except RecursionError:
            raise UserError(f"{self.path} nests too deeply", hint="is this a manifest?") from None
        self.lines = list(_keys_by_line(self.text))
        for key in data:
            if key in (*self.options, "files", "waive"):
                raise self._error((key,), f"{key} stands above all tables", "put it below [divider.NAME]")
        self._known(data, ("defaults", "divider"), ())
        shared = self._table(data.get("defaults", {}), ("defaults",))
        self._known(shared, (*self.options, "waive"), ("defaults",))
        entries = self._table(data.get("divider", {}), ("divider",))
        if not entries:
            raise UserError(f"{self.path}: no divider in it", hint="write a table [divider.NAME] for each")
        dividers: list[Divider] = []
        for name in entries:
            dividers += self._entry(name, entries[name], shared, MOST_DIVIDERS - len(dividers))
        return Manifest(self.path, tuple(dividers))

    def _entry(self, name: str, entry: object, shared: Mapping[str, object], most: int) -> Iterator[Divider]:
        """The dividers of one entry, `most` at most: one for each combination of the values of its ranges."""
        at = ("divider", name)
        if not name.strip():
            raise self._error(at, "a divider without a name", "write [divider.NAME]")
        own = self._table(entry, at)
        self._known(own, ("files", *self.options, "waive"), at)
        if "files" not in own:
            raise self._error(at, "no files", 'say which: files = "divider.v"')
        if "ratio" not in own and "ratio" not in shared:
            raise self._error(at, "no ratio", "say what is claimed: ratio = 3")
        files = tuple(self._texts(own["files"], (*at, "files")))
        if not files or not all(file.strip() for file in files):
            raise self._error((*at, "files"), "no files", 'say which: files = "divider.v"')
        waivers = tuple(self._waivers(shared, ("defaults",)))
        ours = tuple(self._waivers(own, at))
        taken = {waiver.name for waiver in ours}
        waivers = (*ours, *(waiver for waiver in waivers if waiver.name not in taken))
        given = {**shared, **own}
        where = {key: at if key in own else ("defaults",) for key in given}
        ranges = self._ranges(given.get("set", {}), (*where.get("set", at), "set"))
        arguments = [
            argument
            for key in self.options
            if key in given
            for argument in self._arguments(key, given[key], (*where[key], key), ranges)
        ]
        if math.prod(sum(high - low + 1 for low, high in each) for each in ranges.values()) > most:
            raise self._error(at, f"more than {MOST_DIVIDERS} dividers", "narrow a range")
        spec, here = self._spec(arguments, at), self._where(at)
        places = {key: self._where((*where[key], key)) for key in given if key != "waive"}
        for values in itertools.product(*(_values(each) for each in ranges.values())):
            parameters = dict(zip(ranges, values, strict=True))
            claim = replace(spec, parameters={**spec.parameters, **parameters}) if parameters else spec
            yield Divider(name, parameters, files, claim, waivers, here, places)

    def _spec(self, arguments: Sequence[str], at: Sequence[str]) -> Spec:
        try:
            spec = self.spec_of(arguments)
        except UserError as error:
            # The option that is spoken of has a line here.
            words = re.findall(r"[a-z]+(?:-[a-z]+)*", f"{error.message} {error.hint}")
            named = [word for word in words if f"--{word}" in arguments]
            hint = error.hint
            if named[:1] == ["set"] and "whole number" in error.message:
                hint += '; for several values write set = { N = "2..512" }'
            raise self._error((*at, *named[:1]), error.message, hint) from None
        return replace(spec, include=tuple(os.path.normpath(folder) for folder in spec.include))

    # -- values --------------------------------------------------------------------------------------------

    def _arguments(
        self, key: str, value: object, at: Sequence[str], ranges: Mapping[str, Ranges]
    ) -> list[str]:
        """An option's value as the command line has it."""
        if self.options[key] == "flag":
            if not isinstance(value, bool):
                raise self._error(at, f"{key} is {_kind(True)}", f"write {key} = true")
            return [f"--{key}"] if value else []
        if isinstance(value, dict):
            if self.options[key] == "one":
                raise self._error(at, f"{key} is one value, not a table", f'write {key} = "…"')
            pairs = [
                (name, self._text(each, (*at, name))) for name, each in value.items() if name not in ranges
            ]
            texts = [f"{name}={text}" for name, text in pairs]
        else:
            texts = list(self._texts(value, at))
            if len(texts) != 1 and self.options[key] == "one":
                raise self._error(at, f"{key} is one value, not a list", f'write {key} = "…"')
        return [argument for text in texts for argument in (f"--{key}", text)]

    def _ranges(self, value: object, at: Sequence[str]) -> dict[str, Ranges]:
        """The parameters that have several values."""
        found: dict[str, Ranges] = {}
        for name, each in value.items() if isinstance(value, dict) else ():
            if isinstance(each, list):
                each = ",".join(self._texts(each, (*at, name)))
            elif not isinstance(each, str) or not re.search(r",|\.\.", each):
                continue
            try:
                _, ranges = read_each(f"{name}={each}")
            except UserError:
                raise self._error(
                    (*at, name), f"{name} = {each!r}: no range of values", 'such as "2..512" or "2,4,8..16"'
                ) from None
            found[name] = ranges or ()
        return found

    def _texts(self, value: object, at: Sequence[str]) -> Iterator[str]:
        for each in value if isinstance(value, list) else [value]:
            yield self._text(each, at)

    def _text(self, value: object, at: Sequence[str]) -> str:
        """A text, or a number as text."""
        if isinstance(value, str):
            return value
        if isinstance(value, float) and not math.isfinite(value):
            raise self._error(at, f"{value}, where a number is wanted", "write one, or a formula in quotes")
        if isinstance(value, (int, float)) and not isinstance(value, bool):
            return format(Decimal(repr(value)), "f") if isinstance(value, float) else str(value)
        raise self._error(at, f"{_kind(value)}, where a text or a number is wanted", "put it in quotes")

    def _waivers(self, entry: Mapping[str, object], at: Sequence[str]) -> Iterator[Waiver]:
        from properties import ALL

        waived = self._table(entry.get("waive", {}), (*at, "waive"))
        self._known(waived, ALL, (*at, "waive"))
        for name, value in waived.items():
            here = (*at, "waive", name)
            table = self._table(value, here)
            self._known(table, ("reason", "until"), here)
            reason, until = table.get("reason"), table.get("until")
            if not isinstance(reason, str) or not reason.strip():
                raise self._error(here, "a waiver without a reason", 'say why: reason = "…"')
            if "until" not in table:
                raise self._error(here, "a waiver without its last day", f"say until when: {A_DATE}")
            if not isinstance(until, date) or isinstance(until, datetime):
                told = f"until is {_kind(until)}, where a date is wanted"
                raise self._error(here, told, f"write {A_DATE}, with no quotes")
            yield Waiver(name, reason.strip(), until, self._where(here), at == ("defaults",))

    # -- places --------------------------------------------------------------------------------------------

    def _table(self, value: object, at: Sequence[str]) -> Mapping[str, Any]:
        if not isinstance(value, dict):
            header = at if at != ("divider",) else ("divider", "NAME")
            raise self._error(at, f"{_kind(value)}, where a table is wanted", f"write [{'.'.join(header)}]")
        return value

    def _known(self, table: Mapping[str, object], known: Iterable[str], at: Sequence[str]) -> None:
        """Refuse a key that means nothing, and name the nearest one that does."""
        names = list(known)
        for key in table:
            if key in names:
                continue
            if key in OF_THE_COMMAND:
                raise self._error((*at, key), f"{key} is no part of a claim", f"give --{key} to the command")
            near = difflib.get_close_matches(key.lower(), names, 1)
            hints = [f"did you mean {near[0]}?"] if near else []
            hints += ["files are each divider's own;"] if key == "files" else []
            hints += [f"there are {', '.join(sorted(names))}"]
            raise self._error((*at, key), f"no key is called '{key}'", " ".join(hints))

    def _error(self, at: Sequence[str], message: str, hint: str) -> UserError:
        table = at[:2] if at[:1] == ("divider",) else at[:1] if at[:1] == ("defaults",) else ()
        told = f"[{'.'.join(table)}] " if table else ""
        return UserError(f"{told}{message}", self._where(at), hint)

    def _where(self, at: Sequence[str]) -> Where:
        """The line of the key, or of the nearest table around it."""
        best, length = 1, 0
        for path, line in self.lines:
            same = sum(
                1 for _ in itertools.takewhile(lambda pair: pair[0] == pair[1], zip(path, at, strict=False))
            )
            if same > length and same == min(len(path), len(at)):
                best, length = line, same
        text = self.text.split("\n")[best - 1].rstrip("\r")
        return Where(str(self.path), best, len(text) - len(text.lstrip()) + 1, text)

    def _syntax_error(self, fault: Exception) -> UserError:
        message = str(fault)
        found = re.search(r" \(at (?:line (\d+), column (\d+)|end of document)\)$", message)
        lines = self.text.split("\n")
        line, column = (int(found[1]), int(found[2])) if found and found[1] else (len(lines), 1)
        text = lines[min(line, len(lines)) - 1].rstrip("\r")
        what = message[: found.start()] if found else message
        told, hint = _mistaken(what, lines[: min(line, len(lines))])
        if told != what:
            column = len(text) - len(text.lstrip()) + 1
        return UserError(
            told if told != what else f"no TOML: {what}", Where(str(self.path), line, column, text), hint
        )


def _mistaken(what: str, lines: Sequence[str]) -> tuple[str, str]:
    """What the TOML reader says of the last of these lines in the words of a manifest, and a hint."""
    text = lines[-1]
    twice = re.search(r"declare \((.*)\) twice", what)
    if twice:
        names = re.findall(r"'((?:[^'\\]|\\.)*)'", twice[1])
        return (
            f"[{'.'.join(names)}] is there twice",
            "give each divider a name of its own, and each table once",
        )
    key = re.match(r"\s*([\w.\-\"']+)\s*=", text[:LONGEST_KEY])
    if "overwrite" in what and key:
        return f"{key[1]} is there twice", "give it once"
    if re.search(r"\buntil\s*=", text):
        return what, f"write a date as in {A_DATE}, with no quotes"
    if what.startswith("Invalid value"):
        return what, f'put texts in quotes: {key[1] if key else "files"} = "…"'
    if text.rstrip("\r").rstrip().endswith(("{", ",")) and "{" in text:
        return what, "an inline table stands on one line: set = { N = 3, WIDTH = 4 }"
    return what, FORM


def _values(ranges: Ranges) -> Iterator[int]:
    for low, high in ranges:
        yield from range(low, high + 1)


def _kind(value: object) -> str:
    kinds = {
        bool: "true or false",
        list: "a list",
        dict: "a table",
        str: "a text",
        int: "a number",
        float: "a number",
    }
    return kinds.get(type(value), "a date or a time")


def _keys_by_line(text: str) -> Iterator[tuple[tuple[str, ...], int]]:
    """Keys and headers of tables with their lines, as far as single lines tell them: for messages only."""
    table: tuple[str, ...] = ()
    for number, line in enumerate(text.split("\n"), 1):
        header = re.match(r"\s*\[\s*([^\[\]]+?)\s*\]", line[:LONGEST_KEY])
        key = re.match(r"\s*([\w.\-\"' ]+?)\s*=", line[:LONGEST_KEY])
        if header:
            table = _path(header[1])
            yield table, number
        elif key:
            yield (*table, *_path(key[1])), number


def _path(key: str) -> tuple[str, ...]:
    """The parts of a dotted key."""
    try:
        inner: object = tomllib.loads(f"{key} = 0")
    except tomllib.TOMLDecodeError:
        return (key,)
    parts = []
    while isinstance(inner, dict):
        ((name, inner),) = inner.items()
        parts.append(name)
    return tuple(parts)
