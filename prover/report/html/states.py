"""The state graph of a small machine as SVG: each loop a ring, and the trees of states that lead into it.

The layout is a radial one: a ring's circumference is shared out by how much leads into each of its states, and what
leads into a state lies outward of it, one step further for each half-cycle. Stretches in which nothing joins and
nothing changes are folded to one box that tells how many states it stands for; a table lists them all.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import groupby
from math import cos, hypot, inf, pi, sin

from prover import graph
from prover.effort import Effort
from prover.findings import Report
from prover.report import words
from prover.report.html.markup import Markup, element, joined, number
from prover.rhythm import Goal, Loop, Wave
from prover.system import System

MOST_STATES = 128
"""States of a machine whose graph is drawn."""

MOST_BITS = 12
"""Bits of a state up to which its graph is looked at: of these few may be power-up states."""

MOST_DRAWN = 6
"""Loops that are drawn, good ones and those that most states lead into first."""

LEAST_FOLD = 4
"""States that are worth a fold."""

LONGEST_LABEL = 11
CHARACTER = 6.1
"""Pixels a character of 10 px in a monospaced face takes at most."""

HEIGHT, GAP, STEP = 18, 10, 18
"""Pixels: a state's height, between neighbours on a ring, and between a state and what it leads to."""

STRAIGHT = 0.35
"""Radians between a state and what it leads to up to which the way is drawn straight."""

SHALLOW = 2
"""Boxes one after another up to which trees leave the first state of a loop on top."""

SMALLEST = 40
"""Pixels: the least radius of a ring."""

Point = tuple[float, float]


@dataclass(frozen=True)
class Machine:
    """Every state that a small machine can be at rest in, by its number.

    after     the state after one more edge of the clock
    output    the output's level
    rank      half-cycles until good, −1 for never; none where nothing says what good is
    members   the states on each loop, in order, the loops as in the rhythm
    loop      the loop that the state runs into
    distance  half-cycles until it is on it
    """

    system: System
    names: Sequence[str]
    values: Mapping[int, Sequence[int]]
    after: Mapping[int, int]
    output: Mapping[int, int]
    rank: Mapping[int, int]
    members: Sequence[Sequence[int]]
    loop: Mapping[int, int]
    distance: Mapping[int, int]
    starts: frozenset[int]
    slowest: int | None

    @cached_property
    def before(self) -> Mapping[int, Sequence[int]]:
        """The states that lead to a state and are on no loop, in order."""
        found: dict[int, list[int]] = {state: [] for state in self.after}
        for state, after in self.after.items():
            if self.distance[state] > 0:
                found[after].append(state)
        return found

    @cached_property
    def shapes(self) -> Mapping[int, int]:
        """For each state that is on no loop a number, which is that of another if all that leads into both is alike
        and has the same outputs. A state that is marked is like no other."""
        numbers: dict[tuple[int, tuple[int, ...], int], int] = {}
        made: dict[int, int] = {}
        for state in sorted(self.after, key=lambda state: -self.distance[state]):
            if self.distance[state] > 0:
                inner = tuple(sorted(made[before] for before in self.before[state]))
                marked = state in self.starts or state == self.slowest
                made[state] = numbers.setdefault(
                    (self.output[state], inner, state if marked else -1), len(numbers)
                )
        return made

    def tree(self, state: int) -> list[int]:
        """The state and all that leads into it."""
        found = [state]
        for each in found:
            found += self.before[each]
        return found

    @cached_property
    def labels(self) -> Mapping[int, str]:
        """A short name for each state: its values, or its place in the table where these are too long."""
        told = {state: self._spelt([str(v) for v in values], "") for state, values in self.values.items()}
        if max(map(len, told.values())) > LONGEST_LABEL:
            return {state: f"#{place + 1}" for place, state in enumerate(self.values)}
        return told

    @property
    def key(self) -> str:
        """What a label is made of; "" where labels are places in the table."""
        if next(iter(self.labels.values())).startswith("#"):
            return ""
        return self._spelt(self.names, " ")

    def _spelt(self, parts: Sequence[str], between: str) -> str:
        """Bits side by side, everything else apart; the clock is last and by itself."""
        widths = [width for _, width in self.system.variables[:-1]]
        pairs = (
            zip(parts, widths, strict=False)
            if len(parts) == len(widths) + 1
            else ((p, 1) for p in parts[:-1])
        )
        groups = (
            (between.join(part for part, _ in run) if bits else "·".join(part for part, _ in run))
            for bits, run in groupby(pairs, key=lambda pair: pair[1] == 1)
        )
        return "·".join([*groups, parts[-1]])


def machine(report: Report) -> Machine | None:
    """The report's machine, if its graph decided and it has no more states than can be drawn."""
    rhythm = report.rhythm
    system = rhythm.system
    if rhythm.census is None or system.bits > MOST_BITS or sum(rhythm.census.leading) > MOST_STATES:
        return None
    # Few enough states to need no limit: the verdict is there, and a page must not fail for want of time.
    effort = Effort(inf)
    built = graph.build(system, effort)
    wave = next((loop.wave for loop in rhythm.loops if loop.good), None)
    goal = Goal.of(wave) if wave else None
    found = graph.basins(built, effort, goal)
    seen = {number for number, rests in enumerate(built.start.tolist()) if rests}
    after = built.successors[0].tolist()
    todo = list(seen)
    while todo:
        step = after[todo.pop()]
        if step not in seen:
            seen.add(step)
            todo.append(step)
    if len(seen) > MOST_STATES:
        return None
    states = sorted(seen, key=lambda number: built.state(number))
    ranked: Mapping[int, int] = {}
    if goal is not None:
        rank = graph.ranks(built, found, goal).rank.tolist()
        ranked = {state: rank[state] for state in states}
    elif rhythm.recovery is not None:
        ranked = dict.fromkeys(states, -1)
    entry, distance = found.entry.tolist(), found.distance.tolist()
    slowest = rhythm.recovery.slowest if rhythm.recovery else None
    described = {state: system.describe(built.state(state)) for state in states}
    return Machine(
        system=system,
        names=list(next(iter(described.values()))),
        values={state: list(values.values()) for state, values in described.items()},
        after={state: after[state] for state in states},
        output={state: int(built.output[state]) for state in states},
        rank=ranked,
        members=found.members,
        loop={state: int(found.on_loop[entry[state]]) for state in states},
        distance={state: distance[state] for state in states},
        starts=frozenset(built.number(start.state) for start in rhythm.starts),
        slowest=built.number(slowest) if slowest is not None else None,
    )


# -- folding -----------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Node:
    """One box of the drawing: a state, or several that are folded, and the boxes that lead into it.

    `trees` is 1 for a state and for several one after another; else the number of trees alike that it stands for,
    each of which leads where the box does."""

    states: tuple[int, ...]
    inward: tuple[Node, ...] = ()
    trees: int = 1

    @cached_property
    def span(self) -> int:
        """Boxes side by side that it and what leads into it take."""
        return max(1, sum(node.span for node in self.inward))

    @cached_property
    def depth(self) -> int:
        """Boxes one after another from the farthest that leads into it on, it not counted."""
        return max((1 + node.depth for node in self.inward), default=0)

    @property
    def size(self) -> str:
        """How many states it stands for."""
        if self.trees == 1 or self.trees == len(self.states):
            return f"{len(self.states)} states"
        return f"{self.trees}×{len(self.states) // self.trees} states"


def ring(found: Machine, index: int) -> list[Node]:
    """A loop's boxes in order, from the first state after a rise of the output on if there is one."""
    states = list(found.members[index])
    levels = [found.output[state] for state in states]
    rises = [i for i in range(len(states)) if levels[i] and not levels[i - 1]]
    first = min(rises, key=lambda i: states[i]) if rises else 0
    states = states[first:] + states[:first]
    return [Node(part) if len(part) > 1 else _tree(found, part[0]) for part in _stretches(found, states)]


def _stretches(found: Machine, states: Sequence[int]) -> Iterator[tuple[int, ...]]:
    """The states of a long loop one by one, but where nothing happens together."""

    def calm(place: int) -> bool:
        here, left, right = (states[(place + by) % len(states)] for by in (0, -1, 1))
        marked = here in found.starts or here == found.slowest or found.before[here]
        return not marked and found.output[left] == found.output[here] == found.output[right]

    long = len(states) > 16
    for folds, run in groupby(range(len(states)), key=lambda place: long and calm(place)):
        places = list(run)
        if folds and len(places) >= LEAST_FOLD:
            yield tuple(states[place] for place in places)
        else:
            yield from ((states[place],) for place in places)


def _tree(found: Machine, state: int) -> Node:
    """A state with all that leads into it, of many trees alike but the first."""
    alike: dict[int, list[int]] = {}
    for before in found.before[state]:
        alike.setdefault(found.shapes[before], []).append(before)
    inward: list[Node] = []
    for tops in alike.values():
        single = not found.before[tops[0]]
        if len(tops) - (not single) < LEAST_FOLD:
            inward += (_chain(found, top) for top in tops)
            continue
        if not single:
            inward.append(_chain(found, tops[0]))
        rest = tops if single else tops[1:]
        inward.append(Node(tuple(s for top in rest for s in found.tree(top)), trees=len(rest)))
    return Node((state,), tuple(inward))


def _chain(found: Machine, state: int) -> Node:
    """A state with all that leads into it, where a long way without a fork is folded but for its ends."""
    way = [state]
    while len(found.before[way[-1]]) == 1:
        way.append(found.before[way[-1]][0])
    if len(way) < LEAST_FOLD + 2:
        return _tree(found, state)
    return Node((state,), (Node(tuple(way[1:-1]), (_tree(found, way[-1]),)),))


# -- layout ------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Placed:
    """A box with its centre, its half width, how far out it is in steps and at which angle, and the box that it leads
    to (None on the ring)."""

    node: Node
    at: Point
    half: float
    depth: int
    angle: float
    onto: Placed | None = None


@dataclass(frozen=True)
class Plan:
    """A ring's radius about (0, 0), the step from one box of a tree to the next where it goes to the side, the boxes
    of the ring in order, and all boxes of the trees."""

    radius: float
    step: float
    ring: Sequence[Placed]
    trees: Sequence[Placed]

    def point(self, depth: float, angle: float) -> Point:
        """Where a box lies. Boxes are wider than high, so steps to the sides are longer than those up and down."""
        return (
            (self.radius + depth * self.step) * cos(angle),
            (self.radius + depth * (HEIGHT + STEP)) * sin(angle),
        )


def plan(found: Machine, index: int) -> Plan:
    """Where everything of a loop and its trees lies, in pixels."""
    boxes = ring(found, index)
    half = max(_half(found, node) for node, _ in _all(boxes))
    share = 2 * pi / sum(node.span for node in boxes)
    # Each box has room for itself in its share of the circle that it lies on.
    room = (
        (2 * _half(found, node) + GAP) / (share * node.span) - depth * (HEIGHT + STEP)
        for node, depth in _all(boxes)
    )
    radius = max(SMALLEST, 1.5 * half, *room)
    made = Plan(radius, 2 * half + STEP, [], [])
    placed: list[Placed] = []
    trees: list[Placed] = []
    # The others follow clockwise. Boxes are wider than high, so the longest way in is shortest from below.
    deepest = max(boxes, key=lambda node: node.depth)
    first, angle = (deepest, pi / 2) if deepest.depth > SHALLOW else (boxes[0], -pi / 2)
    angle -= share * (first.span / 2 + sum(node.span for node in boxes[: boxes.index(first)]))
    for node in boxes:
        middle = angle + share * node.span / 2
        placed.append(Placed(node, made.point(0, middle), _half(found, node), 0, middle))
        trees += _outward(found, made, placed[-1], angle, share)
        angle += share * node.span
    return replace(made, ring=placed, trees=trees)


def _outward(found: Machine, made: Plan, onto: Placed, angle: float, share: float) -> Iterator[Placed]:
    depth = onto.depth + 1
    for node in onto.node.inward:
        middle = angle + share * node.span / 2
        here = Placed(node, made.point(depth, middle), _half(found, node), depth, middle, onto)
        yield here
        yield from _outward(found, made, here, angle, share)
        angle += share * node.span


def _all(nodes: Sequence[Node], depth: int = 0) -> Iterator[tuple[Node, int]]:
    """Boxes and those that lead into them, with how far out each is."""
    for node in nodes:
        yield node, depth
        yield from _all(node.inward, depth + 1)


def _label(found: Machine, node: Node) -> str:
    if len(node.states) > 1:
        return node.size
    state = node.states[0]
    mark = "▸" if state in found.starts else ""
    return mark + found.labels[state] + ("*" if state == found.slowest else "")


def _half(found: Machine, node: Node) -> float:
    return len(_label(found, node)) * CHARACTER / 2 + 5


# -- drawing -----------------------------------------------------------------------------------------------


def figures(report: Report, found: Machine, key: str) -> Iterator[Markup]:
    """A figure for each of the loops that are drawn."""
    loops = report.rhythm.loops
    census = report.rhythm.census
    leading = census.leading if census else ()
    order = sorted(range(len(loops)), key=lambda i: (not loops[i].good, -leading[i], loops[i].example))
    for count, index in enumerate(order[:MOST_DRAWN]):
        told = caption(report, loops[index], leading[index])
        picture = _picture(found, index, told, f"{key}-{count + 1}")
        box = element("div", picture, class_="strip", tabindex=0, role="group", aria_label=told)
        yield element("figure", box, element("figcaption", told), class_="ring")


def caption(report: Report, loop: Loop, leading: int) -> str:
    """A loop in words: what it is, its wave, and how many power-up states lead into it."""
    kind = words.loop_kind(loop, report.rhythm)
    head = {"good": "The good loop", "stuck": "A stuck loop", "not good": "A false loop"}.get(kind, "A loop")
    if kind == "good" and sum(each.good for each in report.rhythm.loops) > 1:
        head = "A good loop"
    others = leading - loop.length
    into = (
        f"{words.plural(others, 'more state')} lead{'s' * (others == 1)} into it"
        if others > 0
        else "nothing leads into it"
    )
    return f"{head} of {loop.length} states: {_wave(loop.wave)}; {into}."


def _wave(wave: Wave) -> str:
    return words.of_wave(wave)


def _picture(found: Machine, index: int, told: str, key: str) -> Markup:
    made = plan(found, index)
    every = [*made.ring, *made.trees]
    rim = made.radius
    left = min(-rim, *(box.at[0] - box.half for box in every)) - 8
    right = max(rim, *(box.at[0] + box.half for box in every)) + 8
    top = min(-rim, *(box.at[1] - HEIGHT / 2 for box in every)) - 8
    bottom = max(rim, *(box.at[1] + HEIGHT / 2 for box in every)) + 8
    good = any(found.rank.get(box.node.states[0]) == 0 for box in made.ring) or not found.rank
    return element(
        "svg",
        element("title", told, id=f"{key}-title"),
        element("desc", _described(found, index), id=f"{key}-desc"),
        _arcs(made, good),
        (_line(made, box) for box in made.trees),
        (_box(found, box) for box in every),
        role="img",
        class_="states",
        width=right - left,
        height=bottom - top,
        viewBox=" ".join(map(number, (left, top, right - left, bottom - top))),
        aria_labelledby=f"{key}-title",
        aria_describedby=f"{key}-desc",
    )


def _described(found: Machine, index: int) -> str:
    states = found.members[index]
    labels = [found.labels[state] for state in states]
    way = " → ".join(labels[:24]) + (f" → … ({len(labels) - 24} more)" if len(labels) > 24 else "")
    farthest = max((found.distance[s] for s in found.after if found.loop[s] == index), default=0)
    return f"The loop: {way} → {labels[0]}. The longest way into it takes {words.plural(farthest, 'half-cycle')}."


def _arcs(made: Plan, good: bool) -> Markup:
    radius = made.radius
    path, heads = [], []
    for here, then in zip(made.ring, [*made.ring[1:], made.ring[0]], strict=True):
        begins, ends = _leaves(here, radius, 1), _leaves(then, radius, -1) - 5 / radius
        if ends < here.angle:
            ends += 2 * pi
        if ends > begins:
            large = 1 if ends - begins > pi else 0
            a = f"M{_point(radius, begins)}A{number(radius)} {number(radius)} 0 {large} 1 {_point(radius, ends)}"
            path.append(a)
        tip = (radius * cos(ends), radius * sin(ends))
        heads.append(_head(tip, (-sin(ends), cos(ends))))
    kind = "way round" if good else "way round false"
    return joined(
        [element("path", d="".join(path), class_=kind), element("path", d="".join(heads), class_="head")]
    )


def _point(radius: float, angle: float) -> str:
    return f"{number(radius * cos(angle))} {number(radius * sin(angle))}"


def _leaves(box: Placed, radius: float, way: int) -> float:
    """The angle at which one has left a box of the ring, going one way round it or the other."""
    angle = box.angle
    while (
        not _outside(box, (radius * cos(angle), radius * sin(angle)), 2) and abs(angle - box.angle) < pi / 2
    ):
        angle += way / radius
    return angle


def _line(made: Plan, box: Placed) -> Markup:
    """The way from a box to the one it leads to: straight, or round the ring where that would be cut."""
    if box.onto is None:
        return Markup("")
    turn = box.onto.angle - box.angle
    length = hypot(box.onto.at[0] - box.at[0], box.onto.at[1] - box.at[1])
    count = max(2, int(length + made.radius * abs(turn)) // 2)
    points = [_between(made, box, box.onto, i / count, abs(turn) > STRAIGHT) for i in range(count + 1)]
    first = next(i for i, at in enumerate(points) if _outside(box, at, 1))
    last = next(i for i in reversed(range(count + 1)) if _outside(box.onto, points[i], 6))
    ends, way = points[last], (points[last + 1][0] - points[last][0], points[last + 1][1] - points[last][1])
    size = hypot(*way)
    # A curve is drawn by a point every so many pixels.
    shown = [*points[first:last:12], ends] if abs(turn) > STRAIGHT else [points[first], ends]
    path = "L".join(f"{number(x)} {number(y)}" for x, y in shown)
    head = _head(ends, (way[0] / size, way[1] / size))
    return joined([element("path", d=f"M{path}", class_="way"), element("path", d=head, class_="head")])


def _between(made: Plan, box: Placed, onto: Placed, part: float, round_it: bool) -> Point:
    if round_it:
        depth = box.depth + part * (onto.depth - box.depth)
        return made.point(depth, box.angle + part * (onto.angle - box.angle))
    return box.at[0] + part * (onto.at[0] - box.at[0]), box.at[1] + part * (onto.at[1] - box.at[1])


def _outside(box: Placed, at: Point, by: float) -> bool:
    return abs(at[0] - box.at[0]) > box.half + by or abs(at[1] - box.at[1]) > HEIGHT / 2 + by


def _head(at: Point, way: Point) -> str:
    """An arrow's head that begins there and points that way."""
    x, y = at
    tip = f"{number(x + 5 * way[0])} {number(y + 5 * way[1])}"
    left = f"{number(x - 3 * way[1])} {number(y + 3 * way[0])}"
    right = f"{number(x + 3 * way[1])} {number(y - 3 * way[0])}"
    return f"M{left}L{tip}L{right}z"


def _box(found: Machine, box: Placed) -> Markup:
    states = box.node.states
    levels = {found.output[state] for state in states}
    kinds = ["state"]
    if levels == {1}:
        kinds.append("on")
    if len(states) > 1:
        kinds.append("many")
    x, y = box.at
    parts = []
    if found.rank and any(found.rank[state] != 0 for state in states):
        outline = (x - box.half - 3, y - HEIGHT / 2 - 3, 2 * box.half + 6, HEIGHT + 6)
        parts.append(_rectangle(outline, 5, "illegal"))
    parts.append(_rectangle((x - box.half, y - HEIGHT / 2, 2 * box.half, HEIGHT), 3, " ".join(kinds)))
    on = " on" if levels == {1} else ""
    parts.append(element("text", _label(found, box.node), x=x, y=y + 3.5, class_=f"label{on}"))
    return element("g", element("title", _told(found, states)), *parts)


def _rectangle(at: tuple[float, float, float, float], corner: int, kind: str) -> Markup:
    x, y, width, height = at
    return element("rect", x=x, y=y, width=width, height=height, rx=corner, class_=kind)


def _told(found: Machine, states: Sequence[int]) -> str:
    if len(states) > 1:
        shown = ", ".join(found.labels[state] for state in states[:8])
        return f"{len(states)} states: {shown}{', …' if len(states) > 8 else ''}"
    values = zip(found.names, found.values[states[0]], strict=True)
    return ", ".join(f"{name}={value}" for name, value in values) + f"; output {found.output[states[0]]}"


# -- the table ---------------------------------------------------------------------------------------------


def table(found: Machine) -> Markup:
    """Every state, its values, and where it leads."""
    head = ["state", *found.names, "output", "next", "until on a loop"]
    head += ["until good"] if found.rank else []
    rows = []
    for state, values in found.values.items():
        cells = [str(value) for value in values]
        cells += [str(found.output[state]), found.labels[found.after[state]], str(found.distance[state])]
        if found.rank:
            cells.append("never" if found.rank[state] < 0 else str(found.rank[state]))
        label = found.labels[state]
        rows.append(element("tr", element("th", label, scope="row"), (element("td", cell) for cell in cells)))
    titles = (element("th", name, scope="col") for name in head)
    return element("table", element("thead", element("tr", titles)), element("tbody", rows))
