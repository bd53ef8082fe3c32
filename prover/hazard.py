"""Hazards: what an expression, or a network of gates, may do while several of its inputs change.

Between two moments a bit holds, rises, falls, or may change more often than its ends show: it has a hazard. How
gates pass these on is Eichelberger's ternary evaluation (1965) with the two ends kept: a bit that is neither 0 nor 1
all the time is his third value. With the ends it also shows where a bit that rises may fall on the way (a dynamic
hazard; the algebra of change counts of Brzozowski and Ésik 2001, from memory). It holds for any delays of gates and
of wires, because every input of a gate is taken to arrive whenever it likes.

What a function does by itself, whatever gates it is made of, is told apart: some order in which its inputs change
takes it through a value that it should not have.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence, Set
from dataclasses import dataclass
from functools import cached_property, reduce

from prover import expr as e
from prover.design import Gate
from prover.expr import Expr


@dataclass(frozen=True, slots=True)
class Swing:
    """What a word does between two moments: its value at both, and the bits that may change more often than these
    show."""

    first: Expr
    last: Expr
    hazard: Expr

    @property
    def zero(self) -> Expr:
        """The bits that are 0 all the time."""
        return e.bvnot(e.bvor(e.bvor(self.first, self.last), self.hazard))

    @property
    def one(self) -> Expr:
        """The bits that are 1 all the time."""
        return e.bvand(e.bvand(self.first, self.last), e.bvnot(self.hazard))

    @property
    def rises(self) -> Expr:
        return e.bvand(e.bvnot(self.first), self.last)

    @property
    def falls(self) -> Expr:
        return e.bvand(self.first, e.bvnot(self.last))

    @property
    def moves(self) -> Expr:
        """The bits that are not the same all the time: those that have the third value."""
        return e.bvor(e.bvxor(self.first, self.last), self.hazard)


Swings = Mapping[str, Swing]
"""What registers, the clock and nets of gates do, by name."""


def still(value: Expr) -> Swing:
    """A word that keeps its value."""
    return Swing(value, value, e.const(0, value.width))


def clean(first: Expr, last: Expr) -> Swing:
    """A word of which each bit changes once or not at all."""
    return Swing(first, last, e.const(0, first.width))


# -- gates, a bit or a word of them ------------------------------------------------------------------------


def _not(x: Swing) -> Swing:
    return Swing(e.bvnot(x.first), e.bvnot(x.last), x.hazard)


def _opposed(x: Swing, y: Swing) -> Expr:
    return e.bvor(e.bvand(x.rises, y.falls), e.bvand(x.falls, y.rises))


def _and(x: Swing, y: Swing) -> Swing:
    passed = e.bvor(e.bvand(x.hazard, e.bvnot(y.zero)), e.bvand(y.hazard, e.bvnot(x.zero)))
    return Swing(e.bvand(x.first, y.first), e.bvand(x.last, y.last), e.bvor(passed, _opposed(x, y)))


def _or(x: Swing, y: Swing) -> Swing:
    passed = e.bvor(e.bvand(x.hazard, e.bvnot(y.one)), e.bvand(y.hazard, e.bvnot(x.one)))
    return Swing(e.bvor(x.first, y.first), e.bvor(x.last, y.last), e.bvor(passed, _opposed(x, y)))


def _xor(x: Swing, y: Swing) -> Swing:
    both = e.bvand(e.bvxor(x.first, x.last), e.bvxor(y.first, y.last))
    hazard = e.bvor(e.bvor(x.hazard, y.hazard), both)
    return Swing(e.bvxor(x.first, y.first), e.bvxor(x.last, y.last), hazard)


def gate(kind: str, pins: Sequence[Swing]) -> Swing:
    """The output of a gate primitive."""
    base = {"nand": "and", "nor": "or", "xnor": "xor", "not": "buf"}.get(kind, kind)
    made = {
        "and": lambda: reduce(_and, pins),
        "or": lambda: reduce(_or, pins),
        "xor": lambda: reduce(_xor, pins),
        "buf": lambda: pins[0],
    }[base]()
    return made if base == kind else _not(made)


# -- expressions, their operators read as gates ------------------------------------------------------------


def as_written(roots: Sequence[Expr], inputs: Swings) -> list[Swing]:
    """The roots, each operator read as the gates that it is commonly made of, none of them left out.

    Multiplexers are two ANDs and an OR, comparisons and sums ripple from the lowest bit; products, quotients and
    shifts by a word count as hazards wherever an operand changes. What has no swing may be anything at any time."""
    memo: dict[Expr, Swing] = {}
    for node in e.topological(roots):
        if node.op == "const":
            memo[node] = still(node)
        elif node.op == "var":
            known = inputs.get(node.name)
            memo[node] = known or Swing(node, node, e.const(-1, node.width))
        else:
            args = [memo[a] for a in node.args]
            first = e.rebuild(node, [a.first for a in args])
            last = e.rebuild(node, [a.last for a in args])
            memo[node] = Swing(first, last, _hazard(node, args))
    return [memo[root] for root in roots]


def _hazard(node: Expr, args: Sequence[Swing]) -> Expr:
    match node.op:
        case "bvnot":
            return args[0].hazard
        case "bvand":
            return _and(*args).hazard
        case "bvor":
            return _or(*args).hazard
        case "bvxor":
            return _xor(*args).hazard
        case "concat" | "extract":
            return e.rebuild(node, [a.hazard for a in args])
        case "zero_extend" | "sign_extend":
            return e.rebuild(node, [args[0].hazard])
        case "ite":
            return _chosen(*args).hazard
        case "eq":
            return _all_ones(_not(_xor(*args))).hazard
        case "bvult":
            return _less(*args).hazard
        case "bvslt":
            return _less(*(_flipped(a) for a in args)).hazard
        case "bvadd":
            return _sum(args[0], args[1], e.FALSE)
        case "bvsub":
            return _sum(args[0], _not(args[1]), e.TRUE)
        case "bvneg":
            return _sum(still(e.const(0, node.width)), _not(args[0]), e.TRUE)
    moving = e.disj(e.nonzero(a.moves) for a in args)
    return _spread(moving, node.width)


def _spread(bit: Expr, width: int) -> Expr:
    return e.ite(bit, e.const(-1, width), e.const(0, width))


def _chosen(condition: Swing, then: Swing, other: Swing) -> Swing:
    width = then.first.width
    select = Swing(
        _spread(condition.first, width), _spread(condition.last, width), _spread(condition.hazard, width)
    )
    return _or(_and(select, then), _and(_not(select), other))


def _all_ones(x: Swing) -> Swing:
    """The AND of all bits."""
    ones = e.const(-1, x.first.width)
    opposed = e.bvand(e.nonzero(x.rises), e.nonzero(x.falls))
    loose = e.bvor(e.nonzero(x.hazard), opposed)
    hazard = e.bvand(loose, e.bvnot(e.nonzero(x.zero)))
    return Swing(e.eq(x.first, ones), e.eq(x.last, ones), hazard)


def _bit(x: Swing, i: int) -> Swing:
    return Swing(e.extract(x.first, i, i), e.extract(x.last, i, i), e.extract(x.hazard, i, i))


def _flipped(x: Swing) -> Swing:
    """With the uppermost bit inverted: signed order becomes unsigned."""
    return _xor(x, still(e.const(1 << (x.first.width - 1), x.first.width)))


def _less(x: Swing, y: Swing) -> Swing:
    below = still(e.FALSE)
    for i in range(x.first.width):
        a, b = _not(_bit(x, i)), _bit(y, i)
        below = _or(_and(a, b), _and(_or(a, b), below))
    return below


def _sum(x: Swing, y: Swing, carry: Expr) -> Expr:
    """The hazards of a sum's bits."""
    into = still(carry)
    bits = []
    for i in range(x.first.width):
        a, b = _bit(x, i), _bit(y, i)
        bits.append(_xor(_xor(a, b), into).hazard)
        into = _or(_and(a, b), _and(_or(a, b), into))
    return e.concat_all(bits[::-1])


# -- functions, whatever gates they are made of ------------------------------------------------------------


def by_function(root: Expr, inputs: Swings, label: str) -> Swing:
    """One bit, with a hazard only where some order in which its inputs change makes it pulse, or go back on its way.

    The order is given by free masks: `!LABEL.early.NAME` are the bits of an input that have changed by one moment,
    `!LABEL.late.NAME` those by a later one. A bit with a hazard of its own is anything at either."""
    used = [(v, inputs[v.name]) for v in e.variables([root]) if v.name in inputs]
    (first,) = e.substitute([root], {v.name: s.first for v, s in used})
    (last,) = e.substitute([root], {v.name: s.last for v, s in used})
    if all(s.moves.is_const and not s.moves.value for _, s in used):
        return clean(first, last)
    seen = []
    masks: list[list[Expr]] = []
    for moment in ("early", "late"):
        chosen = [e.bvand(e.var(f"!{label}.{moment}.{v.name}", v.width), s.moves) for v, s in used]
        values = {v.name: e.bvxor(s.first, mask) for (v, s), mask in zip(used, chosen, strict=True)}
        seen += e.substitute([root], values)
        masks.append(chosen)
    back = (
        e.nonzero(e.bvand(e.bvand(early, e.bvnot(late)), e.bvnot(s.hazard)))
        for early, late, (_, s) in zip(*masks, used, strict=True)
    )
    early, late = seen
    pulse = e.bvand(e.bvnot(e.bvxor(first, last)), e.bvxor(early, first))
    turn = e.conj([e.bvxor(first, last), e.bvxor(early, first), e.bvxor(late, last), e.bvnot(e.disj(back))])
    return Swing(first, last, e.bvor(pulse, turn))


# -- networks ----------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Network:
    """An output over registers, the clock and nets of gates, and the gates that it hangs on.

    A net that is kept as a register (in a combinational loop) is an input, and where the walk ends."""

    root: Expr
    gates: Mapping[str, Gate]
    stored: Set[str]

    @cached_property
    def order(self) -> list[str]:
        """The nets of the gates below the root, each after those that its own gate reads."""
        done: dict[str, None] = {}
        stack = [v.name for v in e.variables([self.root])]
        while stack:
            name = stack[-1]
            if name in done or name in self.stored or name not in self.gates:
                stack.pop()
                continue
            below = [v.name for v in e.variables(self.gates[name].pins)]
            missing = [n for n in below if n in self.gates and n not in self.stored and n not in done]
            if missing:
                stack += missing
            else:
                done[stack.pop()] = None
        return list(done)

    @cached_property
    def expressions(self) -> list[Expr]:
        """What gates' terminals and the output carry."""
        return [*(pin for net in self.order for pin in self.gates[net].pins), self.root]

    @cached_property
    def inputs(self) -> list[Expr]:
        """The registers, the clock and the choices below the root."""
        nets = set(self.order)
        return [v for v in e.variables(self.expressions) if v.name not in nets]

    @property
    def plain(self) -> bool:
        """Whether it is of gates all through: what their terminals carry are nets, at most inverted."""
        return all(_is_plain(x) for x in self.expressions)

    def as_written(self, inputs: Swings) -> Swing:
        """The output, by the gates as they are written and expressions read as gates."""
        known = dict(inputs)
        for net in self.order:
            known[net] = gate(self.gates[net].kind, as_written(self.gates[net].pins, known))
        return as_written([self.root], known)[0]

    def by_gates(self, inputs: Swings, label: str) -> Swing:
        """The output, by the gates as they are written, where expressions have no hazard but their functions'."""
        known = dict(inputs)
        for net in self.order:
            pins = [
                self._carried(pin, known, f"{label}.{net}.{i}") for i, pin in enumerate(self.gates[net].pins)
            ]
            known[net] = gate(self.gates[net].kind, pins)
        return self._carried(self.root, known, label)

    @staticmethod
    def _carried(x: Expr, known: Swings, label: str) -> Swing:
        return as_written([x], known)[0] if _is_plain(x) else by_function(x, known, label)


def _is_plain(x: Expr) -> bool:
    while x.op in ("bvnot", "extract"):
        x = x.args[0]
    return x.op in ("var", "const")
