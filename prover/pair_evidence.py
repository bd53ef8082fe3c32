"""Evidence of a comparison, as plain data that goes into a certificate and comes out again. Nothing is believed.

Runs      each divider's runs from its starts, for each value of the shared inputs
Settled   each divider's loops, for each value
Both      both side by side: relations that go on holding, all states they can be in, or a run on which they differ
Reading is strict: whatever is not of the form that `as_object` writes is refused.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from prover import evidence
from prover import expr as e
from prover.compared import Run
from prover.equality import STATED, Invariant
from prover.errors import InternalError
from prover.evidence import (
    Evidence,
    Malformed,
    answer_of,
    each_of,
    fields_of,
    list_of,
    number_of,
    state_of,
    text_of,
)
from prover.expr import Expr
from prover.solve import Model
from prover.system import State

DEEPEST = 16
"""Half-cycles in a row that an induction looks back."""

WIDEST = 1 << 16
"""Bits of a word in a relation."""

LONGEST_RUN = 1 << 22
"""Half-cycles of a run that is written."""

Object = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Value:
    """Both dividers with their inputs held at some values: evidence on each, of its machine and of its runs from the
    states that both start from."""

    inputs: Model
    sides: tuple[Evidence, Evidence]


@dataclass(frozen=True, slots=True)
class Runs:
    """The runs from the starts, for each value of the shared inputs.

    answers  to the questions about micro-steps and starts of both side by side, in order"""

    answers: tuple[Model | None, ...]
    values: tuple[Value, ...]


@dataclass(frozen=True, slots=True)
class Shows:
    """One divider with its inputs held: what all its power-up states come to show, and the evidence of that.

    period, high  half-cycles per period and of high time"""

    period: int
    high: int
    found: Evidence


@dataclass(frozen=True, slots=True)
class Settled:
    """What both come to show once they have settled, for each value of the shared inputs."""

    values: tuple[tuple[Model, tuple[Shows, Shows]], ...]


@dataclass(frozen=True, slots=True)
class Both:
    """Both side by side, the new output late by so many half-cycles.

    answers  to the questions about micro-steps and starts, in order"""

    lag: int
    answers: tuple[Model | None, ...]
    shown: Invariant | frozenset[State] | Run


PairEvidence = Runs | Settled | Both


# -- writing -----------------------------------------------------------------------------------------------


def as_object(found: PairEvidence) -> Object:
    """The evidence as dictionaries and lists."""
    if isinstance(found, Runs):
        values = [_value(value) for value in found.values]
        return {"kind": "runs", "answers": list(found.answers), "values": values}
    if isinstance(found, Settled):
        shows = [
            {"inputs": dict(inputs), "old": _shows(sides[0]), "new": _shows(sides[1])}
            for inputs, sides in found.values
        ]
        return {"kind": "settled", "values": shows}
    shown = found.shown
    said: Object = {"kind": "relations", "lag": found.lag, "answers": list(found.answers)}
    if isinstance(shown, Invariant):
        nodes, parts = _nodes(shown.parts)
        return {**said, "depth": shown.depth, "nodes": nodes, "parts": parts}
    if isinstance(shown, Run):
        moves = [list(move) for move in shown.moves]
        told = {
            "start": shown.start,
            "values": dict(shown.values),
            "moves": moves,
            "half_cycle": shown.half_cycle,
        }
        return {**said, "kind": "run", **told}
    return {**said, "kind": "states", "states": [list(state) for state in sorted(shown)]}


def _value(value: Value) -> Object:
    old, new = (evidence.as_object(side) for side in value.sides)
    return {"inputs": dict(value.inputs), "old": old, "new": new}


def _shows(side: Shows) -> Object:
    return {"period": side.period, "high": side.high, "evidence": evidence.as_object(side.found)}


def _nodes(parts: Sequence[Expr]) -> tuple[list[Object], list[int]]:
    """Every node below the parts, operands before their users, and where the parts stand."""
    order = e.topological(parts)
    places = {node: i for i, node in enumerate(order)}
    nodes = [
        {
            "op": node.op,
            "width": node.width,
            "params": list(node.params),
            "args": [places[arg] for arg in node.args],
        }
        for node in order
    ]
    return nodes, [places[part] for part in parts]


# -- reading -----------------------------------------------------------------------------------------------


def read(value: Any) -> PairEvidence:
    """The evidence in an object. Raises Malformed."""
    kind = value.get("kind") if isinstance(value, dict) else None
    if kind == "runs":
        of = fields_of(value, "evidence", "kind answers values")
        answers = each_of(of["answers"], "answers", answer_of)
        return Runs(answers, each_of(of["values"], "values", _read_value))
    if kind == "settled":
        of = fields_of(value, "evidence", "kind values")
        return Settled(each_of(of["values"], "values", _read_settled))
    if not isinstance(kind, str) or kind not in READERS:
        raise Malformed("evidence: of no known kind")
    names, reader = READERS[kind]
    of = fields_of(value, "evidence", f"kind lag answers {names}")
    lag = of["lag"]
    if not isinstance(lag, int) or isinstance(lag, bool):
        raise Malformed("lag: not a whole number")
    return Both(lag, each_of(of["answers"], "answers", answer_of), reader(of))


def _read_value(value: Any, where: str) -> Value:
    of = fields_of(value, where, "inputs old new")
    sides = evidence.read(of["old"]), evidence.read(of["new"])
    return Value(_model(of["inputs"], f"{where}/inputs"), sides)


def _read_settled(value: Any, where: str) -> tuple[Model, tuple[Shows, Shows]]:
    of = fields_of(value, where, "inputs old new")
    return _model(of["inputs"], f"{where}/inputs"), (
        _read_shows(of["old"], f"{where}/old"),
        _read_shows(of["new"], f"{where}/new"),
    )


def _read_shows(value: Any, where: str) -> Shows:
    of = fields_of(value, where, "period high evidence")
    period = number_of(of["period"], f"{where}/period", 2)
    return Shows(period, number_of(of["high"], f"{where}/high", 1, period - 1), evidence.read(of["evidence"]))


def _model(value: Any, where: str) -> Model:
    found = answer_of(value, where)
    if found is None:
        raise Malformed(f"{where}: no values")
    return found


def _read_relations(of: Any) -> Invariant:
    nodes: list[Expr] = []
    for i, x in enumerate(list_of(of["nodes"], "nodes")):
        nodes.append(_node(x, f"nodes/{i}", nodes))
    places = each_of(of["parts"], "parts", lambda x, where: number_of(x, where, 0, len(nodes) - 1))
    if len(set(places)) != len(places):
        raise Malformed("parts: one of them twice")
    return Invariant(tuple(nodes[i] for i in places), number_of(of["depth"], "depth", 1, DEEPEST))


def _node(value: Any, where: str, nodes: Sequence[Expr]) -> Expr:
    """The expression that a node stands for."""
    of = fields_of(value, where, "op width params args")
    op, width = text_of(of["op"], f"{where}/op"), number_of(of["width"], f"{where}/width", 1, WIDEST)
    args = [
        nodes[i]
        for i in each_of(of["args"], f"{where}/args", lambda x, here: number_of(x, here, 0, len(nodes) - 1))
    ]
    params = list_of(of["params"], f"{where}/params")
    try:
        if op == "var":
            (name,) = params
            return e.var(text_of(name, f"{where}/params"), width)
        numbers = [number_of(x, f"{where}/params", 0) for x in params]
        if op == "const":
            (constant,) = numbers
            return e.const(constant, width)
        return e.made(op, args, numbers)
    except (InternalError, KeyError, TypeError, ValueError, IndexError):
        raise Malformed(f"{where}: no expression") from None


def _read_states(of: Any) -> frozenset[State]:
    states = each_of(of["states"], "states", state_of)
    if list(states) != sorted(set(states)) or not 0 < len(states) <= STATED:
        raise Malformed("states: none, too many, or not in order")
    return frozenset(states)


def _read_run(of: Any) -> Run:
    return Run(
        number_of(of["start"], "start", 0),
        _model(of["values"], "values"),
        each_of(of["moves"], "moves", state_of),
        number_of(of["half_cycle"], "half_cycle", 0, LONGEST_RUN),
    )


READERS: dict[str, tuple[str, Callable[[Any], Invariant | frozenset[State] | Run]]] = {
    "relations": ("depth nodes parts", _read_relations),
    "states": ("states", _read_states),
    "run": ("start values moves half_cycle", _read_run),
}
