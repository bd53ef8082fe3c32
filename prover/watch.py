"""A machine with moving inputs beside an ideal observer, as one transition system of words; and claims about it.

The observer measures the pulse at hand (see `observer` for what a pulse is) with words of its own: how many edges it
has lasted, whether a move began it, and whether its beginning was seen at all. Three claims are made of it.

range   While the ratio changes: no pulse is shorter than the shortest nominal one among the values so far, nor longer
        than the longest. The ends of that range are words that never change, and the inputs keep within them: a run
        that keeps within none of them there is not.
after   From some moment on the inputs are held. The pulses that begin with the `changes`-th change of the output
        after that, or later, have exactly the nominal lengths; and no pulse at all is longer than the longest nominal
        one.
whole   While an enable moves: no pulse is shorter than the nominal one of the rigid inputs.

A claim is proved by lines that hold wherever runs begin, that every step keeps, and under which nothing is broken
(Floyd 1967): three obligations, each a formula about one step. Nothing here searches.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from prover import expr as e
from prover.certificate import Obligation
from prover.expr import Expr
from prover.moving import AFTER, Machine
from prover.observer import Nominal

Kind = Literal["range", "after", "whole"]

EDGES, BY_MOVE, SEEN = "!edges", "!by move", "!seen"
"""The observer's words: edges since the pulse began, saturating; a move began it; its beginning was seen."""

HELD, CHANGES = "!held", "!changes"
"""For `after`: the inputs are held from now on; changes of the output since then, saturating."""

FIRST = "!first."
"""Begins the name of an input's value at the start, before its first move."""

WHEN = "!when "
"""Begins the name of a bit that says whether a comparison of the machine's own holds of the state, or the output."""

LEAST, MOST = ("!least low", "!least high"), ("!most low", "!most high")
"""For `range`: the ends that nominal pulses keep to, by level. Where both levels have one nominal length, the first
of each are the ends for both."""


@dataclass(frozen=True, slots=True)
class Seed:
    """A place on the orbit of a start state, which runs may begin at because its inputs have stood still until then.

    registers  values of all registers and the clock, by name
    inputs     those of the moving inputs
    edges      half-cycles since the output changed last
    cause      how it comes about
    """

    registers: Mapping[str, int]
    inputs: Mapping[str, int]
    edges: int
    cause: str


@dataclass(frozen=True)
class Watch:
    """The transition system.

    variables  registers, rigid inputs, clock, moving inputs, bits of WHEN and the observer's words, with their widths
    moves      what is chosen anew in every step: new values of inputs, and the moment from which they are held
    step       the variables after an edge and a move, over variables and moves
    within     one bit over the variables: the inputs have values for which the claim is made
    allowed    one bit over variables and moves: the moves that the claim allows, which keep within
    broken     one bit over the same: the claim is broken in this step
    bits       what the bits of WHEN say, over the machine's variables
    longest    for `after`: half-cycles that no low and no high pulse may exceed
    begins     where runs begin: each variable over free variables, and one bit that says for which of these
    """

    machine: Machine
    nominal: Nominal
    kind: Kind
    variables: tuple[tuple[str, int], ...]
    moves: tuple[tuple[str, int], ...]
    step: tuple[Expr, ...]
    within: Expr
    allowed: Expr
    broken: Expr
    bits: Mapping[str, Expr]
    longest: tuple[int, int]
    begins: tuple[tuple[tuple[Expr, ...], Expr], ...]

    @property
    def names(self) -> list[str]:
        return [name for name, _ in self.variables]


def watch(
    machine: Machine,
    nominal: Nominal,
    kind: Kind,
    changes: int = 0,
    longest: tuple[int, int] = (0, 0),
    bits: int = 0,
) -> Watch:
    """The system for one of the claims. For `after`: how many changes, and the half-cycles that no low and no high
    pulse may exceed. `bits` of the machine's own comparisons are told of each state."""
    return _Builder(machine, nominal, kind, changes, longest, bits).made()


class _Builder:
    """What the parts of a watch have in common."""

    def __init__(
        self,
        machine: Machine,
        nominal: Nominal,
        kind: Kind,
        changes: int,
        longest: tuple[int, int],
        bits: int,
    ) -> None:
        self.machine, self.nominal, self.kind = machine, nominal, kind
        self.changes, self.longest = changes, longest
        widest = max(width for _, width in (*machine.variables, *machine.moving))
        # Twice as much as a register counts to, in half-cycles, leaves the count of edges room to stay ahead of it.
        self.wide = max(nominal.high.width, nominal.low.width, widest) + 2
        self.still = machine.moves_nothing
        self.levels = (0,) if nominal.high is nominal.low else (0, 1)
        self.ends = (
            [pair[level] for pair in (LEAST, MOST) for level in self.levels] if kind == "range" else []
        )
        own = [(EDGES, self.wide), (SEEN, 1)]
        own += [] if self.still else [(BY_MOVE, 1)]
        own += [(HELD, 1), (CHANGES, max(2, changes.bit_length()))] if kind == "after" else []
        own += [(name, self.wide) for name in self.ends]
        self.own = dict(own)
        self.when = {f"{WHEN}{number}": bit for number, bit in enumerate(compared(machine, bits))}
        self.variables = (*machine.variables, *machine.moving, *((name, 1) for name in self.when), *own)
        self.moves = [(name + AFTER, width) for name, width in machine.moving]
        self.moves += [(HELD + AFTER, 1)] if kind == "after" else []

    def told(self, values: Mapping[str, Expr]) -> dict[str, Expr]:
        """Which comparisons hold of a state."""
        return dict(zip(self.when, e.substitute(list(self.when.values()), values), strict=True))

    def var(self, name: str) -> Expr:
        return e.var(name, self.own[name])

    def length(self, word: Expr) -> Expr:
        return e.resize(word, self.wide, False)

    def ends_of(self, which: Sequence[str], level: Expr) -> Expr:
        return e.ite(level, self.var(which[self.levels[-1]]), self.var(which[0]))

    def nominal_of(self, level: Expr) -> Expr:
        return self.length(e.ite(level, self.nominal.high, self.nominal.low))

    def made(self) -> Watch:
        machine = self.machine
        level, at_edge, after = machine.output, machine.output_at_edge(), machine.output_after()
        there = dict(zip(machine.names, machine.edge, strict=True))
        (after,) = e.substitute([after], there)
        own, broken = self.edge(level, at_edge)
        if not self.still:
            own, more = self.move(own, at_edge, after)
            broken = e.bvor(broken, more)
        moved = e.substitute(machine.move, there)
        values = dict(zip(machine.names, moved, strict=True))
        values |= {name: e.var(name + AFTER, width) for name, width in machine.moving} | own
        values |= self.told(values)
        return Watch(
            machine=machine,
            nominal=self.nominal,
            kind=self.kind,
            variables=self.variables,
            moves=tuple(self.moves),
            step=tuple(values[name] for name, _ in self.variables),
            within=e.conj([self.within(), *(e.eq(e.var(n, 1), bit) for n, bit in self.when.items())]),
            allowed=self.allowed(),
            broken=broken,
            bits=self.when,
            longest=self.longest,
            begins=tuple(self.begins()),
        )

    def edge(self, level: Expr, then: Expr) -> tuple[dict[str, Expr], Expr]:
        """The observer after an edge that takes the output from one level to another, and whether that breaks it."""
        edges, seen = self.var(EDGES), self.var(SEEN)
        by_move = self.var(BY_MOVE) if not self.still else e.FALSE
        full = e.eq(edges, e.const(-1, self.wide))
        more = e.ite(full, edges, e.bvadd(edges, e.const(1, self.wide)))
        changed = e.bvxor(level, then)
        broken = self.broken(level, changed, more, seen, by_move)
        own = {
            EDGES: e.ite(changed, e.const(0, self.wide), more),
            SEEN: e.bvor(seen, changed),
            BY_MOVE: e.bvand(by_move, e.bvnot(changed)),
        }
        own |= {name: self.var(name) for name in self.ends}
        if self.kind == "after":
            own |= {CHANGES: self.counted(changed), HELD: e.bvor(self.var(HELD), e.var(HELD + AFTER, 1))}
        return {name: own[name] for name in self.own}, broken

    def counted(self, changed: Expr) -> Expr:
        count = self.var(CHANGES)
        most = e.const(self.changes, count.width)
        counts = e.conj([changed, self.var(HELD), e.bvult(count, most)])
        return e.ite(counts, e.bvadd(count, e.const(1, count.width)), count)

    def broken(self, level: Expr, changed: Expr, edges: Expr, seen: Expr, by_move: Expr) -> Expr:
        """An edge after which the pulse has lasted so many edges breaks the claim."""
        goes_on = e.bvnot(changed)
        if self.kind == "after":
            nominal = self.nominal_of(level)
            exact = e.bvand(seen, e.eq(self.var(CHANGES), e.const(self.changes, self.var(CHANGES).width)))
            wrong = e.ite(
                changed, e.bvnot(e.eq(edges, e.bvadd(nominal, self.length(by_move)))), e.bvule(nominal, edges)
            )
            low, high = (e.const(limit, self.wide) for limit in self.longest)
            too_long = e.bvand(goes_on, e.bvule(e.ite(level, high, low), edges))
            return e.bvor(e.bvand(exact, wrong), too_long)
        short = e.conj([seen, changed, self.short(level, edges, by_move)])
        if self.kind == "whole":
            return short
        long = e.conj([seen, goes_on, e.bvule(self.ends_of(MOST, level), edges)])
        return e.bvor(short, long)

    def short(self, level: Expr, edges: Expr, by_move: Expr) -> Expr:
        """A pulse that ends after so many edges is too short."""
        least = self.nominal_of(level) if self.kind == "whole" else self.ends_of(LEAST, level)
        return e.bvult(edges, e.bvadd(least, self.length(by_move)))

    def move(self, own: Mapping[str, Expr], level: Expr, then: Expr) -> tuple[dict[str, Expr], Expr]:
        """The same for a move, from the observer as the edge before it left it."""
        changed = e.bvxor(level, then)
        broken = e.FALSE
        if self.kind != "after":
            broken = e.conj([own[SEEN], changed, self.short(level, own[EDGES], own[BY_MOVE])])
        after = dict(own)
        after[EDGES] = e.ite(changed, e.const(0, self.wide), own[EDGES])
        after[SEEN] = e.bvor(own[SEEN], changed)
        after[BY_MOVE] = e.bvor(own[BY_MOVE], changed)
        return after, broken

    def allowed(self) -> Expr:
        """The moves that the claim allows."""
        new = {name: e.var(name + AFTER, width) for name, width in self.machine.moving}
        (within,) = e.substitute([self.within()], new)
        if self.kind != "after":
            return within
        stays = e.conj(e.eq(e.var(name, width), new[name]) for name, width in self.machine.moving)
        return e.bvand(within, e.implies(self.var(HELD), stays))

    def within(self) -> Expr:
        """One bit over the inputs: the claim is made for these values."""
        if self.kind != "range":
            return self.nominal.domain
        parts = [self.nominal.domain]
        for level in self.levels:
            length = self.length(self.nominal.of(level))
            parts += [e.bvule(self.var(LEAST[level]), length), e.bvule(length, self.var(MOST[level]))]
        return e.conj(parts)

    def begins(self) -> Iterator[tuple[tuple[Expr, ...], Expr]]:
        """Each beginning after the first move."""
        machine = self.machine
        first = {name: e.var(FIRST + name, width) for name, width in machine.moving}
        new = {name + AFTER: e.var(name, width) for name, width in machine.moving}
        (given,) = e.substitute([self.within()], first)
        allowed = e.bvand(given, self.within())
        (at_first,) = e.substitute([machine.output], first)
        for begin in machine.begins:
            state = dict(zip(machine.names, (begin.state[name] for name in machine.names), strict=True))
            state = dict(zip(state, e.substitute(list(state.values()), first), strict=True))
            moved = e.substitute(machine.move, {**state, **first, **new})
            values = dict(zip(machine.names, moved, strict=True))
            values |= {name: e.var(name, width) for name, width in machine.moving}
            (was,) = e.substitute([at_first], state)
            (now,) = e.substitute([machine.output], values)
            values |= self.told(values)
            changed = e.FALSE if self.still else e.bvxor(was, now)
            values |= {EDGES: e.const(0, self.wide), SEEN: changed, BY_MOVE: changed}
            values |= {name: self.var(name) for name in self.ends}
            if self.kind == "after":
                values |= {HELD: e.FALSE, CHANGES: e.const(0, self.own[CHANGES])}
            yield tuple(values[name] for name, _ in self.variables), allowed


def compared(machine: Machine, most: int) -> list[Expr]:
    """The output, where it is no register, and comparisons in the machine's relations that are of its state alone."""
    inputs = {name for name, _ in machine.moving}
    inputs |= {name + AFTER for name in inputs} | {name for name, _ in machine.choices}

    def own(bit: Expr) -> bool:
        return not any(v.name in inputs for v in e.variables([bit]))

    nodes = e.topological([machine.output, *machine.edge, *machine.move])
    bits = [node for node in nodes if node.op in ("eq", "bvult", "bvslt") and own(node)]
    level = [machine.output] if machine.output.op != "var" and own(machine.output) else []
    return list(dict.fromkeys([*level, *bits]))[: len(level) + most]


# -- invariants --------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Line:
    """A linear invariant: where some bits have these values, a sum is 0, or is at least 0.

    where   values of variables of few bits; none: everywhere
    terms   whole numbers by which variables are multiplied
    offset  a whole number that is added
    equal   the sum is 0; else it is at least 0
    """

    where: tuple[tuple[str, int], ...]
    terms: tuple[tuple[str, int], ...]
    offset: int
    equal: bool

    def value(self, values: Mapping[str, int]) -> bool:
        """Whether it holds of these values of the variables."""
        if any(values[name] != value for name, value in self.where):
            return True
        total = sum(by * values[name] for name, by in self.terms) + self.offset
        return total == 0 if self.equal else total >= 0

    def expr(self, widths: Mapping[str, int]) -> Expr:
        """One bit over the variables. Words are wide enough that no sum wraps."""
        size = sum(abs(by) << widths[name] for name, by in self.terms) + abs(self.offset)
        wide = size.bit_length() + 1
        # Nothing is negative on either side: unsigned words are easier for solvers.
        sides = [e.const(max(self.offset, 0), wide), e.const(max(-self.offset, 0), wide)]
        for name, by in self.terms:
            word = e.zero_extend(e.var(name, widths[name]), wide - widths[name])
            sides[by < 0] = e.bvadd(_times(word, abs(by)), sides[by < 0])
        holds = e.eq(*sides) if self.equal else e.bvule(sides[1], sides[0])
        here = e.conj(e.eq(e.var(name, widths[name]), e.const(x, widths[name])) for name, x in self.where)
        return e.implies(here, holds)


def _times(word: Expr, by: int) -> Expr:
    """The product, by a shift where that will do."""
    if by & (by - 1) == 0:
        return e.binary("bvshl", word, e.const(by.bit_length() - 1, word.width))
    return e.bvmul(word, e.const(by, word.width))


def obligations(system: Watch, lines: Sequence[Line], name: str) -> Iterator[Obligation]:
    """What no assignment may make true if the claim is to follow from the lines."""
    widths = dict(system.variables)
    parts = [system.within, *(line.expr(widths) for line in lines)]
    inside = e.conj(parts)
    for number, (values, given) in enumerate(system.begins):
        (there,) = e.substitute([inside], dict(zip(system.names, values, strict=True)))
        yield Obligation(f"{name}: beginning {number}", e.bvand(given, e.bvnot(there)))
    within = e.bvand(inside, system.allowed)
    then = e.substitute(parts, dict(zip(system.names, system.step, strict=True)))
    for number, kept in enumerate(then):
        told = f"line {number} is kept" if number else "the inputs keep within what is claimed"
        yield Obligation(f"{name}: {told}", e.bvand(within, e.bvnot(kept)))
    yield Obligation(f"{name}: nothing is broken", e.bvand(within, system.broken))
