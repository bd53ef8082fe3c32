"""The ledger: verdicts that were found, with their reports and certificates, and their history, in one SQLite file.

A verdict is kept under a digest of all that decides it. It is written whole or not at all, in a transaction of its
own, so runs may share a ledger and be killed at any time; SQLite's own locks go with the process that held them. Each
entry carries a seal over its fields and the digests of its texts, so that what has been damaged is not believed. The
seal keeps no one from forging: whoever can write the file can.
"""

from __future__ import annotations

import hashlib
import json
import sqlite3
import time
import zlib
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from prover.errors import InternalError, UserError

MARK = 0x7375_6268
"""What an SQLite file has for an application id if it is a ledger."""

VERSION = 1

PATIENCE = 60.0
"""Seconds to wait for another run that is writing."""

STEP = 0.2
"""Seconds that SQLite waits at a time: it can't be interrupted meanwhile."""

MOST_BYTES = 1 << 30
"""Bytes of one text: what claims to be longer is damaged."""

SCHEMA = """
CREATE TABLE kept (key TEXT PRIMARY KEY, decided TEXT NOT NULL, told TEXT NOT NULL, seal TEXT NOT NULL);
CREATE INDEX kept_decided ON kept (decided);
CREATE TABLE texts (key TEXT NOT NULL, kind TEXT NOT NULL, data BLOB NOT NULL, PRIMARY KEY (key, kind));
CREATE TABLE history (number INTEGER PRIMARY KEY, divider TEXT NOT NULL, told TEXT NOT NULL);
CREATE INDEX history_divider ON history (divider);
"""


@dataclass(frozen=True, slots=True)
class Property:
    """One property of a kept report: its name, verdict, what was found, and how many obligations that rests on."""

    name: str
    verdict: str
    says: str
    obligations: int


@dataclass(frozen=True, slots=True)
class Kept:
    """A kept verdict.

    key          digest of all that decides it
    decided      when, in UTC, as ISO 8601
    effort       seconds that it was given
    seconds      how long it took
    properties   the verdicts, waivers not counted
    raw          digest of the sources' names and bytes where the report's places hold for these alone, else ""
    report       SHA-256 of the report as text
    certificate  SHA-256 of the certificate, "" where there is none
    left_open    verdicts that the certificate does not bear out, by property
    """

    key: str
    decided: str
    effort: float
    seconds: float
    properties: tuple[Property, ...]
    raw: str
    report: str
    certificate: str
    left_open: tuple[str, ...]

    @property
    def is_decided(self) -> bool:
        """Whether no property was left open."""
        return all(each.verdict != "open" for each in self.properties)


@dataclass(frozen=True, slots=True)
class Event:
    """What a run found a divider to be.

    divider   its name in the manifest, with the values of its ranges; `entry` is the name alone
    run       when the run began, in UTC, as ISO 8601
    files     every file that was read, from the manifest's folder
    verdict   "proved", "refuted", "open" or "error", waivers counted
    says      the properties that made it so, or the error
    sources, prover, options  what decided it: digests, and the options as texts by their names
    waived    reasons by property
    """

    divider: str
    entry: str
    run: str
    files: tuple[str, ...]
    verdict: str
    says: str
    sources: str
    prover: str
    options: Mapping[str, str]
    waived: Mapping[str, str]

    def repeats(self, last: Event | None) -> bool:
        """Whether nothing has changed since."""
        return last is not None and asdict(self) | {"run": ""} == asdict(last) | {"run": ""}


def digest(text: str) -> str:
    """The SHA-256 of a text, in hexadecimal."""
    return hashlib.sha256(text.encode()).hexdigest()


class _Patient(sqlite3.Connection):
    """A connection that waits for other runs, and can be interrupted while it does."""

    def execute(self, sql: str, parameters: Any = ()) -> sqlite3.Cursor:
        end = time.monotonic() + PATIENCE
        while True:
            try:
                return super().execute(sql, parameters)
            except sqlite3.OperationalError as fault:
                if not _is_busy(fault) or time.monotonic() >= end:
                    raise


def _is_busy(fault: sqlite3.Error) -> bool:
    return getattr(fault, "sqlite_errorname", "").startswith(("SQLITE_BUSY", "SQLITE_LOCKED"))


class Ledger:
    """An open ledger. Everything here raises UserError where the file can't be read or written."""

    def __init__(self, path: Path, to_read: bool = False) -> None:
        """Open the ledger, made anew if there is none, and see that it can be written; `to_read` only opens it."""
        self.path = path
        if path.is_dir():
            raise UserError(f"the ledger {path} is a folder", hint="give the path of a file with --ledger")
        how: dict[str, Any] = {"timeout": STEP, "isolation_level": None, "factory": _Patient}
        with self._guarded():
            if to_read:
                self._base = sqlite3.connect(f"{path.resolve().as_uri()}?mode=ro", uri=True, **how)
            else:
                try:
                    path.parent.mkdir(parents=True, exist_ok=True)
                except OSError as fault:
                    raise self._unusable(f"can't make its folder: {fault.strerror or fault}") from None
                self._base = sqlite3.connect(path, **how)
        try:
            with self._guarded():
                if to_read:
                    self._check_kind(*self._kind())
                else:
                    self._base.execute("PRAGMA synchronous = FULL")
                    self._open()
        except BaseException:
            self.close()
            raise

    def _open(self) -> None:
        with self._writing():
            empty = self._number("SELECT count(*) FROM sqlite_master") == 0
            if empty and self._kind() == (0, 0):
                for statement in SCHEMA.split(";"):
                    self._base.execute(statement)
                self._base.execute(f"PRAGMA application_id = {MARK}")
            else:
                self._check_kind(*self._kind())
            # Where nothing changes by that, whether it could is known now.
            self._base.execute(f"PRAGMA user_version = {VERSION}")

    def _kind(self) -> tuple[int, int]:
        return self._number("PRAGMA application_id"), self._number("PRAGMA user_version")

    def _check_kind(self, mark: int, version: int) -> None:
        if mark != MARK:
            raise UserError(f"{self.path} is no ledger", hint="name another file with --ledger")
        if version != VERSION:
            raise UserError(
                f"{self.path}: a ledger of version {version}, and this program writes version {VERSION}",
                hint="use the program that wrote it, or name another file with --ledger",
            )

    def close(self) -> None:
        self._base.close()

    def find(self, key: str) -> Kept | None:
        """The verdict that is kept under the key."""
        with self._guarded():
            row = self._base.execute("SELECT told, seal FROM kept WHERE key = ?", (key,)).fetchone()
            return None if row is None else self._kept(key, *row)

    def _kept(self, key: str, told: object, seal: object) -> Kept:
        if not isinstance(told, str) or seal != digest(f"{key} {told}"):
            raise self._damaged(f"the entry {key[:12]} is not as it was written")
        fields: dict[str, Any] = json.loads(told)
        fields["properties"] = tuple(Property(**each) for each in fields["properties"])
        fields["left_open"] = tuple(fields["left_open"])
        return Kept(key=key, **fields)

    def text(self, kept: Kept, kind: str) -> str:
        """The text of a kept verdict: its "report" or its "certificate"."""
        with self._guarded():
            row = self._base.execute(
                "SELECT data FROM texts WHERE key = ? AND kind = ?", (kept.key, kind)
            ).fetchone()
            try:
                inflating = zlib.decompressobj()
                text = inflating.decompress(row[0] if row else b"", MOST_BYTES).decode()
            except (zlib.error, UnicodeDecodeError, TypeError):
                text = ""
            if digest(text) != {"report": kept.report, "certificate": kept.certificate}[kind]:
                raise self._damaged(f"the {kind} of the entry {kept.key[:12]} is not as it was written")
            return text

    def keep(self, kept: Kept, report: str, certificate: str, event: Event | None) -> None:
        """Keep a verdict with its texts, and what it is an event of. A decided verdict does not give way to one that
        was left open. Raises InternalError where one contradicts the other."""
        told = asdict(kept)
        for name in ("key",):
            del told[name]
        text = json.dumps(told)
        packed = {
            kind: zlib.compress(each.encode(), 6)
            for kind, each in (("report", report), ("certificate", certificate))
            if each
        }
        with self._guarded(), self._writing():
            before = self.find(kept.key)
            if before is not None:
                _check_agreement(before, kept)
            if before is None or kept.is_decided or not before.is_decided:
                self._base.execute("DELETE FROM texts WHERE key = ?", (kept.key,))
                for kind, data in packed.items():
                    self._base.execute("INSERT INTO texts VALUES (?, ?, ?)", (kept.key, kind, data))
                self._base.execute(
                    "INSERT OR REPLACE INTO kept VALUES (?, ?, ?, ?)",
                    (kept.key, kept.decided, text, digest(f"{kept.key} {text}")),
                )
            if event is not None:
                self._note(event)

    def drop(self, keys: Iterable[str]) -> None:
        """Keep these verdicts no longer."""
        with self._guarded(), self._writing():
            for key in keys:
                self._base.execute("DELETE FROM texts WHERE key = ?", (key,))
                self._base.execute("DELETE FROM kept WHERE key = ?", (key,))

    def older_than(self, decided: str) -> list[str]:
        """The keys of verdicts that were decided before."""
        with self._guarded():
            rows = self._base.execute("SELECT key FROM kept WHERE decided < ?", (decided,))
            return [str(key) for (key,) in rows]

    def note(self, events: Iterable[Event]) -> None:
        """Write events into the history, but for those that repeat the divider's last one."""
        fresh = [event for event in events if not event.repeats(self.last(event.divider))]
        if fresh:
            with self._guarded(), self._writing():
                for event in fresh:
                    self._note(event)

    def _note(self, event: Event) -> None:
        if not event.repeats(self.last(event.divider)):
            told = json.dumps(asdict(event))
            self._base.execute("INSERT INTO history (divider, told) VALUES (?, ?)", (event.divider, told))

    def last(self, divider: str) -> Event | None:
        """The divider's last event."""
        with self._guarded():
            row = self._base.execute(
                "SELECT told FROM history WHERE divider = ? ORDER BY number DESC LIMIT 1", (divider,)
            ).fetchone()
            return None if row is None else _event(row[0])

    def history(self) -> Iterator[Event]:
        """All events, in the order in which they were written."""
        with self._guarded():
            for (told,) in self._base.execute("SELECT told FROM history ORDER BY number"):
                yield _event(told)

    # -- how it fails --------------------------------------------------------------------------------------

    @contextmanager
    def _writing(self) -> Iterator[None]:
        """A transaction: all of it or nothing, and no other run's in between."""
        self._base.execute("BEGIN IMMEDIATE")
        try:
            yield
            self._base.execute("COMMIT")
        except BaseException:
            if self._base.in_transaction:
                self._base.execute("ROLLBACK")
            raise

    @contextmanager
    def _guarded(self) -> Iterator[None]:
        try:
            yield
        except sqlite3.Error as fault:
            raise self._told(fault) from None
        except (ValueError, TypeError, KeyError) as fault:
            raise self._damaged(f"an entry is not as it was written: {fault}") from None

    def _told(self, fault: sqlite3.Error) -> UserError:
        """SQLite's error for people: its code says who has to do something about it."""
        name = getattr(fault, "sqlite_errorname", "")
        if _is_busy(fault):
            return UserError(
                f"the ledger {self.path} has been locked by another run for {PATIENCE:g} seconds",
                hint="wait for it, or name another file with --ledger",
            )
        if name.startswith(
            ("SQLITE_FULL", "SQLITE_IOERR", "SQLITE_READONLY", "SQLITE_CANTOPEN", "SQLITE_PERM")
        ):
            return self._unusable(str(fault))
        if name == "SQLITE_NOTADB":
            return UserError(
                f"{self.path} is no ledger, or one that is damaged from its beginning",
                hint="name another file with --ledger; if it is one, move it away: all is judged anew",
            )
        return self._damaged(str(fault))

    def _unusable(self, why: str) -> UserError:
        return UserError(
            f"can't write the ledger {self.path}: {why}",
            hint="make room or give it another place with --ledger; what it holds already is as it was",
        )

    def _damaged(self, why: str) -> UserError:
        return UserError(
            f"the ledger {self.path} is damaged: {why}",
            hint="move it away and run again: all is judged anew, and nothing else depends on it",
        )

    def _number(self, query: str) -> int:
        (value,) = self._base.execute(query).fetchone()
        return int(value)


def _event(told: str) -> Event:
    fields: dict[str, Any] = json.loads(told)
    return Event(**{**fields, "files": tuple(fields["files"])})


def _check_agreement(before: Kept, now: Kept) -> None:
    """Raise InternalError where one and the same question got two answers."""
    known = {each.name: each.verdict for each in before.properties}
    for each in now.properties:
        pair = {known.get(each.name), each.verdict}
        if pair == {"proved", "refuted"}:
            raise InternalError(f"{each.name} is {each.verdict}, and the ledger holds it {known[each.name]}")
