"""The properties, in the order in which reports list them.

A property is a module with a NAME and a function `judge(rhythm, spec) -> Finding`, or None for what the spec does
not claim, and for the reset of a divider that has none; a function `claim(spec) -> str` gives its claim where that
holds the spec's numbers. It only reads the rhythm and judges it: to add one, write a file, name it here, and add a
case of the same name. Those of inputs that move are judged where there are such, from
`Moves` in place of the rhythm.
"""

from __future__ import annotations

from properties import (
    enable,
    glitch_free,
    high_time,
    no_stuck,
    ratio,
    ratio_change,
    recovery,
    reset,
    settling,
)
from prover.findings import Finding, with_waivers
from prover.rhythm import Rhythm
from prover.spec import Spec

ORDER = (ratio, high_time, no_stuck, recovery, settling, glitch_free, reset)
NAMES = tuple(module.NAME for module in ORDER)
WHILE_MOVING = (ratio_change, enable)
EVERY = (*ORDER, *WHILE_MOVING)
ALL = tuple(module.NAME for module in EVERY)


def claim(name: str, spec: Spec) -> str:
    """What a property claims, with formulas as they are written; "" where it says none."""
    module = EVERY[ALL.index(name)]
    return str(module.claim(spec)) if hasattr(module, "claim") else ""


def judge_all(rhythm: Rhythm, spec: Spec) -> tuple[Finding, ...]:
    """Every property's finding, with the user's waivers on those that are not proved."""
    judged = [module.judge(rhythm, spec) for module in ORDER]
    return with_waivers([finding for finding in judged if finding is not None], spec)
