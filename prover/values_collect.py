"""From a report on each value to the evidence for its certificate."""

from __future__ import annotations

from dataclasses import replace

from prover.collect import collect
from prover.each import Basis
from prover.effort import Effort
from prover.together import Together
from prover.values_evidence import AllAtOnce, ValuesEvidence


def collect_values(basis: Basis, effort: Effort) -> ValuesEvidence:
    """The evidence of the values that were judged singly, each with its share of the time, and the proof of the
    others."""
    found = []
    for number, (values, report) in enumerate(basis.reports):
        share = max(2.0, effort.left / max(1, (len(basis.reports) - number) / 8))
        found.append((dict(values), collect(report, effort.share(share))))
    return ValuesEvidence(tuple(found), None if basis.together is None else _at_once(basis.together))


def _at_once(together: Together) -> AllAtOnce | None:
    machines, proof = together.machines, together.proof
    if proof.starts is None and proof.everywhere is None:
        return None
    under = machines.under_reset
    return AllAtOnce(
        settling=machines.settling.answers,
        reset=None if under is None else under.answers,
        glitches=together.glitches,
        proof=replace(proof, singly=()),
        bound=together.at_once.bound if proof.everywhere is not None else None,
    )
