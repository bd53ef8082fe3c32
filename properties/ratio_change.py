"""ratio-change: while its inputs move, no pulse is shorter or longer than nominal ones; then the last ratio holds."""

from __future__ import annotations

from typing import TYPE_CHECKING

from properties.glitch_free import facts_of
from prover.domain import among
from prover.findings import Fact, Finding
from prover.spec import Spec

if TYPE_CHECKING:
    from prover.moves import Moves

NAME = "ratio-change"


def judge(found: Moves, spec: Spec) -> Finding:
    """Every pulse of every run lies between the shortest and the longest nominal one of its level, among the values
    that the inputs have had so far; some half-cycles after the last move the wave is that of the last value."""
    moving = found.question.moving
    told = f"however {' and '.join(moving)} move{'s' * (len(moving) == 1)}{among(spec, moving)}"
    claim = (
        f"{told}, no pulse is shorter than the shortest or longer than the longest nominal one of the "
        "values so far, and the last ratio comes to hold"
    )
    facts: dict[str, Fact] = {"inputs": list(found.question.moving)}
    if found.trace is not None:
        facts |= facts_of(found.glitch) if found.glitch is not None else {}
        return Finding(NAME, "refuted", claim, found.trace.text, found.method, facts=facts, trace=found.trace)
    if not found.proved or found.back is None:
        return Finding(NAME, "open", claim, found.open, found.method, facts=facts)
    facts |= {"back_half_cycles": found.back, "exact": found.exact}
    word = "exactly" if found.exact else "at most"
    back = f"the new ratio holds {word} {found.back} half-cycles after the last move"
    says = f"no pulse is too short or too long; {back}"
    if not found.question.steady:
        says += "; what happens within a half-cycle aside, of which settling and glitch-free tell"
    if found.owed:
        says += f"; under {len(found.owed)} timing obligation{'s' * (len(found.owed) != 1)}"
    return Finding(
        NAME, "proved", claim, says, found.method, f"{found.back} half-cycles", facts, obligations=found.owed
    )
