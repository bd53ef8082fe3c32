"""settling: every step settles within a proved number of micro-steps, whatever the order of simultaneous events."""

from __future__ import annotations

from prover.findings import Fact, Finding, Obligation
from prover.rhythm import Rhythm
from prover.spec import Spec

NAME = "settling"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Refuted by a step that never ends, or an outcome that hangs on an order no timing inequality can fix."""
    found = rhythm.settling
    claim = "every step settles, and its outcome does not hang on the order of simultaneous events"
    obligations = tuple(
        Obligation(r.text, r.where, r.register, r.via) for r in found.races if r.kind != "pulse"
    )
    facts: dict[str, Fact] = {"micro_steps": found.depth}
    if rhythm.races_won:
        facts["if_the_edge_won"] = list(rhythm.races_won)
    if found.unsettled is not None:
        when = "at power-up" if found.unsettled.power_up else "after a clock edge"
        text = f"never settles {when}: a round of {len(found.unsettled.cycle)} micro-steps goes on for ever"
        replayed = "the round replayed on values"
        return Finding(NAME, "refuted", claim, text, replayed, facts=facts, unsettled=found.unsettled)
    pulses = [race for race in found.races if race.kind == "pulse"]
    if pulses:
        race = pulses[0]
        facts["state"] = rhythm.system.describe(race.state)
        method = "hazard search over every order of the changing bits"
        return Finding(NAME, "refuted", claim, race.text, method, facts=facts, obligations=obligations)
    if found.open or found.depth is None:
        return Finding(NAME, "open", claim, found.open, "", facts=facts)
    method = "by the form of the step" if found.by_form else "no state moves after the bound (solver)"
    text = f"settles within {found.depth} micro-step{'s' * (found.depth != 1)}"
    if obligations:
        text += f", under {len(obligations)} timing obligation{'s' * (len(obligations) != 1)}"
    bound = f"{found.depth} micro-step{'s' * (found.depth != 1)}"
    return Finding(NAME, "proved", claim, text, method, bound, facts, obligations)
