"""Where the ratio is claimed from: the states that reset or declared initial values leave behind.

Reset is held from an unknown state. Each half-cycle is computed on expressions over that unknown state, and
as reset takes hold they become constants. What does not is enumerated while it is small.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.expr import Expr
from prover.rhythm import Start
from prover.solve import constant
from prover.system import Inputs, Moment, State, System, change_inputs, clock_edge

MOST_UNKNOWN_BITS = 10
"""Bits that reset does not force, or that have no initial value, up to which every value is followed."""


@dataclass(frozen=True, slots=True)
class Held:
    """Reset held long enough.

    half_cycles   how long that is: from then on the registers go through `states`, one a half-cycle, for ever
    states        the states while reset is held, once round, for each value of the unforced bits
    unforced      registers that never become known
    problem       why there is no answer, "" otherwise
    """

    half_cycles: int
    states: tuple[State, ...]
    unforced: tuple[str, ...]
    problem: str = ""


def hold(design: Design, clock: str, active: Inputs, effort: Effort) -> Held:
    """Hold reset at its active value from every state, until what can become known is known."""
    effort.say("holding reset")
    limit = 2 * len(design.registers) + 8
    names = [*(r.name for r in design.registers), clock]
    found: set[State] = set()
    unforced: list[str] = []
    longest = 0
    # What the first edge is makes a difference: a register on the other edge may have to wait for it once more.
    for level in (e.FALSE, e.TRUE):
        count, moment = _known_after(design, clock, active, level, limit, effort)
        unknown = e.variables([moment[name] for name in names])
        unforced += [name for name in names if e.variables([moment[name]]) and name not in unforced]
        longest = max(longest, count)
        if sum(v.width for v in unknown) > MOST_UNKNOWN_BITS:
            return Held(longest, (), tuple(unforced), f"reset never forces {', '.join(unforced)}")
        for filled in _fillings(moment):
            states = _round(design, clock, filled, names, limit, effort)
            if not states:
                return Held(longest, (), tuple(unforced), "the registers run on while reset is held")
            found |= set(states)
    return Held(longest, tuple(sorted(found)), tuple(unforced))


def _known_after(
    design: Design, clock: str, active: Inputs, level: Expr, limit: int, effort: Effort
) -> tuple[int, Moment]:
    """Half-cycles of reset, begun at that level of the clock, after which all is known or no more will be; and what
    the registers are then."""
    names = [*(r.name for r in design.registers), clock]
    moment: Moment = {r.name: e.var(r.name, r.width) for r in design.registers}
    moment |= active.moment(design.inputs) | {clock: level}
    moment = _fresh_choices(change_inputs(design, clock, moment, active, limit), f"{level.value}")
    longest = 4 * len(design.registers) + 8
    for count in range(longest):
        for name in names:
            known = constant(moment[name])
            if known is not None:
                moment[name] = e.const(known, moment[name].width)
        if not e.variables([moment[name] for name in names]):
            return count, moment
        moment = _fresh_choices(clock_edge(design, clock, moment, limit), f"{level.value}.{count}")
        effort.check()
    return longest, moment


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
        values = zip(system.variables, state, strict=True)
        moment = {name: e.const(value, width) for (name, width), value in values}
        moment |= active.moment(system.design.inputs)
        freed = _at_rest(system, moment, limit)
        if freed is None:
            return "the registers do not settle when reset is released"
        level = "high" if freed[-1] else "low"
        starts.setdefault(freed, Start(freed, f"reset released while the clock is {level}"))
    return tuple(starts.values())


def _at_rest(system: System, moment: Moment, limit: int) -> State | None:
    """The state once the inputs have changed to the system's and all has settled; None where more than `limit`
    micro-steps do not suffice."""
    ends = []
    for count in (limit, limit + 1):
        after = change_inputs(system.design, system.clock, moment, system.inputs, count)
        ends.append(tuple(e.evaluate([after[name] for name in system.names], {})))
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
                return "the initial values do not settle"
            word = "high" if level else "low"
            starts.setdefault(state, Start(state, f"initial values, the clock {word} at power-up"))
    return tuple(starts.values())
