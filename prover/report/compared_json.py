"""The report on two dividers, for machines: schema "subharmonic/comparison-1". Key order is stable, times are
half-cycles; keys may be added, none is renamed."""

from __future__ import annotations

from json import dumps

from prover.compared import Apart, Comparison, Difference
from prover.facts import LIMITS
from prover.pair import SIDES, Pair, Pairing
from prover.report.json import Object, of_obligation, of_ports, of_trace

SCHEMA = "subharmonic/comparison-1"


def render(comparison: Comparison) -> str:
    """The report as JSON text, one object, ended by a newline."""
    return dumps(as_object(comparison), indent=2) + "\n"


def as_object(comparison: Comparison) -> Object:
    """The report as plain dictionaries and lists."""
    outcome = comparison.outcome
    return {
        "schema": SCHEMA,
        "verdict": outcome.verdict,
        "old": of_ports(comparison.pair.old),
        "new": of_ports(comparison.pair.new),
        "asked": asked(comparison.pair, comparison.pairing),
        "claim": comparison.claim,
        "says": outcome.says,
        "method": outcome.method,
        "lag_half_cycles": outcome.lag,
        "facts": dict(outcome.facts),
        "difference": None if outcome.difference is None else _difference(outcome.difference),
        "obligations": [{"side": side, **of_obligation(owed)} for side, owed in outcome.obligations],
        "assumptions": list(comparison.assumptions),
        "notes": list(comparison.notes),
        "limits": LIMITS,
        "seconds": round(comparison.seconds, 3),
    }


def asked(pair: Pair, pairing: Pairing) -> Object:
    """In what sense the outputs were compared: where from, how late, and the inputs that both share."""
    inputs = [
        {"name": x.name, "old": x.old, "new": x.new, "width": x.width, "moving": x.moving}
        for x in pair.inputs
    ]
    lag = "any" if pairing.lag is None else pairing.lag
    return {"start": pair.scope, "lag": lag, "settled": pairing.settled, "inputs": inputs}


def _difference(found: Difference) -> Object:
    return {
        "old_half_cycle": found.old_half_cycle,
        "new_half_cycle": found.new_half_cycle,
        "levels": list(found.levels),
        "at_edge": found.at_edge,
        "cause": found.cause,
        "text": found.text,
        **(_apart(found.shown) if isinstance(found.shown, Apart) else {"trace": of_trace(found.shown)}),
    }


def _apart(shown: Apart) -> Object:
    states = zip(SIDES, shown.orbits, shown.systems, strict=True)
    return {
        "inputs": dict(shown.inputs),
        "states": {side: system.describe(orbit.start) for side, orbit, system in states},
    }
