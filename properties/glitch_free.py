"""glitch-free: per half-cycle the output changes at most once, in whatever order simultaneous changes arrive."""

from __future__ import annotations

from collections.abc import Mapping

from prover.arrival import Glitch
from prover.findings import Fact, Finding, Obligation
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "glitch-free"
CLAIM = (
    "from every good state the output changes at most once in a half-cycle, whatever the order in which simultaneous "
    "changes reach it through gates of any delay"
)
SAID = {
    "function": "no gates can cure that, for it is what they compute",
    "gates": "the gates as they are written do that, what they compute does not",
}

MOST_TOLD = 6
"""Bits or values that are told in a sentence; the rest is counted."""


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Refuted by a pulse of what is computed or of written gates; one of gates yet to be made is an obligation."""
    found = rhythm.glitches
    if found is None:
        why = rhythm.settling.open or "the micro-steps do not settle" if rhythm.settling.depth is None else ""
        return Finding(NAME, "open", CLAIM, why or rhythm.open or "not looked at", "")
    method = "every order of arrival, as the gates stand (solver)"
    if found.found is not None:
        text = _told(found.found)
        replayed = "the order of arrival replayed on values"
        return Finding(NAME, "refuted", CLAIM, text, replayed, facts=_facts(found.found), glitch=found.found)
    if found.open:
        return Finding(NAME, "open", CLAIM, found.open, "", f"looked at: {found.scope or 'nothing'}")
    obligations = tuple(Obligation(due.text, due.where, due.register) for due in found.dues)
    text = "no order of simultaneous changes makes the output pulse"
    if found.by_form:
        text, method = "the form of the output leaves no room for a second change", "by that form"
    if obligations:
        text += f", under {len(obligations)} timing obligation{'s' * (len(obligations) != 1)}"
    return Finding(NAME, "proved", CLAIM, text, method, found.scope, obligations=obligations)


def _told(glitch: Glitch) -> str:
    arrival = glitch.arrivals[glitch.first]
    before = {name: value for name, value in glitch.state.items() if name in arrival.seen}
    moved = [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals[: glitch.first + 1]]
    ends = glitch.arrivals[-1].level
    kept = f"stay {ends}" if ends == glitch.level else f"go from {glitch.level} to {ends} once"
    between = {name: value for name, value in arrival.seen.items() if before.get(name) != value}
    return (
        f"pulses to {arrival.level} at the {glitch.edge} edge from {_values(before)}, where it should {kept}: once "
        f"{_listed(moved)} {'has' if len(moved) == 1 else 'have'} arrived before the rest, {_values(between)}; "
        f"{SAID[glitch.kind]}"
    )


def _values(values: Mapping[str, int]) -> str:
    return _listed([f"{name}={value}" for name, value in values.items()])


def _listed(parts: list[str]) -> str:
    more = f" and {len(parts) - MOST_TOLD} more" if len(parts) > MOST_TOLD else ""
    return ", ".join(parts[:MOST_TOLD]) + more


def _facts(glitch: Glitch) -> dict[str, Fact]:
    return {
        "kind": glitch.kind,
        "edge": glitch.edge,
        "state": dict(glitch.state),
        "arrivals": [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals],
        "levels": [glitch.level, *(a.level for a in glitch.arrivals)],
        "between": dict(glitch.between),
    }
