"""The certificate of a comparison, schema "subharmonic/comparison-certificate-1": its verdict and what it rests on.

Like that of a single divider it holds nothing but what follows from the sources, the options and the evidence, so
that `recheck` can make it again and compare; nothing in it tells of the run that made it.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Sequence
from dataclasses import dataclass
from json import dumps
from pathlib import Path

from prover import expr as e
from prover import pair_evidence
from prover.compared import Apart, Comparison, claim
from prover.effort import Effort
from prover.errors import InternalError
from prover.joint import Joint
from prover.pair import SIDES, Pair, Pairing
from prover.pair_evidence import PairEvidence
from prover.pair_rebuild import Rebuilt, rebuild
from prover.ports import Ports
from prover.rebuild import Rejected
from prover.report.certificate import Object, Subject, digest, options, relative, render
from prover.spec import Spec
from prover.trace import Trace

SCHEMA = "subharmonic/comparison-certificate-1"


@dataclass(frozen=True, slots=True)
class Subjects:
    """What a comparison is about: the old divider, the new one, and what is asked of both."""

    sides: tuple[Subject, Subject]
    pairing: Pairing


def certify(
    comparison: Comparison, old: Sequence[str | Path], new: Sequence[str | Path], effort: Effort
) -> str | None:
    """The certificate of a comparison of these files; None where what its verdict rests on can't be written.

    Raises InternalError where the evidence says something else than the report."""
    from prover.pair_collect import collect

    found = collect(comparison, effort)
    if found is None:
        return None
    found = _as_read(found)
    pair, pairing = comparison.pair, comparison.pairing
    try:
        made = rebuild(pair, pairing, found, Effort(math.inf))
    except Rejected as fault:
        raise InternalError(f"the evidence for a certificate fails: {fault}") from fault
    outcome = comparison.outcome
    if (made.outcome.verdict, made.outcome.lag) != (outcome.verdict, outcome.lag):
        raise InternalError(
            f"the evidence shows {made.outcome.verdict} with a lag of {made.outcome.lag}, "
            f"the report {outcome.verdict} with {outcome.lag}"
        )
    subjects = Subjects((_subject(pair.old, pairing.old, old), _subject(pair.new, pairing.new, new)), pairing)
    return render(document(subjects, pair, found, made))


def _as_read(found: PairEvidence) -> PairEvidence:
    """The evidence as it comes out of a certificate: expressions are simplified when they are made."""
    for _ in range(8):
        again = pair_evidence.read(pair_evidence.as_object(found))
        if again == found:
            return found
        found = again
    raise InternalError("evidence that does not come out as it went in")


def _subject(ports: Ports, spec: Spec, files: Sequence[str | Path]) -> Subject:
    read = ports.design.files
    return Subject(
        spec,
        tuple(relative(file) for file in files),
        tuple(relative(folder) for folder in spec.include),
        tuple((relative(file), digest(Path(file))) for file in read),
    )


def document(subjects: Subjects, pair: Pair, found: PairEvidence, made: Rebuilt) -> Object:
    """The certificate as plain dictionaries and lists."""
    outcome = made.outcome
    difference = outcome.difference
    return {
        "schema": SCHEMA,
        "verdict": outcome.verdict,
        "claim": claim(pair, subjects.pairing),
        "says": outcome.says,
        "lag_half_cycles": outcome.lag,
        "settled_half_cycles": outcome.facts.get("settled_half_cycles"),
        "differs": None if difference is None else [difference.old_half_cycle, difference.new_half_cycle],
        "trace_sha256": _trace(difference.shown) if difference is not None else None,
        "asked": asked(subjects.pairing),
        "sides": sides(subjects),
        "sha256": bound_to(subjects),
        "machine": None if made.joint is None else _machine(made.joint),
        "timing_obligations": [{"side": side, "text": owed.text} for side, owed in outcome.obligations],
        "evidence": pair_evidence.as_object(found),
        "obligations": [{"name": each.name, "script": each.script()} for each in made.obligations],
    }


def _trace(shown: Apart | Trace) -> str | None:
    """The SHA-256 of a run of both side by side, in hexadecimal: every input and register at every rest."""
    if not isinstance(shown, Trace):
        return None
    rests = [[r.half_cycle, r.moved, dict(r.inputs), dict(r.registers)] for r in shown.rests]
    return hashlib.sha256(dumps(rests).encode()).hexdigest()


def asked(pairing: Pairing) -> Object:
    """In what sense the outputs are claimed to be equal."""
    return {
        "holds": dict(pairing.holds),
        "maps": dict(pairing.maps),
        "moving": list(pairing.moving),
        "start": pairing.start,
        "lag": "any" if pairing.lag is None else pairing.lag,
        "settled": pairing.settled,
    }


def sides(subjects: Subjects) -> list[Object]:
    """How each divider is read, and the files that were."""
    return [
        {
            "side": name,
            **options(subject),
            "read": [{"path": path, "sha256": sha256} for path, sha256 in subject.digests],
        }
        for name, subject in zip(SIDES, subjects.sides, strict=True)
    ]


def bound_to(subjects: Subjects) -> str:
    """The SHA-256 that binds what is asked, the options and the files' digests to one another, in hexadecimal."""
    return hashlib.sha256(dumps([asked(subjects.pairing), sides(subjects)]).encode()).hexdigest()


def _machine(joint: Joint) -> Object:
    """Both dividers as one transition relation, as SMT-LIB definitions over its variables."""
    named = {f"next {name}": step for name, step in zip(joint.names, joint.step, strict=True)}
    named |= {"the outputs differ": joint.differs, "they differ after the edge": joint.differs_at_edge}
    return {
        "variables": dict(joint.variables),
        "moves": dict(joint.moves),
        "starts": [start.cause for start in joint.starts],
        "definitions": e.smtlib_definitions(named),
    }
