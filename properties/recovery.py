"""recovery: every power-up state becomes good, within a computed number of half-cycles."""

from __future__ import annotations

from prover.findings import Counterexample, Fact, Finding
from prover.rhythm import Orbit, Rhythm
from prover.spec import Spec

NAME = "recovery"


def judge(rhythm: Rhythm, spec: Spec) -> Finding:
    """The worst over all power-up states, compared with the user's limit where there is one."""
    limit = f" within {spec.within} half-cycles" if spec.within is not None else ""
    claim = f"every power-up state reaches the specified wave{limit}, with no reset"
    method = rhythm.methods.get("power-up", "")
    found = rhythm.recovery
    if found is None:
        return Finding(NAME, "open", claim, rhythm.open, method)
    facts: dict[str, Fact] = {"worst_half_cycles": found.worst, "exact": found.exact}
    if found.illegal is not None:
        facts["illegal_states"] = found.illegal
    if found.slowest is not None:
        facts["slowest_state"] = rhythm.system.describe(found.slowest)
    if found.lost is not None:
        text = _lost(found.lost)
        lead = found.lost.lead_half_cycles
        broken = Counterexample(
            found.lost, lead, lead + (found.lost.loop_half_cycles or 2), text, "a power-up state"
        )
        replayed = "counterexample replayed on the machine"
        return Finding(NAME, "refuted", claim, text, replayed, facts=facts, counterexample=broken)
    if found.worst is None:
        return Finding(NAME, "open", claim, found.open, method, facts=facts)
    word = "exactly" if found.exact else "at most"
    text = f"worst recovery {word} {found.worst} half-cycles"
    if spec.within is not None and found.worst > spec.within:
        return _too_late(rhythm, spec, claim, text, facts, found.exact)
    return Finding(NAME, "proved", claim, text, method, f"{found.worst} half-cycles", facts)


def _lost(orbit: Orbit) -> str:
    wave = orbit.wave()
    loop = orbit.loop_half_cycles
    if wave is None:
        return f"a loop of {loop} states that is not the specified wave"
    if wave.stuck:
        return f"locks up: a loop of {loop} states on which the output stays {wave.runs[0][0]}"
    if len(wave.runs) == 2:
        return f"locks up in a loop of {loop} states: period {wave.period} half-cycles, high {wave.high}"
    pattern = ", ".join(f"{'high' if level else 'low'} {length}" for level, length in wave.runs[:8])
    more = ", …" if len(wave.runs) > 8 else ""
    return f"locks up in a loop of {loop} states: {pattern}{more} half-cycles"


def _too_late(
    rhythm: Rhythm, spec: Spec, claim: str, text: str, facts: dict[str, Fact], exact: bool
) -> Finding:
    slowest = rhythm.recovery.slowest if rhythm.recovery else None
    worst = rhythm.recovery.worst if rhythm.recovery else None
    if not exact or slowest is None or worst is None:
        return Finding(NAME, "open", claim, text, rhythm.methods.get("power-up", ""), facts=facts)
    orbit = rhythm.orbit_from(slowest)
    broken = Counterexample(orbit, 0, worst, f"{text}, more than {spec.within}", "the slowest power-up state")
    replayed = "counterexample replayed on the machine"
    return Finding(NAME, "refuted", claim, broken.text, replayed, facts=facts, counterexample=broken)
