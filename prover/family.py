"""Families: one claim about a divider for all values of some inputs at once, as obligations. Imports no engine.

The inputs are variables of the machine's step that nothing moves (rigid variables). A course is an orbit whose states
and numbers of rounds are polynomials in them (`forms`), so that it stands for an orbit for each value: a down-counter
that is loaded with `div` passes `div` rounds, whatever `div` is. What has to hold of a course is what has to hold of
an orbit (see `certificate`): one-step formulas over the indices of its rounds, and now over the inputs as well. Its
lengths are polynomials, so that its gaps are compared with the claimed ratio as such. Acceleration with the loop's
bound as a rigid variable is common practice; here a piece of the domain says for which values a course is meant.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

from prover import expr as e
from prover import path
from prover.certificate import Obligation, onwards, round_at
from prover.certificate import part as part_of
from prover.design import Design
from prover.expr import Expr
from prover.forms import ONE, ZERO, Beyond, Poly, at_least, equal, polynomial, total
from prover.formula import Formula
from prover.good import Region
from prover.path import Beat, Repeat
from prover.rhythm import Orbit
from prover.system import Moment, State, System, change_inputs

MOST_EXPANDED = 512
"""Rounds of a repeat with changing output, or of all those within one another, that are written out."""


class Unfit(Exception):
    """A family that cannot be what it is to be; the message says why."""


@dataclass(frozen=True, slots=True)
class Point:
    """One half-cycle: the state, each component mod 2^width, and the output's level."""

    state: tuple[Poly, ...]
    level: int


@dataclass(frozen=True, slots=True)
class Pass:
    """The body so many times over, at least once, the stride added to its states each time."""

    times: Poly
    stride: State
    body: tuple[Part, ...]


Part = Point | Pass
Track = tuple[Part, ...]


@dataclass(frozen=True, slots=True)
class Course:
    """A lead-in and the loop that it enters, for each value of the inputs."""

    lead: Track
    loop: Track


@dataclass(frozen=True, slots=True)
class Piece:
    """Some of the values: those of the domain at which each input leaves the rest `rest` when divided by 2^shift, and
    no guard is negative.

    rests   input, width, shift, rest
    cases   how the conditions within the formulas of the claim come out, in order
    """

    rests: tuple[tuple[str, int, int, int], ...]
    guards: tuple[Poly, ...] = ()
    cases: tuple[bool, ...] = ()

    def holds(self) -> Expr:
        """One bit: the inputs are of the piece."""
        parts = [
            e.eq(e.extract(e.var(name, width), shift - 1, 0), e.const(rest, shift))
            for name, width, shift, rest in self.rests
            if shift
        ]
        return e.conj([*parts, *(at_least(guard, ZERO) for guard in self.guards)])

    def names(self, fixed: Mapping[str, int]) -> dict[str, Poly]:
        """The inputs as polynomials in what varies within the piece, and what is fixed."""
        out = {name: Poly.const(value) for name, value in fixed.items()}
        for name, width, shift, rest in self.rests:
            out[name] = Poly.atom(name, width, shift) * Poly.const(1 << shift) + Poly.const(rest)
        return out

    def formula(
        self, formulas: Sequence[Formula], fixed: Mapping[str, int], premise: Expr
    ) -> tuple[list[Poly], list[Obligation]]:
        """The formulas on this piece, owing that their conditions come out as `cases` says. Raises Unfit."""
        cases = iter(self.cases)
        owed: list[Obligation] = []

        def decide(question: Expr) -> bool:
            try:
                answer = next(cases)
            except StopIteration:
                raise Unfit("a condition whose outcome is not stated") from None
            wrong = e.bvnot(question) if answer else question
            owed.append(Obligation(f"condition {len(owed)} of the claim", e.bvand(premise, wrong)))
            return answer

        try:
            made = [polynomial(each, self.names(fixed), decide) for each in formulas]
        except Beyond as fault:
            raise Unfit(str(fault)) from None
        if next(cases, None) is not None:
            raise Unfit("more outcomes than conditions")
        return made, owed


# -- tracks ------------------------------------------------------------------------------------------------


def length(track: Sequence[Part]) -> Poly:
    """Half-cycles from the track's first to the end of its last."""
    return total(ONE if isinstance(part, Point) else part.times * length(part.body) for part in track)


def shifted(part: Part, stride: State, times: Poly) -> Part:
    """The part with its states moved."""
    if isinstance(part, Point):
        return Point(moved(part.state, stride, times), part.level)
    return Pass(part.times, part.stride, tuple(shifted(inner, stride, times) for inner in part.body))


def moved(state: Sequence[Poly], stride: State, times: Poly) -> tuple[Poly, ...]:
    """state + times · stride."""
    return tuple(v + times * Poly.const(d) if d else v for v, d in zip(state, stride, strict=True))


def first_point(track: Sequence[Part]) -> Point:
    part = track[0]
    while isinstance(part, Pass):
        part = part.body[0]
    return part


def last_point(track: Sequence[Part]) -> Point:
    """The track's last half-cycle, every pass in its last round."""
    part = track[-1]
    moves: list[tuple[State, Poly]] = []
    while isinstance(part, Pass):
        moves.append((part.stride, part.times - ONE))
        part = part.body[-1]
    state: tuple[Poly, ...] = part.state
    for stride, times in moves:
        state = moved(state, stride, times)
    return Point(state, part.level)


def passes(track: Sequence[Part]) -> Iterator[Pass]:
    """Every pass, the outer ones first."""
    for part in track:
        if isinstance(part, Pass):
            yield part
            yield from passes(part.body)


def at(course: Course, values: Mapping[str, int], widths: Sequence[int]) -> Orbit:
    """The orbit that the course is where the inputs have these values."""

    def items(track: Sequence[Part]) -> tuple[path.Item, ...]:
        return tuple(item(part) for part in track)

    def item(part: Part) -> path.Item:
        if isinstance(part, Pass):
            return Repeat(part.times.number(values), part.stride, items(part.body))
        state = (v.number(values) % (1 << w) for v, w in zip(part.state, widths, strict=True))
        return Beat(tuple(state), part.level)

    return Orbit(path.joined(items(course.lead)), path.joined(items(course.loop)), tuple(widths))


# -- steps -------------------------------------------------------------------------------------------------

Axes = tuple[tuple[Poly, State], ...]


@dataclass(frozen=True, slots=True)
class Step:
    """For all indices within the axes, `source` steps to `target` and shows `level`; both have the sum of
    index · stride added to them."""

    source: tuple[Poly, ...]
    target: tuple[Poly, ...]
    level: int
    axes: Axes


def steps(track: Sequence[Part], then: Point | None, axes: Axes = ()) -> Iterator[Step]:
    """Everything that has to hold for the machine to run through the track, and from its end to `then`."""
    for i, part in enumerate(track):
        following = first_point(track[i + 1 : i + 2]) if i + 1 < len(track) else then
        last = part if isinstance(part, Point) else last_point((part,))
        if isinstance(part, Pass):
            yield from steps(part.body, None, (*axes, (part.times, part.stride)))
            back = moved(first_point(part.body).state, part.stride, ONE)
            inner = last_point(part.body)
            yield Step(inner.state, back, inner.level, (*axes, (part.times - ONE, part.stride)))
        if following is not None:
            yield Step(last.state, following.state, last.level, axes)


def course_steps(course: Course) -> list[Step]:
    """Every step of a course: along the lead-in, into the loop, and round it."""
    entry = first_point(course.loop)
    return list(dict.fromkeys([*steps(course.lead, entry), *steps(course.loop, entry)]))


def course_obligations(
    system: System, premise: Expr, courses: Sequence[Course], name: str
) -> Iterator[Obligation]:
    """No step of the courses is other than claimed, and every pass has a round. Raises Unfit for courses that are
    none of this machine."""
    for course in courses:
        check_course(system, course)
    groups: dict[Axes, dict[Step, None]] = {}
    times: dict[Poly, None] = {}
    for course in courses:
        for step in course_steps(course):
            groups.setdefault(step.axes, {})[step] = None
        for each in passes((*course.lead, *course.loop)):
            times[each.times] = None
    for number, of in enumerate(times):
        yield Obligation(f"{name}: rounds of pass {number}", e.bvand(premise, e.bvnot(at_least(of, ONE))))
    for number, (axes, members) in enumerate(groups.items()):
        wrong, within = e.FALSE, e.TRUE
        moves: list[tuple[Expr, State]] = []
        for i, (count, stride) in enumerate(axes):
            index = e.var(f"!index{i}", count.size)
            within = e.bvand(within, e.bvslt(index, count.word(count.size)))
            within = e.bvand(within, e.bvnot(e.bvslt(index, e.const(0, count.size))))
            moves.append((index, stride))
        for step in members:
            wrong = e.bvor(wrong, _differs(system, step, moves))
        yield Obligation(f"{name}: steps {number}", e.conj([premise, within, wrong]))


def check_course(system: System, course: Course) -> None:
    """Raise Unfit for a course that is none of the machine's."""
    _check_form(system, (*course.lead, *course.loop))
    if not course.loop:
        raise Unfit("a course without a loop")


def _check_form(system: System, track: Sequence[Part]) -> None:
    """Raise Unfit for states and strides that are none of the machine's."""
    todo = list(track)
    widths = [width for _, width in system.variables]
    while todo:
        part = todo.pop()
        if isinstance(part, Point):
            fits = len(part.state) == len(widths) and all(v.whole for v in part.state)
        else:
            sizes = zip(part.stride, widths, strict=False)
            fits = len(part.stride) == len(widths) and all(0 <= d < 1 << w for d, w in sizes)
            fits = fits and part.times.whole and bool(part.body)
            todo += part.body
        if not fits:
            raise Unfit("a state or a stride that is none of the machine's")


def _differs(system: System, step: Step, moves: Sequence[tuple[Expr, State]]) -> Expr:
    source, target = words(system, step.source, moves), words(system, step.target, moves)
    *after, out = e.substitute([*system.step, system.output], dict(zip(system.names, source, strict=True)))
    wrong = e.disj(e.bvnot(e.eq(a, b)) for a, b in zip(after, target, strict=True))
    return e.bvor(wrong, e.bvnot(out) if step.level else out)


def words(system: System, state: Sequence[Poly], moves: Sequence[tuple[Expr, State]] = ()) -> list[Expr]:
    """A state as words, with so many strides added to it."""
    out = []
    for place, (value, (_, width)) in enumerate(zip(state, system.variables, strict=True)):
        word = value.word(width)
        for index, stride in moves:
            if stride[place]:
                scaled = e.bvmul(e.resize(index, width, False), e.const(stride[place], width))
                word = e.bvadd(scaled, word)
        out.append(word)
    return out


# -- start states ------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Held:
    """Reset held for so many half-cycles leaves one of the states, from wherever it began."""

    half_cycles: int
    states: tuple[tuple[Poly, ...], ...]


@dataclass(frozen=True, slots=True)
class Origin:
    """What start states are derived from: the design with its rigid registers, the machine without them, and what it
    is while reset is held (None where the claim begins with initial values). `limit` is a number of micro-steps that
    are looked at after inputs change."""

    design: Design
    rigid: tuple[str, ...]
    system: System
    resetting: System | None
    limit: int


def start_obligations(
    origin: Origin, premise: Expr, held: Held | None, starts: Sequence[Sequence[Poly]]
) -> Iterator[Obligation]:
    """These are all the start states, in order: those after the release of reset from each held state, or the initial
    values at either level of the clock. Raises Unfit."""
    design, system = origin.design, origin.system
    if (held is None) != (origin.resetting is None):
        raise Unfit("start states of another kind than the claim's")
    before: list[Moment] = []
    if held is not None and origin.resetting is not None:
        yield reset_obligation(origin.resetting, premise, held.half_cycles, held.states)
        active = origin.resetting.inputs.moment(design.inputs)
        for state in held.states:
            named = zip(origin.resetting.names, words(origin.resetting, state), strict=True)
            before.append({**active, **dict(named)})
    else:
        if any(r.initial is None for r in design.registers if r.name not in origin.rigid):
            raise Unfit("registers without an initial value")
        for level in (0, 1):
            values = {r.name: e.const(r.initial or 0, r.width) for r in design.registers}
            before.append({**values, **system.inputs.moment(design.inputs), system.clock: e.const(level, 1)})
    if len(before) != len(starts):
        raise Unfit("not as many start states as there are")
    for number, (moment, start) in enumerate(zip(before, starts, strict=True)):
        rigid = {r.name: e.var(r.name, r.width) for r in design.registers if r.name in origin.rigid}
        for limit in (origin.limit, origin.limit + 1):
            after = change_inputs(design, system.clock, {**moment, **rigid}, system.inputs, limit)
            made = [after[name] for name in system.names]
            yield state_obligation(system, premise, made, start, f"start state {number}")


def release_obligations(origin: Origin, premise: Expr, starts: Starts) -> Iterator[Obligation]:
    """The release of reset moves no register, and no output. Raises Unfit where reset leaves more than one state."""
    if starts.held is None or origin.resetting is None:
        raise Unfit("a release without a reset")
    if len(starts.held.states) != 2:
        raise Unfit("reset leaves several states")
    system, resetting = origin.system, origin.resetting
    for number, (state, course) in enumerate(zip(starts.held.states, starts.courses, strict=True)):
        named = dict(zip(resetting.names, words(resetting, state), strict=True))
        start = first_point(course.lead or course.loop)
        now = [named[name] for name in system.names]
        yield state_obligation(system, premise, now, start.state, f"the release moves nothing, {number}")
        (before,) = e.substitute([resetting.output], named)
        shown = e.bvnot(before) if start.level else before
        yield Obligation(f"the release changes no output, {number}", e.bvand(premise, shown))


def state_obligation(
    system: System, premise: Expr, made: Sequence[Expr], wanted: Sequence[Poly], name: str
) -> Obligation:
    """What was made of a state is the one that is wanted."""
    pairs = zip(made, words(system, wanted), strict=True)
    return Obligation(name, e.bvand(premise, e.disj(e.bvnot(e.eq(a, b)) for a, b in pairs)))


def reset_obligation(
    resetting: System, premise: Expr, half_cycles: int, held: Sequence[Sequence[Poly]]
) -> Obligation:
    """From any state at rest, so many half-cycles with reset held end in one of these states."""
    state: list[Expr] = [e.var(name, width) for name, width in resetting.variables]
    for gone in range(half_cycles):
        state = onwards(resetting, state, gone)[:-1]
    hits = [e.conj(e.eq(a, b) for a, b in zip(state, words(resetting, each), strict=True)) for each in held]
    missed = (e.bvnot(hit) for hit in hits)
    return Obligation("the states that reset leaves", e.conj([premise, resetting.settled, *missed]))


# -- waves -------------------------------------------------------------------------------------------------

Runs = list[tuple[int, Poly]]


def steady(part: Part) -> int | None:
    """The output's level if it never changes within the part."""
    if isinstance(part, Point):
        return part.level
    levels = {steady(inner) for inner in part.body}
    return levels.pop() if len(levels) == 1 else None


def expanded(track: Sequence[Part]) -> Track:
    """The same track without passes in which the output changes: their rounds written out. Raises Unfit where there
    are many, or not the same number for all values."""
    out: list[Part] = []
    for part in track:
        if isinstance(part, Point) or steady(part) is not None:
            out.append(part)
            continue
        times = part.times.constant
        if times is None or times > MOST_EXPANDED:
            raise Unfit(
                "a repeat in which the output changes, with a number of rounds that varies or is large"
            )
        for round_ in range(int(times)):
            out += (shifted(inner, part.stride, Poly.const(round_)) for inner in expanded(part.body))
        if len(out) > MOST_EXPANDED:
            raise Unfit("too many changes of the output to be written out")
    return tuple(out)


def runs(track: Sequence[Part]) -> Runs:
    """The output's runs, neighbours of one level joined."""
    out: Runs = []
    for part in expanded(track):
        level = steady(part)
        assert level is not None
        if out and out[-1][0] == level:
            out[-1] = (level, out[-1][1] + length((part,)))
        else:
            out.append((level, length((part,))))
    return out


@dataclass(frozen=True, slots=True)
class Wave:
    """What is claimed: half-cycles of a period, and of its high run."""

    period: Poly
    high: Poly

    def run(self, level: int) -> Poly:
        return self.high if level else self.period - self.high


def gap_obligations(premise: Expr, course: Course, wave: Wave) -> tuple[Obligation, Obligation, Obligation]:
    """Every gap from rise to rise is a period; every high run is as it is claimed to be; no low run after a fall is
    shorter than in the wave. Raises Unfit for a course whose output has no gaps at all."""
    if not changes(course):
        raise Unfit("an output that stops changing")
    found = runs((*course.lead, *course.loop, *course.loop, *course.loop))
    rises = [i for i, (level, _) in enumerate(found) if level and i]
    gaps = [total(size for _, size in found[begins:ends]) for begins, ends in pairwise(rises)]
    highs = [found[i][1] for i in rises if i + 1 < len(found)]
    lows = [size for level, size in found[1:-1] if not level]
    wrong = (
        (e.bvnot(equal(size, wave.period)) for size in gaps),
        (e.bvnot(equal(size, wave.high)) for size in highs),
        (e.bvnot(at_least(size, wave.run(0))) for size in lows),
    )
    names = ("gaps from rise to rise", "high runs", "low runs after a fall")
    of_gaps, of_highs, of_lows = (
        Obligation(name, e.bvand(premise, e.disj(dict.fromkeys(each))))
        for name, each in zip(names, wrong, strict=True)
    )
    return of_gaps, of_highs, of_lows


def changes(course: Course) -> bool:
    """Whether the output changes for ever."""
    return len({level for level, _ in runs(course.loop)}) == 2


# -- everywhere --------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Layer:
    """Courses that every state gets on: a `certificate.CoverClaim` for each value, about some of the registers.

    names       the registers, which depend on no others, and the clock, in the machine's order
    recoveries  for each course the runs that are behind before it is good (counted from its start, the loop taken
                twice), and after how many half-cycles it is; in layers before the last one, good is to be on a loop
    unrolled, merge  as in CoverClaim
    """

    names: tuple[str, ...]
    courses: tuple[Course, ...]
    recoveries: tuple[tuple[int, Poly], ...]
    unrolled: int | None
    merge: int

    @property
    def bounds(self) -> tuple[Poly, ...]:
        """Half-cycles, in the most of which every state is good."""
        if self.unrolled is not None:
            return (Poly.const(self.unrolled),)
        slow = dict.fromkeys(recovery for _, recovery in self.recoveries)
        return tuple(dict.fromkeys([*slow, Poly.const(self.merge)])) if self.merge else tuple(slow)


@dataclass(frozen=True, slots=True)
class Everywhere:
    """Every power-up state is good within the greatest of `bounds`. The claim of a layer is made for states in which
    the layer before it is on its loops; the last one is the whole machine's."""

    layers: tuple[Layer, ...]

    @property
    def bounds(self) -> tuple[Poly, ...]:
        """Half-cycles, in the most of which every state is good: what the layers take together."""
        sums = [ZERO]
        for layer in self.layers:
            sums = list(dict.fromkeys(a + b for a in sums for b in layer.bounds))
        return tuple(sums)

    @property
    def courses(self) -> tuple[Course, ...]:
        """The courses of the whole machine."""
        return self.layers[-1].courses


def everywhere_obligations(
    system: System, premise: Expr, claim: Everywhere, wave: Wave
) -> Iterator[Obligation]:
    """The courses are runs, good when they are said to be, and no power-up state escapes them. Raises Unfit."""
    if not claim.layers or claim.layers[-1].names != tuple(system.names):
        raise Unfit("the last layer is not the whole machine")
    assumed = e.TRUE
    before: set[str] = set()
    for number, layer in enumerate(claim.layers):
        last = layer is claim.layers[-1]
        names = set(layer.names)
        if not before <= names or system.clock not in names or not names <= set(system.names):
            raise Unfit("layers that do not grow")
        ours = system if last else part_of(system, names)
        outside = {v.name for v in e.variables(ours.step)} & (set(system.names) - names)
        if outside or tuple(ours.names) != layer.names:
            raise Unfit("a layer that depends on registers outside it")
        here = e.bvand(premise, assumed)
        for each in layer_obligations(ours, premise, here, layer, wave if last else None):
            yield Obligation(f"layer {number}, {each.name}", each.goal)
        state = [e.var(name, width) for name, width in ours.variables]
        loops = dict.fromkeys(course.loop for course in layer.courses)
        places = dict.fromkeys(
            (point.state, axes) for loop in loops for point, axes, _ in _placed(loop, ZERO)
        )
        assumed = e.disj(is_at(ours, state, at_, axes) for at_, axes in places)
        before = names


def layer_obligations(
    system: System, premise: Expr, assumed: Expr, layer: Layer, wave: Wave | None
) -> Iterator[Obligation]:
    """The same of one layer. `assumed` is what may be assumed of a state, `premise` of the inputs; without a wave
    good is to be on a loop."""
    if len(layer.courses) != len(layer.recoveries):
        raise Unfit("not as many recoveries as courses")
    if layer.merge < 0 or (layer.unrolled or 0) < 0 or any(behind < 0 for behind, _ in layer.recoveries):
        raise Unfit("less than nothing")
    for course in layer.courses:
        check_course(system, course)
    whole = [written_out(course) for course in layer.courses]
    yield from course_obligations(system, premise, layer.courses, "courses")
    for number, (course, (behind, recovery)) in enumerate(zip(whole, layer.recoveries, strict=True)):
        late = [e.bvnot(at_least(recovery, length(course.lead)))]
        wrong = e.disj(late if wave is None else _not_good_from(course, behind, recovery, wave))
        yield Obligation(f"course {number} is good after {recovery}", e.bvand(premise, wrong))
    courses = list(zip(whole, (recovery for _, recovery in layer.recoveries), strict=True))
    for level in (0, 1):
        fixed = {system.clock: e.const(level, 1)}
        settled, here = e.substitute([system.settled, assumed], fixed)
        state = [fixed.get(name, e.var(name, width)) for name, width in system.variables]
        escapes = e.bvnot(_covered(system, state, layer, courses, wave))
        yield Obligation(f"cover, clock {level}", e.conj([here, settled, escapes]))


def written_out(course: Course) -> Course:
    """The course with all passes in which the output changes written out."""
    return Course(expanded(course.lead), expanded(course.loop))


def _not_good_from(course: Course, behind: int, recovery: Poly, wave: Wave) -> Iterator[Expr]:
    """Ways in which the course is not good from there on."""
    found = runs((*course.lead, *course.loop, *course.loop))
    if behind + 2 >= len(found) or not changes(course):
        raise Unfit("a course with too few changes of its output after its recovery")
    begins = total(size for _, size in found[:behind])
    level, size = found[behind]
    yield e.bvnot(at_least(recovery, begins))
    yield e.bvnot(at_least(begins + size, recovery))
    # The rest of the run in which it becomes good may be shorter than a whole one, as the last may that is seen.
    yield e.bvnot(at_least(wave.run(level), begins + size - recovery))
    for level, size in found[behind + 1 : -1]:
        yield e.bvnot(equal(size, wave.run(level)))
    yield e.bvnot(at_least(wave.run(found[-1][0]), found[-1][1]))
    # Twice round shows the seam of the loop.
    yield e.bvnot(at_least(length(course.lead), recovery))
    rises = sum(level for level, _ in _round(course.loop))
    yield e.bvnot(equal(length(course.loop), wave.period * Poly.const(rises)))


def _round(loop: Sequence[Part]) -> Runs:
    """The runs once round, the last joined with the first where they are of one level."""
    found = runs(loop)
    if len(found) > 1 and found[0][0] == found[-1][0]:
        level, size = found.pop()
        found[0] = (level, found[0][1] + size)
    return found


def _covered(
    system: System,
    state: list[Expr],
    claim: Layer,
    courses: Sequence[tuple[Course, Poly]],
    wave: Wave | None,
) -> Expr:
    levels: list[Expr] = []
    gone = 0

    def onward() -> None:
        nonlocal state, gone
        *state, level = onwards(system, state, gone)
        levels.append(level)
        gone += 1

    reached: list[Expr] = []
    if claim.unrolled is None:
        for count in range(claim.merge + 1):
            reached.append(_on_courses(system, state, courses, count))
            onward()
        return e.disj(reached)
    for _ in range(claim.unrolled):
        onward()
    levels.clear()
    for count in range(claim.merge + 1):
        if count == 0:
            reached.append(_on_courses(system, state, courses, None))
        elif wave is not None:
            reached.append(_behind_loops(system, state, levels, courses))
        onward()
    return e.disj(reached)


def _placed(track: Sequence[Part], first: Poly, axes: Axes = ()) -> Iterator[tuple[Point, Axes, Poly]]:
    """Every point with the passes around it and the first half-cycle at which it comes."""
    for part in track:
        if isinstance(part, Point):
            yield part, axes, first
            first = first + ONE
        else:
            yield from _placed(part.body, first, (*axes, (part.times, part.stride)))
            first = first + length((part,))


def _on_courses(
    system: System, state: Sequence[Expr], courses: Sequence[tuple[Course, Poly]], count: int | None
) -> Expr:
    """True of a state on a course where it is good or, given `count`, at least that far from the course's start."""
    places: dict[tuple[tuple[Poly, ...], Axes], Expr] = {}
    for course, recovery in courses:
        for point, axes, first in _placed((*course.lead, *course.loop), ZERO):
            fits = at_least(first, recovery)
            if count is not None:
                fits = e.bvor(fits, at_least(first, Poly.const(count)))
            key = (point.state, axes)
            places[key] = e.bvor(places.get(key, e.FALSE), fits)
    return e.disj(
        e.bvand(fits, is_at(system, state, at_, axes))
        for (at_, axes), fits in places.items()
        if fits is not e.FALSE
    )


def _behind_loops(
    system: System, state: Sequence[Expr], levels: Sequence[Expr], courses: Sequence[tuple[Course, Poly]]
) -> Expr:
    """True of a state on a loop, where the output before it was what it is before that place of the loop: loops are
    good, so that is what the wave has there."""
    back = len(levels)
    parts: dict[Expr, None] = {}
    for loop in dict.fromkeys(course.loop for course, _ in courses):
        for point, axes, (level, since, before) in _phased(loop):
            ways = [(at_least(since, Poly.const(back)), (level,) * back)]
            if not axes:
                # In the first half-cycles of its run, what came before is the end of the run before that.
                for gone in range(back):
                    room = at_least(before, Poly.const(back - gone))
                    here = e.bvand(equal(since, Poly.const(gone)), room)
                    ways.append((here, (1 - level,) * (back - gone) + (level,) * gone))
            for here, wanted in ways:
                if here is not e.FALSE:
                    shown = e.conj(x if v else e.bvnot(x) for x, v in zip(levels, wanted, strict=True))
                    parts[e.conj([here, shown, is_at(system, state, point.state, axes)])] = None
    return e.disj(parts)


def _phased(loop: Sequence[Part]) -> Iterator[tuple[Point, Axes, tuple[int, Poly, Poly]]]:
    """Every point of a loop with the passes around it; then its level, the half-cycles since its run began (in the
    first round of those passes), and the length of the run before. The output is steady in every pass."""
    found = runs(loop)
    joins = len(found) > 1 and found[0][0] == found[-1][0]
    index, since = 0, found[-1][1] if joins else ZERO
    for part in loop:
        level = steady(part)
        if level != found[index][0]:
            index, since = index + 1, ZERO
        before = found[index - 1][1]
        if index == 0 and joins:
            before = found[-2][1]
        elif index == 1 and joins and len(found) > 1:
            before = found[0][1] + found[-1][1]
        for point, axes, first in _placed((part,), since):
            yield point, axes, (point.level, first, before)
        since = since + length((part,))


def is_at(system: System, state: Sequence[Expr], point: Sequence[Poly], axes: Axes) -> Expr:
    """True of the point's state in some round of each pass around it. False where that can't be written: a claim may
    then fail, but nothing false passes."""
    wanted = words(system, point)
    within = e.TRUE
    moves: list[tuple[Expr, State]] = []
    strides = [stride for _, stride in axes]
    for i, (count, stride) in enumerate(axes):
        index = round_at(system, state, wanted, strides, i)
        if index is None:
            return e.FALSE
        size = max(count.size, index.width + 1)
        within = e.bvand(within, e.bvslt(e.resize(index, size, False), count.word(size)))
        moves.append((index, stride))
    pairs = zip(state, words(system, point, moves), strict=True)
    return e.conj([within, *(e.eq(a, b) for a, b in pairs)])


def regions(system: System, premise: Expr, courses: Iterable[Course]) -> list[Region]:
    """The states on the courses' loops, a region for each half-cycle that is written."""
    found: dict[tuple[tuple[Poly, ...], Axes], None] = {}
    for course in courses:
        for point, axes, _ in _placed(course.loop, ZERO):
            found[point.state, axes] = None
    out = []
    for state, axes in found:
        within = premise
        moves: list[tuple[Expr, State]] = []
        for i, (count, stride) in enumerate(axes):
            index = e.var(f"!round{i}", count.size)
            within = e.bvand(within, e.bvslt(index, count.word(count.size)))
            within = e.bvand(within, e.bvnot(e.bvslt(index, e.const(0, count.size))))
            moves.append((index, stride))
        out.append(Region(within, dict(zip(system.names, words(system, state, moves), strict=True))))
    return out


# -- the claims of a piece ---------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Claim:
    """The ratio and the high time as formulas or numbers, in input cycles and half-cycles, and what other names stand
    for. No high time is half of an integral period."""

    ratio: Formula | Fraction
    high: Formula | int | None
    fixed: Mapping[str, int]


def wave_of(claim: Claim, piece: Piece, premise: Expr) -> tuple[Wave, list[Obligation]]:
    """What is claimed on a piece, owing that it means something there. Raises Unfit."""
    formulas = [each for each in (claim.ratio, claim.high) if isinstance(each, Formula)]
    made, owed = piece.formula(formulas, claim.fixed, premise)
    rest = iter(made)
    ratio = next(rest) if isinstance(claim.ratio, Formula) else Poly.const(claim.ratio)
    period = ratio * Poly.const(2)
    high = (
        next(rest)
        if isinstance(claim.high, Formula)
        else None
        if claim.high is None
        else Poly.const(claim.high)
    )
    wave = Wave(period, ratio if high is None else high)
    if not wave.period.whole or not wave.high.whole:
        raise Unfit("a period or a high time that is not plainly a whole number of half-cycles")
    bad = [at_least(ONE, period), at_least(ZERO, wave.high), at_least(wave.high, period)]
    return wave, [*owed, Obligation("the claim means something", e.bvand(premise, e.disj(bad)))]


@dataclass(frozen=True, slots=True)
class Starts:
    """What reset leaves (None: the start states are initial values), and the courses of the start states."""

    held: Held | None
    courses: tuple[Course, ...]


def starts_obligations(origin: Origin, premise: Expr, starts: Starts) -> Iterator[Obligation]:
    """These are the start states, and these the courses that they run through. Raises Unfit."""
    for course in starts.courses:
        check_course(origin.system, course)
    for state in starts.held.states if starts.held is not None else ():
        if origin.resetting is None:
            raise Unfit("states that reset leaves, and no reset")
        _check_form(origin.resetting, (Point(state, 0),))
    firsts = [first_point(course.lead or course.loop).state for course in starts.courses]
    yield from start_obligations(origin, premise, starts.held, firsts)
    yield from course_obligations(origin.system, premise, starts.courses, "from the start")


@dataclass(frozen=True, slots=True)
class Proof:
    """What is claimed of all values at once; an entry for each piece.

    starts      None where nothing is claimed of the start states
    everywhere  None where nothing is claimed of all power-up states
    gaps, high  whether the start states' gaps, and their high runs, are claimed to be as the formulas say
    release     whether it is claimed that the release of reset moves nothing, and no low run after it is too short
    singly      values that are judged by themselves: the pieces need not hold them
    """

    starts: tuple[tuple[Piece, Starts], ...] | None
    everywhere: tuple[tuple[Piece, Everywhere], ...] | None
    gaps: bool
    high: bool
    release: bool
    singly: tuple[Mapping[str, int], ...]


def proof_obligations(
    origin: Origin, admitted: Expr, widths: Mapping[str, int], claim: Claim, proof: Proof
) -> Iterator[Obligation]:
    """Everything that the proof hangs on, for the values that are `admitted`. Raises Unfit."""
    for number, (piece, starts) in enumerate(proof.starts or ()):
        premise = e.bvand(admitted, piece.holds())
        wave, owed = wave_of(claim, piece, premise)
        owed += starts_obligations(origin, premise, starts)
        for course in starts.courses:
            gaps, high, low = gap_obligations(premise, course, wave)
            owed += [gaps] * proof.gaps + [high] * proof.high + [low] * proof.release
        if proof.release:
            owed += release_obligations(origin, premise, starts)
        yield from (Obligation(f"starts {number}, {each.name}", each.goal) for each in owed)
    for number, (piece, everywhere) in enumerate(proof.everywhere or ()):
        premise = e.bvand(admitted, piece.holds())
        wave, owed = wave_of(claim, piece, premise)
        owed += everywhere_obligations(origin.system, premise, everywhere, wave)
        yield from (Obligation(f"everywhere {number}, {each.name}", each.goal) for each in owed)
    for name, pieces in (("starts", proof.starts), ("everywhere", proof.everywhere)):
        if pieces is not None:
            beyond = [e.bvnot(piece.holds()) for piece, _ in pieces]
            for values in proof.singly:
                pairs = ((e.var(n, widths[n]), e.const(v, widths[n])) for n, v in values.items())
                beyond.append(e.bvnot(e.conj(e.eq(a, b) for a, b in pairs)))
            yield Obligation(f"{name}: every value is looked at", e.conj([admitted, *beyond]))


Discharge = Callable[[Obligation], bool]


def faults(obligations: Iterable[Obligation], discharge: Discharge) -> list[str]:
    """The names of those that can be fulfilled, or what is unfit about the claim."""
    try:
        return [each.name for each in obligations if not discharge(each)]
    except Unfit as fault:
        return [str(fault)]
