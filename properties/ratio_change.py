"""ratio-change: while its inputs move, no pulse is shorter or longer than nominal ones; then the last ratio holds."""

from __future__ import annotations

from typing import TYPE_CHECKING

from properties.moves import judged
from prover.domain import among
from prover.findings import Finding
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
    return judged(NAME, claim, found, "no pulse is too short or too long; the new ratio holds", {})
