"""enable: stopping and starting the divider gives no short pulse; it parks, and its ratio comes back."""

from __future__ import annotations

from typing import TYPE_CHECKING

from properties.glitch_free import facts_of
from prover.domain import among
from prover.findings import Fact, Finding
from prover.spec import Spec

if TYPE_CHECKING:
    from prover.moves import Moves

NAME = "enable"


def judge(found: Moves, spec: Spec) -> Finding:
    """No pulse of any run is shorter than nominal; where the divider does not run the output comes to stay; where it
    runs the wave is right some half-cycles after the last move."""
    (name,) = found.question.moving
    kept = found.question.rigid
    told = f"however {name} moves"
    if kept:
        told += f" while {' and '.join(kept)} keep{'s' * (len(kept) == 1)} any one value{among(spec, kept)}"
    claim = (
        f"{told}, no pulse is shorter than nominal, the output parks while the divider is stopped, and "
        "the ratio comes back"
    )
    facts: dict[str, Fact] = {"inputs": [name]}
    if found.trace is not None:
        facts |= facts_of(found.glitch) if found.glitch is not None else {}
        return Finding(NAME, "refuted", claim, found.trace.text, found.method, facts=facts, trace=found.trace)
    if not found.proved or found.back is None:
        return Finding(NAME, "open", claim, found.open, found.method, facts=facts)
    facts |= {"back_half_cycles": found.back, "exact": found.exact, "parked": list(found.parked)}
    facts["park_half_cycles"] = found.still
    word = "exactly" if found.exact else "at most"
    back = f"the ratio is back {word} {found.back} half-cycles after the last move"
    says = f"no short pulse; {_parked(name, found)}; {back}"
    if not found.question.steady:
        says += "; what happens within a half-cycle aside, of which settling and glitch-free tell"
    if found.owed:
        says += f"; under {len(found.owed)} timing obligation{'s' * (len(found.owed) != 1)}"
    return Finding(
        NAME, "proved", claim, says, found.method, f"{found.back} half-cycles", facts, obligations=found.owed
    )


def _parked(name: str, found: Moves) -> str:
    if not found.parked:
        return f"the divider runs at either value of {name}"
    level = (
        f"at {found.parked[0]}" if len(found.parked) == 1 else "at the level that it has when it is stopped"
    )
    within = f" within {found.still} half-cycles" if found.still else ""
    return f"the output parks {level}{within}"
