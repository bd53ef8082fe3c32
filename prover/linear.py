"""Linear shift registers: a step that is a matrix over GF(2) is counted by its powers, not followed.

If the step of an n-bit register is x -> M·x + c with a fixed point a (the lock-up state), then y = x + a goes by
y -> M·y. If moreover M has order 2^n - 1 (M to that power is the identity, and to that power divided by any of its
prime factors is not), M is a Singer cycle: it takes every y but 0 through all the others. So the states are M^k·y0
for k = 0 .. 2^n - 2, and the register is a counter k in other coordinates, with one more value for the lock-up
state. Orders in GL(n, 2): Lidl and Niederreiter, Finite Fields, chapter 8 (from memory).

The output has to be a decode: one value in a single state and the other elsewhere. That state is k = 0.
"""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import dataclass, replace

from prover import expr as e
from prover.effort import Effort
from prover.expr import Expr
from prover.solve import find
from prover.system import State, System

WIDEST = 40
"""Bits of a register up to which 2^n - 1 is factored by trial division."""

NAME = "steps from the decoded state"


@dataclass(frozen=True, slots=True)
class Logs:
    """The coordinates of a linear register: state number k stands for M^k·(start + fixed) + fixed.

    registers  the bits' registers with their widths, the lowest first
    columns    M's columns as words
    fixed      the state that steps to itself; its number is 2^n - 1
    start      the decoded state, number 0
    """

    registers: tuple[tuple[str, int], ...]
    columns: tuple[int, ...]
    fixed: int
    start: int

    @property
    def period(self) -> int:
        """Input cycles round the loop of all states but the fixed one."""
        return (1 << len(self.columns)) - 1

    def word(self, number: int) -> int:
        """The register bits, side by side, of a state number."""
        if number == self.period:
            return self.fixed
        return apply(power(self.columns, number), self.start ^ self.fixed) ^ self.fixed

    def values(self, number: int) -> dict[str, int]:
        """Register values of a state number."""
        word, out = self.word(number), {}
        for name, width in self.registers:
            out[name] = word & ((1 << width) - 1)
            word >>= width
        return out

    def number(self, values: dict[str, int]) -> int:
        """The number of a state: a discrete logarithm, by baby steps and giant steps (Shanks 1971)."""
        word, at = 0, 0
        for name, width in self.registers:
            word |= values[name] << at
            at += width
        target = word ^ self.fixed
        if target == 0:
            return self.period
        stride = 1 << ((len(self.columns) + 1) // 2)
        seen: dict[int, int] = {}
        baby, giant = _tables(self.columns), _tables(power(self.columns, stride))
        y = target
        for i in range(stride):
            seen.setdefault(y, i)
            y = _looked_up(baby, y)
        y = self.start ^ self.fixed
        for j in range(self.period // stride + 2):
            if y in seen and j * stride >= seen[y]:
                return (j * stride - seen[y]) % self.period
            y = _looked_up(giant, y)
        raise ValueError("not a state of this register")


def logs(system: System, effort: Effort) -> System | None:
    """The system in these coordinates, a counter; None if it is no such register."""
    registers = system.variables[:-1]
    n = sum(width for _, width in registers)
    if not 2 <= n <= WIDEST or system.choices or system.settled is not e.TRUE:
        return None
    if not _may_be_linear(system):
        return None
    effort.say("looking at the register as a matrix")
    word = e.concat_all([e.var(*pair) for pair in reversed(registers)])
    moving = _moving_level(system, registers, effort)
    if moving is None or system.clock in {v.name for v in e.variables([system.output])}:
        return None
    stepped = e.substitute(list(system.step[:-1]), {system.clock: e.const(moving, 1)})
    after = e.concat_all(list(reversed(stepped)))
    matrix = _matrix(after, word, registers, effort)
    if matrix is None:
        return None
    columns, constant = matrix
    fixed = _fixed_point(columns, constant)
    if fixed is None or not has_full_order(columns):
        return None
    decoded = _decoded(system, word, registers, effort)
    if decoded is None or decoded[0] == fixed:
        return None
    found = Logs(tuple(registers), columns, fixed, decoded[0])
    return counter(system, found, moving, decoded[1])


def _may_be_linear(system: System) -> bool:
    """Whether two edges take sums to sums, on a few samples: an affine map takes x + y + z to the sum of images."""
    rng = random.Random(0)
    for _ in range(12):
        states = [[rng.getrandbits(width) for _, width in system.variables[:-1]] for _ in range(3)]
        states.append([a ^ b ^ c for a, b, c in zip(*states, strict=True)])
        images = [system.next(system.next((*state, 0))) for state in states]
        if any(a ^ b ^ c ^ d for a, b, c, d in zip(*images, strict=True)):
            return False
    return True


def _moving_level(system: System, registers: Sequence[tuple[str, int]], effort: Effort) -> int | None:
    """The clock level from which an edge moves the registers, if the other edge moves none."""
    for level in (0, 1):
        fixed = {system.clock: e.const(1 - level, 1)}
        still = e.substitute(list(system.step[:-1]), fixed)
        moved = e.disj(e.bvnot(e.eq(a, e.var(*pair))) for a, pair in zip(still, registers, strict=True))
        if find(moved, effort) is None:
            return level
    return None


def _matrix(
    after: Expr, word: Expr, registers: Sequence[tuple[str, int]], effort: Effort
) -> tuple[tuple[int, ...], int] | None:
    """M's columns and c, if the step is x -> M·x + c for every x."""
    names = [name for name, _ in registers]
    run = e.compile_step([after], names)

    def step(x: int) -> int:
        parts = []
        for _, width in registers:
            parts.append(x & ((1 << width) - 1))
            x >>= width
        return run(*parts)[0]

    n = word.width
    constant = step(0)
    columns = tuple(step(1 << i) ^ constant for i in range(n))
    rows = []
    for bit in range(n):
        total = e.const(constant >> bit & 1, 1)
        for i in range(n):
            if columns[i] >> bit & 1:
                total = e.bvxor(total, e.extract(word, i, i))
        rows.append(e.bvxor(total, e.extract(after, bit, bit)))
    return None if find(e.disj(rows), effort) is not None else (columns, constant)


def _decoded(
    system: System, word: Expr, registers: Sequence[tuple[str, int]], effort: Effort
) -> tuple[int, int] | None:
    """The only state in which the output has one of its values, and that value."""
    for level in (1, 0):
        shows = system.output if level else e.bvnot(system.output)
        model = find(shows, effort)
        if model is None:
            return None
        state = e.evaluate([word], {name: model.get(name, 0) for name, _ in registers})[0]
        other = e.bvand(shows, e.bvnot(e.eq(word, e.const(state, word.width))))
        if find(other, effort) is None:
            return state, level
    return None


def counter(system: System, found: Logs, moving: int, level: int) -> System:
    """The system in the coordinates: it counts at the edge from a clock at `moving`, and shows `level` at 0."""
    n = len(found.columns)
    k, clock = e.var(NAME, n), e.var(system.clock, 1)
    locked = e.eq(k, e.const(found.period, n))
    following = e.ite(e.eq(k, e.const(found.period - 1, n)), e.const(0, n), e.bvadd(k, e.const(1, n)))
    moved = e.ite(locked, k, following)
    ticks = clock if moving else e.bvnot(clock)
    decoded = e.eq(k, e.const(0, n))
    return replace(
        system,
        variables=((NAME, n), (system.clock, 1)),
        step=(e.ite(ticks, moved, k), e.bvnot(clock)),
        output=decoded if level else e.bvnot(decoded),
        logs=found,
    )


def moved(state: State, system: System, recoded: System) -> State:
    """A state of the system in the recoded one's coordinates."""
    assert recoded.logs is not None
    return recoded.logs.number(dict(zip(system.names, state, strict=True))), state[-1]


# -- matrices over GF(2), as tuples of columns ---------------------------------------------------------------


def apply(columns: Sequence[int], y: int) -> int:
    """M·y."""
    out = 0
    while y:
        low = y & -y
        out ^= columns[low.bit_length() - 1]
        y ^= low
    return out


def _tables(columns: Sequence[int]) -> list[list[int]]:
    """For each byte of y, what its values contribute to M·y."""
    parts = [columns[i : i + 8] for i in range(0, len(columns), 8)]
    return [[apply(part, byte) for byte in range(1 << len(part))] for part in parts]


def _looked_up(tables: Sequence[Sequence[int]], y: int) -> int:
    out = 0
    for table in tables:
        out ^= table[y & 255]
        y >>= 8
    return out


def product(a: Sequence[int], b: Sequence[int]) -> tuple[int, ...]:
    """A·B."""
    return tuple(apply(a, column) for column in b)


def power(columns: Sequence[int], exponent: int) -> tuple[int, ...]:
    """M to a power, by squaring."""
    out = tuple(1 << i for i in range(len(columns)))
    base = tuple(columns)
    while exponent:
        if exponent & 1:
            out = product(base, out)
        base = product(base, base)
        exponent >>= 1
    return out


def has_full_order(columns: Sequence[int]) -> bool:
    """Whether M's order is 2^n - 1."""
    n = len(columns)
    identity = tuple(1 << i for i in range(n))
    whole = (1 << n) - 1
    if power(columns, whole) != identity:
        return False
    return all(power(columns, whole // p) != identity for p in prime_factors(whole))


def prime_factors(number: int) -> list[int]:
    """The distinct primes that divide a number, by trial division."""
    out = []
    divisor = 2
    while divisor * divisor <= number:
        if number % divisor == 0:
            out.append(divisor)
            while number % divisor == 0:
                number //= divisor
        divisor += 1 if divisor == 2 else 2
    return [*out, number] if number > 1 else out


def _fixed_point(columns: Sequence[int], constant: int) -> int | None:
    """The a with M·a + c = a, if there is exactly one (Gauss over GF(2))."""
    n = len(columns)
    rows = []
    for bit in range(n):
        mask = sum((columns[i] >> bit & 1) << i for i in range(n)) ^ (1 << bit)
        rows.append((mask, constant >> bit & 1))
    solved: list[tuple[int, int, int]] = []
    for mask, value in rows:
        for pivot, other, known in solved:
            if mask >> pivot & 1:
                mask, value = mask ^ other, value ^ known
        if mask == 0:
            return None
        pivot = (mask & -mask).bit_length() - 1
        solved = [(p, m ^ mask, v ^ value) if m >> pivot & 1 else (p, m, v) for p, m, v in solved]
        solved.append((pivot, mask, value))
    return sum(value << pivot for pivot, _, value in solved)
