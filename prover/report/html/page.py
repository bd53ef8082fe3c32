"""The file around a report, or around several: head, index, foot. It forbids itself scripts and the network."""

from __future__ import annotations

import hashlib
import os
from base64 import b64encode
from collections import Counter
from collections.abc import Sequence
from importlib.resources import files

from prover import __version__
from prover.compared import Comparison
from prover.findings import Report
from prover.pair import SIDES
from prover.ports import Ports
from prover.report import several, words
from prover.report.html import compared
from prover.report.html.markup import Markup, element, joined, prose
from prover.report.html.sections import MOST_STACKED, Part, Place, about, parts, ring_mark, section
from prover.several import Outcome

MOST_OPEN = 4
"""Dividers with something wrong that are shown at once; of more, the reader opens one after the other."""

MOST_WHOLE = 100
"""Dividers in one file up to which each is told whole."""

SOUND = ("proved", "measured")

WORST = ("measured", "proved", "open", "refuted", "error", "fault")
"""Outcomes, the worst last."""


def render(report: Report) -> str:
    """One report as a file. Nothing in it tells of the run: the same input gives the same bytes."""
    place = Place()
    made = parts(report, place)
    head = element(
        "header",
        _maker(),
        element("h1", report.ports.design.top),
        *_opening(report),
        about(report.ports, report.each.shown if report.each else ()),
    )
    main = element("main", (section(part, place) for part in made), id="main")
    title = f"{report.ports.design.top}: {_word(report)}"
    return _file(title, joined([head, _contents(made), main]))


def render_several(found: Sequence[Outcome], waivers: Sequence[tuple[str, str]] = ()) -> str:
    """What came of several dividers as one file: a table of all, then a section for each. `waivers` are those
    of a gate, each with its state and what there is to say of it; one that has expired fails the gate."""
    count = words.plural(len(found), "divider")
    words_of = [several.word(outcome) for outcome in found]
    counted = ", ".join(f"{n} {word.lower()}" for word, n in Counter(words_of).items())
    worst = max((word.lower() for word in words_of), key=WORST.index, default="measured")
    if worst in SOUND and any(state == "expired" for state, _ in waivers):
        worst, counted = "error", f"{counted}, but a waiver has expired"
    overall = [ring_mark(worst), element("b", worst), element("span", counted)]
    head = element("header", _maker(), element("h1", count), element("p", overall, class_=f"overall {worst}"))
    few = sum(word.lower() not in SOUND for word in words_of) <= MOST_OPEN
    brief = len(found) > MOST_WHOLE
    dividers = (_divider(outcome, i, few, brief) for i, outcome in enumerate(found))
    main = element("main", _index(found), _waivers(waivers), dividers, id="main")
    return _file(f"{count}: {counted}", joined([head, main]))


def _word(report: Report) -> str:
    return report.verdict if report.findings else "measured"


def _opening(report: Report) -> list[Markup]:
    """The overall verdict and the claim."""
    word = _word(report)
    waived = sum(finding.waived is not None for finding in report.findings)
    counted = Counter(finding.verdict for finding in report.findings)
    told = ", ".join(f"{count} of {len(report.findings)} {verdict}" for verdict, count in counted.items())
    told += f", {waived} waived" if waived else ""
    overall = [ring_mark(word), element("b", word), element("span", told)]
    claim = words.claim(report)
    line = f"Claim: {claim}." if claim else "A measurement: nothing is claimed."
    return [element("p", overall, class_=f"overall {word}"), element("p", prose(line), class_="claim")]


def _contents(made: Sequence[Part]) -> Markup:
    links = (element("li", element("a", title, href=f"#{key}")) for key, title, _ in made)
    return element("nav", element("ul", links), aria_label="Sections")


# -- two compared ------------------------------------------------------------------------------------------


def render_compared(comparison: Comparison) -> str:
    """Two dividers compared, as a file."""
    place = Place()
    made = compared.parts(comparison, place)
    word = comparison.verdict
    sides = zip(SIDES, (comparison.pair.old, comparison.pair.new), strict=True)
    head = element(
        "header",
        _maker(),
        element("h1", compared.title(comparison)),
        element("p", ring_mark(word), element("b", word), class_=f"overall {word}"),
        element("p", prose(f"Claim: {comparison.claim}."), class_="claim"),
        element("div", (_side(side, ports) for side, ports in sides), class_="sides"),
    )
    main = element("main", (section(part, place) for part in made), id="main")
    return _file(f"{compared.title(comparison)}: {word}", joined([head, _contents(made), main]))


def _side(side: str, ports: Ports) -> Markup:
    return element("div", element("p", f"{side}: ", element("b", ports.design.top)), about(ports))


# -- several -----------------------------------------------------------------------------------------------


def _index(found: Sequence[Outcome]) -> Markup:
    names = ("divider", "verdict", "remarks", "file")
    head = (element("th", name, scope="col") for name in names)
    rows = []
    for index, outcome in enumerate(found):
        word = several.word(outcome).lower()
        mark = element("span", ring_mark(word), " ", word, class_=f"word {word}")
        link = element("a", _top(outcome), href=f"#{_key(index)}top")
        cells = [
            element("th", link, scope="row"),
            element("td", mark, class_="short", data_head=names[1]),
            element("td", _remarks(outcome), class_="long", data_head=names[2]),
            element("td", element("span", outcome.name, class_="name"), class_="long", data_head=names[3]),
        ]
        rows.append(element("tr", cells))
    kind = "told" if len(rows) <= MOST_STACKED else None
    table = element("table", element("thead", element("tr", head)), element("tbody", rows), class_=kind)
    title = element("h2", "All dividers", id="index-title", class_="title")
    inner = element("div", table, class_="scroll")
    return element("section", title, inner, id="index", class_="index", aria_labelledby="index-title")


def _waivers(told: Sequence[tuple[str, str]]) -> list[Markup]:
    if not told:
        return []
    title = element("h2", "Waivers", id="waivers-title", class_="title")
    items = element("ul", (element("li", text, class_=state) for state, text in told))
    return [element("section", title, items, id="waivers", class_="index", aria_labelledby="waivers-title")]


def _remarks(outcome: Outcome) -> Markup:
    """What is wrong or measured, then what is waived, and what the verdict rests on."""
    findings = outcome.report.findings if outcome.report else ()
    told = [several.says(outcome)]
    told += [f"{f.name} waived" for f in findings if f.waived is not None and f.verdict != "proved"]
    due = sum(len(finding.obligations) for finding in findings)
    if due and several.word(outcome) == "PROVED":
        told.append(f"under {due} timing obligation{'s' * (due > 1)}")
    return prose("; ".join(filter(None, told)))


def _key(index: int) -> str:
    return f"d{index + 1}-"


def _top(outcome: Outcome) -> str:
    """The divider's name in a manifest or its top's, or its file's where the file could not be read."""
    if outcome.title:
        return outcome.title
    return outcome.report.ports.design.top if outcome.report else os.path.basename(outcome.name)


def _divider(outcome: Outcome, index: int, few: bool, brief: bool) -> Markup:
    """One divider, folded away if it is proved or measured, or one of many that are not. In brief what is proved is
    told without its states."""
    word = several.word(outcome).lower()
    place = Place(_key(index), 3)
    heading = element("h2", _top(outcome), id=f"{place.key}top")
    body: list[Markup] = [heading]
    if outcome.report is not None:
        brief = brief and word in SOUND
        made = parts(outcome.report, place, left_out=("states",) if brief else ())
        report = outcome.report
        body += [*_opening(report), about(report.ports, report.each.shown if report.each else ())]
        body += [section(part, place) for part in made]
        if brief:
            body.append(element("p", "Its states are in a page of fewer dividers.", class_="quiet"))
    else:
        told = outcome.error or outcome.fault or outcome.open
        body += [element("p", line) for line in str(told).split("\n")]
    summary = element(
        "summary",
        element("span", ring_mark(word), class_=word),
        element("span", word, class_=f"word {word}"),
        element("b", _top(outcome)),
        element("span", outcome.name, class_="file"),
    )
    return element("details", summary, body, class_="divider", open=few and word not in SOUND)


# -- the file ----------------------------------------------------------------------------------------------


def _maker() -> Markup:
    """The program's name beside a clock and the half of it."""
    wave = "M1 7h4V2h4v5h4V2h4v5h4V2h4v5h4V2h4v5h4M1 18h8v-6h8v6h8v-6h8v6h4"
    mark = element(
        "svg",
        element("path", d=wave, class_="line"),
        width=38,
        height=20,
        viewBox="0 0 38 20",
        aria_hidden="true",
    )
    return element("div", mark, "Subharmonic report", class_="maker")


def _file(title: str, body: Markup) -> str:
    style = files("prover.report.html").joinpath("style.css").read_text(encoding="utf-8")
    digest = b64encode(hashlib.sha256(style.encode()).digest()).decode()
    policy = f"default-src 'none'; style-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=policy),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="color-scheme", content="light dark"),
        element("meta", name="referrer", content="no-referrer"),
        element("title", title),
        # The style is this package's own and no text of the user's; it stands as it is.
        element("style", Markup(style)),
    )
    skip = element("a", "Skip to the report", href="#main", class_="skip")
    foot = element("footer", f"Subharmonic {__version__}. Time is counted in half-cycles of the input clock.")
    return "<!DOCTYPE html>\n" + element("html", head, element("body", skip, body, foot), lang="en") + "\n"
