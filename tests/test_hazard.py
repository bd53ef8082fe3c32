"""Hazards of expressions and of gates, against all orders in which changes can arrive."""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence

import pytest
from machines import random_expression
from orders import most_changes

from prover import expr as e
from prover.design import Gate, GateKind
from prover.effort import Effort
from prover.errors import Where
from prover.expr import Expr
from prover.hazard import Network, Swing, as_written, by_function, clean
from prover.solve import find

HERE = Where("gates.v", 1)
KINDS: Sequence[GateKind] = ("and", "nand", "or", "nor", "xor", "xnor", "buf", "not")


def swings(then: Mapping[str, int], now: Mapping[str, int], leaves: Sequence[Expr]) -> dict[str, Swing]:
    return {v.name: clean(e.const(then[v.name], v.width), e.const(now[v.name], v.width)) for v in leaves}


# -- expressions -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(40))
def test_expressions_pulse_in_the_orders_that_enumeration_finds(seed: int) -> None:
    rng = random.Random(seed)
    leaves = [e.var("a", 3), e.var("b", 2), e.var("c", 1)]
    for _ in range(12):
        root = random_expression(rng, leaves, 1, 3)
        then = {v.name: rng.getrandbits(v.width) for v in leaves}
        now = {v.name: rng.getrandbits(v.width) for v in leaves}

        def level(values: Mapping[str, int], root: Expr = root) -> int:
            return e.evaluate([root], values)[0]

        pulses = most_changes(level, [then, now]) > (level(then) != level(now))
        inputs = swings(then, now, leaves)
        function = by_function(root, inputs, "order")
        assert (find(function.hazard, Effort(10)) is not None) == pulses, root
        # Whatever the function does by itself, the gates that it is commonly made of do as well.
        (made,) = as_written([root], inputs)
        assert (made.first, made.last) == (function.first, function.last)
        assert not pulses or made.hazard is e.TRUE, root


def test_a_choice_may_be_anything_at_any_time() -> None:
    choice, q = e.var("?x", 1), e.var("q", 1)
    (made,) = as_written([e.bvand(choice, q)], {"q": clean(e.FALSE, e.FALSE)})
    assert made.hazard is e.FALSE
    (made,) = as_written([e.bvand(choice, q)], {"q": clean(e.TRUE, e.TRUE)})
    assert made.hazard is e.TRUE


# -- gates -------------------------------------------------------------------------------------------------


def random_network(rng: random.Random, inputs: int, count: int) -> Network:
    """Gates one after the other, each on inputs and nets before it; the last one's net is the output."""
    nets = [e.var(f"i{k}", 1) for k in range(inputs)]
    gates: dict[str, Gate] = {}
    for k in range(count):
        kind = rng.choice(KINDS)
        pins = tuple(rng.choice(nets) for _ in range(1 if kind in ("buf", "not") else rng.randint(2, 3)))
        gates[f"n{k}"] = Gate(kind, pins, HERE)
        nets.append(e.var(f"n{k}", 1))
    return Network(nets[-1], gates, frozenset())


def output_of(kind: str, pins: Sequence[int]) -> int:
    """IEEE 1364-2005 clause 7.2 and 7.3."""
    value = {"a": all(pins), "o": any(pins), "x": sum(pins) % 2 == 1}.get(kind.lstrip("n")[0], pins[0] == 1)
    return int(value != (kind in ("nand", "nor", "xnor", "not")))


class Delays:
    """The network where every pin sees a change after a time of its own: all that can happen, by enumeration."""

    def __init__(self, network: Network, then: Mapping[str, int], now: Mapping[str, int]) -> None:
        self.network, self.now = network, now
        self.pins = [
            (net, i, pin.name) for net in network.order for i, pin in enumerate(network.gates[net].pins)
        ]
        values = dict(then)
        for net in network.order:
            values[net] = output_of(
                network.gates[net].kind, [values[p.name] for p in network.gates[net].pins]
            )
        self.begin = tuple(values[name] for _, _, name in self.pins)
        self.best: dict[tuple[int, ...], int] = {}

    def driven(self, seen: tuple[int, ...]) -> dict[str, int]:
        by_net: dict[str, list[int]] = {}
        for (net, _, _), value in zip(self.pins, seen, strict=True):
            by_net.setdefault(net, []).append(value)
        return {net: output_of(self.network.gates[net].kind, values) for net, values in by_net.items()}

    def most_changes(self) -> int:
        """How often the output can change at most; no situation comes twice, for signals only go one way."""
        stack = [self.begin]
        while stack:
            seen = stack[-1]
            driven = self.driven(seen)
            sources = {**self.now, **driven}
            onward = [
                (*seen[:i], 1 - seen[i], *seen[i + 1 :])
                for i, (_, _, name) in enumerate(self.pins)
                if sources[name] != seen[i]
            ]
            missing = [other for other in onward if other not in self.best]
            if missing:
                stack += missing
                continue
            stack.pop()
            out = self.network.root.name
            changes = [self.best[o] + (self.driven(o)[out] != driven[out]) for o in onward]
            self.best[seen] = max(changes, default=0)
        return self.best[self.begin]


@pytest.mark.parametrize("seed", range(40))
def test_networks_of_gates_pulse_with_the_delays_that_enumeration_finds(seed: int) -> None:
    rng = random.Random(seed)
    hazards = 0
    for _ in range(10):
        network = random_network(rng, 3, rng.randint(1, 4))
        leaves = [e.var(f"i{k}", 1) for k in range(3)]
        then = {v.name: rng.getrandbits(1) for v in leaves}
        now = {v.name: rng.getrandbits(1) for v in leaves}
        made = network.as_written(swings(then, now, leaves))
        delays = Delays(network, then, now)
        turns = made.first is not made.last
        assert (delays.most_changes() > turns) == (made.hazard is e.TRUE), (network.gates, then, now)
        hazards += made.hazard is e.TRUE
    assert hazards < 10


def test_a_bridge_between_two_terms_takes_their_hazard_away() -> None:
    # Eichelberger 1965 (from memory): a·b + ā·c with b = c = 1 while a falls, and the consensus term b·c.
    a, b, c, na, t0, t1, t2 = (e.var(n, 1) for n in ("a", "b", "c", "na", "t0", "t1", "t2"))
    gates = {
        "na": Gate("not", (a,), HERE),
        "t0": Gate("and", (a, b), HERE),
        "t1": Gate("and", (na, c), HERE),
        "t2": Gate("and", (b, c), HERE),
        "two": Gate("or", (t0, t1), HERE),
        "three": Gate("or", (t0, t1, t2), HERE),
    }
    inputs = {"a": clean(e.TRUE, e.FALSE), "b": clean(e.TRUE, e.TRUE), "c": clean(e.TRUE, e.TRUE)}
    assert Network(e.var("two", 1), gates, frozenset()).as_written(inputs).hazard is e.TRUE
    assert Network(e.var("three", 1), gates, frozenset()).as_written(inputs).hazard is e.FALSE


def test_what_is_simplified_away_still_pulses_as_gates() -> None:
    # a OR not a is 1 for the expression; as gates it has a static hazard.
    a = e.var("a", 1)
    gates = {"na": Gate("not", (a,), HERE), "or": Gate("or", (a, e.var("na", 1)), HERE)}
    made = Network(e.var("or", 1), gates, frozenset()).as_written({"a": clean(e.TRUE, e.FALSE)})
    assert (made.first, made.last, made.hazard) == (e.TRUE, e.TRUE, e.TRUE)
    (made,) = as_written([e.bvor(a, e.bvnot(a))], {"a": clean(e.TRUE, e.FALSE)})
    assert made.hazard is e.FALSE
