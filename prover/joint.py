"""Two dividers side by side as one transition system, and the states that it starts from.

A state is the machine at rest, with the values at which the shared inputs are. A step is an edge of the clock, after
which the outputs have to agree, and then, where inputs move, their change in the middle of the half-cycle, after
which they have to agree again. Where one output is to be late, its values wait in a queue that is part of the state.

All of it is derived from the two designs. Questions about the micro-steps are asked of `ask`, so that a certificate
can answer them without a solver.
"""

from __future__ import annotations

import itertools
import random
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property, reduce
from operator import and_, or_

from prover import expr as e
from prover.design import Design
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.pair import SIDES, Pair, side_by_side
from prover.ports import Ports
from prover.settling import Ask, Settling, bound, settle
from prover.solve import Model, find
from prover.system import Inputs, Moment, State, System, settled_when

LONGEST_LAG = 64
"""Half-cycles that an output is made to wait in a queue."""

Values = dict[str, Expr]


@dataclass(frozen=True, slots=True)
class Start:
    """States to start from, as expressions over what is not known of them: registers that nothing forces, and the
    inputs while reset was held.

    rest       every variable when the comparison begins
    first      every variable once the inputs have moved for the first time; the same where none moves
    differs    one bit over the same: the outputs differ at the rest
    cause      how the states come about
    under      every register, and the clock, just before the release of reset; empty where it does not start there
    """

    rest: tuple[Expr, ...]
    first: tuple[Expr, ...]
    differs: Expr
    cause: str
    under: tuple[Expr, ...] = ()


@dataclass(frozen=True, slots=True)
class Held:
    """Reset held for so many half-cycles. Each is every register, over registers, clock and shared inputs.

    lasting  whether every state that it leaves then is left however long it is held; else some may be gone later
    rest     once arbitrary values have settled
    edge     after an edge of the clock
    move     after inputs have moved, over the moves as well
    release  after reset was released
    """

    half_cycles: int
    lasting: bool
    rest: tuple[Expr, ...]
    edge: tuple[Expr, ...]
    move: tuple[Expr, ...]
    release: tuple[Expr, ...]


@dataclass(frozen=True)
class Joint:
    """Two dividers side by side.

    both       their ports as one design
    outputs    of the old and of the new one, one bit each
    system     the step of all registers at an edge, with inputs free
    settling   what is known of its micro-steps and races
    limit      micro-steps within which everything settles
    variables  registers of both, clock, shared inputs, and the queue, with their widths
    moves      the variables that stand for the inputs after they moved
    step       every variable one half-cycle later, over variables, moves and choices
    differs    one bit over the variables: the outputs differ at rest
    differs_at_edge  the same at the rest after the edge that follows, before inputs move
    starts     where it starts from
    begin      every variable once the inputs have moved for the first time, over variables and moves; then whether
               the outputs differ before that
    held       reset; None where it does not start there
    answers    the answers to all questions asked on the way
    goals      what must not be satisfiable for the micro-steps to suffice
    """

    both: Ports
    outputs: tuple[Expr, Expr]
    system: System
    settling: Settling
    limit: int
    variables: tuple[tuple[str, int], ...]
    moves: tuple[tuple[str, int], ...]
    step: tuple[Expr, ...]
    differs: Expr
    differs_at_edge: Expr
    starts: tuple[Start, ...]
    begin: tuple[Expr, ...]
    held: Held | None
    answers: tuple[Model | None, ...]
    goals: tuple[Expr, ...]

    @cached_property
    def names(self) -> list[str]:
        return [name for name, _ in self.variables]

    @cached_property
    def own(self) -> tuple[tuple[str, int], ...]:
        """The variables without those of the queue."""
        return self.variables[: len(self.both.design.registers) + 1 + len(self.both.free)]

    @property
    def bits(self) -> int:
        """Bits of a state."""
        return sum(width for _, width in self.variables)

    @cached_property
    def choices(self) -> list[tuple[str, int]]:
        """The values that x stands for in a step, with their widths."""
        found = e.variables([*self.step, self.differs, self.differs_at_edge])
        return [(v.name, v.width) for v in found if v.name.startswith("?")]


def build(pair: Pair, lag: int, effort: Effort, ask: Ask | None = None, races: bool = True) -> Joint:
    """Both dividers as one, the new output `lag` half-cycles late; without `races` none are looked for. Raises
    OutOfEffort, with the reason, where the micro-steps don't settle or can't be bounded, or where the lag is too long
    for a queue."""
    if abs(lag) > LONGEST_LAG:
        raise OutOfEffort(
            f"a lag of more than {LONGEST_LAG} half-cycles is followed only where inputs have few values"
        )
    return _Builder(pair, effort, ask).build(lag, races)


def unknowns(start: Start) -> list[Expr]:
    """What is not known of a start."""
    return e.variables([*start.rest, *start.first, start.differs])


def starts_of(start: Start, fixed: Mapping[str, int] | None = None) -> Iterator[tuple[Model, State, bool]]:
    """Every state of a start: what is not known, the first state, and whether the outputs differ before it.

    `fixed` are values of some of what is not known."""
    fixed = fixed or {}
    free = unknowns(start)
    run = e.compile_step([*start.first, start.differs], [v.name for v in free])
    ranges = ((fixed[v.name],) if v.name in fixed else range(1 << v.width) for v in free)
    for values in itertools.product(*ranges):
        *first, differs = run(*values)
        yield {v.name: x for v, x in zip(free, values, strict=True)}, tuple(first), bool(differs)


MOST_START_BITS = 12
"""Bits that are not known of a start up to which every start state is listed."""


def starts_apart(joint: Joint, inputs: Model) -> list[tuple[str, State, State]]:
    """How each start comes about, with the inputs held at values, and the registers and the clock of the old divider
    of the new one then. Raises OutOfEffort where there are too many."""
    out: dict[tuple[str, State, State], None] = {}
    clock = joint.both.clock
    for cause, state in _lasting(joint, inputs):
        values = dict(zip(joint.names, state, strict=True))
        sides = []
        for side in SIDES:
            mine = (values[n] for n, _ in joint.own if n.startswith(f"{side}."))
            sides.append((*mine, values[clock]))
        out[cause, sides[0], sides[1]] = None
    return list(out)


def _lasting(joint: Joint, inputs: Model) -> Iterator[tuple[str, State]]:
    """The start states with the inputs held at values, and how each comes about; of those that reset leaves only
    such as it leaves however long it is held."""
    listed: list[list[tuple[State, State]]] = []
    for start in joint.starts:
        free = e.variables([*start.first, *start.under])
        unknown = [v for v in free if v.name not in inputs]
        if sum(v.width for v in unknown) > MOST_START_BITS:
            names = ", ".join(dict.fromkeys(v.name for v in unknown))
            raise OutOfEffort(f"too many start states: nothing forces {names}")
        run = e.compile_step([*start.first, *start.under], [v.name for v in free])
        ranges = ((inputs[v.name],) if v.name in inputs else range(1 << v.width) for v in free)
        found = (run(*values) for values in itertools.product(*ranges))
        listed.append([(all_of[: len(start.first)], all_of[len(start.first) :]) for all_of in found])
    held = joint.held
    if held is None or held.lasting or certain(held) is None:
        for start, states in zip(joint.starts, listed, strict=True):
            yield from ((start.cause, first) for first, _ in states)
        return
    kept, longer = _gone_round(joint, held, inputs, [{under for _, under in states} for states in listed])
    for start, states, left in zip(joint.starts, listed, kept, strict=True):
        cause = _released(held.half_cycles + longer, start.under[-1].value)
        yield from ((cause, first) for first, under in states if under in left)


def _gone_round(
    joint: Joint, held: Held, inputs: Model, left: Sequence[set[State]]
) -> tuple[list[set[State]], int]:
    """Of states under reset, those that remain however long it is held, and for how many half-cycles longer that
    takes. Two half-cycles lead from each set into itself, so what remains is what goes round in it."""
    names = [*(r.name for r in joint.both.design.registers), joint.both.clock]
    free = [name for name, _ in joint.own if name not in names]
    edge = e.compile_step(held.edge, [*names, *free])
    values = tuple(inputs[name] for name in free)

    def onward(state: State) -> State:
        return (*edge(*state, *values), 1 - state[-1])

    kept, longer = list(left), 0
    while True:
        following = [{onward(onward(state)) for state in states} for states in kept]
        if [len(states) for states in following] == [len(states) for states in kept]:
            return following, longer
        kept, longer = following, longer + 2


def _left(joint: Joint, held: Held) -> set[State]:
    """All states under reset, however long it is held and however the inputs move: registers, clock, inputs."""
    registers = len(joint.both.design.registers)
    names = [name for name, _ in joint.own]
    moving = [names.index(name.removesuffix(" moved")) for name, _ in joint.moves]
    rest, edge = e.compile_step(held.rest, names), e.compile_step(held.edge, names)
    move = e.compile_step(held.move, [*names, *(name for name, _ in joint.moves)])
    every = list(itertools.product(*(range(1 << width) for _, width in joint.moves)))

    def onward(state: State) -> Iterator[State]:
        after = (*edge(*state), 1 - state[registers], *state[registers + 1 :])
        for values in every:
            then = list(after)
            for place, value in zip(moving, values, strict=True):
                then[place] = value
            yield (*move(*after, *values), *then[registers:])

    states = itertools.product(*(range(1 << width) for _, width in joint.own))
    left = {(*rest(*state), *state[registers:]) for state in states}
    while len(following := {then for state in left for then in onward(state)}) < len(left):
        left = following
    return left


def certain(held: Held) -> Held | None:
    """Reset held, if nothing of it hangs on what x stands for."""
    known = e.variables([*held.rest, *held.edge, *held.move, *held.release])
    return None if any(v.name.startswith("?") for v in known) else held


LONGEST_ROUND = 4096
"""Half-cycles of reset after which a state is looked for again."""


def lasts(joint: Joint, start: Start, values: Model) -> bool:
    """Whether a start state is seen to be left however long reset is held, as one that comes round again with the
    inputs where they are."""
    held = joint.held
    if held is None or held.lasting:
        return True
    free = e.variables([*start.under, *start.rest])
    known = {v.name: 0 for v in free} | values
    names = [*(r.name for r in joint.both.design.registers), joint.both.clock]
    first = tuple(e.evaluate(start.under, known))
    inputs = {name: known.get(name, 0) for name in joint.both.free}
    small = sum(width for _, width in joint.own) <= MOST_START_BITS
    if joint.moves and small and certain(held) is not None:
        return (*first, *inputs.values()) in _left(joint, held)
    choices = [v.name for v in e.variables(held.edge) if v.name.startswith("?")]
    edge = e.compile_step(held.edge, [*names, *inputs, *choices])
    others = (*inputs.values(), *(0 for _ in choices))
    state = first
    for _ in range(LONGEST_ROUND):
        state = (*edge(*state, *others), 1 - state[-1])
        if state == first:
            return True
    return False


def _released(half_cycles: int, level: int) -> str:
    long = f" held for {half_cycles} half-cycles or longer" if half_cycles else ""
    return f"reset{long}, released while the clock is {('low', 'high')[level]}"


def moved(name: str) -> str:
    """What stands for an input after it has moved. No name of a design has a space in it."""
    return f"{name} moved"


def renamed(values: Sequence[Expr], label: str) -> list[Expr]:
    """The expressions with choices named anew: x is another value every time."""
    fresh = {v.name: e.var(f"{v.name}/{label}", v.width) for v in e.variables(values) if v.name[0] == "?"}
    return e.substitute(values, fresh) if fresh else list(values)


class _Builder:
    """Derives the transition system; keeps the questions and their answers."""

    def __init__(self, pair: Pair, effort: Effort, ask: Ask | None) -> None:
        self.pair = pair
        self.effort = effort
        self.asked = ask
        self.answers: list[Model | None] = []
        self.goals: list[Expr] = []
        self.both = side_by_side(pair)
        self.design: Design = self.both.design
        self.clock = self.both.clock
        self.names = [r.name for r in self.design.registers]
        self.moving = [each.name for each in pair.inputs if each.moving]
        self.inputs = {each.name: e.var(each.name, each.width) for each in pair.inputs}
        self.limit = 1
        self.held: Held | None = None

    def build(self, lag: int, races: bool) -> Joint:
        self.effort.say("setting both dividers side by side")
        known = self.both.running.moment(self.design.inputs)
        system, settling = self._settled(self.both.running, "", races)
        edge = dict(zip(system.names, system.step, strict=True))
        move = self._move(known)
        values = [signal.value for signal in self.design.signals.values()]
        out_old, out_new = e.substitute(values, known)
        queue = _Queue(lag, bool(self.moving))
        after_edge = {**edge, **self.inputs}
        then = dict(zip(self.names, _applied([move[n] for n in self.names], after_edge, "move"), strict=True))
        step: Values = {**then, self.clock: edge[self.clock]}
        step |= {n: e.var(moved(n), x.width) if n in self.moving else x for n, x in self.inputs.items()}
        at_edge = e.substitute([out_old, out_new], after_edge)
        step |= queue.step((out_old, out_new), (at_edge[0], at_edge[1]))
        variables = (
            *((r.name, r.width) for r in self.design.registers),
            (self.clock, 1),
            *((each.name, each.width) for each in self.pair.inputs),
            *queue.variables,
        )
        names = [name for name, _ in variables]
        first = {**move, self.clock: e.var(self.clock, 1), **queue.start(out_old, out_new)}
        first |= {n: e.var(moved(n), x.width) if n in self.moving else x for n, x in self.inputs.items()}
        begin = [*(first[n] for n in names), e.FALSE if lag else e.bvxor(out_old, out_new)]
        starts = []
        for cause, level, rest, under in self._starts():
            here = {**rest, self.clock: e.const(level, 1), **self.inputs}
            *begun, differs = _applied(begin, here, "begin")
            queued = queue.start(*_applied([out_old, out_new], here, "begin"))
            at_rest = tuple({**here, **queued}[n] for n in names)
            starts.append(Start(at_rest, tuple(begun), differs, cause, under))
        return Joint(
            both=self.both,
            outputs=(out_old, out_new),
            system=system,
            settling=settling,
            limit=self.limit,
            variables=variables,
            moves=tuple((moved(n), self.inputs[n].width) for n in self.moving),
            step=tuple(step[name] for name in names),
            differs=queue.differs(out_old, out_new),
            differs_at_edge=queue.differs_at_edge(at_edge[0], at_edge[1]),
            starts=tuple(starts),
            begin=tuple(begin),
            held=self.held,
            answers=tuple(self.answers),
            goals=tuple(self.goals),
        )

    # -- micro-steps -----------------------------------------------------------------------------------------

    def ask(self, goal: Expr) -> Model | None:
        model = self.asked(goal) if self.asked else _sampled(goal) or find(goal, self.effort)
        if not goal.is_const:
            self.answers.append(model)
            if model is None:
                self.goals.append(goal)
        return model

    def _settled(self, inputs: Inputs, when: str, races: bool) -> tuple[System, Settling]:
        """The step at an edge with some inputs known and the others free."""
        system, settling = settle(
            self.design, self.clock, inputs, self.both.output_value, self.effort, ask=self.ask, races=races
        )
        if settling.depth is None or settling.at_rest is None:
            raise OutOfEffort(settling.open or f"the micro-steps do not settle{when}")
        self.limit = max(self.limit, settling.depth, settling.at_rest)
        return system, settling

    def _moment(self, known: Moment) -> Moment:
        registers = {r.name: e.var(r.name, r.width) for r in self.design.registers}
        return {**registers, self.clock: e.var(self.clock, 1), **self.inputs, **known}

    def _change(self, before: Moment, now: Moment, assumed: Expr, what: str) -> Values:
        """Every register once all has settled after a change that makes `before` into `now`."""
        chain, depth, _ = bound(self.design, before, now, assumed, self.ask)
        if depth is None:
            raise OutOfEffort(f"the micro-steps do not settle when {what}")
        self.limit = max(self.limit, depth)
        return {name: chain[-1][name] for name in self.names}

    def _move(self, known: Moment) -> Values:
        """Every register after the moving inputs have changed between two edges."""
        watched = [x for r in self.design.registers for x in (edge.clock for edge in r.edges)]
        watched += [x for r in self.design.registers for f in r.forces for x in (f.when, f.value)]
        if not {v.name for v in e.variables(watched)} & set(self.moving):
            # Nothing that acts between edges looks at them.
            return {r.name: e.var(r.name, r.width) for r in self.design.registers}
        before = self._moment(known)
        now = {**before, **{n: e.var(moved(n), self.inputs[n].width) for n in self.moving}}
        return self._change(before, now, settled_when(self.design.registers, before), "inputs move")

    def _at_rest(self, known: Moment) -> Values:
        """Every register once arbitrary values have settled, with no edge."""
        before = self._moment(known)
        return self._change(before, before, e.TRUE, "power comes up")

    # -- starts ----------------------------------------------------------------------------------------------

    def _starts(self) -> Iterable[tuple[str, int, Values, tuple[Expr, ...]]]:
        """How each start comes about, the level of the clock in it, the registers, and all of that under reset."""
        if self.pair.scope == "initial":
            yield from self._initial()
            return
        active = self.both.resetting.moment(self.design.inputs)
        free = self.both.running.moment(self.design.inputs)
        held, _ = self._settled(self.both.resetting, " while reset is held", races=False)
        edge = dict(zip(held.names, held.step, strict=True))
        rest, move = self._at_rest(active), self._move(active)
        before = self._moment(active)
        release = self._change(
            before,
            {**before, **free},
            settled_when(self.design.registers, before),
            "reset is released",
        )
        count, under = self._under(edge, rest, move)
        phases = ([of[name] for name in self.names] for of in (rest, edge, move, release))
        lasting = all(self._lasting(rest, edge, move, values) for values in under)
        self.held = Held(count, lasting, *map(tuple, phases))
        for level in (0, 1):
            values = under[level ^ (count & 1)]
            registers = _applied([release[n] for n in self.names], values, "release")
            still = tuple(values[n] for n in (*self.names, self.clock))
            yield _released(count, level), level, dict(zip(self.names, registers, strict=True)), still

    def _under(self, edge: Values, rest: Values, move: Values) -> tuple[int, list[Values]]:
        """Reset held until what can become known is: the half-cycles, and every register then, begun with the clock
        low and with it high. Inputs that move are new in each half-cycle and have their own names in the last."""
        patience = 4 * len(self.names) + 8
        runs = [self._holding(edge, rest, move, level) for level in (0, 1)]
        values = [next(run) for run in runs]
        count = since = 0
        fewest = self.design.state_bits + 1
        hanging = [self._hanging(here) for here in values]
        while any(hanging) and count - since < patience:
            values = [next(run) for run in runs]
            count += 1
            # A long shift register becomes known a bit at a time.
            unlike = max(self._unlike(here) for here in values)
            if unlike < fewest:
                fewest, since = unlike, count
            # A register that is not forced is asked about less and less often.
            if count < 6 or count & (count - 1) == 0 or not unlike or count - since == patience:
                hanging = [self._hanging(here) for here in values]
            self.effort.check()
        zeros = {r.name: e.const(0, r.width) for r in self.design.registers}
        last = {f"{n} in {count}": self.inputs[n] for n in self.moving}
        out = []
        for here, kept in zip(values, hanging, strict=True):
            named = {n: e.substitute([x], last if n in kept else zeros | last)[0] for n, x in here.items()}
            out.append(named)
        return count, out

    def _holding(self, edge: Values, rest: Values, move: Values, level: int) -> Iterator[Values]:
        """Every register, the clock and the inputs after more and more half-cycles of reset, begun at that level."""
        values: Values = {r.name: e.var(r.name, r.width) for r in self.design.registers}
        values |= {self.clock: e.const(level, 1), **self._inputs_in(0)}
        registers = _applied([rest[n] for n in self.names], values, "rest")
        values |= dict(zip(self.names, registers, strict=True))
        for count in itertools.count():
            yield dict(values)
            stepped = _applied([edge[n] for n in (*self.names, self.clock)], values, f"{count}")
            values |= dict(zip((*self.names, self.clock), stepped, strict=True))
            following = self._inputs_in(count + 1)
            after = {moved(n): following[n] for n in self.moving}
            registers = _applied([move[n] for n in self.names], {**values, **after}, f"{count} moved")
            values |= dict(zip(self.names, registers, strict=True)) | following

    def _inputs_in(self, half_cycle: int) -> Values:
        """The shared inputs in a half-cycle of reset: those that move are what they like."""
        return {
            n: e.var(f"{n} in {half_cycle}", x.width) if n in self.moving else x
            for n, x in self.inputs.items()
        }

    def _hanging(self, values: Values) -> set[str]:
        """The registers that still hang on what some register was before reset."""
        others = {r.name: e.var(f"{r.name} else", r.width) for r in self.design.registers}
        found = set()
        for name in self.names:
            value = values[name]
            if {v.name for v in e.variables([value])} & set(self.names):
                (other,) = e.substitute([value], others)
                if self.ask(e.bvnot(e.eq(value, other))) is not None:
                    found.add(name)
        return found

    def _unlike(self, values: Values) -> int:
        """Bits of registers that are not the same after reset from each of some states, other things being equal."""
        rng = random.Random(0)
        listed = [values[name] for name in self.names]
        used = e.variables(listed)
        samples = []
        for _ in range(SAMPLES):
            known = {v.name: rng.getrandbits(v.width) if v.name in self.names else 0 for v in used}
            samples.append(e.evaluate(listed, known))
        columns = zip(*samples, strict=True)
        return sum((reduce(or_, column) ^ reduce(and_, column)).bit_count() for column in columns)

    def _lasting(self, rest: Values, edge: Values, move: Values, values: Values) -> bool:
        """Whether all states after reset remain however long it is held.

        They do where they hang on no register of before. Else two half-cycles more have to lead from no two of them
        to one: as they lead from these states into these states, each comes round again. Where inputs move, the same
        has to hold of the registers of before, whatever the inputs and other registers are: then longer reset only
        begins elsewhere among them."""
        begun = [values[name] for name in self.names]
        before = {v.name for v in e.variables(begun)} & set(self.names)
        if not before:
            return True
        if any(v.name.startswith("?") for v in e.variables([*begun, *edge.values()])):
            return False
        if not self.moving:
            return self._apart(begun, self._twice(edge, values))
        own = [r.name for r in self.design.registers if r.name in before]
        here = [e.var(r.name, r.width) for r in self.design.registers if r.name in before]
        if any(of[x.name] is not x for x in here for of in (rest, move)):
            return False
        for level in (0, 1):
            after = dict(zip(self.names, self._twice(edge, {self.clock: e.const(level, 1)}), strict=True))
            ended = [after[name] for name in own]
            if not {v.name for v in e.variables(ended)} <= before or not self._apart(here, ended):
                return False
        return True

    def _twice(self, edge: Values, values: Values) -> list[Expr]:
        """Every register two half-cycles later, with the inputs where they are."""
        names = [*self.names, self.clock]
        step = [edge[name] for name in names]
        after = dict(values)
        for _ in range(2):
            after |= dict(zip(names, e.substitute(step, after), strict=True))
        return [after[name] for name in self.names]

    def _apart(self, begun: Sequence[Expr], ended: Sequence[Expr]) -> bool:
        """Whether no two beginnings that differ, for the registers of before, come to one end."""
        used = e.variables([*begun, *ended])
        others = {v.name: e.var(f"{v.name} else", v.width) for v in used if v.name in self.names}
        same = [
            e.conj(e.eq(a, b) for a, b in zip(side, e.substitute(side, others), strict=True))
            for side in (begun, ended)
        ]
        return self.ask(e.bvand(e.bvnot(same[0]), same[1])) is None

    def _initial(self) -> Iterable[tuple[str, int, Values, tuple[Expr, ...]]]:
        known = self.both.running.moment(self.design.inputs)
        rest = self._at_rest(known)
        for level in (0, 1):
            values: Values = {
                r.name: e.const(r.initial, r.width) if r.initial is not None else e.var(r.name, r.width)
                for r in self.design.registers
            }
            values |= {**self.inputs, self.clock: e.const(level, 1)}
            registers = _applied([rest[n] for n in self.names], values, "rest")
            yield (
                f"initial values, the clock {('low', 'high')[level]} at power-up",
                level,
                dict(zip(self.names, registers, strict=True)),
                (),
            )


SAMPLES = 8
"""Assignments that a question is tried on before the solver is."""


def _sampled(goal: Expr) -> Model | None:
    """Values that make a goal true, if they are soon found."""
    if goal.is_const:
        return None
    rng = random.Random(0)
    used = e.variables([goal])
    for _ in range(SAMPLES):
        values = {v.name: rng.getrandbits(v.width) for v in used}
        if e.evaluate([goal], values) == [1]:
            return values
    return None


def _applied(values: Sequence[Expr], to: Mapping[str, Expr], label: str) -> list[Expr]:
    """The expressions with names replaced, and choices named anew."""
    return e.substitute(renamed(values, label), to)


class _Queue:
    """The values that an output had in the half-cycles before, as bits of the state.

    The one that leads waits: the old output where the new one is late. `known` bits tell how long it has run."""

    def __init__(self, lag: int, moving: bool) -> None:
        self.late = abs(lag)
        self.leads = 0 if lag > 0 else 1
        self.moving = moving
        self.twice = moving and lag != 0
        count = range(1, self.late + 1)
        self.rest = [e.var(f"output {j} before", 1) for j in count]
        self.edge = (
            [e.var(f"output at the edge {j} before", 1) for j in range(self.late)] if self.twice else []
        )
        self.known = [e.var(f"known {j} before", 1) for j in count]

    @property
    def variables(self) -> tuple[tuple[str, int], ...]:
        return tuple((v.name, 1) for v in (*self.rest, *self.edge, *self.known))

    def step(self, rest: tuple[Expr, Expr], edge: tuple[Expr, Expr]) -> Values:
        shifted = [
            (self.rest, [rest[self.leads], *self.rest]),
            (self.edge, [edge[self.leads], *self.edge]),
            (self.known, [e.TRUE, *self.known]),
        ]
        return {v.name: x for bits, values in shifted for v, x in zip(bits, values, strict=False)}

    def start(self, *outputs: Expr) -> Values:
        values: Values = {v.name: e.FALSE for v in (*self.rest, *self.edge, *self.known)}
        if self.edge:
            values[self.edge[0].name] = outputs[self.leads]
        return values

    def differs(self, *outputs: Expr) -> Expr:
        if not self.late:
            return e.bvxor(*outputs)
        return e.bvand(self.known[-1], e.bvxor(self.rest[-1], outputs[1 - self.leads]))

    def differs_at_edge(self, *outputs: Expr) -> Expr:
        if not self.moving:
            # The rest after the edge is the next state's.
            return e.FALSE
        if not self.late:
            return e.bvxor(*outputs)
        known = self.known[-2] if self.late > 1 else e.TRUE
        return e.bvand(known, e.bvxor(self.edge[-1], outputs[1 - self.leads]))
