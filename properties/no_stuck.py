"""no-stuck: the output never freezes, from any power-up state."""

from __future__ import annotations

from prover.findings import Counterexample, Finding
from prover.rhythm import Orbit, Rhythm
from prover.spec import Spec

NAME = "no-stuck"
CLAIM = "from every power-up state the output goes on changing for ever"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """Refuted by any state on whose loop the output is constant, whether or not reset can reach it."""
    method = rhythm.methods.get("power-up", "")
    frozen = rhythm.stuck or next((o for o in rhythm.orbits if _stuck(o)), None)
    if frozen is not None:
        wave = frozen.wave()
        level = wave.runs[0][0] if wave else 0
        lead, loop = frozen.lead_half_cycles, frozen.loop_half_cycles or 2
        text = f"the output stays {level} for ever once in a loop of {loop} states"
        broken = Counterexample(frozen, lead, lead + loop, text, "a power-up state")
        return Finding(
            NAME, "refuted", CLAIM, text, "counterexample replayed on the machine", counterexample=broken
        )
    if rhythm.never_stuck:
        return Finding(NAME, "proved", CLAIM, "no loop on which the output is constant", method)
    why = rhythm.open or (rhythm.recovery.open if rhythm.recovery else "")
    return Finding(NAME, "open", CLAIM, why, method)


def _stuck(orbit: Orbit) -> bool:
    wave = orbit.wave()
    return wave is not None and wave.stuck
