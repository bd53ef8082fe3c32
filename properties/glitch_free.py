"""glitch-free: per half-cycle the output changes at most once, in whatever order simultaneous changes arrive."""

from __future__ import annotations

from prover.arrival import Glitch, told
from prover.findings import Fact, Finding, Obligation
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "glitch-free"
CLAIM = (
    "from every good state the output changes at most once in a half-cycle, whatever the order in which simultaneous "
    "changes reach it through gates of any delay"
)


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Refuted by a pulse of what is computed or of written gates; one of gates yet to be made is an obligation."""
    found = rhythm.glitches
    if found is None:
        why = rhythm.settling.open or "the micro-steps do not settle" if rhythm.settling.depth is None else ""
        return Finding(NAME, "open", CLAIM, why or rhythm.open or "not looked at", "")
    method = "every order of arrival, as the gates stand (solver)"
    if found.found is not None:
        text = told(found.found)
        replayed = "the order of arrival replayed on values"
        return Finding(
            NAME, "refuted", CLAIM, text, replayed, facts=facts_of(found.found), glitch=found.found
        )
    if found.open:
        return Finding(NAME, "open", CLAIM, found.open, "", f"looked at: {found.scope or 'nothing'}")
    obligations = tuple(Obligation(due.text, due.where, due.register) for due in found.dues)
    text = "no order of simultaneous changes makes the output pulse"
    if found.by_form:
        text, method = "the form of the output leaves no room for a second change", "by that form"
    if obligations:
        text += f", under {len(obligations)} timing obligation{'s' * (len(obligations) != 1)}"
    return Finding(NAME, "proved", CLAIM, text, method, found.scope, obligations=obligations)


def facts_of(glitch: Glitch) -> dict[str, Fact]:
    """What shows the pulse, for machines."""
    return {
        "kind": glitch.kind,
        "edge": glitch.edge,
        "state": dict(glitch.state),
        "arrivals": [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals],
        "levels": [glitch.level, *(a.level for a in glitch.arrivals)],
        "between": dict(glitch.between),
    }
