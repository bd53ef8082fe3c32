"""The parts of a report on two dividers: what was found, where they differ, and what that rests on."""

from __future__ import annotations

from collections.abc import Iterator

from prover.compared import Comparison, Difference
from prover.facts import LIMITS
from prover.pair import SIDES
from prover.report import apart, words
from prover.report.compared import joint_of
from prover.report.html import waves
from prover.report.html.markup import Content, Markup, element, prose
from prover.report.html.sections import (
    BROKEN,
    Part,
    Place,
    broken_scene,
    definitions,
    obligations,
    ring_mark,
    texts,
    values,
)
from prover.report.trace import drawing
from prover.report.wave import Drawing
from prover.trace import Trace


def title(comparison: Comparison) -> str:
    """Both dividers by name."""
    return f"{comparison.pair.old.design.top} and {comparison.pair.new.design.top}"


def parts(comparison: Comparison, place: Place) -> list[Part]:
    """The sections of a comparison in order, those without content left out."""
    made: list[Part] = [
        ("found", "Verdict", list(_found(comparison))),
        ("difference", "Difference", list(_difference(comparison))),
        ("obligations", "Obligations", list(obligations(comparison.outcome.obligations))),
        ("assumptions", "Assumptions", list(texts(comparison.assumptions))),
        ("notes", "Notes", list(texts(comparison.notes))),
        ("limits", "Limits", [element("p", LIMITS)]),
    ]
    return [(place.key + key, name, content) for key, name, content in made if content]


def _found(comparison: Comparison) -> Iterator[Markup]:
    outcome = comparison.outcome
    word = outcome.verdict
    rows: list[tuple[str, Content]] = [("claimed", comparison.claim)]
    rows += [("method", outcome.method)] if outcome.method else []
    if outcome.obligations:
        due = words.plural(len(outcome.obligations), "obligation")
        rows.append(("rests on", element("a", due, href="#obligations")))
    told = element("div", element("p", prose(outcome.says), class_="says"), definitions(rows))
    yield element("ol", element("li", element("div", ring_mark(word), class_=word), told), class_="verdicts")


def _difference(comparison: Comparison) -> Iterator[Markup]:
    found = comparison.outcome.difference
    if found is None:
        return
    yield element("p", element("strong", found.text))
    yield definitions([("start", found.cause), *_start(found)])
    made, left = _drawn(comparison, found)
    note = "Numbers count half-cycles from the start; the outputs differ between the ticks."
    if left:
        note += f" {words.plural(left, 'more register')} not drawn."
    scene = broken_scene(made, "The outputs where they differ", "difference-wave")
    yield element("figure", waves.figure(scene), element("figcaption", note))


def _start(found: Difference) -> Iterator[tuple[str, Content]]:
    """The inputs and the states from which both begin."""
    if isinstance(found.shown, Trace):
        first = found.shown.rests[0]
        yield "state", values({**first.inputs, **first.registers})
        return
    if found.shown.inputs:
        yield "inputs", values(found.shown.inputs)
    for side, orbit, system in zip(SIDES, found.shown.orbits, found.shown.systems, strict=True):
        yield side, values(system.describe(orbit.start))


def _drawn(comparison: Comparison, found: Difference) -> tuple[Drawing, int]:
    if isinstance(found.shown, Trace):
        both = joint_of(comparison).both
        return drawing(both.design, both.clock, found.shown, BROKEN)
    return apart.drawing(comparison, found, found.shown, BROKEN)
