"""A gate's run and a divider's history, for people and for machines.

The dividers of one entry that are proved stand in one line; every other one has a line of its own.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from itertools import groupby
from typing import Any

from prover.domain import ranges_text
from prover.gate.ledger import Event
from prover.gate.runner import Excused, Row, Run
from prover.output import harmless
from prover.report.look import Look, finished
from prover.several import Lapse

Object = dict[str, Any]

SHOWN = 12
"""Digits of a digest that are shown."""

SOON = 14
"""Days before a waiver's last one from which on that is told."""


def headed(row: Row, text: str) -> str:
    """A divider's report below the name that the manifest gives it; "" for none."""
    return f"divider {harmless(row.divider.name)}\n{text}" if text else ""


def render(run: Run, look: Look, reported: bool = False) -> str:
    """The table of a run, what is to be told of waivers, and the sum of it, ended by a newline; `reported` if it goes
    to reports, too."""
    lines = list(_table([_line(group) for group in _groups(run.rows)]))
    lines += [line for each in run.excused for line in _waiver(each)]
    if not reported and any(row.verdict == "proved" and _obligations(row) for row in run.rows):
        lines.append(
            "note      timing obligations are for timing analysis: see them with --html, --json or --sarif"
        )
    return finished([*lines, _sum(run)], look) + "\n"


def _groups(rows: Sequence[Row]) -> Iterator[list[Row]]:
    """Rows that share a line: neighbours of one entry with ranges that are proved, and of one source; and all that
    nobody got round to."""
    skipped = [row for row in rows if row.skipped]
    for (_, folds, *_), group in groupby(
        (row for row in rows if not row.skipped),
        key=lambda row: (row.divider.entry, row.divider.parameters and row.verdict == "proved", row.source),
    ):
        if folds:
            yield list(group)
        else:
            yield from ([row] for row in group)
    if skipped:
        yield skipped


def _line(rows: list[Row]) -> tuple[str, str, str, str]:
    """Verdict, name, time and words of a line."""
    first = rows[0]
    seconds = [row.kept.seconds for row in rows if row.kept is not None]
    words = [first.says]
    if first.skipped:
        more = f" and {len(rows) - 1} more" if len(rows) > 1 else ""
        return first.verdict.upper(), first.divider.name + more, "", first.says
    if len(rows) > 1:
        words = [f"{_ends(rows)}: {len(rows)} dividers"]
        if first.source == "new":
            slowest = max(rows, key=lambda row: row.kept.seconds if row.kept else 0.0)
            words[0] += f", the slowest {slowest.divider.name} {max(seconds):.2f} s"
    obligations = sum(map(_obligations, rows))
    if first.verdict == "proved" and obligations:
        words.append(f"under {obligations} timing obligation{'s' * (obligations > 1)}")
    words += sorted({f"{name} waived" for row in rows for name in _excused_by(row)})
    if first.kept is not None and not first.kept.certificate:
        words.append("no certificate")
    name = first.divider.name if len(rows) == 1 else first.divider.entry
    time = f"{sum(seconds):.2f} s" if first.source == "new" and seconds else first.source
    return first.verdict.upper(), name, "" if first.kept is None else time, "; ".join(filter(None, words))


def _obligations(row: Row) -> int:
    """How many timing obligations its verdict carries."""
    return sum(each.obligations for each in row.kept.properties) if row.kept is not None else 0


def _excused_by(row: Row) -> Iterator[str]:
    """The properties for which a waiver of the divider counts."""
    for each in row.kept.properties if row.kept else ():
        if each.verdict != "proved" and each.name in row.waived:
            yield each.name


def _ends(rows: Sequence[Row]) -> str:
    """The values of the ranges: N=2..512."""
    told = []
    for name in rows[0].divider.parameters:
        values = sorted({row.divider.parameters[name] for row in rows})
        ranges: list[tuple[int, int]] = []
        for value in values:
            follows = bool(ranges) and value == ranges[-1][1] + 1
            ranges[-1:] = [(ranges[-1][0], value)] if follows else [*ranges[-1:], (value, value)]
        told.append(f"{name}={ranges_text(ranges)}")
    return ", ".join(told)


def _table(rows: Sequence[Sequence[str]]) -> Iterator[str]:
    """The cells in columns; the last one is as long as it likes."""
    shown = [[harmless(cell) for cell in row] for row in rows]
    columns = max(map(len, shown), default=1) - 1
    widths = [max(len(row[column]) for row in shown) for column in range(columns)]
    for row in shown:
        cells = [f"{cell:{width}}" for cell, width in zip(row, widths, strict=False)]
        yield "  ".join([*cells, row[-1]]).rstrip()


def _waiver(each: Excused) -> Iterator[str]:
    waiver = each.waiver
    at = f"{waiver.where}: {each.entry or 'all'}: {waiver.name}"
    needless = f"{each.why}{' by now' * (each.why == 'proved')}" if each.why else ""
    if each.state == "expired":
        yield f"EXPIRED   {at} was waived until {waiver.until}: {waiver.reason}"
        yield (
            f"          hint: it is {needless}: take the waiver out"
            if needless
            else ("          hint: mend the divider, or judge the reason anew and give it another date")
        )
    elif each.state == "needless":
        yield f"note      {at} is {needless}: take its waiver out ({waiver.reason})"
    else:
        yield f"waived    {at} until {waiver.until}{_left(each.days)}: {waiver.reason}"


def waivers(run: Run) -> list[tuple[str, str]]:
    """Of each waiver its state, and what there is to tell of it as one sentence."""
    told = ((each.state, _waiver(each)) for each in run.excused)
    return [(state, "; ".join(" ".join(line.split()) for line in lines)) for state, lines in told]


def lapses(run: Run) -> list[Lapse]:
    """The waivers that have expired, as reports for other programs take them."""
    return [
        Lapse(
            f"{each.entry or 'all'}: {each.waiver.name}",
            f"the waiver expired on {each.waiver.until}: {each.waiver.reason}",
            each.waiver.where,
        )
        for each in run.expired
    ]


def _left(days: int) -> str:
    """How long it has left, where that is not long."""
    if days > SOON:
        return ""
    return f" ({days} more day{'s' * (days > 1)})" if days else " (today is the last day)"


def _sum(run: Run) -> str:
    counted = Counter(row.verdict for row in run.rows)
    sources = Counter(row.source for row in run.rows if row.kept is not None)
    told = ", ".join(f"{count} {what}" for what, count in counted.items())
    named = {"new": "judged now", "kept": "kept", "rechecked": "kept and rechecked"}
    how = ", ".join(f"{count} {named[source]}" for source, count in sources.items())
    expired = f"; {len(run.expired)} waiver{'s' * (len(run.expired) > 1)} expired" if run.expired else ""
    return f"{len(run.rows)} divider{'s' * (len(run.rows) != 1)}: {told}{expired}" + (
        f" ({how}, in {run.seconds:.2f} s)" if how else ""
    )


def as_object(run: Run) -> Object:
    """What JSON tells of a run beside the reports: `gate`, with a line for each divider in the manifest's order."""
    return {
        "gate": {
            "manifest": str(run.manifest.path),
            "dividers": [_as_object(row) for row in run.rows],
            "waivers": [
                {
                    "divider": each.entry or None,
                    "property": each.waiver.name,
                    "reason": each.waiver.reason,
                    "until": each.waiver.until.isoformat(),
                    "state": each.state,
                }
                for each in run.excused
            ],
            "seconds": round(run.seconds, 3),
        }
    }


def _as_object(row: Row) -> Object:
    return {
        "name": row.divider.name,
        "entry": row.divider.entry,
        "parameters": dict(row.divider.parameters),
        "files": list(row.files),
        "verdict": row.verdict,
        "says": row.says,
        "source": row.source,
        "decided": row.kept.decided if row.kept else None,
        "key": row.key,
        "certified": bool(row.kept and row.kept.certificate),
    }


# -- history -----------------------------------------------------------------------------------------------


def render_history(events: Sequence[Event], look: Look) -> str:
    """Verdicts over time: when, what, of which divider and content, and what had changed since its last verdict;
    ended by a newline. Dividers of one entry to which the same happened in one run stand in one line."""
    last: dict[str, Event] = {}
    rows: list[tuple[Event, str]] = []
    for event in events:
        rows.append((event, _changed(last.get(event.divider), event)))
        last[event.divider] = event
    lines = []
    for _, group in groupby(rows, key=lambda row: (row[0].run, row[0].entry, row[0].verdict, row[1])):
        same = list(group)
        event, changed = same[0]
        name = event.divider if len(same) == 1 else f"{event.divider} and {len(same) - 1} more"
        says = f"; {event.says}" if event.says and event.verdict != "proved" else ""
        when = event.run.replace("T", " ").removesuffix("+00:00")
        lines.append((when, event.verdict.upper(), name, event.sources[:SHOWN] or "-", changed + says))
    return finished(_table([("UTC", "verdict", "divider", "content", "what changed"), *lines]), look) + "\n"


def _changed(before: Event | None, now: Event) -> str:
    """What had changed, in words."""
    if before is None:
        return "first seen"
    told = []
    if before.sources != now.sources:
        told.append("sources")
    told += _pairs(before.options, now.options)
    if before.prover != now.prover:
        told.append(f"prover {before.prover} -> {now.prover}")
    for name in _pairs_of(before.waived, now.waived):
        how = "no" if name not in now.waived else "another" if name in before.waived else "a"
        told.append(f"{how} waiver of {name}")
    if before.files != now.files:
        told.append("names of files")
    return ", ".join(told) or "the verdict"


def _pairs(before: Mapping[str, str], now: Mapping[str, str]) -> Iterator[str]:
    for name in _pairs_of(before, now):
        yield f"{name.replace('_', '-')} {before.get(name, 'none')} -> {now.get(name, 'none')}"


def _pairs_of(before: Mapping[str, str], now: Mapping[str, str]) -> list[str]:
    """The names whose values differ."""
    return [name for name in {**before, **now} if before.get(name) != now.get(name)]
