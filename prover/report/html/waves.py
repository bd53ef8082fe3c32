"""Waves as SVG: a `Drawing` on its ruler, in strips that fit a page.

Each strip is two pictures side by side, the names and the signals, so that the names stay when a narrow window
scrolls the signals. Folds are torn out of the strip and state their length. Where a clock edge launches an edge of
the output there is an arrowhead, and a line down to what it launches. What is measured stands between two ticks, as
a dimension does in a drawing. Nothing is told by colour alone, and all of it by the description as well.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import ceil
from typing import Literal

from prover.report.html.markup import Markup, element, joined, number
from prover.report.wave import Drawing, Piece, Row, blocks, value_runs
from prover.report.words import digits

WIDEST = 760
"""Pixels of signals in a strip."""

ROW = 34
LEVEL = 16
"""Pixels from one row to the next, and between low and high."""

RULER = 26
RIGHT = 24
DIMENSION = 20
FOLD_MARGIN = 30
NARROWEST, WIDER, BROADEST = 14, 20, 44
"""Pixels of a half-cycle: at least, at most where there is room, and at most where values have to fit."""

CHARACTER = 6.7
"""Pixels a character of 11 px in a monospaced face takes at most."""

LONGEST_NAME = 20
MOST_TOLD = 24
"""Runs that a description spells out."""


@dataclass(frozen=True, slots=True)
class Dimension:
    """A stretch of a row that is measured: from `begins` to `ends` (exclusive, in columns), and what it is."""

    row: int
    begins: int
    ends: int
    text: str
    fault: bool = False


@dataclass(frozen=True, slots=True)
class Scene:
    """What a figure shows: a drawing, the row of the output in it, what is measured, and a name for it all.

    `key` is part of the identifiers in the file, different for each figure. `clocked`: the first row is the clock."""

    drawing: Drawing
    output: int
    dimensions: tuple[Dimension, ...]
    title: str
    key: str
    clocked: bool = True

    def on(self, row: int) -> list[Dimension]:
        """What is measured on a row."""
        return [dimension for dimension in self.dimensions if dimension.row == row]

    @property
    def launches(self) -> list[tuple[int, bool]]:
        """The columns in which a drawn edge of the output begins, of those that begin with an edge of the clock as
        well, and whether that one rises."""
        clock, row = self.drawing.rows[0], self.drawing.rows[self.output]
        return [
            (at, clock.value(at) == 1)
            for piece in self.drawing.pieces
            if self.clocked and not piece.folded
            for at in range(max(piece.begins, 1), piece.ends)
            if row.value(at) != row.value(at - 1) and clock.value(at) != clock.value(at - 1)
        ]


def figure(scene: Scene) -> Markup:
    """The scene's strips, one below the other."""
    frame = _Frame.of(scene)
    strips = list(blocks(scene.drawing, frame.column, WIDEST, frame.width))
    return joined(_strip(scene, frame, pieces, count, len(strips)) for count, pieces in enumerate(strips))


@dataclass(frozen=True, slots=True)
class _Frame:
    """Measures of a figure in pixels: a column's width, the names' column, and where each row lies."""

    column: int
    names: int
    tops: tuple[int, ...]
    height: int
    launched: frozenset[int]
    per: int

    @staticmethod
    def of(scene: Scene) -> _Frame:
        drawing = scene.drawing
        longest = max(len(_short(row.name)) for row in drawing.rows)
        tops, at = [], RULER
        for index in range(len(drawing.rows)):
            tops.append(at)
            at += ROW + DIMENSION * len(scene.on(index))
        launched = frozenset(at for at, _ in scene.launches)
        column = _column(drawing)
        shown = sum(piece.length for piece in drawing.pieces if not piece.folded)
        folds = sum(_fold_width(piece, drawing.per) for piece in drawing.pieces if piece.folded)
        # What is no clock's has few columns, and a measure has to fit into one.
        wider = WIDER // drawing.per if scene.clocked else BROADEST
        column = max(column, min(wider, (WIDEST - folds) // shown))
        names = int(max(longest, len(drawing.ruler)) * CHARACTER) + 14
        return _Frame(column, names, tuple(tops), at + 2, launched, drawing.per)

    def width(self, piece: Piece) -> int:
        """Pixels that a piece takes."""
        return _fold_width(piece, self.per) if piece.folded else piece.length * self.column


def _column(drawing: Drawing) -> int:
    """Pixels a column, so that most values fit before the next one begins."""
    need = float(NARROWEST // drawing.per)
    for row in drawing.rows:
        for piece in drawing.pieces:
            if row.width > 1 and not piece.folded:
                for first, last, value in value_runs(row, piece):
                    if piece.begins < first and last < piece.ends:
                        need = max(need, (len(str(value)) * CHARACTER + 8) / (last - first))
    return min(ceil(need), BROADEST)


def _short(name: str) -> str:
    """A name that fits its column: of a long one its end, which tells most."""
    return name if len(name) <= LONGEST_NAME else "…" + name[1 - LONGEST_NAME :]


def _fold_text(piece: Piece, per: int) -> str:
    return f"{digits(piece.length // per)} half-cycles"


def _fold_width(piece: Piece, per: int) -> int:
    return int(len(_fold_text(piece, per)) * CHARACTER) + FOLD_MARGIN


# -- a strip -----------------------------------------------------------------------------------------------


def _strip(scene: Scene, frame: _Frame, pieces: Sequence[Piece], count: int, of: int) -> Markup:
    places = list(_placed(frame, pieces))
    right = sum(frame.width(piece) for piece in pieces) + RIGHT
    width = 4 + max(right, *(_reach(each, frame, places) for each in scene.dimensions), 0)
    key = f"{scene.key}-{count + 1}"
    title = scene.title + (f", part {count + 1} of {of}" if of > 1 else "")
    told = _described(scene) if count == 0 else "The figure above, continued."
    picture = element(
        "svg",
        element("title", title, id=f"{key}-title"),
        element("desc", told, id=f"{key}-desc"),
        _signals(scene, frame, places),
        role="img",
        class_="wave",
        width=width,
        height=frame.height,
        viewBox=f"-4 0 {number(width)} {number(frame.height)}",
        aria_labelledby=f"{key}-title",
        aria_describedby=f"{key}-desc",
    )
    names = _names(scene.drawing, frame)
    return element("div", names, picture, class_="strip", tabindex=0, role="group", aria_label=title)


def _names(drawing: Drawing, frame: _Frame) -> Markup:
    texts = [element("text", drawing.ruler, x=0, y=16, class_="quiet")]
    for row, top in zip(drawing.rows, frame.tops, strict=True):
        inner = [element("title", row.name)] if _short(row.name) != row.name else []
        texts.append(element("text", *inner, _short(row.name), x=0, y=top + LEVEL))
    box = f"0 0 {number(frame.names)} {number(frame.height)}"
    return element(
        "svg", texts, class_="names", width=frame.names, height=frame.height, viewBox=box, aria_hidden="true"
    )


def _signals(scene: Scene, frame: _Frame, places: Places) -> Iterator[Markup]:
    yield _ruler(scene.drawing, frame, places)
    yield _threads(scene, frame, places)
    for row, top in zip(scene.drawing.rows, frame.tops, strict=True):
        yield from _levels(row, top, frame, places) if row.width == 1 else _values(row, top, frame, places)
    for x, piece in places:
        if piece.folded:
            yield from _tear(x, piece, frame)
    for index, top in enumerate(frame.tops):
        for line, dimension in enumerate(scene.on(index)):
            yield from _dimension(dimension, top + ROW + line * DIMENSION, frame, places)


def _placed(frame: _Frame, pieces: Sequence[Piece]) -> Iterator[tuple[float, Piece]]:
    """The pieces with where each begins, in pixels."""
    x = 0.0
    for piece in pieces:
        yield x, piece
        x += frame.width(piece)


Places = Sequence[tuple[float, Piece]]


def _ruler(drawing: Drawing, frame: _Frame, places: Places) -> Markup:
    """A tick for each half-cycle and as many numbers as there is room for, those of launching edges first."""
    ticks: list[str] = []
    numbered: list[tuple[float, float, Markup]] = []
    wanted: list[tuple[bool, bool, float, int]] = []
    torn = [(x, x + frame.width(piece)) for x, piece in places if piece.folded]
    for x, piece in places:
        if piece.folded:
            middle, half = x + frame.width(piece) / 2, len(_fold_text(piece, drawing.per)) * CHARACTER / 2 + 4
            made = element("text", _fold_text(piece, drawing.per), x=middle, y=15, class_="fold")
            numbered.append((middle - half, middle + half, made))
            continue
        for at in range(piece.begins, piece.ends):
            if at % drawing.per:
                continue
            place = x + (at - piece.begins) * frame.column
            label = at // drawing.per + drawing.origin
            ticks.append(f"M{number(place)} 20v6")
            first = at == piece.begins
            wanted.append((at not in frame.launched, not first, place, label))
    every = _every(drawing, frame, places)
    for quiet, later, place, label in sorted(wanted):
        if quiet and later and (label - drawing.phase) % every:
            continue
        shown = digits(label)
        half = len(shown) * CHARACTER / 2 + 2
        # The first number of a piece stays within it, and none is crossed by a tear where that can be.
        begins = place - (half if later and place > half else 4)
        begins = next((max(begins, b) for a, b in torn if a <= begins < b), begins)
        begins = next((a - 2 * half for a, b in torn if a < begins + 2 * half <= b), begins)
        crossed = any(begins < b and a < begins + 2 * half for a, b in torn)
        if crossed and quiet:
            continue
        if all(begins + 2 * half <= a or b <= begins for a, b, _ in numbered):
            kind = "number" if quiet else "number launch"
            made = element("text", shown, x=begins + half, y=15, class_=kind)
            numbered.append((begins, begins + 2 * half, made))
    texts = [made for _, _, made in sorted(numbered, key=lambda entry: entry[0])]
    return joined([element("path", d="".join(ticks), class_="tick"), *texts])


def _every(drawing: Drawing, frame: _Frame, places: Places) -> int:
    longest = max(len(digits(piece.ends // drawing.per + drawing.origin)) for _, piece in places)
    room = frame.column * drawing.per
    steps = (1, 2, 4, 8, 16, 32, 64) if room > 2 * WIDER else (2, 4, 8, 16, 32, 64)
    return next(step for step in steps if step * room >= longest * CHARACTER + 8 or step == 64)


def _threads(scene: Scene, frame: _Frame, places: Places) -> Markup:
    """From each launching edge of the clock down to the edge that it launches."""
    top, bottom = frame.tops[0] + LEVEL / 2, frame.tops[scene.output] + LEVEL / 2
    marks: list[str] = []
    for at, rises in scene.launches:
        for x in _places_of(at, frame, places):
            tip, foot = (top + 2, top + 10) if rises else (top + 10, top + 2)
            arrow = f"M{number(x)} {number(tip)}L{number(x - 4)} {number(foot)}h8z"
            thread = f"M{number(x)} {number(top + 12)}V{number(bottom)}"
            marks += [element("path", d=thread, class_="thread"), element("path", d=arrow, class_="arrow")]
    return joined(marks)


def _places_of(at: int, frame: _Frame, places: Places) -> Iterator[float]:
    for x, piece in places:
        if not piece.folded and piece.begins <= at < piece.ends:
            yield x + (at - piece.begins) * frame.column


def _levels(row: Row, top: float, frame: _Frame, places: Places) -> Iterator[Markup]:
    """A row of one bit as a line, drawn through where it keeps its level over a fold."""
    high, low = top + 4, top + 4 + LEVEL
    solid: list[str] = []
    pen = False
    for x, piece in places:
        if piece.folded:
            kept = row.steady(piece.begins, piece.ends)
            yield from _folded_level(x, piece, kept, high, low, frame)
            pen = False
            continue
        for at in range(piece.begins, piece.ends):
            y = number(high if row.value(at) else low)
            place = number(x + (at - piece.begins) * frame.column)
            changed = at > 0 and row.value(at - 1) != row.value(at)
            if not pen:
                before = number(high if row.value(at - 1) else low) if changed else y
                solid.append(f"M{place} {before}")
                pen = True
            if changed:
                solid.append(f"H{place}V{y}")
        solid.append(f"H{number(x + piece.length * frame.column)}")
    yield element("path", d="".join(solid), class_="line")


def _folded_level(
    x: float, piece: Piece, kept: int | None, high: float, low: float, frame: _Frame
) -> Iterator[Markup]:
    begins, ends = x + 8, x + frame.width(piece) - 8
    if kept is not None:
        y = high if kept else low
        yield element("path", d=f"M{number(begins)} {number(y)}H{number(ends)}", class_="line far")
    else:
        yield element("path", d=_hatched(begins, ends, high, low), class_="hatch")


def _hatched(begins: float, ends: float, high: float, low: float) -> str:
    count = int((ends - begins) // 9)
    return "".join(f"M{number(begins + 9 * i)} {number(low)}l6 {number(high - low)}" for i in range(count))


def _values(row: Row, top: float, frame: _Frame, places: Places) -> Iterator[Markup]:
    """A row of several bits: a box for each value, crossed over where it changes."""
    high, low, middle = top + 4, top + 4 + LEVEL, top + 4 + LEVEL / 2
    boxes: list[str] = []
    for x, piece in places:
        if piece.folded:
            begins, ends = x + 8, x + frame.width(piece) - 8
            kept = row.steady(piece.begins, piece.ends)
            if kept is None:
                yield element("path", d=_hatched(begins, ends, high, low), class_="hatch")
            else:
                yield _value(row, kept, begins, ends, middle)
            continue
        for first, last, value in value_runs(row, piece):
            a = x + (first - piece.begins) * frame.column
            b = x + (last - piece.begins) * frame.column
            opens, closes = first > piece.begins or first == 0, last < piece.ends
            boxes.append(_box(a, b, high, low, opens, closes))
            yield _value(row, value, a, b, middle)
    yield element("path", d="".join(boxes), class_="line thin")


def _value(row: Row, value: int | None, a: float, b: float, middle: float) -> Markup:
    """A value in the room from a to b; one that is too long for it is told where it is pointed at."""
    shown = str(value)
    fits = len(shown) * CHARACTER + 4 <= b - a
    inner = [shown] if fits else [element("title", f"{row.name}={shown}"), "…"]
    return element("text", inner, x=(a + b) / 2, y=middle + 4, class_="value")


def _box(a: float, b: float, high: float, low: float, opens: bool, closes: bool) -> str:
    """The outline of a value between two changes; left open where it began before or goes on."""
    middle = number((high + low) / 2)
    left, right = number(a + 3 if opens else a), number(b - 3 if closes else b)
    out = ""
    for y in (number(high), number(low)):
        out += f"M{number(a)} {middle}L{left} {y}" if opens else f"M{left} {y}"
        out += f"H{right}" + (f"L{number(b)} {middle}" if closes else "")
    return out


def _dimension(shown: Dimension, top: float, frame: _Frame, places: Places) -> Iterator[Markup]:
    """A line between two ticks with its length on it, or beside it where that is longer than the line."""
    stretch = _inside(shown, frame, places)
    if stretch is None:
        return
    begins, ends = stretch
    y = top + 6
    path = f"M{number(begins)} {number(y)}H{number(ends)}"
    for x, tick in ((begins, _holds(places, shown.begins)), (ends, _holds(places, shown.ends - 1))):
        if tick:
            path += f"M{number(x)} {number(y - 5)}v10"
    yield element("path", d=path, class_="dimension fault" if shown.fault else "dimension")
    kind = "measure fault" if shown.fault else "measure"
    need, side = _beside(shown, begins, ends, places, frame)
    if side == "on":
        middle = (begins + ends) / 2
        yield element("rect", x=middle - need / 2, y=y - 7, width=need, height=14, class_="gap")
        yield element("text", shown.text, x=middle, y=y + 4, class_=kind)
    else:
        x = ends + 6 if side == "after" else begins - 6
        yield element("text", shown.text, x=x, y=y + 4, class_=f"{kind} {side}")


def _inside(shown: Dimension, frame: _Frame, places: Places) -> tuple[float, float] | None:
    """From where to where a dimension is drawn, in pixels, in the pieces that it is in."""
    begins = ends = None
    for x, piece in places:
        first, last = max(shown.begins, piece.begins), min(shown.ends, piece.ends)
        if first < last:
            scale = frame.width(piece) / piece.length
            begins = x + (first - piece.begins) * scale if begins is None else begins
            ends = x + (last - piece.begins) * scale
    return None if begins is None or ends is None else (begins, ends)


def _beside(
    shown: Dimension, begins: float, ends: float, places: Places, frame: _Frame
) -> tuple[float, Literal["on", "before", "after"]]:
    """The room that a dimension's text needs, in pixels, and where it is put."""
    need = len(shown.text) * CHARACTER + 10
    right = max(x + frame.width(piece) for x, piece in places) + RIGHT
    if need <= ends - begins:
        return need, "on"
    return need, "before" if ends + need > right and begins > need else "after"


def _reach(shown: Dimension, frame: _Frame, places: Places) -> float:
    """How far to the right a dimension and its text go, in pixels."""
    stretch = _inside(shown, frame, places)
    if stretch is None:
        return 0
    need, side = _beside(shown, *stretch, places, frame)
    return stretch[1] + (need if side == "after" else 0)


def _holds(places: Places, at: int) -> bool:
    return any(piece.begins <= at < piece.ends for _, piece in places)


def _tear(x: float, piece: Piece, frame: _Frame) -> Iterator[Markup]:
    """The torn edges of a fold; the ruler has its length."""
    width = frame.width(piece)
    for at in (x + 4, x + width - 4):
        steps = int((frame.height - 8) // 8)
        zigzag = "".join("l3 4l-3 4" for _ in range(steps))
        yield element("path", d=f"M{number(at)} 4{zigzag}", class_="tear")


# -- in words ----------------------------------------------------------------------------------------------


def _described(scene: Scene) -> str:
    """The figure in words: the output's runs as drawn, with their half-cycles, and what is measured."""
    drawing, row = scene.drawing, scene.drawing.rows[scene.output]
    runs = []
    for first, last, level in _runs(drawing, row):
        word = "changing, folded" if level is None else "high" if level else "low"
        runs.append(f"{word} {number((last - first) / drawing.per)}")
    more = f", and {len(runs) - MOST_TOLD} more runs" if len(runs) > MOST_TOLD else ""

    def labelled(at: int) -> str:
        return f"{drawing.ruler} {at // drawing.per + drawing.origin}"

    begins = labelled(drawing.pieces[0].begins)
    unit = "half-cycles" if scene.clocked else "arrivals"
    told = [f"{row.name} from {begins} on, in {unit}: {', '.join(runs[:MOST_TOLD])}{more}."]
    if drawing.ruler == "edge":
        edges = [f"{labelled(at)} ({'rising' if up else 'falling'})" for at, up in scene.launches]
        told.append(f"Launched by {', '.join(edges[:MOST_TOLD])} of the clock." if edges else "")
    told += [f"{each.text}, from {labelled(each.begins)} on." for each in scene.dimensions]
    return " ".join(part for part in told if part)


def _runs(drawing: Drawing, row: Row) -> list[tuple[int, int, int | None]]:
    """The row's runs over all pieces, neighbours of one level joined; None for a fold in which it moves."""
    out: list[tuple[int, int, int | None]] = []
    for piece in drawing.pieces:
        if piece.folded:
            parts: list[tuple[int, int, int | None]] = [
                (piece.begins, piece.ends, row.steady(piece.begins, piece.ends))
            ]
        else:
            parts = [*value_runs(row, piece)]
        for begins, ends, level in parts:
            if out and out[-1][2] == level and level is not None:
                out[-1] = (out[-1][0], ends, level)
            else:
                out.append((begins, ends, level))
    return out
