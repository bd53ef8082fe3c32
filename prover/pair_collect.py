"""From a comparison to the evidence for a certificate: what the engines found, in the form that others can check."""

from __future__ import annotations

from dataclasses import replace

from prover import collect as single
from prover.compared import Apiece, Comparison, Together
from prover.effort import Effort
from prover.equality import STATED, Invariant
from prover.evidence import Evidence
from prover.findings import Report
from prover.pair_evidence import Both, PairEvidence, Runs, Settled, Shows, Value
from prover.pair_rebuild import claim_of
from prover.ports import Ports
from prover.rhythm import Rhythm
from prover.settling import settle
from prover.solve import Model
from prover.spec import Spec


def collect(comparison: Comparison, effort: Effort) -> PairEvidence | None:
    """The evidence for the verdict; None for one that is open, or rests on what is too large to be written."""
    outcome, pairing = comparison.outcome, comparison.pairing
    shown = outcome.evidence
    if shown is None or outcome.verdict == "open":
        return None
    if isinstance(shown, Together):
        lag = (outcome.lag if outcome.lag is not None else pairing.lag) or 0
        if not isinstance(shown.shown, frozenset) or len(shown.shown) <= STATED:
            return Both(lag, shown.joint.answers, shown.shown)
        return _related(shown, lag, effort)
    if pairing.settled:
        if outcome.verdict != "proved" or pairing.lag is not None:
            return None
        return _settled(shown, comparison, effort)
    if shown.joint is None:
        return None
    values = []
    for each in shown.followed:
        old, new = (_side(*one, effort) for one in zip(each.ports, each.rhythms, strict=True))
        values.append(Value(each.inputs, (old, new)))
    return Runs(shown.joint.answers, tuple(values))


def _related(shown: Together, lag: int, effort: Effort) -> Both | None:
    """Relations in place of a set of states that is too long."""
    from prover import relations

    claim: Invariant | None = relations.invariant(shown.joint, effort)
    return None if claim is None else Both(lag, shown.joint.answers, claim)


# -- each on its own ---------------------------------------------------------------------------------------


def _side(ports: Ports, rhythm: Rhythm, effort: Effort) -> Evidence:
    """One divider's machine, and its runs."""
    answers = rhythm.settling.answers
    whole, _ = settle(
        ports.design,
        ports.clock,
        ports.running,
        ports.output_value,
        effort,
        ask=single.repeated(answers),
    )
    tracks = tuple(single.track(orbit) for orbit in rhythm.orbits)
    return replace(single.of_machine(rhythm.system, whole, answers), starts=tracks)


# -- once both have settled --------------------------------------------------------------------------------


def _settled(shown: Apiece, comparison: Comparison, effort: Effort) -> Settled | None:
    values: list[tuple[Model, tuple[Shows, Shows]]] = []
    pairing = comparison.pairing
    for each in shown.followed:
        sides = [
            _shows(*one, effort)
            for one in zip(each.ports, each.rhythms, (pairing.old, pairing.new), strict=True)
        ]
        old, new = sides
        if old is None or new is None:
            return None
        values.append((each.inputs, (old, new)))
    return Settled(tuple(values))


def _shows(ports: Ports, rhythm: Rhythm, spec: Spec, effort: Effort) -> Shows | None:
    """What one divider comes to show, and the evidence; None where that is constant or has several pulses, or where
    the evidence can't be written."""
    wave = rhythm.loops[0].wave
    if len(wave.runs) != 2 or rhythm.recovery is None or rhythm.recovery.worst is None:
        return None
    period, high = wave.period or 0, wave.high or 0
    bare = replace(rhythm, scope="any", starts=(), orbits=())
    report = Report(ports, claim_of(spec, period, high), bare, (), {}, (), (), 0.0)
    found = single.collect(report, effort, glitches=False)
    return None if found.everywhere is None else Shows(period, high, found)
