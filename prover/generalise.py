"""From samples to all values: families of orbits and covers, guessed from a few values of the inputs.

Each value's divider is an ordinary machine, whose orbits are traced with jumps and whose power-up states are covered
by paths, whatever they count to. Neighbouring values give paths of one shape, whose numbers differ by constants: so a
shape is taken from a base and one neighbour for each input, its numbers are read as linear in the inputs, and the
result is a conjecture for all values, which `family` states as obligations. Where an obligation fails for a value,
the piece of the domain is cut there; where numbers go by halves of an input, even and odd values are taken apart.
What no piece holds is handed back, to be judged value by value. Guessing an invariant's parameters from instances is
common practice in parameterised verification.

Limits: one shape for most of the domain, numbers linear in the inputs, strides that are the same for all values.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any, Protocol

from prover import certificate, family, orbit, path, wide
from prover import expr as e
from prover.analyse import corners
from prover.certificate import CoverClaim, Obligation, Stage, discharge
from prover.domain import Values
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.family import Claim, Course, Everywhere, Held, Layer, Pass, Piece, Point, Starts, Track, Unfit
from prover.forms import ONE, ZERO, Beyond, Poly, at_least
from prover.path import Beat, Item, Path, Repeat
from prover.rhythm import Goal, Orbit
from prover.sample import Machines
from prover.solve import find
from prover.system import State, System

LEFT = 24
"""Values of a region that are handed back instead of being looked at together."""

MOST_PIECES = 24
UNROLLED = 6
"""Half-cycles up to which machines are unrolled: what takes longer takes another time for each value."""

CUTS = 8
"""Times that a piece is cut where an obligation fails."""

HELD = 8
"""Values of an input, in a region, up to which it is held at each of them in turn."""

TRIED = 4
"""Values of which the shape is looked at, to find the one that most have."""

FINEST = 2
"""By how many powers of two the values of an input are taken apart."""


# -- trees: what samples share, and their numbers ----------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Leaf:
    """A number of a sample: a whole one, or with a width a word of so many bits."""

    value: int
    width: int = 0


Tree = Any
"""Tuples of trees; what is no tuple is a leaf, or the same for all values."""


def skeleton(tree: Tree) -> Tree:
    """The tree without its numbers."""
    if isinstance(tree, tuple):
        return tuple(skeleton(part) for part in tree)
    return ("leaf", tree.width) if isinstance(tree, Leaf) else tree


def leaves(tree: Tree) -> Iterator[Leaf]:
    """The numbers, in order."""
    if isinstance(tree, tuple):
        for part in tree:
            yield from leaves(part)
    elif isinstance(tree, Leaf):
        yield tree


def filled(tree: Tree, numbers: Iterator[Poly]) -> Tree:
    """The tree with polynomials for its numbers."""
    if isinstance(tree, tuple):
        return tuple(filled(part, numbers) for part in tree)
    return next(numbers) if isinstance(tree, Leaf) else tree


def state_tree(state: State, widths: Sequence[int]) -> Tree:
    return tuple(Leaf(value, width) for value, width in zip(state, widths, strict=True))


def track_tree(items: Sequence[Item], widths: Sequence[int]) -> Tree:
    """A path as a tree."""
    return tuple(
        ("point", item.level, state_tree(item.state, widths))
        if isinstance(item, Beat)
        else ("pass", Leaf(item.times), item.stride, track_tree(item.body, widths))
        for item in items
    )


def track_of(tree: Tree) -> Track:
    """A tree with polynomials as a track."""
    return tuple(
        Point(part[2], part[1]) if part[0] == "point" else Pass(part[1], part[2], track_of(part[3]))
        for part in tree
    )


# -- kinds of claims ---------------------------------------------------------------------------------------


class Kind(Protocol):
    """Something that is claimed for all values, and how a sample of it is had."""

    def sample(self, values: Values) -> Tree | None:
        """What it is at one value; None if it cannot be had there."""

    def claim(self, tree: Tree) -> Any:
        """A tree with polynomials as a claim."""

    def passes(self, claim: Any) -> Iterator[Pass]:
        """The passes in the claim: each has at least one round where it is meant."""

    def obligations(self, premise: Expr, piece: Piece, claim: Any) -> Iterator[Obligation]:
        """What has to hold. Raises Unfit."""


class Lost(Exception):
    """At this value a state never becomes good."""

    def __init__(self, values: Values) -> None:
        super().__init__("a state that never becomes good")
        self.values = values


class FromStarts:
    """The courses of the start states."""

    def __init__(self, machines: Machines) -> None:
        self.machines = machines

    def sample(self, values: Values) -> Tree | None:
        system, scope, starts, held = self.machines.at(values)
        if scope == "any" or not starts or (held is not None and (held.problem or held.unforced)):
            return None
        widths = [width for _, width in system.variables]
        under = self.machines.origin().resetting
        if held is not None and (under is None or held.names != tuple(under.names)):
            return None
        full = [width for _, width in under.variables] if under is not None else []
        courses = []
        for start in starts:
            run = orbit.trace(system, start, self.machines.effort, most=MOST_ITEMS)
            if not run.closed:
                return None
            courses.append(_course_tree(run, widths))
        if held is None:
            return ("starts", None, (), tuple(courses))
        states = tuple(state_tree(state, full) for state in held.states)
        return ("starts", held.half_cycles, states, tuple(courses))

    def claim(self, tree: Tree) -> Starts:
        _, half_cycles, states, courses = tree
        held = None if half_cycles is None else Held(half_cycles, states)
        return Starts(held, tuple(Course(track_of(lead), track_of(loop)) for lead, loop in courses))

    def passes(self, claim: Starts) -> Iterator[Pass]:
        for course in claim.courses:
            yield from family.passes((*course.lead, *course.loop))

    def obligations(self, premise: Expr, piece: Piece, claim: Starts) -> Iterator[Obligation]:
        yield from family.starts_obligations(self.machines.origin(), premise, claim)


MOST_ITEMS = 4000
"""Items of an orbit beyond which it has no shape that others might share."""


def _course_tree(run: Orbit, widths: Sequence[int]) -> Tree:
    return tuple(track_tree(condensed(items, widths), widths) for items in (run.lead, run.loop))


def condensed(items: Sequence[Item], widths: Sequence[int]) -> Path:
    """The same path in a form that does not hang on how its repeats were come upon: every stretch of two cycles or
    more that move by one vector is one repeat, begun as early as it can be."""
    out: list[Item] = []
    todo = list(reversed(items))
    while todo:
        item = todo.pop()
        if isinstance(item, Repeat) and not all(isinstance(part, Beat) for part in item.body):
            item = Repeat(item.times, item.stride, condensed(item.body, widths))
        out.append(item)
        while (joined := _joined(out, widths)) is not None:
            tail, later = joined
            out = tail
            todo += reversed(later)
    return tuple(out)


def _joined(out: list[Item], widths: Sequence[int]) -> tuple[list[Item], list[Item]] | None:
    """The path with its end written as a repeat, or one that begins earlier; and what then follows it."""
    last = out[-1]
    if isinstance(last, Repeat) and len(last.body) == 2:
        first, second = last.body
        if not isinstance(first, Beat) or not isinstance(second, Beat):
            return None
        before = out[-2] if len(out) > 1 else None
        earlier = _moved(second, last.stride, -1, widths)
        if before == earlier:
            ends = _moved(second, last.stride, last.times - 1, widths)
            return [*out[:-2], Repeat(last.times, last.stride, (earlier, first))], [ends]
        if isinstance(before, Repeat) and before.stride == last.stride:
            follows = tuple(_moved(part, before.stride, before.times, widths) for part in before.body)
            if follows == last.body:
                return [*out[:-2], _lasting(before, before.times + last.times)], []
        return None
    if len(out) >= 3 and isinstance(out[-3], Repeat):
        block = out[-3]
        if tuple(out[-2:]) == tuple(_moved(part, block.stride, block.times, widths) for part in block.body):
            return [*out[:-3], _lasting(block, block.times + 1)], []
    a, b, c, d = out[-4:] if len(out) >= 4 else (None, None, None, None)
    if isinstance(a, Beat) and isinstance(b, Beat) and isinstance(c, Beat) and isinstance(d, Beat):
        stride = tuple((y - x) & ((1 << w) - 1) for x, y, w in zip(a.state, c.state, widths, strict=True))
        if any(stride) and (c, d) == (_moved(a, stride, 1, widths), _moved(b, stride, 1, widths)):
            return [*out[:-4], Repeat(2, stride, (a, b))], []
    return None


def _lasting(block: Repeat, times: int) -> Repeat:
    return Repeat(times, block.stride, block.body)


def _moved(item: Item, stride: State, times: int, widths: Sequence[int]) -> Item:
    if isinstance(item, Beat):
        return Beat(path.moved(item.state, stride, times, widths), item.level)
    return Repeat(item.times, item.stride, tuple(_moved(part, stride, times, widths) for part in item.body))


class FromEverywhere:
    """Courses that every power-up state gets on, and how long until it is good."""

    def __init__(self, machines: Machines, claim: Claim) -> None:
        self.machines = machines
        self.said = claim

    def sample(self, values: Values) -> Tree | None:
        system, _, starts, _ = self.machines.at(values)
        spec = self.machines.spec_at(values)
        goal = Goal(spec.period, spec.high_half_cycles)
        seeds = [*starts, *corners(system)]
        effort = self.machines.effort
        found = wide.cover_in_stages(system, goal, seeds, effort, UNROLLED)
        if found is None or not found.claims:
            found = wide.cover(system, goal, system.settled, seeds, effort, UNROLLED)
        if any(line.recovery is None for line in found.lines):
            raise Lost(values)
        if not found.claims or found.worst is None:
            return None
        layers = []
        stages = _pruned(system, found.claims, effort)
        for stage in stages:
            if any(stage.claim.spreads):
                return None
            layers.append(_layer_tree(stage, last=stage is stages[-1]))
        return ("everywhere", tuple(layers))

    def claim(self, tree: Tree) -> Everywhere:
        return Everywhere(
            tuple(
                Layer(
                    names,
                    tuple(Course(track_of(lead), track_of(loop)) for lead, loop, _, _ in courses),
                    tuple((behind, recovery) for _, _, behind, recovery in courses),
                    unrolled,
                    merge,
                )
                for names, unrolled, merge, courses in tree[1]
            )
        )

    def passes(self, claim: Everywhere) -> Iterator[Pass]:
        for course in (course for layer in claim.layers for course in layer.courses):
            yield from family.passes((*course.lead, *course.loop))

    def obligations(self, premise: Expr, piece: Piece, claim: Everywhere) -> Iterator[Obligation]:
        wave, owed = family.wave_of(self.said, piece, premise)
        yield from owed
        yield from family.everywhere_obligations(self.machines.system, premise, claim, wave)


def _layer_tree(stage: Stage, last: bool) -> Tree:
    system, claim = stage.system, stage.claim
    widths = [width for _, width in system.variables]
    courses = []
    for run, recovery in zip(claim.orbits, claim.recoveries, strict=True):
        if claim.unrolled is None and not claim.merge:
            # Every place on it counts, so none has to be written out for itself.
            lead, loop = (condensed(items, widths) for items in (run.lead, run.loop))
            run = replace(run, lead=lead, loop=loop)
        behind = _behind(run, recovery) if last else 0
        courses.append((track_tree(run.lead, widths), track_tree(run.loop, widths), behind, Leaf(recovery)))
    courses.sort(key=lambda course: (repr(skeleton(course)), [leaf.value for leaf in leaves(course)]))
    return (tuple(system.names), claim.unrolled, claim.merge, tuple(courses))


def _pruned(system: System, stages: Sequence[Stage], effort: Effort) -> list[Stage]:
    """The stages without orbits that they hold without: what the solver came across by chance has no shape. States
    that are on an orbit need not be given time to join one."""
    out: list[Stage] = []
    for stage in stages:
        ours = stage.system
        assumed = certificate.assumption(ours, out[-1] if out else None)

        def holds(claim: CoverClaim, ours: System = ours, assumed: Expr = assumed) -> bool:
            return all(
                discharge(each, effort) for each in certificate.cover_obligations(ours, assumed, claim)
            )

        claim = stage.claim
        if claim.unrolled is None:
            sooner = (replace(claim, merge=merge) for merge in range(claim.merge))
            claim = next((each for each in sooner if holds(each)), claim)
        at = len(claim.orbits) - 1
        while at >= 0 and len(claim.orbits) > 1:
            kept = [i for i in range(len(claim.orbits)) if i != at]
            fewer = replace(
                claim,
                orbits=tuple(claim.orbits[i] for i in kept),
                recoveries=tuple(claim.recoveries[i] for i in kept),
                spreads=tuple(claim.spreads[i] for i in kept),
            )
            if holds(fewer):
                claim = fewer
            at -= 1
        out.append(replace(stage, claim=claim))
    return out


def _behind(run: Orbit, recovery: int) -> int:
    """How many of the output's runs end before the orbit is good."""
    total, count = 0, 0
    for _, size in path.merged([*path.pieces(run.lead), *path.pieces(run.loop), *path.pieces(run.loop)]):
        total += size
        if total > recovery:
            return count
        count += 1
    return count


# -- the search --------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Found:
    """What was made of a claim.

    pieces  pieces with the claim of each, all obligations discharged
    left    values that no piece holds, to be judged by themselves
    why     why that is not all, "" if it is
    """

    pieces: tuple[tuple[Piece, Any], ...]
    left: tuple[dict[str, int], ...]
    why: str = ""


class Search:
    """Pieces for one kind of claim."""

    def __init__(self, machines: Machines, kind: Kind) -> None:
        self.machines, self.kind = machines, kind
        self.admitted = machines.admitted()
        self.rng = random.Random(0)
        self.samples: dict[tuple[int, ...], Tree | None] = {}

    def run(self) -> Found:
        """All the pieces that are found. Raises Lost at a value that no claim can hold for."""
        todo = [Piece(tuple((name, width, 0, 0) for name, width in self.machines.inputs))]
        pieces: list[tuple[Piece, Any]] = []
        left: list[dict[str, int]] = []
        try:
            while todo:
                region = todo.pop()
                some = self._some(region)
                few = self._values(region, LEFT + 1) if len(some) < TRIED else some
                if len(some) < TRIED and len(few) <= LEFT:
                    left += few
                    continue
                if len(pieces) >= MOST_PIECES:
                    return Found(tuple(pieces), tuple(left), f"more than {MOST_PIECES} shapes")
                made = self._piece(region, few[:TRIED])
                if isinstance(made, str):
                    return Found(tuple(pieces), tuple(left), made)
                if isinstance(made, list):
                    todo += made
                    continue
                pieces.append(made)
                todo += self._rest(region, made[0])
        except (OutOfEffort, Unfit, Beyond) as fault:
            return Found(tuple(pieces), tuple(left), str(fault))
        return Found(tuple(pieces), tuple(left))

    def _premise(self, piece: Piece) -> Expr:
        return e.bvand(self.admitted, piece.holds())

    def _values(self, region: Piece, most: int) -> list[dict[str, int]]:
        """Values of a region, at most so many."""
        out: list[dict[str, int]] = []
        goal = self._premise(region)
        while len(out) < most:
            model = find(goal, self.machines.effort)
            if model is None:
                break
            values = {name: model.get(name, 0) for name, _ in self.machines.inputs}
            out.append(values)
            same = (e.eq(e.var(n, w), e.const(values[n], w)) for n, w in self.machines.inputs)
            goal = e.bvand(goal, e.bvnot(e.conj(same)))
        return out

    def _inside(self, region: Piece, values: Values) -> bool:
        premise = self._premise(region)
        return e.evaluate([premise], values) == [1]

    def _some(self, region: Piece) -> list[dict[str, int]]:
        """Values from all over a region, different each time."""
        out: dict[tuple[int, ...], dict[str, int]] = {}
        for _ in range(200):
            values = self.machines.domain.value(self.rng.randrange(self.machines.domain.size))
            for name, width, shift, rest in region.rests:
                values[name] = (values[name] >> shift << shift | rest) % (1 << width)
            if self._inside(region, values):
                out[tuple(values.values())] = values
            if len(out) >= TRIED:
                break
        return list(out.values())

    def _sample(self, values: Values) -> Tree | None:
        key = tuple(values.values())
        if key not in self.samples:
            self.machines.effort.say(f"taking a sample at {', '.join(f'{n}={v}' for n, v in values.items())}")
            self.samples[key] = self.kind.sample(values)
        return self.samples[key]

    def _neighbours(self, region: Piece, base: Values) -> list[dict[str, int] | None]:
        """The base with one input moved by one step, for each; None where the region allows no other value there."""
        out: list[dict[str, int] | None] = []
        for name, width, shift, _ in region.rests:
            moved = ({**base, name: base[name] + step} for step in (1 << shift, -(1 << shift)))
            out.append(
                next((v for v in moved if 0 <= v[name] < 1 << width and self._inside(region, v)), None)
            )
        return out

    def _piece(self, region: Piece, some: Sequence[Values]) -> tuple[Piece, Any] | list[Piece] | str:
        """A piece of the region with its claim; or the region taken apart; or why there is neither."""
        shapes: dict[Any, list[Values]] = {}
        for values in some:
            tree = self._sample(values)
            if tree is not None:
                shapes.setdefault(repr(skeleton(tree)), []).append(values)
        bases = [values for group in sorted(shapes.values(), key=len, reverse=True) for values in group]
        for base in bases[:3]:
            near = self._neighbours(region, base)
            shape = repr(skeleton(self._sample(base)))
            if any(values and repr(skeleton(self._sample(values))) != shape for values in near):
                continue
            numbers = self._numbers(region, base, near, shapes[shape])
            if numbers is None:
                continue
            claim = self.kind.claim(filled(self._sample(base), iter(numbers)))
            made = self._cut_to_hold(region, base, claim)
            if made is not None:
                return made, claim
        return self._apart(region) or "no shape that neighbouring values share"

    def _apart(self, region: Piece) -> list[Piece] | None:
        """The region with an input that has few values held at each of them, or else with one input's values taken
        apart once more."""
        for name, width in self.machines.inputs if len(self.machines.inputs) > 1 else ():
            values = self._values_of(region, name, width)
            if 1 < len(values) <= HELD:
                word = Poly.atom(name, width)
                ends = ((word - Poly.const(v), Poly.const(v) - word) for v in values)
                return [replace(region, guards=(*region.guards, *pair)) for pair in ends]
        at = min(range(len(region.rests)), key=lambda i: region.rests[i][2])
        name, width, shift, rest = region.rests[at]
        if shift >= FINEST or shift + 1 >= width:
            return None
        out = []
        for bit in (0, 1):
            rests = list(region.rests)
            rests[at] = (name, width, shift + 1, rest | bit << shift)
            out.append(replace(region, rests=tuple(rests)))
        return out

    def _values_of(self, region: Piece, name: str, width: int) -> list[int]:
        """Values that one input has in a region, at most one more than are held singly."""
        out: list[int] = []
        goal, word = self._premise(region), e.var(name, width)
        while len(out) <= HELD:
            model = find(goal, self.machines.effort)
            if model is None:
                break
            out.append(model.get(name, 0))
            goal = e.bvand(goal, e.bvnot(e.eq(word, e.const(out[-1], width))))
        return sorted(out)

    def _numbers(
        self, region: Piece, base: Values, near: Sequence[Values | None], others: Sequence[Values]
    ) -> list[Poly] | None:
        """The numbers of the base as linear in the inputs, if the other samples of its shape bear that out."""
        columns = [list(leaves(self._sample(values or base))) for values in (base, *near)]
        checks = [(values, list(leaves(self._sample(values)))) for values in (*near, *others) if values]
        out = []
        for place, leaf in enumerate(columns[0]):
            number = Poly.const(leaf.value)
            for (name, width, shift, _), values, column in zip(region.rests, near, columns[1:], strict=True):
                if values is None:
                    continue
                step = (values[name] >> shift) - (base[name] >> shift)
                slope = (column[place].value - leaf.value) * step
                if leaf.width:
                    slope %= 1 << leaf.width
                    slope -= (slope >> (leaf.width - 1)) << leaf.width if leaf.width > 1 else 0
                moved = Poly.atom(name, width, shift) - Poly.const(base[name] >> shift)
                number = number + moved * Poly.const(slope)
            if leaf.width:
                number = number.reduced(leaf.width)
            for values, column in checks:
                wrong = number.number(values) - column[place].value
                if wrong % (1 << leaf.width) if leaf.width else wrong:
                    return None
            out.append(number)
        return out

    def _cut_to_hold(self, region: Piece, base: Values, claim: Any) -> Piece | None:
        """The region cut so that every obligation of the claim holds on it; None if that does not come to an end."""
        times = dict.fromkeys(each.times - ONE for each in self.kind.passes(claim))
        guards = [guard for guard in times if guard.constant is None]
        if any(guard.constant is not None and guard.constant < 0 for guard in times):
            return None
        piece = replace(region, guards=(*region.guards, *self._needed(region, guards)))
        for _ in range(CUTS):
            piece = replace(piece, cases=self._cases(piece, base, claim))
            broken = self._broken(piece, claim)
            if broken is None:
                return piece
            guard = self._cut(region, base, broken, claim, piece.cases)
            if guard is None:
                return None
            piece = replace(piece, guards=(*piece.guards, guard))
        return None

    def _needed(self, region: Piece, guards: Sequence[Poly]) -> list[Poly]:
        """The guards that others do not imply."""
        kept = list(guards)
        for guard in guards:
            others = [other for other in kept if other is not guard]
            holds = replace(region, guards=(*region.guards, *others))
            if self._discharged(
                Obligation("a guard", e.bvand(self._premise(holds), e.bvnot(at_least(guard, ZERO))))
            ):
                kept = others
        return kept

    def _discharged(self, obligation: Obligation) -> bool:
        return discharge(obligation, self.machines.effort)

    def _cases(self, piece: Piece, base: Values, claim: Any) -> tuple[bool, ...]:
        """How the conditions of the claimed formulas come out at the base."""
        if not isinstance(self.kind, FromEverywhere):
            return ()
        return cases_at(self.kind.said, piece, base)

    def _broken(self, piece: Piece, claim: Any) -> dict[str, int] | None:
        """A value of the piece at which an obligation fails."""
        self.machines.effort.say("proving a shape for all values")
        for obligation in self.kind.obligations(self._premise(piece), piece, claim):
            if not self._discharged(obligation):
                model = find(obligation.goal, self.machines.effort)
                assert model is not None, obligation.name
                return {name: model.get(name, 0) for name, _ in self.machines.inputs}
        return None

    def _cut(
        self, region: Piece, base: Values, broken: Values, claim: Any, cases: tuple[bool, ...]
    ) -> Poly | None:
        """A guard that leaves out a value at which the claim fails, as near to it as it begins to hold."""
        for name, width, shift, rest in region.rests:
            if broken[name] == base[name]:
                continue
            others = dict(base) if len(region.rests) > 1 else dict(broken)
            bad, good = broken[name] >> shift, base[name] >> shift
            piece = replace(region, cases=cases)
            if self._holds_at(piece, {**others, name: bad << shift | rest}, claim):
                continue
            while abs(bad - good) > 1:
                middle = (bad + good) // 2
                if self._holds_at(piece, {**others, name: middle << shift | rest}, claim):
                    good = middle
                else:
                    bad = middle
            atom = Poly.atom(name, width, shift)
            return Poly.const(good) - atom if bad > good else atom - Poly.const(good)
        return None

    def _holds_at(self, piece: Piece, values: Values, claim: Any) -> bool:
        """Whether every obligation holds at one value."""
        if not self._inside(piece, values):
            # Beyond the region nothing is claimed.
            return True
        given = {name: e.const(values[name], width) for name, width in self.machines.inputs}
        try:
            for each in self.kind.obligations(e.TRUE, replace(piece, guards=()), claim):
                (goal,) = e.substitute([each.goal], given)
                if not self._discharged(Obligation(each.name, goal)):
                    return False
        except Unfit:
            return False
        return all(each.times.number(values) >= 1 for each in self.kind.passes(claim))

    def _rest(self, region: Piece, piece: Piece) -> list[Piece]:
        """What the piece leaves of its region, in regions that do not overlap."""
        added = piece.guards[len(region.guards) :]
        return [
            replace(region, guards=(*region.guards, *added[:i], -guard - ONE), cases=())
            for i, guard in enumerate(added)
        ]


def cases_at(claim: Claim, piece: Piece, base: Values) -> tuple[bool, ...]:
    """How the conditions within the claim's formulas come out at a value of the piece."""
    from prover.forms import polynomial
    from prover.formula import Formula

    out: list[bool] = []

    def decide(question: Expr) -> bool:
        out.append(e.evaluate([question], base) == [1])
        return out[-1]

    for formula in (claim.ratio, claim.high):
        if isinstance(formula, Formula):
            polynomial(formula, piece.names(claim.fixed), decide)
    return tuple(out)
