"""The run of a gate: what is kept is taken from the ledger, the rest is judged and kept, divider by divider.

A kept verdict counts for the content that decides it and for nothing else: the sources as the reader's tokens, the
options, this program. A task brings the bytes of its sources and says of what content it judged, so that a file that
changes meanwhile lends its verdict to no other content. Waivers are applied after all that: they decide no verdict.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
import os
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, date, datetime, timedelta
from fractions import Fraction
from typing import Any, Literal

from prover.content import Content, identity, read_content
from prover.errors import InternalError, UserError
from prover.findings import Report, with_waivers
from prover.gate import ledger as kept_in
from prover.gate.ledger import Event, Kept, Ledger, Property
from prover.gate.manifest import Divider, Manifest, Waiver
from prover.plain import Unreadable, thaw
from prover.pool import Crew
from prover.several import Outcome, outcome
from prover.spec import Spec
from prover.task import Answer, Task, packed

Tell = Callable[[str], None]

APART = ("include", "waivers", "effort")
"""What of a claim is no part of the key: where includes lie, what is excused, how long was tried."""

REMEMBERED = timedelta(days=90)
"""How long a verdict is kept that no divider of the manifest has any more."""


RECHECKING = 600.0
"""Seconds at least for a certificate to be checked again, as for `recheck`: a large one takes longer than it took to
find."""


@dataclass
class Row:
    """What came of one divider.

    divider   as the manifest has it
    source    whether its verdict was found now, was kept, or was kept and its certificate has been checked again
    kept      the verdict as the ledger has it
    came      what came of it instead where there is none to keep: an error, a fault, open
    rejected  why the certificate of a kept verdict was rejected
    skipped   whether nobody got round to it
    decided   when the verdict was found, in UTC, as ISO 8601
    """

    divider: Divider
    files: tuple[str, ...]
    content: Content | None = None
    key: str = ""
    source: Literal["new", "kept", "rechecked"] = "new"
    kept: Kept | None = None
    report: str = ""
    came: Outcome | None = None
    rejected: tuple[str, ...] = ()
    gave_up: tuple[str, ...] = ()
    waived: Mapping[str, str] = field(default_factory=dict)
    skipped: bool = False

    @property
    def verdict(self) -> Literal["proved", "refuted", "open", "error", "fault"]:
        """The verdict, waivers counted."""
        if self.kept is not None and self.came is None:
            told = {each.verdict for each in self.kept.properties if each.name not in self.waived}
            return "refuted" if "refuted" in told else "open" if "open" in told else "proved"
        if self.came is None or self.came.open:
            return "open"
        return "error" if self.came.error else "fault"

    @property
    def wrong(self) -> tuple[str, ...]:
        """The properties that make the verdict what it is; none where it is proved."""
        if self.kept is None or self.verdict == "proved":
            return ()
        return tuple(
            each.name
            for each in self.kept.properties
            if each.verdict == self.verdict and each.name not in self.waived
        )

    @property
    def says(self) -> str:
        """What made the verdict, in a few words; "" where it is proved."""
        if self.came is None:
            return ", ".join(self.wrong)
        return self.came.error.message if self.came.error else self.came.fault or self.came.open

    def outcome(self, ledger: Ledger) -> Outcome:
        """The row as reports take it, its places those in the sources as they are now."""
        if self.came is not None or self.kept is None:
            return self.came or Outcome(self.files, title=self.divider.name, open="not judged")
        text = self.report or ledger.text(self.kept, "report")
        try:
            report = thaw(json.loads(text), self.content)
        except (ValueError, Unreadable) as fault:
            raise UserError(
                f"the ledger {ledger.path} is damaged: a report can't be read: {fault}",
                hint="move it away and run again: all is judged anew, and nothing else depends on it",
            ) from None
        return Outcome(self.files, _waived(report, self.waived), title=self.divider.name)


@dataclass(frozen=True)
class Excused:
    """What is to be told of a waiver.

    entry   whose it is, "" where it is every divider's
    state   that it counts, has expired, or is needless
    days    how many days it has left, today aside; negative where it has expired
    why     why it is, or would be, needless: what it excuses is proved, or not judged; "" where it isn't
    """

    entry: str
    waiver: Waiver
    state: Literal["counts", "expired", "needless"]
    days: int
    why: Literal["", "proved", "not judged"]


@dataclass(frozen=True)
class Run:
    """What a gate came to.

    rows      the dividers, in the manifest's order
    excused   the waivers
    seconds   how long it took
    unkept    why verdicts could not be kept, None if all were
    lost      why some dividers could not be judged, None if all were
    """

    manifest: Manifest
    rows: tuple[Row, ...]
    excused: tuple[Excused, ...]
    seconds: float
    unkept: UserError | None
    lost: UserError | None = None

    @property
    def expired(self) -> tuple[Excused, ...]:
        return tuple(each for each in self.excused if each.state == "expired")

    @property
    def rejected(self) -> tuple[Row, ...]:
        return tuple(row for row in self.rows if row.rejected)


def run_gate(
    manifest: Manifest,
    ledger: Ledger,
    crew: Crew,
    *,
    afresh: bool = False,
    recheck: bool = False,
    today: date | None = None,
    tell: Tell = lambda doing: None,
) -> Run:
    """Bring the ledger up to date with the manifest. `afresh`: as if it were empty. `recheck`: certificates of kept
    verdicts are checked again, and what they don't bear out is judged again. Raises UserError where the ledger can't
    be read."""
    gate = _Gate(manifest, ledger, crew, afresh, recheck, today or date.today(), tell)
    return gate.run()


@dataclass
class _Gate:
    manifest: Manifest
    ledger: Ledger
    crew: Crew
    afresh: bool
    recheck: bool
    today: date
    tell: Tell
    unkept: UserError | None = None
    lost: UserError | None = None
    contents: dict[object, Content | UserError] = field(default_factory=dict)

    def run(self) -> Run:
        began, self.began = time.monotonic(), _now()
        self.base = os.path.relpath(self.manifest.folder)
        self.tell("reading the sources")
        rows = [self._row(divider) for divider in self.manifest.dividers]
        asked: list[tuple[Row, Task]] = []
        for row in rows:
            task = self._looked_up(row)
            if task is not None:
                asked.append((row, task))
        left = dict(enumerate(asked))
        for number, answer in self._answers([task for _, task in asked]):
            row, task = left.pop(number)
            if task.recheck is None:
                self._judged(row, answer)
            else:
                self._rechecked(row, answer)
        for row, _ in left.values():
            row.skipped = True
            row.came = Outcome(row.files, title=row.divider.name, open="not judged")
        self._note(rows)
        excused = tuple(self._excused(rows))
        return Run(self.manifest, tuple(rows), excused, time.monotonic() - began, self.unkept, self.lost)

    def _answers(self, tasks: Sequence[Task]) -> Iterator[tuple[int, Answer]]:
        """What the crew answers until it is lost, if it is: what is known by then is told all the same."""
        if not tasks:
            return
        try:
            yield from self.crew.run(tasks, self.tell)
        except UserError as error:
            self.lost = error

    # -- what is known already -----------------------------------------------------------------------------

    def _row(self, divider: Divider) -> Row:
        names = tuple(self._named(name) for name in divider.files)
        waived = {w.name: w.text for w in divider.waivers if not w.expired(self.today)}
        row = Row(divider, names, waived=waived)
        content = self._content(names, divider.spec)
        if isinstance(content, UserError):
            row.came = Outcome(names, error=divider.placed(content), title=divider.name)
        else:
            row.content = content
            row.key = key_of(content, divider.spec)
        return row

    def _named(self, name: str) -> str:
        """A path from the manifest's folder as one from the working folder."""
        return name if self.base == "." or os.path.isabs(name) else os.path.join(self.base, name)

    def _content(self, files: tuple[str, ...], spec: Spec) -> Content | UserError:
        key = files, spec.include, tuple(spec.defines.items())
        if key not in self.contents:
            include = tuple(self._named(folder) for folder in spec.include)
            try:
                self.contents[key] = read_content(files, replace(spec, include=include))
            except UserError as error:
                self.contents[key] = error
        return self.contents[key]

    def _looked_up(self, row: Row) -> Task | None:
        """What is to be done for the row; None if nothing is."""
        content = row.content
        if content is None:
            return None
        kept = None if self.afresh else self.ledger.find(row.key)
        if kept is not None and not self._counts(kept, row):
            kept = None
        include = tuple(self._named(folder) for folder in row.divider.spec.include)
        task = Task(row.files, replace(row.divider.spec, include=include), certify=True)
        task = replace(task, title=row.divider.name)
        try:
            if kept is None:
                return packed(task, content, self.base)
            row.kept, row.source = kept, "kept"
            if not self.recheck:
                return None
            if not kept.certificate or kept.left_open:
                row.kept, row.source = None, "new"
                return packed(task, content, self.base)
            certificate = self.ledger.text(kept, "certificate")
            patient = replace(task.spec, effort=max(task.spec.effort, RECHECKING))
            return packed(replace(task, spec=patient, certify=False, recheck=certificate), content, self.base)
        except UserError as error:
            if row.kept is not None:
                raise
            row.came = Outcome(row.files, error=error, title=row.divider.name)
            return None

    def _counts(self, kept: Kept, row: Row) -> bool:
        """Whether a kept verdict is what a new one would be: of one that was left open more effort may make more, and
        where not every place in its report has an anchor, the files have to be the same to the byte."""
        if kept.raw and kept.raw != self._raw(row):
            return False
        return kept.is_decided or kept.effort >= row.divider.spec.effort

    def _raw(self, row: Row) -> str:
        sha256 = hashlib.sha256()
        for name in row.content.files if row.content else ():
            with open(name, "rb") as file:
                data = file.read()
            sha256.update(f"{os.path.relpath(name, self.base)}\0{len(data)}\0".encode() + data)
        return sha256.hexdigest()

    # -- what comes of the rest ----------------------------------------------------------------------------

    def _judged(self, row: Row, answer: Answer) -> None:
        """A new verdict, kept at once."""
        content = row.content
        if content is None:
            return
        came = outcome(row.files, answer, content)
        error = row.divider.placed(came.error) if came.error else None
        came = replace(came, title=row.divider.name, error=error)
        if came.report is None:
            row.came = came
            return
        if not came.report.findings:
            raise InternalError(f"{row.divider.name}: nothing was claimed, and nothing can be kept")
        for what, is_same in (
            ("a source", answer.content == content.digest),
            ("this program", answer.prover == identity()),
        ):
            if not is_same:
                changed = UserError(
                    f"{what} was changed while the gate was running", hint="run the gate again"
                )
                row.came = Outcome(row.files, error=changed, title=row.divider.name)
                return
        row.report = json.dumps(answer.report)
        row.kept = Kept(
            key=row.key,
            decided=_now(),
            effort=row.divider.spec.effort,
            seconds=round(came.report.seconds, 3),
            properties=tuple(
                Property(f.name, f.verdict, f.says, len(f.obligations)) for f in came.report.findings
            ),
            raw="" if answer.anchored else self._raw(row),
            report=kept_in.digest(row.report),
            certificate=kept_in.digest(answer.certificate) if answer.certificate else "",
            left_open=answer.left_open,
        )
        if self.unkept is None:
            try:
                self.ledger.keep(row.kept, row.report, answer.certificate, self._event(row))
            except UserError as error:
                # The other verdicts are found all the same: they are told, and this is told after them.
                self.unkept = error
            except InternalError as fault:
                row.came = Outcome(row.files, fault=str(fault), title=row.divider.name)

    def _rechecked(self, row: Row, answer: Answer) -> None:
        """What came of checking a kept verdict's certificate again."""
        found, kept = answer.rechecked, row.kept
        if found is None or kept is None:
            row.came = replace(outcome(row.files, answer, row.content), title=row.divider.name)
            return
        row.source = "rechecked"
        borne = dict(found.verdicts)
        differences = list(found.differences)
        if not found.gave_up and not differences:
            differences = [
                f"{each.name} is kept as {each.verdict}, and the certificate bears {borne.get(each.name, 'nothing')}"
                for each in kept.properties
                if each.verdict not in ("open", borne.get(each.name))
            ]
        row.rejected, row.gave_up = tuple(differences), found.gave_up
        if row.rejected:
            # It is proved anew by the next run.
            self.ledger.drop([kept.key])
            told = UserError(
                f"its kept certificate is rejected: {row.rejected[0]}",
                hint="the verdict is dropped from the ledger; run again to have it judged anew",
            )
            row.came = Outcome(row.files, error=told, title=row.divider.name)
        elif row.gave_up:
            left = f"its certificate could not be checked again: {row.gave_up[0]}"
            row.came = Outcome(row.files, open=left, title=row.divider.name)

    # -- history and waivers -------------------------------------------------------------------------------

    def _event(self, row: Row) -> Event:
        divider, content = row.divider, row.content
        files = content.files if content else row.files
        return Event(
            divider=divider.name,
            entry=divider.entry,
            run=self.began,
            files=tuple(os.path.relpath(name, self.base).replace(os.sep, "/") for name in files),
            verdict=row.verdict,
            says=row.says,
            sources=content.digest if content else "",
            prover=identity(),
            options={name: str(value) for name, value in options_of(divider.spec).items()},
            waived=row.waived,
        )

    def _note(self, rows: Sequence[Row]) -> None:
        """The history of what has changed, and verdicts forgotten that nobody asks for."""
        if self.unkept is not None:
            return
        try:
            told = [row for row in rows if row.verdict != "fault" and not row.gave_up and not row.skipped]
            self.ledger.note(map(self._event, told))
            used = {row.key for row in rows}
            old = self.ledger.older_than((datetime.now(UTC) - REMEMBERED).isoformat())
            forgotten = [key for key in old if key not in used]
            if forgotten:
                self.ledger.drop(forgotten)
        except UserError as error:
            self.unkept = error

    def _excused(self, rows: Sequence[Row]) -> list[Excused]:
        """Each waiver once. It is about the rows of its entry; one that is shared, about those of all entries
        that have none of their own."""
        about: dict[tuple[str, Waiver], list[Row]] = {}
        for row in rows:
            for waiver in row.divider.waivers:
                about.setdefault(("" if waiver.shared else row.divider.entry, waiver), []).append(row)
        found: list[Excused] = []
        for (entry, waiver), group in about.items():
            days, why = (waiver.until - self.today).days, _needless(group, waiver.name)
            state: Literal["counts", "expired", "needless"] = "needless" if why else "counts"
            found.append(Excused(entry, waiver, "expired" if days < 0 else state, days, why))
        return found


def _needless(rows: Sequence[Row], name: str) -> Literal["", "proved", "not judged"]:
    """Why none of the rows needs the property to be waived; "" where one does, or where that is not known."""
    judged = [row.kept for row in rows if row.kept is not None and row.came is None]
    verdicts = {each.verdict for kept in judged for each in kept.properties if each.name == name}
    if len(judged) < len(rows) or verdicts - {"proved"}:
        return ""
    return "proved" if verdicts else "not judged"


def _waived(report: Report, waived: Mapping[str, str]) -> Report:
    spec = replace(report.spec, waivers=dict(waived))
    return replace(report, spec=spec, findings=with_waivers(report.findings, spec))


def key_of(content: Content, spec: Spec) -> str:
    """The key of a verdict: a digest of all that decides it."""
    decides = [content.digest, options_of(spec), identity()]
    return hashlib.sha256(json.dumps(decides).encode()).hexdigest()


def options_of(spec: Spec) -> dict[str, Any]:
    """The options that decide a verdict, those that are not given left out, as plain data."""
    fields = {each.name: getattr(spec, each.name) for each in dataclasses.fields(spec)}
    return {
        name: _plain(value)
        for name, value in fields.items()
        if name not in APART and value is not None and value != () and value != {}
    }


def _plain(value: object) -> Any:
    if isinstance(value, Fraction):
        return str(value)
    if isinstance(value, Mapping):
        # Their order counts where there are several: the last one changes fastest.
        return [[name, _plain(each)] for name, each in value.items()]
    if isinstance(value, (tuple, list)):
        return [_plain(each) for each in value]
    if value is None or isinstance(value, (str, int, bool, float)):
        return value
    if hasattr(value, "text"):
        return str(value.text)
    raise TypeError(f"{type(value).__name__} is no option")


def _now() -> str:
    return datetime.now(UTC).isoformat(timespec="seconds")
