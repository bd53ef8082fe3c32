"""Waves for the eye: an orbit looked up by half-cycle, and the choice of what to show of it.

    Timeline   an orbit's state and output at any half-cycle, found by bisection over its stretches
    Piece      half-cycles that are shown, or folded away with their number stated
    plan       the pieces of a range of half-cycles that show the points that matter
    draw       rows of levels and values under a ruler, in columns of one half-cycle

An orbit may be billions of half-cycles long: nothing here walks it half-cycle by half-cycle, except over what
is shown.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import accumulate, islice

from prover.rhythm import Orbit, Stretch
from prover.system import State

MOST_STRETCHES = 256
"""Stretches that are looked at to tell what stays constant over a range; over more, nothing is claimed to."""


class Timeline:
    """What an orbit is at each half-cycle after its start."""

    def __init__(self, orbit: Orbit) -> None:
        self.orbit = orbit
        self.lead = orbit.lead_half_cycles
        self.loop = orbit.loop_half_cycles
        self._begins = list(accumulate((2 * s.cycles for s in orbit.stretches), initial=0))

    @property
    def once(self) -> int:
        """Half-cycles of the lead-in and once round the loop, or all that is known of an unclosed orbit."""
        return self._begins[-1]

    def end(self, wanted: int) -> int:
        """`wanted`, or the half-cycle at which an orbit that has not closed ends, whichever comes first."""
        return wanted if self.loop is not None else min(wanted, self.once)

    def _folded(self, half_cycle: int) -> int:
        """The same moment within the first round."""
        if self.loop is None or half_cycle < self.once:
            return half_cycle
        return self.lead + (half_cycle - self.lead) % self.loop

    def place(self, half_cycle: int) -> tuple[Stretch, int]:
        """The stretch that a half-cycle falls into, and how many half-cycles into it."""
        at = self._folded(half_cycle)
        index = bisect_right(self._begins, at) - 1
        if at < 0 or index >= len(self.orbit.stretches):
            raise IndexError("beyond the end of an orbit that has not closed")
        return self.orbit.stretches[index], at - self._begins[index]

    def state(self, half_cycle: int) -> State:
        """Register values, then the clock's level."""
        stretch, into = self.place(half_cycle)
        return stretch.state(into, self.orbit.widths)

    def level(self, half_cycle: int) -> int:
        """The output."""
        stretch, into = self.place(half_cycle)
        return stretch.levels[into % 2]

    def parts(self, begins: int, ends: int) -> Iterator[tuple[Stretch, int, int]]:
        """The stretches that make up a range of half-cycles, each with the range of itself that it gives."""
        at = begins
        while at < ends:
            stretch, into = self.place(at)
            upto = min(2 * stretch.cycles, into + ends - at)
            yield stretch, into, upto
            at += upto - into

    def regular(self, begins: int, ends: int) -> Iterator[int]:
        """The lengths of the stretches that make up a range, along each of which registers move steadily."""
        for _, into, upto in self.parts(begins, ends):
            yield upto - into

    def edges(self, begins: int, ends: int) -> Iterator[int]:
        """The half-cycles in the range that begin with a change of the output."""
        at = begins
        before = self.level(begins - 1) if begins > 0 else None
        for stretch, into, upto in self.parts(begins, ends):
            if stretch.levels[0] == stretch.levels[1]:
                if before is not None and before != stretch.levels[0]:
                    yield at
            else:
                if before is None or before != stretch.levels[into % 2]:
                    yield from (at,) if before is not None else ()
                yield from range(at + 1, at + upto - into)
            before = stretch.levels[(upto - 1) % 2]
            at += upto - into

    def steady(self, begins: int, ends: int) -> tuple[int | None, ...]:
        """The value that each component of the state, and last the output, keeps all through the range; None
        for one that moves in it, or where the range is too varied to tell."""
        kept: tuple[int | None, ...] | None = None
        for count, (stretch, into, upto) in enumerate(self.parts(begins, ends)):
            if count == MOST_STRETCHES:
                return (None,) * len(kept or ())
            here = _steady_within(stretch, into, upto, self.orbit.widths)
            both = zip(kept or here, here, strict=True)
            kept = tuple(a if a == b else None for a, b in both)
        return kept or ()


def _steady_within(stretch: Stretch, into: int, upto: int, widths: tuple[int, ...]) -> tuple[int | None, ...]:
    first = (*stretch.state(into, widths), stretch.levels[into % 2])
    if upto - into == 1:
        return first
    second = (*stretch.state(into + 1, widths), stretch.levels[(into + 1) % 2])
    strides = (*stretch.stride, 0) if upto - into > 2 else (0,) * len(first)
    return tuple(a if a == b and not d else None for a, b, d in zip(first, second, strides, strict=True))


@dataclass(frozen=True, slots=True)
class Piece:
    """Half-cycles `begins` to `ends` (exclusive), shown one by one or folded."""

    begins: int
    ends: int
    folded: bool = False

    @property
    def length(self) -> int:
        return self.ends - self.begins


def plan(
    begins: int, ends: int, points: Iterable[int], margin: int, most: int, least_fold: int
) -> list[Piece]:
    """Pieces that cover the range. Around each point, in order of weight, `margin` half-cycles are shown on
    either side until `most` are; what lies between is folded, where it is at least `least_fold`."""
    if ends - begins <= most:
        return [Piece(begins, ends)]
    shown: list[tuple[int, int]] = []
    for point in points:
        window = (max(begins, point - margin), min(ends, point + margin))
        if window[0] >= window[1]:
            continue
        wider = _joined([*shown, window], least_fold)
        if sum(b - a for a, b in wider) > most:
            break
        shown = wider
    return _with_folds(begins, ends, shown, least_fold)


def _joined(windows: list[tuple[int, int]], least_fold: int) -> list[tuple[int, int]]:
    out: list[tuple[int, int]] = []
    for begins, ends in sorted(windows):
        if out and begins - out[-1][1] < least_fold:
            out[-1] = (out[-1][0], max(ends, out[-1][1]))
        else:
            out.append((begins, ends))
    return out


def _with_folds(begins: int, ends: int, shown: list[tuple[int, int]], least_fold: int) -> list[Piece]:
    pieces: list[Piece] = []
    at = begins
    for first, last in shown:
        if at < first:
            pieces.append(Piece(at, first, first - at >= least_fold))
        pieces.append(Piece(first, last))
        at = last
    if at < ends:
        pieces.append(Piece(at, ends, ends - at >= least_fold))
    return pieces


def points_of_interest(
    timeline: Timeline, begins: int, ends: int, broken: tuple[int, int] | None
) -> Iterator[int]:
    """What a drawing of the range should show, the weightiest first: the ends of what is broken, the ends of
    the range, where the loop is entered, the first edges of the output within what is broken and after the
    start."""
    if broken is not None:
        yield from broken
    yield from (begins, ends)
    if begins < timeline.lead < ends:
        yield timeline.lead
    if broken is not None:
        yield from islice(timeline.edges(broken[0], min(broken[1], ends)), 8)
    yield from islice(timeline.edges(begins, ends), 16)


# -- drawing -----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Style:
    """The characters that a drawing is made of."""

    high: str = "‾"
    low: str = "_"
    edge: str = "|"
    mark: str = "^"
    fold: str = "…"


UNICODE = Style()
ASCII = Style(high="~", fold="..")


@dataclass(frozen=True, slots=True)
class Row:
    """One signal of a drawing: its value at a half-cycle, and drawn as a level if it is one bit wide.

    `steady` is the value it keeps through a range of half-cycles, None if it moves there. `counts` says that
    its folds state their length; the half-cycles `marked` (ends exclusive) are underlined."""

    name: str
    width: int
    value: Callable[[int], int]
    steady: Callable[[int, int], int | None]
    counts: bool = False
    marked: tuple[int, int] | None = None


@dataclass(frozen=True, slots=True)
class Drawing:
    """Rows over pieces of time. The ruler labels a half-cycle with itself plus `origin`: each piece's first,
    and every so many from label `phase` on."""

    ruler: str
    origin: int
    phase: int
    rows: tuple[Row, ...]
    pieces: tuple[Piece, ...]


def draw(drawing: Drawing, style: Style, width: int) -> list[str]:
    """The drawing's lines, in blocks of at most `width` characters."""
    names = [drawing.ruler, *(row.name for row in drawing.rows)]
    margin = max(len(name) for name in names) + 2
    column = _column_width(drawing)
    out: list[str] = []
    for block in _blocks(drawing.pieces, column, width - margin, style):
        if out:
            out.append("")
        out.append(drawing.ruler.ljust(margin) + _ruler(drawing, block, column, style))
        for row in drawing.rows:
            paint = _levels if row.width == 1 else _values
            out.append(row.name.ljust(margin) + paint(row, block, column, style))
            marks = _marks(row.marked, block, column, style) if row.marked is not None else ""
            if marks.strip():
                out.append(" " * margin + marks)
    return [line.rstrip() for line in out]


def fold_text(length: int, style: Style) -> str:
    """How a fold is written: the number of half-cycles with digits in threes."""
    digits = f"{length:,}".replace(",", " ")
    return f" {style.fold} {digits} half-cycles {style.fold} "


def _column_width(drawing: Drawing) -> int:
    """Characters a half-cycle, so that every value fits before the next one begins."""
    need = 2
    for row in drawing.rows:
        if row.width == 1:
            continue
        for piece in drawing.pieces:
            if not piece.folded:
                for first, last, value in _value_runs(row, piece):
                    # Runs that the piece cuts off need not fit.
                    if piece.begins < first and last < piece.ends:
                        need = max(need, -(-(len(str(value)) + 1) // (last - first)))
    return min(need, 6)


def _value_runs(row: Row, piece: Piece) -> Iterator[tuple[int, int, int]]:
    first, value = piece.begins, row.value(piece.begins)
    for at in range(piece.begins + 1, piece.ends):
        now = row.value(at)
        if now != value:
            yield first, at, value
            first, value = at, now
    yield first, piece.ends, value


def _blocks(pieces: Sequence[Piece], column: int, width: int, style: Style) -> Iterator[list[Piece]]:
    """The pieces cut into blocks that fit the width."""
    block: list[Piece] = []
    left = width
    for piece in pieces:
        if piece.folded:
            need = len(fold_text(piece.length, style))
            if need > left and block:
                yield block
                block, left = [], width
            block.append(piece)
            left -= need
            continue
        at = piece.begins
        while at < piece.ends:
            # Whole input cycles a line, so that lines begin at the same clock level.
            fits = max(2, left // column // 2 * 2)
            if left < 2 * column and block:
                yield block
                block, left = [], width
                continue
            upto = min(piece.ends, at + fits)
            block.append(Piece(at, upto))
            left -= (upto - at) * column
            at = upto
    if block:
        yield block


def _ruler(drawing: Drawing, block: list[Piece], column: int, style: Style) -> str:
    longest = max(len(str(piece.ends + drawing.origin)) for piece in block)
    every = next(step for step in (4, 8, 16, 32) if step * column >= longest + 1 or step == 32)
    line = ""
    at = 0
    for piece in block:
        if piece.folded:
            at += len(fold_text(piece.length, style))
            continue
        for half_cycle in range(piece.begins, piece.ends):
            label = half_cycle + drawing.origin
            due = half_cycle == piece.begins or (label - drawing.phase) % every == 0
            if due and len(line) < at + (at == 0):
                line = line.ljust(at) + str(label)
            at += column
    return line


def _levels(row: Row, block: list[Piece], column: int, style: Style) -> str:
    line = ""
    for piece in block:
        if piece.folded:
            line += _folded_level(row, piece, style)
            continue
        for at in range(piece.begins, piece.ends):
            level = row.value(at)
            body = style.high if level else style.low
            changed = at > 0 and row.value(at - 1) != level
            line += (style.edge if changed else body) + body * (column - 1)
    return line


def _folded_level(row: Row, piece: Piece, style: Style) -> str:
    """The fold's length in the row that counts; in others the level, where it keeps one all through."""
    text = fold_text(piece.length, style)
    kept = row.steady(piece.begins, piece.ends)
    if row.counts:
        return text
    if kept is None:
        return style.fold.center(len(text))
    return (style.high if kept else style.low) * len(text)


def _values(row: Row, block: list[Piece], column: int, style: Style) -> str:
    line = ""
    for piece in block:
        if piece.folded:
            text = fold_text(piece.length, style)
            kept = row.steady(piece.begins, piece.ends)
            line += " " * len(text) if kept is not None else style.fold.center(len(text))
            continue
        for first, last, value in _value_runs(row, piece):
            room = (last - first) * column
            text = str(value)
            at_end = last == piece.ends and piece is block[-1]
            if len(text) >= room and not at_end:
                text = text[: max(0, room - 1 - len(style.fold))] + style.fold
            line += text[:room].ljust(room) if not at_end else text
    return line


def _marks(marked: tuple[int, int], block: list[Piece], column: int, style: Style) -> str:
    begins, ends = marked[0], max(marked[1], marked[0] + 1)
    line = ""
    for piece in block:
        if piece.folded:
            inside = begins < piece.ends and piece.begins < ends
            line += (style.mark if inside else " ") * len(fold_text(piece.length, style))
            continue
        for at in range(piece.begins, piece.ends):
            line += (style.mark if begins <= at < ends else " ") * column
    return line
