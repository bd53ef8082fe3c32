"""Small machines' evidence as tables: a value for every state, and what they have to fulfil as obligations.

A table becomes an expression over the state's bits, a tree of multiplexers in which equal branches are one
(hash-consing makes it a decision diagram), so that one-step claims about phases, ranks and loops are formulas for
any solver, as those about paths are. A state's number has the first register in its lowest bits and the clock's
level in its highest.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby

from prover import expr as e
from prover.certificate import Obligation
from prover.expr import Expr
from prover.path import Beat
from prover.rhythm import Goal, Orbit, Wave
from prover.system import State, System

MOST_BITS = 14
"""Bits of a state, the clock's level among them, up to which its evidence is written as a table."""

MOST_BITS_IF_REGULAR = 17
MOST_NODES = 20_000
"""Bits up to which it is if the table is so regular that its expression has no more nodes than this."""


@dataclass(frozen=True, slots=True)
class Ranking:
    """Every power-up state is good within `bound` half-cycles.

    phase  φ of each good state by its number, −1 for others
    rank   ρ: 0 for a good state, more for others, −1 where nothing is claimed (no power-up state leads there)
    """

    phase: tuple[int, ...]
    rank: tuple[int, ...]
    bound: int


@dataclass(frozen=True, slots=True)
class Rounds:
    """These are all the loops of all power-up states.

    members   the numbers of the states on each, in order
    levels    the output in each of these
    distance  by state number, a bound on the half-cycles until it is on one; −1 where nothing is claimed
    """

    members: tuple[tuple[int, ...], ...]
    levels: tuple[tuple[int, ...], ...]
    distance: tuple[int, ...]

    def waves(self) -> list[Wave]:
        """The wave of each loop."""
        return [
            Wave.of_round((bit, len(list(run))) for bit, run in groupby(levels)) for levels in self.levels
        ]

    def orbits(self, system: System) -> list[Orbit]:
        """Each loop as the orbit of its first state."""
        widths = tuple(width for _, width in system.variables)
        return [
            Orbit(
                (), tuple(Beat(state_of(system, n), v) for n, v in zip(numbers, levels, strict=True)), widths
            )
            for numbers, levels in zip(self.members, self.levels, strict=True)
        ]


def state_of(system: System, number: int) -> State:
    """The state with that number."""
    out = []
    for _, width in system.variables:
        out.append(number & ((1 << width) - 1))
        number >>= width
    return tuple(out)


def lookup(system: System, values: Sequence[int | None], width: int) -> Expr:
    """The table as an expression over the state; where a value is None any will do."""
    bits = [e.extract(e.var(name, w), i, i) for name, w in system.variables for i in range(w)]
    row = [None if value is None else e.const(value, width) for value in values]
    for bit in bits:
        row = [_either(bit, high, low) for low, high in zip(row[::2], row[1::2], strict=True)]
    return row[0] if row[0] is not None else e.const(0, width)


def _either(bit: Expr, high: Expr | None, low: Expr | None) -> Expr | None:
    if high is None or low is None:
        return low if high is None else high
    return e.ite(bit, high, low)


def is_regular(system: System, columns: Sequence[Sequence[int]]) -> bool:
    """Whether the columns make expressions of few nodes; −1 stands for any value."""
    size = max(max(column) for column in columns).bit_length() or 1
    made = [lookup(system, [v if v >= 0 else None for v in column], size) for column in columns]
    return len(e.topological(made)) <= MOST_NODES


def ranking_form_faults(system: System, table: Ranking, period: int) -> list[str]:
    """What is wrong with the table by itself."""
    count = 1 << system.bits
    if len(table.phase) != count or len(table.rank) != count:
        return [f"a table that has not {count} states"]
    if any(not -1 <= phase < period for phase in table.phase) or any(rank < -1 for rank in table.rank):
        return ["a phase or a rank that there is not"]
    if any((phase >= 0) != (rank == 0) for phase, rank in zip(table.phase, table.rank, strict=True)):
        return ["a rank of zero where there is no phase, or the other way round"]
    return []


def ranking_obligations(system: System, table: Ranking, goal: Goal) -> Iterator[Obligation]:
    """Good states have the output and the successor that their phase wants; all others come nearer to being good."""
    size = max(max(table.rank) + 1, table.bound + 1).bit_length()
    # Written one higher, so that 0 says that nothing is claimed.
    rank = lookup(system, [value + 1 for value in table.rank], size)
    period = goal.period
    wide = max(period, 2).bit_length()
    phase = lookup(system, [value if value >= 0 else None for value in table.phase], wide)
    rank_after, phase_after = _after(system, [rank, phase])
    claimed, good = e.nonzero(rank), e.eq(rank, e.const(1, size))
    following = e.bvadd(phase, e.const(1, wide))
    following = e.ite(e.eq(phase, e.const(period - 1, wide)), e.const(0, wide), following)
    level = _level(goal, phase)
    late = e.bvult(e.const(table.bound + 1, size), rank)
    escapes = e.bvand(system.settled, e.bvor(e.bvnot(claimed), late))
    stays = e.bvand(e.eq(rank_after, e.const(1, size)), e.eq(phase_after, following))
    nears = e.bvand(e.nonzero(rank_after), e.bvult(rank_after, rank))
    yield Obligation(f"every power-up state has a rank of at most {table.bound}", escapes)
    yield Obligation("a good state's output fits its phase", e.bvand(good, e.bvxor(system.output, level)))
    yield Obligation("a good state's successor has the next phase", e.bvand(good, e.bvnot(stays)))
    nearer = e.conj([claimed, e.bvnot(good), e.bvnot(nears)])
    yield Obligation("any other state's successor has a lower rank", nearer)


def _level(goal: Goal, phase: Expr) -> Expr:
    """The goal's output in a phase."""
    level, at = e.FALSE, 0
    for value, length in goal.pulses:
        within = e.bvult(phase, e.const(at + length, phase.width))
        if value:
            level = e.bvor(level, e.bvand(e.bvule(e.const(at, phase.width), phase), within))
        at += length
    return level


def every_good_state(system: System, table: Ranking, goal: Goal) -> Obligation:
    """No state is good but those with a rank of zero: the last other one on the way to these has the wrong output.

    (Any other one is not good because its successor is not; without choices.)"""
    wide = max(goal.period, 2).bit_length()
    good = lookup(system, [int(value == 0) if value >= 0 else None for value in table.rank], 1)
    claimed = lookup(system, [int(value >= 0) for value in table.rank], 1)
    phase = lookup(system, [value if value >= 0 else None for value in table.phase], wide)
    good_after, phase_after = _after(system, [good, phase])
    first = e.eq(phase_after, e.const(0, wide))
    before = e.ite(first, e.const(goal.period - 1, wide), e.bvsub(phase_after, e.const(1, wide)))
    fits = e.bvnot(e.bvxor(system.output, _level(goal, before)))
    missed = e.conj([claimed, e.bvnot(good), good_after, fits])
    return Obligation("no good state is left out", missed)


def rounds_form_faults(system: System, table: Rounds) -> list[str]:
    """What is wrong with the list of loops by itself."""
    count = 1 << system.bits
    if len(table.distance) != count or any(value < -1 for value in table.distance):
        return [f"a table that has not {count} states"]
    listed = [number for states in table.members for number in states]
    if len(set(listed)) != len(listed) or {n for n, d in enumerate(table.distance) if d == 0} != set(listed):
        return ["a state at distance 0 that is on no loop, or the other way round"]
    sizes = [(len(states), len(levels)) for states, levels in zip(table.members, table.levels, strict=True)]
    if any(a != b or not a for a, b in sizes) or any(
        bit not in (0, 1) for bits in table.levels for bit in bits
    ):
        return ["a loop without a level for each of its states"]
    return []


def rounds_obligations(system: System, table: Rounds) -> Iterator[Obligation]:
    """States on the loops go round them and show their levels; all others come nearer to one."""
    size = (max(table.distance) + 1).bit_length()
    distance = lookup(system, [value + 1 for value in table.distance], size)
    (after,) = _after(system, [distance])
    claimed, on_loop = e.nonzero(distance), e.eq(distance, e.const(1, size))
    levels: list[int | None] = [None] * len(table.distance)
    following: list[State | None] = [None] * len(table.distance)
    for states, shown in zip(table.members, table.levels, strict=True):
        for number, then, level in zip(states, (*states[1:], states[0]), shown, strict=True):
            levels[number] = level
            following[number] = state_of(system, then)
    wrong = [e.bvxor(system.output, lookup(system, levels, 1))]
    for place, (step, (_, width)) in enumerate(zip(system.step, system.variables, strict=True)):
        column = [None if state is None else state[place] for state in following]
        wrong.append(e.bvnot(e.eq(step, lookup(system, column, width))))
    nears = e.bvand(e.nonzero(after), e.bvult(after, distance))
    yield Obligation("every power-up state has a distance", e.bvand(system.settled, e.bvnot(claimed)))
    yield Obligation("a state on a loop goes on round it", e.bvand(on_loop, e.disj(wrong)))
    nearer = e.conj([claimed, e.bvnot(on_loop), e.bvnot(nears)])
    yield Obligation("any other state's successor is nearer to a loop", nearer)


def rounds_at_rest(system: System, table: Rounds) -> Obligation:
    """Every state on a loop is a power-up state."""
    on_loop = lookup(system, [int(value == 0) for value in table.distance], 1)
    return Obligation("a state on a loop is at rest", e.bvand(on_loop, e.bvnot(system.settled)))


def _after(system: System, values: Sequence[Expr]) -> list[Expr]:
    return e.substitute(values, dict(zip(system.names, system.step, strict=True)))
