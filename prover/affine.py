"""Affine hulls: the least set of the form x₀ + span that holds all points seen, over bits and over words mod 2^w.

Over bits this is linear algebra over GF(2) (Karr 1976, for the two-element field); over words it is a module over
Z/2^w, kept in Howell's echelon form, as Müller-Olm and Seidl (2007) do for programs. A hull grows with every point
outside it, at most as many times as it has dimensions (times w for words), and its equations are what all points seen
have in common.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

MOST_SHORTENED = 160
"""Equations up to which it is looked for shorter ones."""


@dataclass(frozen=True, slots=True)
class Equation:
    """The sum of coefficient times variable, over places, is `total` (mod 2, or mod 2^w)."""

    terms: tuple[tuple[int, int], ...]
    total: int


class BitHull:
    """The affine hull of points over GF(2); a point is an integer whose bit i is coordinate i."""

    def __init__(self, size: int) -> None:
        self.size = size
        self.origin: int | None = None
        self.rows: dict[int, int] = {}

    def add(self, point: int) -> bool:
        """Take a point in; whether the hull has grown."""
        if self.origin is None:
            self.origin = point
            return True
        rest = point ^ self.origin
        while rest:
            top = rest.bit_length() - 1
            if top not in self.rows:
                self.rows[top] = rest
                return True
            rest ^= self.rows[top]
        return False

    def equations(self) -> list[Equation]:
        """Equations that say exactly that a point is in the hull, short ones where these are found."""
        if self.origin is None:
            return []
        # Rows are solved for the lowest coordinates they have, so that the others are given by these.
        pivots: dict[int, int] = {}
        for row in self.rows.values():
            for place, other in pivots.items():
                if row >> place & 1:
                    row ^= other
            low = (row & -row).bit_length() - 1
            for place, other in pivots.items():
                if other >> low & 1:
                    pivots[place] = other ^ row
            pivots[low] = row
        out = []
        for place in range(self.size):
            if place in pivots:
                continue
            mask = 1 << place
            for low, row in pivots.items():
                if row >> place & 1:
                    mask |= 1 << low
            out.append(mask)
        return [
            Equation(
                tuple((i, 1) for i in range(self.size) if mask >> i & 1), (mask & self.origin).bit_count() & 1
            )
            for mask in (_shorter(out) if len(out) <= MOST_SHORTENED else out)
        ]


def _shorter(masks: list[int]) -> list[int]:
    """The same equations, with one added to another wherever that leaves less of it."""
    masks = list(masks)
    shorter = True
    while shorter:
        shorter = False
        for i, mask in enumerate(masks):
            for j, other in enumerate(masks):
                if i != j and (mask ^ other).bit_count() < mask.bit_count():
                    mask ^= other
                    shorter = True
            masks[i] = mask
    return masks


class WordHull:
    """The affine hull of vectors over Z/2^width."""

    def __init__(self, size: int, width: int) -> None:
        self.size = size
        self.width = width
        self.mask = (1 << width) - 1
        self.origin: tuple[int, ...] | None = None
        self.rows: dict[int, list[int]] = {}

    def add(self, point: Sequence[int]) -> bool:
        """Take a point in; whether the hull has grown."""
        if self.origin is None:
            self.origin = tuple(point)
            return True
        return _insert(
            self.rows, [(x - o) & self.mask for x, o in zip(point, self.origin, strict=True)], self.width
        )

    def equations(self) -> list[Equation]:
        """Equations that say no more and no less than that a point is in the hull."""
        if self.origin is None:
            return []
        out = []
        for row in _solved(_kernel(list(self.rows.values()), self.size, self.width), self.width):
            total = sum(a * o for a, o in zip(row, self.origin, strict=True)) & self.mask
            out.append(Equation(tuple((i, a) for i, a in enumerate(row) if a), total))
        return out


def _twos(value: int) -> int:
    """How often two divides a number other than 0."""
    return (value & -value).bit_length() - 1


def _insert(rows: dict[int, list[int]], row: list[int], width: int) -> bool:
    """Put a vector into a set of rows in echelon form; whether it was not among their sums. The rows' first entries
    are powers of two, and what is a sum of rows and begins later is a sum of rows that begin later."""
    mask = (1 << width) - 1
    grown = False
    todo = [row]
    while todo:
        row = todo.pop()
        at = next((i for i, x in enumerate(row) if x), None)
        if at is None:
            continue
        twos = _twos(row[at])
        held = rows.get(at)
        if held is not None and _twos(held[at]) <= twos:
            times = row[at] >> _twos(held[at])
            todo.append([(x - times * y) & mask for x, y in zip(row, held, strict=True)])
            continue
        inverse = pow(row[at] >> twos, -1, 1 << width)
        row = [x * inverse & mask for x in row]
        rows[at] = row
        grown = True
        if held is not None:
            todo.append(held)
        if twos:
            todo.append([(x << (width - twos)) & mask for x in row])
    return grown


def _solved(rows: list[list[int]], width: int) -> list[list[int]]:
    """Rows with the same sums, each of which gives a variable by the others: the last of those that the fewest twos
    divide, so that its factor is 1 where that can be."""
    mask = (1 << width) - 1
    left = [row for row in rows if any(row)]
    out: list[list[int]] = []
    while left:
        row, place = min(
            ((row, j) for row in left for j, x in enumerate(row) if x),
            key=lambda at: (_twos(at[0][at[1]]), -at[1]),
        )
        twos = _twos(row[place])
        inverse = pow(row[place] >> twos, -1, 1 << width)
        row[:] = [x * inverse & mask for x in row]
        left = [other for other in left if other is not row]
        for other in (*left, *out):
            times = other[place] >> twos
            if times:
                for j, x in enumerate(row):
                    other[j] = (other[j] - times * x) & mask
        out.append(row)
        left = [other for other in left if any(other)]
    return out


def _kernel(rows: list[list[int]], size: int, width: int) -> list[list[int]]:
    """Vectors whose sums are all that give 0 with every row: the rows made diagonal by operations on rows and on
    columns, of which the latter are kept."""
    mask = (1 << width) - 1
    rows = [list(row) for row in rows]
    columns = [[int(i == j) for i in range(size)] for j in range(size)]
    diagonal: list[int] = []
    while True:
        done = len(diagonal)
        entries = [
            (_twos(row[j]), i, j)
            for i, row in enumerate(rows[done:], done)
            for j in range(done, size)
            if row[j]
        ]
        if not entries:
            break
        # An entry that the fewest twos divide divides all others.
        twos, i, j = min(entries)
        rows[done], rows[i] = rows[i], rows[done]
        for row in rows:
            row[done], row[j] = row[j], row[done]
        columns[done], columns[j] = columns[j], columns[done]
        inverse = pow(rows[done][done] >> twos, -1, 1 << width)
        rows[done] = [x * inverse & mask for x in rows[done]]
        for other in rows[done + 1 :]:
            times = other[done] >> twos
            if times:
                for k, x in enumerate(rows[done]):
                    other[k] = (other[k] - times * x) & mask
        for k in range(done + 1, size):
            times = rows[done][k] >> twos
            if times:
                for row in rows:
                    row[k] = (row[k] - times * row[done]) & mask
                columns[k] = [(a - times * b) & mask for a, b in zip(columns[k], columns[done], strict=True)]
        diagonal.append(twos)
    out = [[(x << (width - twos)) & mask for x in columns[i]] for i, twos in enumerate(diagonal) if twos]
    return out + columns[len(diagonal) :]
