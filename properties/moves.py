"""What ratio-change and enable share: the finding on inputs that move."""

from __future__ import annotations

from typing import TYPE_CHECKING

from properties.glitch_free import facts_of
from prover.findings import Fact, Finding

if TYPE_CHECKING:
    from prover.moves import Moves


def judged(name: str, claim: str, found: Moves, says: str, more: dict[str, Fact]) -> Finding:
    """The finding. `says` is how the words begin where the claim is proved, and `more` are facts of that."""
    facts: dict[str, Fact] = {"inputs": list(found.question.moving)}
    if found.trace is not None:
        facts |= facts_of(found.glitch) if found.glitch is not None else {}
        return Finding(name, "refuted", claim, found.trace.text, found.method, facts=facts, trace=found.trace)
    if not found.proved or found.back is None:
        return Finding(name, "open", claim, found.open, found.method, facts=facts)
    facts |= {"back_half_cycles": found.back, "exact": found.exact, **more}
    word = "exactly" if found.exact else "at most"
    says = f"{says} {word} {found.back} half-cycles after the last move"
    if not found.question.steady:
        says += "; what happens within a half-cycle aside, of which settling and glitch-free tell"
    if found.owed:
        says += f"; under {len(found.owed)} timing obligation{'s' * (len(found.owed) != 1)}"
    return Finding(
        name, "proved", claim, says, found.method, f"{found.back} half-cycles", facts, obligations=found.owed
    )
