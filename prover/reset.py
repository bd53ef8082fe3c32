"""Where the ratio is claimed from: the states that reset or declared initial values leave behind.

Reset is held from an unknown state. Each half-cycle is computed on expressions over that unknown state, and
as reset takes hold they become constants. What does not is enumerated while it is small.
"""

from __future__ import annotations

import functools
import itertools
import random
from collections.abc import Callable, Iterator, Sequence, Set
from dataclasses import dataclass, replace
from operator import and_, or_

from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.expr import Expr
from prover.ports import Ports
from prover.rhythm import Start
from prover.solve import constant, find
from prover.system import Inputs, Moment, State, System, change_inputs, clock_edge

MOST_UNKNOWN_BITS = 10
"""Bits that reset does not force, or that have no initial value, up to which every value is followed."""

FEW_STATES = 64
"""States that reset leaves up to which registers beside those that the output depends on are followed under reset."""

SAMPLES = 16
"""Unknown states that are followed on values, to see whether reset still takes hold of more of them."""


@dataclass(frozen=True, slots=True)
class Held:
    """Reset held long enough.

    names     what the states are made of: the registers that the output depends on, and the clock
    states    the states while it is held, once round: however long it is held, the machine goes round among them
    needs     half-cycles of reset, begun with the clock low and with it high, from which on it does
    unforced  registers that are not the same in all states of one clock level, or that are not known
    slowest   by the clock's level a state for which one half-cycle less does not do; None where none is known
    problem   why the states are not known, "" otherwise
    """

    names: tuple[str, ...]
    states: tuple[State, ...]
    needs: tuple[int, int]
    unforced: tuple[str, ...]
    slowest: tuple[State | None, State | None] = (None, None)
    problem: str = ""

    @property
    def half_cycles(self) -> int:
        """How long reset has to be held, whatever the clock's level when it is asserted."""
        return max(self.needs)

    @property
    def exact(self) -> bool:
        """Whether it really has to be held for as long as it `needs`."""
        return all(k == 0 or state is not None for k, state in zip(self.needs, self.slowest, strict=True))


def seen_by(ports: Ports) -> Ports:
    """The ports with a design of those registers only on which the output depends, now or later, reset or not."""
    by_name = {register.name: register for register in ports.design.registers}
    kept: set[str] = set()
    todo = [ports.output_value]
    while todo:
        for v in e.variables([todo.pop()]):
            register = by_name.get(v.name)
            if register is not None and v.name not in kept:
                kept.add(v.name)
                todo += [x for edge in register.edges for x in (edge.clock, edge.data)]
                todo += [x for force in register.forces for x in (force.when, force.value)]
    if len(kept) == len(by_name):
        return ports
    registers = tuple(r for r in ports.design.registers if r.name in kept)
    return replace(ports, design=replace(ports.design, registers=registers))


def hold(design: Design, clock: str, active: Inputs, effort: Effort) -> Held:
    """Hold reset at its active value from every state, until what can become known is known. `needs` is enough, and
    `exactly` tells how much of it is needed."""
    effort.say("holding reset")
    limit = 2 * len(design.registers) + 8
    names = [*(r.name for r in design.registers), clock]
    found: set[State] = set()
    needs: list[int] = []
    # What the first edge is makes a difference: a register on the other edge may have to wait for it once more.
    for level in (e.FALSE, e.TRUE):
        count, moment = _known_after(design, clock, active, level, limit, effort)
        needs.append(count)
        unknown = e.variables([moment[name] for name in names])
        if sum(v.width for v in unknown) > MOST_UNKNOWN_BITS:
            left = tuple(name for name in names if e.variables([moment[name]]))
            why = f"{', '.join(left)} not known after {count} half-cycles of reset"
            return Held(tuple(names), (), (count, count), left, problem=why)
        for filled in _fillings(moment):
            states = _round(design, clock, filled, names, limit, effort)
            if not states:
                why = "the registers run on while reset is held"
                return Held(tuple(names), (), (count, count), (), problem=why)
            found |= set(states)
    states = tuple(sorted(found))
    return Held(tuple(names), states, (needs[0], needs[1]), several_values(names, states))


def several_values(names: Sequence[str], states: Sequence[State]) -> tuple[str, ...]:
    """Names of components that are not the same in all the states of one clock level."""
    return tuple(
        name
        for place, name in enumerate(names)
        if any(len({state[place] for state in states if state[-1] == level}) > 1 for level in (0, 1))
    )


def exactly(system: System, held: Held, goal: Callable[[int, int], Expr], effort: Effort) -> Held:
    """What reset held long enough really needs, in the system under reset. `goal(level, count)` is true of states
    that, after so many half-cycles begun at that level, are none of those that reset leaves.

    A state that needs long is followed on values, and a state that needs longer is asked for, until there is none."""
    effort.say("looking for the shortest reset")
    home = set(held.states)
    needs, slowest = [], []
    for level in (0, 1):
        starts = [any_at_rest(system, level, number) for number in range(SAMPLES // 2)]
        timed = [(gone, start) for start in starts if (gone := _until(system, start, home)) is not None]
        count, state = max(timed, default=(0, None), key=lambda pair: pair[0])
        while (model := find(goal(level, count), effort)) is not None:
            state = (*(model.get(name, 0) for name in system.names[:-1]), level)
            gone = _until(system, state, home)
            if gone is None or gone <= count:
                why = "what reset leaves hangs on a value that x stands for"
                return replace(held, states=(), problem=why)
            count = gone
        needs.append(count)
        slowest.append(state if count else None)
    return replace(held, needs=(needs[0], needs[1]), slowest=(slowest[0], slowest[1]))


def any_at_rest(system: System, level: int, number: int) -> State:
    """Some state at rest under reset: from all ones, all zeros, and then from values at random."""
    rng = random.Random(number)
    values = {
        r.name: (-1, 0)[number] % (1 << r.width) if number < 2 else rng.getrandbits(r.width)
        for r in system.design.registers
    }
    moment = {r.name: e.const(values[r.name], r.width) for r in system.design.registers}
    moment |= system.inputs.moment(system.design.inputs) | {system.clock: e.const(level, 1)}
    limit = 2 * len(system.design.registers) + 8
    return known(change_inputs(system.design, system.clock, moment, system.inputs, limit), system.names)


def known(moment: Moment, names: Sequence[str]) -> State:
    """The values in a moment that is known, choices that x leaves at 0."""
    values = [moment[name] for name in names]
    zeros = {v.name: 0 for v in e.variables(values)}
    return tuple(e.evaluate(values, zeros))


def _until(system: System, state: State, home: Set[State]) -> int | None:
    """Half-cycles until the state is one of those; None if it takes too long."""
    for count in range(4 * system.bits + 64):
        if state in home:
            return count
        state = system.next(state)
    return None


def _known_after(
    design: Design, clock: str, active: Inputs, level: Expr, limit: int, effort: Effort
) -> tuple[int, Moment]:
    """Half-cycles of reset, begun at that level of the clock, after which all is known or no more will be; and what
    the registers are then."""
    names = [*(r.name for r in design.registers), clock]
    moment: Moment = {r.name: e.var(r.name, r.width) for r in design.registers}
    moment |= active.moment(design.inputs) | {clock: level}
    moment = _fresh_choices(change_inputs(design, clock, moment, active, limit), f"{level.value}")
    patience = 4 * len(design.registers) + 8
    fewest, since, count = design.state_bits + 1, 0, 0
    while count - since < patience:
        for name in names:
            value = constant(moment[name])
            if value is not None:
                moment[name] = e.const(value, moment[name].width)
        if not e.variables([moment[name] for name in names]):
            return count, moment
        moving = _moving_bits([moment[name] for name in names])
        if moving < fewest:
            fewest, since = moving, count
        moment = _fresh_choices(clock_edge(design, clock, moment, limit), f"{level.value}.{count}")
        count += 1
        effort.check()
    return count, moment


def _moving_bits(values: Sequence[Expr]) -> int:
    """Bits that are not the same in all of some samples: a long shift register becomes known a bit at a time."""
    rng = random.Random(0)
    used = e.variables(values)
    samples = [e.evaluate(values, {v.name: rng.getrandbits(v.width) for v in used}) for _ in range(SAMPLES)]
    return sum(
        (functools.reduce(or_, column) ^ functools.reduce(and_, column)).bit_count()
        for column in zip(*samples, strict=True)
    )


def _fresh_choices(moment: Moment, label: str) -> Moment:
    """The moment with the choices that came in since the last call named anew: x is another value every time."""
    new = {
        v.name: e.var(f"{v.name}#{label}", v.width)
        for v in e.variables(list(moment.values()))
        if v.name.startswith("?") and "#" not in v.name
    }
    return dict(zip(moment, e.substitute(list(moment.values()), new), strict=True)) if new else moment


def _fillings(moment: Moment) -> Iterator[Moment]:
    """The moment with every value of its unknowns in turn."""
    unknown = e.variables(list(moment.values()))
    for values in itertools.product(*(range(1 << v.width) for v in unknown)):
        chosen = {v.name: e.const(x, v.width) for v, x in zip(unknown, values, strict=True)}
        yield dict(zip(moment, e.substitute(list(moment.values()), chosen), strict=True))


def _round(
    design: Design, clock: str, moment: Moment, names: Sequence[str], limit: int, effort: Effort
) -> tuple[State, ...]:
    """The states that a known state runs into while reset is held, once round; none if that takes too long."""
    seen: dict[State, int] = {}
    while len(seen) < 4096:
        values = e.evaluate([moment[name] for name in names], {})
        state = tuple(values)
        if state in seen:
            return tuple(s for s, at in seen.items() if at >= seen[state])
        seen[state] = len(seen)
        moment = clock_edge(design, clock, moment, limit)
        if e.variables([moment[name] for name in names]):
            return ()
        effort.check()
    return ()


def released(system: System, held: Held, active: Inputs, limit: int) -> tuple[Start, ...] | str:
    """The states just after release, at either level of the clock, while reset was held long enough; a text if
    some state does not settle after its release."""
    starts: dict[State, Start] = {}
    for state in held.states:
        freed = released_from(system, held, state, active, limit)
        if freed is None:
            return "the registers do not settle when reset is released, or hang on a value that x stands for"
        level = "high" if freed[-1] else "low"
        starts.setdefault(freed, Start(freed, f"reset released while the clock is {level}"))
    return tuple(starts.values())


def released_from(system: System, held: Held, state: State, active: Inputs, limit: int) -> State | None:
    """The state of the whole system after a release from one that reset leaves; None where more than `limit`
    micro-steps do not suffice. Registers on which the output does not depend are as reset makes them from 0."""
    return _at_rest(system, _under_reset(system, held, state, active, limit), limit)


def _under_reset(system: System, held: Held, state: State, active: Inputs, limit: int) -> Moment:
    moment = _with_others(system, held.names, state, active)
    if tuple(held.names) == tuple(system.names):
        return moment
    design, clock = system.design, system.clock
    moment = change_inputs(design, clock, moment, active, limit)
    rounds = 4 * len(design.registers) + 8 if len(held.states) <= FEW_STATES else 0
    for count in range(rounds + len(held.states)):
        # Once round and longer, until what reset forces is forced.
        if count >= rounds and known(moment, held.names) == state:
            break
        moment = clock_edge(design, clock, moment, limit)
    # The others may hang on x; what reset leaves does not.
    values = dict(zip(system.names, known(moment, system.names), strict=True))
    values |= dict(zip(held.names, state, strict=True))
    return {**moment, **{name: e.const(values[name], width) for name, width in system.variables}}


def filled(system: System, names: Sequence[str], state: State, limit: int) -> State | None:
    """A state of those registers as one of the whole system, at rest; registers on which the output does not depend
    are 0. None where more than `limit` micro-steps do not suffice."""
    if tuple(names) == tuple(system.names):
        return state
    return _at_rest(system, _with_others(system, names, state, system.inputs), limit)


def _with_others(system: System, names: Sequence[str], state: State, inputs: Inputs) -> Moment:
    values = dict(zip(names, state, strict=True))
    moment = {name: e.const(values.get(name, 0), width) for name, width in system.variables}
    return moment | inputs.moment(system.design.inputs)


def _at_rest(system: System, moment: Moment, limit: int) -> State | None:
    """The state once the inputs have changed to the system's and all has settled; None where more than `limit`
    micro-steps do not suffice, or where it hangs on a value that x stands for."""
    ends = []
    for count in (limit, limit + 1):
        after = change_inputs(system.design, system.clock, moment, system.inputs, count)
        values = [after[name] for name in system.names]
        if e.variables(values):
            return None
        ends.append(tuple(e.evaluate(values, {})))
    return ends[0] if ends[0] == ends[1] else None


def initial(system: System, limit: int) -> tuple[Start, ...] | str:
    """The states that declared initial values leave at power-up, at either level of the clock.

    Registers without an initial value take every value while they are few; a text says why not otherwise."""
    design, clock = system.design, system.clock
    without = [r for r in design.registers if r.initial is None]
    bits = sum(r.width for r in without)
    if len(without) == len(design.registers):
        return "no register has an initial value"
    if bits > MOST_UNKNOWN_BITS:
        return f"no initial value for {', '.join(r.name for r in without)}"
    starts: dict[State, Start] = {}
    for level in (0, 1):
        moment: Moment = {
            r.name: e.const(r.initial, r.width) if r.initial is not None else e.var(r.name, r.width)
            for r in design.registers
        }
        moment |= system.inputs.moment(design.inputs) | {clock: e.const(level, 1)}
        for filled in _fillings(moment):
            state = _at_rest(system, filled, limit)
            if state is None:
                return "the initial values do not settle, or hang on a value that x stands for"
            word = "high" if level else "low"
            starts.setdefault(state, Start(state, f"initial values, the clock {word} at power-up"))
    return tuple(starts.values())
