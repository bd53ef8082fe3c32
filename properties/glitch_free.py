"""glitch-free: per half-cycle the output changes at most once, in whatever order simultaneous changes arrive."""

from __future__ import annotations

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
    "function": "whatever gates it is made of",
    "gates": "with the gates as they are written",
}


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
        text, method = "the output changes with one bit at a time", "by the form of the output"
    if obligations:
        text += f", under {len(obligations)} timing obligation{'s' * (len(obligations) != 1)}"
    return Finding(NAME, "proved", CLAIM, text, method, found.scope, obligations=obligations)


def _told(glitch: Glitch) -> str:
    edge = "rising" if glitch.rising else "falling"
    arrival = glitch.arrivals[glitch.first]
    moved = [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals[: glitch.first + 1]]
    ends = glitch.arrivals[-1].level
    kept = f"stay {ends}" if ends == glitch.level else f"go from {glitch.level} to {ends} once"
    return (
        f"a pulse to {arrival.level} at the {edge} edge, where the output should {kept}, {SAID[glitch.kind]}: "
        f"when {', '.join(moved)} {'has' if len(moved) == 1 else 'have'} arrived before the rest"
    )


def _facts(glitch: Glitch) -> dict[str, Fact]:
    return {
        "kind": glitch.kind,
        "edge": "rising" if glitch.rising else "falling",
        "state": dict(glitch.state),
        "arrivals": [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals],
        "levels": [glitch.level, *(a.level for a in glitch.arrivals)],
        "between": dict(glitch.between),
    }
