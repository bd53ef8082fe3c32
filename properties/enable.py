"""enable: stopping and starting the divider gives no short pulse; it parks, and its ratio comes back."""

from __future__ import annotations

from typing import TYPE_CHECKING

from properties.moves import judged
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
    facts: dict[str, Fact] = {"parked": list(found.parked), "park_half_cycles": found.still}
    says = f"no short pulse; {_parked(name, found)}; the ratio is back"
    return judged(NAME, claim, found, says, facts)


def _parked(name: str, found: Moves) -> str:
    if not found.parked:
        return f"the divider runs at either value of {name}"
    level = (
        f"at {found.parked[0]}" if len(found.parked) == 1 else "at the level that it has when it is stopped"
    )
    within = f" within {found.still} half-cycles" if found.still else ""
    return f"the output parks {level}{within}"
