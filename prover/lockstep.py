"""Engine: two dividers in lockstep, every input free in every half-cycle.

    reach   breadth first over the states that both can be in together: the shortest difference, or all states
    Frames  the half-cycles one after another as one question to the solver (Biere, Cimatti, Clarke and Zhu 1999):
            the shortest difference where the states are too many

Limits: `reach` visits states one by one; `Frames` proves nothing but that there is no shorter difference.
"""

from __future__ import annotations

import itertools
import random
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.joint import MOST_START_BITS, Held, Joint, Start, starts_of, unknowns
from prover.solve import Model, fresh_solver

State = tuple[int, ...]

MOST_FREE_BITS = 16
"""Bits of moves and choices up to which a step is taken with every value of them."""

MOST_HELD_BITS = 12
"""Bits of both dividers and their inputs up to which reset is held in every state of theirs instead."""


@dataclass(frozen=True, slots=True)
class Divergence:
    """A run on which the outputs differ.

    start, values  which start it begins at, and what is not known of it
    moves          what the moving inputs change to in each half-cycle, in the order of `Joint.moves`
    half_cycle     when the outputs differ
    at_edge        whether they do before inputs move in it
    """

    start: Start
    values: Model
    moves: tuple[State, ...]
    half_cycle: int
    at_edge: bool


class Stepper:
    """A transition system on integers; choices that x leaves are arguments as well."""

    def __init__(self, joint: Joint) -> None:
        self.joint = joint
        self.moves = len(joint.moves)

    @cached_property
    def run(self) -> Callable[..., tuple[int, ...]]:
        """State, moves and choices to the next state, then whether the outputs differ at rest and after the edge."""
        joint = self.joint
        names = [*joint.names, *(n for n, _ in joint.moves), *(n for n, _ in joint.choices)]
        return e.compile_step([*joint.step, joint.differs, joint.differs_at_edge], names)

    @cached_property
    def free(self) -> list[State]:
        """Every value of the moves and choices."""
        widths = [w for _, w in (*self.joint.moves, *self.joint.choices)]
        return list(itertools.product(*(range(1 << w) for w in widths)))

    @property
    def free_bits(self) -> int:
        return sum(w for _, w in (*self.joint.moves, *self.joint.choices))


def begun(joint: Joint, effort: Effort) -> Iterator[tuple[Start, Model, State, bool]] | None:
    """Every state to start from: which start it is of, what is not known of that, the state, and whether the outputs
    differ before it. None where there are too many to be listed."""
    if all(sum(v.width for v in unknowns(start)) <= MOST_START_BITS for start in joint.starts):
        return ((start, *each) for start in joint.starts for each in starts_of(start))
    used = sum(width for _, width in joint.own)
    moves = sum(width for _, width in joint.moves)
    if joint.held is None or used > MOST_HELD_BITS or moves > MOST_HELD_BITS:
        return None
    expressions = [*joint.held.rest, *joint.held.edge, *joint.held.move, *joint.held.release, *joint.begin]
    if any(v.name.startswith("?") for v in e.variables(expressions)):
        return None
    return _after_reset(joint, joint.held, effort)


def _after_reset(joint: Joint, held: Held, effort: Effort) -> Iterator[tuple[Start, Model, State, bool]]:
    """The same by holding reset in every state, half-cycle by half-cycle, with the inputs moving as they like."""
    names = [name for name, _ in joint.own]
    clock = names.index(joint.both.clock)
    registers, inputs = names[:clock], names[clock + 1 :]
    places = [inputs.index(name.removesuffix(" moved")) for name, _ in joint.moves]
    moved_names = [*names, *(name for name, _ in joint.moves)]
    rest, edge, release = (e.compile_step(values, names) for values in (held.rest, held.edge, held.release))
    move, begin = (e.compile_step(values, moved_names) for values in (held.move, joint.begin))
    every = list(itertools.product(*(range(1 << width) for _, width in joint.moves)))

    def onto(values: State, moves: State) -> State:
        """The inputs after they have moved."""
        out = list(values)
        for place, value in zip(places, moves, strict=True):
            out[place] = value
        return tuple(out)

    layers: list[dict[State, State]] = [{}]
    for state in itertools.product(*(range(1 << width) for _, width in joint.own)):
        layers[0].setdefault((*rest(*state), *state[clock:]), state)
    for count in range(held.half_cycles):
        effort.say(f"holding reset side by side, half-cycle {count}")
        following: dict[State, State] = {}
        for state in layers[-1]:
            after = (*edge(*state), 1 - state[clock])
            for moves in every:
                then = (
                    *move(*after, *state[clock + 1 :], *moves),
                    after[clock],
                    *onto(state[clock + 1 :], moves),
                )
                following.setdefault(then, state)
        layers.append(following)
    for state in layers[-1]:
        start = joint.starts[state[clock]]
        values = _history(layers, state, registers, inputs, clock)
        freed = (*release(*state), *state[clock:])
        for moves in every:
            *first, differs = begin(*freed, *moves)
            moved_to = {name: value for (name, _), value in zip(joint.moves, moves, strict=True)}
            yield start, values | moved_to, tuple(first), bool(differs)


def _history(
    layers: Sequence[dict[State, State]],
    state: State,
    registers: Sequence[str],
    inputs: Sequence[str],
    clock: int,
) -> Model:
    """What is not known of the start that a state under reset leads to: the registers at first, and the inputs."""
    values: Model = dict(zip(inputs, state[clock + 1 :], strict=True))
    for count in range(len(layers) - 1, 0, -1):
        state = layers[count][state]
        values |= {f"{n} in {count - 1}": x for n, x in zip(inputs, state[clock + 1 :], strict=True)}
    return values | dict(zip(registers, layers[0][state], strict=False))


def reach(joint: Joint, effort: Effort, most: int) -> set[State] | Divergence | None:
    """All states that both can be in together, or the shortest run on which the outputs differ; None where more than
    so many steps are to be taken."""
    stepper = Stepper(joint)
    listed = begun(joint, effort)
    if listed is None or stepper.free_bits > MOST_FREE_BITS:
        return None
    came: dict[State, tuple[Any, Any]] = {}
    frontier: list[State] = []
    for start, values, state, differs in listed:
        if differs:
            return Divergence(start, values, (), 0, True)
        if state not in came:
            came[state] = (start, values)
            frontier.append(state)
    effort.check()
    run, free = stepper.run, stepper.free
    steps = half_cycle = 0
    at_rest, at_edge = len(joint.variables), len(joint.variables) + 1
    while frontier:
        effort.say(f"both dividers in lockstep, half-cycle {half_cycle}")
        steps += len(frontier) * len(free)
        if steps > most:
            return None
        following: list[State] = []
        results: list[tuple[State, State, State]] = []
        broken: State | None = None
        for state in frontier:
            for moves in free:
                after = run(*state, *moves)
                if after[at_rest]:
                    return _divergence(joint, came, state, half_cycle, False)
                if after[at_edge] and broken is None:
                    broken = state
                results.append((after[:at_rest], state, moves))
        if broken is not None:
            return _divergence(joint, came, broken, half_cycle + 1, True)
        for after, state, moves in results:
            if after not in came:
                came[after] = (state, moves)
                following.append(after)
        frontier = following
        half_cycle += 1
    return set(came)


def _divergence(
    joint: Joint, came: dict[State, tuple[Any, Any]], state: State, half_cycle: int, at_edge: bool
) -> Divergence:
    """The run that leads to a state."""
    moves: list[State] = []
    while not isinstance(came[state][0], Start):
        before, move = came[state]
        moves.append(move[: len(joint.moves)])
        state = before
    start, values = came[state]
    first = tuple(values.get(name, 0) for name, _ in joint.moves)
    return Divergence(start, values, (first, *reversed(moves)), half_cycle, at_edge)


def differs_at(
    stepper: Stepper, start: Start, values: Model, moves: Sequence[State], last: int
) -> int | None:
    """The first half-cycle up to `last` in which a run shows outputs that differ; x stands for 0 in it."""
    joint = stepper.joint
    known = {v.name: 0 for v in unknowns(start)} | values
    known |= {name: x for (name, _), x in zip(joint.moves, moves[0] if moves else (), strict=False)}
    *state, differs = e.evaluate([*start.first, start.differs], known)
    if differs:
        return 0
    zeros = [0] * len(joint.choices)
    places = [joint.names.index(name.removesuffix(" moved")) for name, _ in joint.moves]
    for half_cycle in range(last + 1):
        # After the last move the inputs stay where they are.
        move = moves[half_cycle + 1] if half_cycle + 1 < len(moves) else [state[place] for place in places]
        *state, at_rest, at_edge = stepper.run(*state, *move, *zeros)
        if at_rest:
            return half_cycle
        if at_edge:
            return half_cycle + 1
    return None


def walked(
    stepper: Stepper, rng: random.Random, state: State, count: int, stay: float = 0.5, agreeing: bool = False
) -> Iterator[State]:
    """States from one on, with inputs that stay where they are that often and move anywhere otherwise; if
    they are to be `agreeing`, up to the first at which the outputs differ."""
    joint = stepper.joint
    places = [joint.names.index(name.removesuffix(" moved")) for name, _ in joint.moves]
    for _ in range(count):
        yield state
        moves = [
            state[place] if rng.random() < stay else _likely(rng, width)
            for place, (_, width) in zip(places, joint.moves, strict=True)
        ]
        choices = [rng.getrandbits(width) for _, width in joint.choices]
        *after, at_rest, at_edge = stepper.run(*state, *moves, *choices)
        if (at_rest or at_edge) and agreeing:
            return
        state = tuple(after)


def _likely(rng: random.Random, width: int) -> int:
    """A value for an input: small ones are as likely as large ones."""
    return rng.getrandbits(rng.randint(1, width))


def random_start(joint: Joint, rng: random.Random) -> tuple[Start, Model, State]:
    """One of the start states."""
    start = rng.choice(joint.starts)
    free = unknowns(start)
    values = {v.name: _likely(rng, v.width) for v in free}
    return start, values, tuple(e.evaluate(start.first, values))


class Frames:
    """Half-cycles one after another, for the solver: frame t is the state at the rest of half-cycle t.

    Frame 0 is a start, or any state if it is not `started`."""

    def __init__(self, joint: Joint, effort: Effort, started: bool = True) -> None:
        self.joint = joint
        self.effort = effort
        self.solver = fresh_solver()
        self.memo: dict[Expr, Any] = {}
        self.count = 0
        self.names = set(joint.names)
        self.which = e.var("start", max(1, (len(joint.starts) - 1).bit_length()))
        if not started:
            return
        here = []
        for number, start in enumerate(joint.starts):
            known = _in_frame(start.first, f"start {number}")
            pairs = zip(self._state(0).values(), known, strict=True)
            here.append(e.conj([self._is(number), *(e.eq(a, b) for a, b in pairs)]))
        self._assert(e.disj(here))

    def _is(self, number: int) -> Expr:
        return e.eq(self.which, e.const(number, self.which.width))

    def _term(self, x: Expr) -> Any:
        return e.z3_terms([x], self.memo, self.solver.ctx)[0]

    def _assert(self, x: Expr) -> None:
        self.solver.add(self._term(x) == 1)

    def _state(self, frame: int) -> dict[str, Expr]:
        """What stands for each variable in a frame."""
        return {name: e.var(f"{name}@{frame}", width) for name, width in self.joint.variables}

    def here(self, x: Expr, frame: int) -> Expr:
        """An expression over variables, moves and choices in a frame."""
        names = {v.name: e.var(f"{v.name}@{frame}", v.width) for v in e.variables([x])}
        return e.substitute([x], names)[0]

    def assume(self, x: Expr, frame: int) -> None:
        """Look only at runs in which something holds in a frame."""
        self._assert(self.here(x, frame))

    def onward(self) -> None:
        """One frame more."""
        step = [self.here(x, self.count) for x in self.joint.step]
        self.count += 1
        pairs = zip(self._state(self.count).values(), step, strict=True)
        self._assert(e.conj(e.eq(a, b) for a, b in pairs))

    def find(self, x: Expr) -> Model | None:
        """Values for which something over the frames holds, None if there are none."""
        import z3

        self.effort.check()
        self.solver.push()
        self._assert(x)
        self.solver.set("timeout", max(1, int(self.effort.left * 1000)))
        answer = self.solver.check()
        model = self.solver.model() if answer == z3.sat else None
        self.solver.pop()
        if answer == z3.unknown:
            raise OutOfEffort(f"the solver gave up while {self.effort.doing}")
        return None if model is None else {str(d): model[d].as_long() for d in model.decls()}

    def find_state(self, x: Expr, frame: int, where: Expr = e.TRUE) -> State | None:
        """A state in a frame in which x holds, while `where` holds of the frames; None if there is none."""
        goal = e.bvand(where, self.here(x, frame))
        if goal.is_const and not goal.value:
            return None
        model = self.find(goal)
        return None if model is None else tuple(model.get(f"{n}@{frame}", 0) for n in self.joint.names)

    def core(self, held: Mapping[str, Expr], goal: Expr) -> list[str]:
        """Labels of such of the conditions on the frames as suffice to exclude the goal. Raises OutOfEffort where
        they don't."""
        import z3

        self.effort.check()
        self.solver.push()
        self._assert(goal)
        labels = {z3.Bool(label, self.solver.ctx): x for label, x in held.items()}
        for label, x in labels.items():
            self.solver.add(z3.Implies(label, self._term(x) == 1))
        self.solver.set("timeout", max(1, int(self.effort.left * 1000)))
        answer = self.solver.check(*labels)
        found = [str(label) for label in self.solver.unsat_core()] if answer == z3.unsat else None
        self.solver.pop()
        if found is None:
            raise OutOfEffort(f"the solver gave up while {self.effort.doing}")
        return found

    def exclude(self, x: Expr) -> None:
        """Look no more for what was found not to be."""
        self._assert(e.bvnot(x))

    def begins_apart(self) -> Divergence | None:
        """A start at which the outputs differ before any input has moved."""
        for number, start in enumerate(self.joint.starts):
            (differs,) = _in_frame([start.differs], f"start {number}")
            model = self.find(e.bvand(self._is(number), differs))
            if model is not None:
                return self.divergence(model, 0, True)
        return None

    def divergence(self, model: Model, half_cycle: int, at_edge: bool) -> Divergence:
        """The run that a model stands for."""
        number = model.get("start", 0)
        start = self.joint.starts[number]
        values = {v.name: model.get(f"{v.name}@start {number}", 0) for v in unknowns(start)}
        first = tuple(values.get(name, 0) for name, _ in self.joint.moves)
        last = half_cycle - at_edge
        rest = [
            tuple(model.get(f"{name}@{frame}", 0) for name, _ in self.joint.moves) for frame in range(last)
        ]
        return Divergence(start, values, (first, *rest)[: half_cycle + 1], half_cycle, at_edge)


def _in_frame(values: Sequence[Expr], frame: str) -> list[Expr]:
    names = {v.name: e.var(f"{v.name}@{frame}", v.width) for v in e.variables(values)}
    return e.substitute(values, names)


def unrolled(
    joint: Joint, effort: Effort, frames: int, after: Frames | None = None
) -> tuple[Frames, Divergence | None]:
    """The shortest difference within so many half-cycles, if there is one, and the frames to go on from."""
    made = after or Frames(joint, effort)
    if after is None:
        found = made.begins_apart()
        if found is not None:
            return made, found
    while made.count < frames:
        effort.say(f"comparing in every run of {made.count} half-cycles")
        found = _differs(made, made.count)
        if found is not None:
            return made, found
        made.onward()
    return made, None


def _differs(frames: Frames, frame: int) -> Divergence | None:
    """A run on which the outputs differ at the rest in a frame, or after the edge that follows."""
    joint = frames.joint
    for x, at_edge in ((joint.differs, False), (joint.differs_at_edge, True)):
        goal = frames.here(x, frame)
        if goal.is_const and not goal.value:
            continue
        model = frames.find(goal)
        if model is not None:
            return frames.divergence(model, frame + at_edge, at_edge)
        # What can't be helps to exclude what is asked next.
        frames.exclude(goal)
    return None
