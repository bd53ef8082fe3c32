"""Waves for the eye: an orbit looked up by half-cycle, and the choice of what to show of it.

    Timeline   an orbit's state and output at any half-cycle, whatever its length
    Piece      half-cycles that are shown, or folded away with their number stated
    plan       the pieces of a range of half-cycles that show the points that matter
    draw       rows of levels and values under a ruler, in columns of one half-cycle or a part of it

An orbit may be billions of half-cycles long: nothing here walks it half-cycle by half-cycle, except over what
is shown.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from itertools import islice

from prover.path import Place, Places, length
from prover.report.words import digits
from prover.rhythm import Orbit
from prover.system import State

MOST_SPANS = 256
"""Spans that are looked at to tell what stays constant over a range; over more, nothing is claimed to."""


class Timeline:
    """What an orbit is at each half-cycle after its start."""

    def __init__(self, orbit: Orbit) -> None:
        self.orbit = orbit
        self.lead = orbit.lead_half_cycles
        self.loop = orbit.loop_half_cycles
        self._lead = Places(orbit.lead, orbit.widths)
        self._loop = Places(orbit.loop, orbit.widths)

    @property
    def once(self) -> int:
        """Half-cycles of the lead-in and once round the loop, or all that is known of an unclosed orbit."""
        return self.lead + self.loop

    def end(self, wanted: int) -> int:
        """`wanted`, or the half-cycle at which an orbit that has not closed ends, whichever comes first."""
        return wanted if self.loop else min(wanted, self.once)

    def place(self, half_cycle: int) -> Place:
        """Where the orbit is; as Orbit.place says, but made to be asked for each half-cycle of a long one."""
        if half_cycle < self.lead or not self.loop:
            return self._lead.at(half_cycle)
        return self._loop.at((half_cycle - self.lead) % self.loop)

    def state(self, half_cycle: int) -> State:
        """Register values, then the clock's level."""
        return self.place(half_cycle).state

    def level(self, half_cycle: int) -> int:
        """The output."""
        return self.place(half_cycle).level

    def spans(self, begins: int, ends: int) -> Iterator[tuple[Place, int]]:
        """The places from which a range of half-cycles runs on regularly, each with how far it does."""
        at = begins
        while at < ends:
            place = self.place(at)
            size = min(place.calm, ends - at)
            yield place, size
            at += size

    def regular(self, begins: int, ends: int) -> Iterator[int]:
        """The lengths of the spans that make up a range, along each of which registers move steadily."""
        for _, size in self.spans(begins, ends):
            yield size

    def edges(self, begins: int, ends: int) -> Iterator[int]:
        """The half-cycles in the range that begin with a change of the output."""
        rounds = max(ends - self.lead, 0) // self.loop + 2 if self.loop else 0
        at = 0
        for index, (_, size) in enumerate(self.orbit.runs(rounds)):
            if at >= ends:
                return
            if index > 0 and at >= begins:
                yield at
            at += size

    def steady(self, begins: int, ends: int) -> tuple[int | None, ...]:
        """The value that each component of the state, and last the output, keeps all through the range; None
        for one that moves in it, or where the range is too varied to tell."""
        kept: tuple[int | None, ...] | None = None
        at = begins
        for count, (place, size) in enumerate(self.spans(begins, ends)):
            if count == MOST_SPANS:
                return (None,) * len(kept or ())
            here = self._steady_within(at, place, size)
            both = zip(kept or here, here, strict=True)
            kept = tuple(a if a == b else None for a, b in both)
            at += size
        return kept or ()

    def _steady_within(self, at: int, place: Place, size: int) -> tuple[int | None, ...]:
        """The same within one span, of which two rounds of its repeat show all that changes."""
        if place.around and 2 * length(place.around.body) > MOST_SPANS:
            # A long round: its output alone is known without looking at each half-cycle of it.
            return (*(None for _ in place.state), place.around.steady)
        shown = min(size, 2 * length(place.around.body)) if place.around else 1
        rows = [(*p.state, p.level) for p in (self.place(at + i) for i in range(shown))]
        return tuple(column[0] if len(set(column)) == 1 else None for column in zip(*rows, strict=True))


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
    and every so many from label `phase` on. Rows and pieces count in columns, of which `per` make a half-cycle."""

    ruler: str
    origin: int
    phase: int
    rows: tuple[Row, ...]
    pieces: tuple[Piece, ...]
    per: int = 1


def draw(drawing: Drawing, style: Style, width: int) -> list[str]:
    """The drawing's lines, in blocks of at most `width` characters."""
    names = [drawing.ruler, *(row.name for row in drawing.rows)]
    margin = max(len(name) for name in names) + 2
    column = _column_width(drawing)
    out: list[str] = []
    for block in blocks(drawing, column, width - margin, lambda piece: len(_fold(piece, drawing, style))):
        if out:
            out.append("")
        out.append(drawing.ruler.ljust(margin) + _ruler(drawing, block, column, style))
        for row in drawing.rows:
            paint = _levels if row.width == 1 else _values
            out.append(row.name.ljust(margin) + paint(row, block, drawing, column, style))
            marks = _marks(row.marked, block, drawing, column, style) if row.marked is not None else ""
            if marks.strip():
                out.append(" " * margin + marks)
    return [line.rstrip() for line in out]


def fold_text(length: int, style: Style) -> str:
    """How a fold is written: the number of half-cycles with digits in threes."""
    return f" {style.fold} {digits(length)} half-cycles {style.fold} "


def _column_width(drawing: Drawing) -> int:
    """Characters a column, so that every value fits before the next one begins."""
    need = 2
    for row in drawing.rows:
        if row.width == 1:
            continue
        for piece in drawing.pieces:
            if not piece.folded:
                for first, last, value in value_runs(row, piece):
                    # Runs that the piece cuts off need not fit.
                    if piece.begins < first and last < piece.ends:
                        need = max(need, -(-(len(str(value)) + 1) // (last - first)))
    return min(need, 6)


def value_runs(row: Row, piece: Piece) -> Iterator[tuple[int, int, int]]:
    """The stretches of a piece over which a row keeps its value: begin, end (exclusive) and value."""
    first, value = piece.begins, row.value(piece.begins)
    for at in range(piece.begins + 1, piece.ends):
        now = row.value(at)
        if now != value:
            yield first, at, value
            first, value = at, now
    yield first, piece.ends, value


def blocks(
    drawing: Drawing, column: int, width: int, fold_width: Callable[[Piece], int]
) -> Iterator[list[Piece]]:
    """The pieces cut into blocks that fit the width; it, a column's and a fold's are in one unit."""
    block: list[Piece] = []
    left = width
    cycle = 2 * drawing.per
    for piece in drawing.pieces:
        if piece.folded:
            need = fold_width(piece)
            if need > left and block:
                yield block
                block, left = [], width
            block.append(piece)
            left -= need
            continue
        at = piece.begins
        while at < piece.ends:
            # Whole input cycles a line, so that lines begin at the same clock level.
            fits = max(cycle, left // column // cycle * cycle)
            if (piece.ends - at) * column <= left:
                fits = piece.ends - at
            elif left < cycle * column and block:
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
    per = drawing.per
    longest = max(len(str(piece.ends // per + drawing.origin)) for piece in block)
    every = next(step for step in (4, 8, 16, 32) if step * column * per >= longest + 1 or step == 32)
    line = ""
    at = 0
    for piece in block:
        if piece.folded:
            at += len(_fold(piece, drawing, style))
            continue
        for place in range(piece.begins, piece.ends):
            label = place // per + drawing.origin
            due = place == piece.begins or (label - drawing.phase) % every == 0
            if due and place % per == 0 and len(line) < at + (at == 0):
                line = line.ljust(at) + str(label)
            at += column
    return line


def _fold(piece: Piece, drawing: Drawing, style: Style) -> str:
    return fold_text(piece.length // drawing.per, style)


def _levels(row: Row, block: list[Piece], drawing: Drawing, column: int, style: Style) -> str:
    line = ""
    for piece in block:
        if piece.folded:
            line += _folded_level(row, piece, _fold(piece, drawing, style), style)
            continue
        for at in range(piece.begins, piece.ends):
            level = row.value(at)
            body = style.high if level else style.low
            changed = at > 0 and row.value(at - 1) != level
            line += (style.edge if changed else body) + body * (column - 1)
    return line


def _folded_level(row: Row, piece: Piece, text: str, style: Style) -> str:
    """The fold's length in the row that counts; in others the level, where it keeps one all through."""
    kept = row.steady(piece.begins, piece.ends)
    if row.counts:
        return text
    if kept is None:
        return style.fold.center(len(text))
    return (style.high if kept else style.low) * len(text)


def _values(row: Row, block: list[Piece], drawing: Drawing, column: int, style: Style) -> str:
    line = ""
    for piece in block:
        if piece.folded:
            text = _fold(piece, drawing, style)
            kept = row.steady(piece.begins, piece.ends)
            line += " " * len(text) if kept is not None else style.fold.center(len(text))
            continue
        for first, last, value in value_runs(row, piece):
            room = (last - first) * column
            text = str(value)
            at_end = last == piece.ends and piece is block[-1]
            if len(text) >= room and not at_end:
                text = text[: max(0, room - 1 - len(style.fold))] + style.fold
            line += text[:room].ljust(room) if not at_end else text
    return line


def _marks(marked: tuple[int, int], block: list[Piece], drawing: Drawing, column: int, style: Style) -> str:
    begins, ends = marked[0], max(marked[1], marked[0] + 1)
    line = ""
    for piece in block:
        if piece.folded:
            inside = begins < piece.ends and piece.begins < ends
            line += (style.mark if inside else " ") * len(_fold(piece, drawing, style))
            continue
        for at in range(piece.begins, piece.ends):
            line += (style.mark if begins <= at < ends else " ") * column
    return line
