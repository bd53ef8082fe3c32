"""The orbit of one start state, traced with jumps (loop acceleration).

Follow the machine one input cycle at a time. When two cycles in a row add the same vector d to the registers,
ask the solver for the least number k of cycles after which the next one no longer does, or the output changes,
and jump there. A counter's pass from zero to its limit becomes one stretch whatever the limit, so an orbit of
billions of half-cycles is a list of a few stretches. Acceleration of guarded counters is due to Comon and
Jurski (1998) and Finkel and Leroux (2002); here the guard is whatever the solver says it is.

Limits: an orbit that never adds the same vector twice (a shift register, a Gray counter) is followed state by
state, and one that runs through more stretches than the effort allows is left open.
"""

from __future__ import annotations

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.rhythm import Orbit, Stretch
from prover.system import State, System

PATIENCE = 6
"""Cycles with the same stride that are followed one by one before a jump is tried: short counters, the
common case, never need the solver."""


def trace(system: System, start: State, effort: Effort) -> Orbit:
    """The orbit of `start`, as far as the effort allows; `loop_from` is None if it did not close.

    The stretches are the search's word only: `certificate` checks them.
    """
    widths = tuple(width for _, width in system.variables)
    search = _Search(system, widths, effort)
    try:
        search.follow(start)
    except OutOfEffort as out:
        return Orbit(search.stretches(), None, widths, str(out))
    return Orbit(search.stretches(), search.loop_from, widths)


class _Search:
    """The orbit as found so far. `seen` gives for a state at a stretch's start the stretch's index."""

    def __init__(self, system: System, widths: tuple[int, ...], effort: Effort) -> None:
        self.system = system
        self.widths = widths
        self.effort = effort
        self.found: list[Stretch] = []
        self.seen: dict[State, int] = {}
        self.loop_from: int | None = None
        self.refused: set[State] = set()

    def stretches(self) -> tuple[Stretch, ...]:
        return tuple(self.found)

    def follow(self, state: State) -> None:
        run, choices = self.system.run, [0] * len(self.system.choices)
        previous: State | None = None
        repeats = 0
        count = 0
        while state not in self.seen:
            count += 1
            if count % 1024 == 0:
                self.effort.say(f"following an orbit, stretch {len(self.found)}")
            *middle_list, first = run(*state, *choices)
            middle = tuple(middle_list)
            *after_list, second = run(*middle, *choices)
            after = tuple(after_list)
            stride = tuple((b - a) % (1 << w) for a, b, w in zip(state, after, self.widths, strict=True))
            repeats = repeats + 1 if stride == previous else 0
            previous = stride
            cycles = 1
            if repeats >= PATIENCE and any(stride) and stride not in self.refused:
                cycles = self._jump(state, middle, stride, (first, second))
                if cycles < 4:
                    # Not worth a question again: this stride holds for no more than a few cycles.
                    self.refused.add(stride)
            self.seen[state] = len(self.found)
            self.found.append(Stretch(state, middle, stride, cycles, (first, second)))
            if cycles > 1:
                repeats = 0
                state = self.found[-1].state(2 * cycles, self.widths)
            else:
                state = after
        self.loop_from = self.seen[state]

    def _jump(self, start: State, middle: State, stride: State, levels: tuple[int, int]) -> int:
        """The greatest number of cycles for which the stride and the output's levels surely hold."""
        self.effort.say(f"jumping along an orbit, stretch {len(self.found)}")
        return least_break(self.system, Stretch(start, middle, stride, 1, levels), self.effort)


def least_break(system: System, stretch: Stretch, effort: Effort) -> int:
    """The least number of cycles after which the stretch is broken, or the cycles until it returns to its start.

    Found with the solver by asking for any break, then for an earlier one, halving the range as it goes."""
    import z3

    widths = tuple(width for _, width in system.variables)
    size = max(w for w, d in zip(widths, stretch.stride, strict=True) if d) + 1
    count = e.var("!k", size)
    (broken,) = e.z3_terms([broken_at(system, stretch, count)])
    index = z3.BitVec("!k", size)
    solver = z3.SolverFor("QF_BV")
    solver.add(broken == 1)
    # The stretch returns to its own start after 2^(size-1) cycles at the latest.
    low, high = 1, _likely_break(system, stretch, 1 << (size - 1))

    def any_below(bound: int) -> int | None:
        effort.check()
        solver.push()
        solver.set("timeout", max(1, int(effort.left * 1000)))
        solver.add(z3.ULE(low, index), z3.ULT(index, bound))
        answer = solver.check()
        model = solver.model() if answer == z3.sat else None
        solver.pop()
        if answer == z3.unknown:
            raise OutOfEffort(f"the solver gave up while {effort.doing}")
        return model.eval(index).as_long() if model is not None else None

    found = any_below(high)
    while found is not None:
        high = found
        if low >= high:
            break
        # An unbroken half is excluded at once; otherwise the model found is a better bound.
        half = (low + high) // 2
        below = any_below(half) if half > low else None
        if below is None:
            if half > low:
                low = half
            found = any_below(high)
        else:
            found = below
    return high


def _likely_break(system: System, stretch: Stretch, limit: int) -> int:
    """A number of cycles at which the stretch is broken, or the limit: guessed from the constants of the design
    and from powers of two, and tried. The solver then only has to show that there is none before it."""
    widths = tuple(width for _, width in system.variables)
    constants = {node.value for node in e.topological(system.step) if node.is_const and node.width > 1}
    guesses: set[int] = set()
    for value, step, width in zip(stretch.start, stretch.stride, widths, strict=True):
        if step in (1, (1 << width) - 1):
            sign = 1 if step == 1 else -1
            powers = {1 << i for i in range(width)}
            near = {c + slip for c in constants | powers for slip in (-1, 0, 1)}
            guesses |= {sign * (c - value) % (1 << width) for c in near}
    for cycles in sorted(guess for guess in guesses if 0 < guess < limit):
        here, half, after = (stretch.state(2 * cycles + i, widths) for i in range(3))
        choices = [0] * len(system.choices)
        if system.run(*here, *choices) != (*half, stretch.levels[0]):
            return cycles
        if system.run(*half, *choices) != (*after, stretch.levels[1]):
            return cycles
    return limit


def broken_at(system: System, stretch: Stretch, count: Expr) -> Expr:
    """One bit: in cycle number `count` of the stretch the step, its stride or an output level is another."""
    here = _along(system, stretch.start, stretch.stride, count)
    half = _along(system, stretch.middle, stretch.stride, count)
    beyond = _along(system, stretch.start, stretch.stride, e.bvadd(count, e.const(1, count.width)))
    wrong: list[Expr] = []
    for state, after, level in ((here, half, stretch.levels[0]), (half, beyond, stretch.levels[1])):
        values = dict(zip(system.names, state, strict=True))
        *stepped, out = e.substitute([*system.step, system.output], values)
        wrong += [e.bvnot(e.eq(a, b)) for a, b in zip(stepped, after, strict=True)]
        wrong.append(e.bvnot(out) if level else out)
    return e.disj(wrong)


def _along(system: System, base: State, stride: State, count: Expr) -> list[Expr]:
    out: list[Expr] = []
    for value, step, (_, width) in zip(base, stride, system.variables, strict=True):
        scaled = e.bvmul(e.resize(count, width, False), e.const(step, width))
        out.append(e.bvadd(e.const(value, width), scaled))
    return out
