"""Glitches: whether the output may change more than once in a half-cycle, whatever the order of simultaneous changes.

What changes in one micro-step may arrive at the output in any order, through gates of any delay (`reach`, `hazard`).
If some order makes the output pulse whatever gates it is made of, or if the gates that are written do, that is a
glitch. Two things are timing obligations instead: an expression whose gates may pulse though its function does not,
and changes of different micro-steps, one of which causes the other, that have to keep their order.

Questions are asked in the order of `find`, region by region (`good`); from their answers all can be found again.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Literal

from prover import expr as e
from prover.arrival import Glitch, Replay, bit_name
from prover.effort import OutOfEffort
from prover.errors import Where
from prover.expr import Expr
from prover.good import EVERYWHERE, Region, Scope
from prover.ports import Ports
from prover.reach import Reach, network_of
from prover.rhythm import Orbit
from prover.settling import Ask
from prover.solve import Model
from prover.system import State, System


@dataclass(frozen=True, slots=True)
class Due:
    """A timing obligation under which the output is free of glitches."""

    text: str
    where: Where
    register: str


@dataclass(frozen=True, slots=True)
class Glitches:
    """What is known about glitches of a divider's output.

    found    one that happens; None if none was found
    dues     what timing analysis has to show for there to be none
    scope    which steps were looked at, in words
    by_form  that there is none follows from the form of the output, without a solver
    open     why it is not known, "" where it is
    goals    what must not be satisfiable for that, to be checked again
    answers  the answers to all questions asked on the way, in order
    """

    found: Glitch | None = None
    dues: tuple[Due, ...] = ()
    scope: str = ""
    by_form: bool = False
    open: str = ""
    goals: tuple[Expr, ...] = ()
    answers: tuple[Model | None, ...] = field(default=())


# -- questions and answers ---------------------------------------------------------------------------------

Follow = Callable[[State], Orbit | None]
"""The run from a power-up state if it is in scope: good, or where no state is good any."""


def find(ports: Ports, whole: System, scope: Scope, follow: Follow, ask: Ask) -> Glitches:
    """Whether the output may change more than once in a half-cycle, over the steps from the scope's states."""
    return _Search(ports, Reach(whole, whole.output, network_of(ports)), scope, follow, ask).run()


class _Search:
    """The questions, in order, with what was answered."""

    def __init__(self, ports: Ports, reach: Reach, scope: Scope, follow: Follow, ask: Ask) -> None:
        self.ports, self.reach, self.scope = ports, reach, scope
        self.follow, self._ask = follow, ask
        self.goals: list[Expr] = []
        self.answers: list[Model | None] = []
        self.dues: list[Due] = []

    def run(self) -> Glitches:
        told = self.scope.told
        try:
            found = self._found()
            if not self.answers:
                told = "every step"
            elif self.answers == [None]:
                told = "every step from a state at rest"
        except OutOfEffort as out:
            found = str(out)
        return Glitches(
            found=found if isinstance(found, Glitch) else None,
            dues=tuple(self.dues),
            scope=told,
            by_form=not self.answers,
            open=found if isinstance(found, str) else "",
            goals=tuple(self.goals),
            answers=tuple(self.answers),
        )

    def ask(self, region: Region, goal: Expr) -> State | None:
        """A state of the region in which the goal holds; the values of all else that the goal hangs on are kept."""
        question = region.of(e.bvand(goal, self.reach.whole.settled))
        model = self._ask(question)
        if not question.is_const:
            self.answers.append(model)
            if model is None:
                self.goals.append(question)
        if model is None:
            return None
        self.model = model
        return region.state(self.reach.whole, model)

    def first(self, goal: Expr) -> State | None:
        """The first state in scope for which the goal holds."""
        if goal is e.FALSE:
            return None
        found = (self.ask(region, goal) for region in self.scope.regions)
        return next((state for state in found if state is not None), None)

    def _found(self) -> Glitch | str:
        """A glitch, or why none can be told, "" if there is none but for what is due."""
        reach = self.reach
        if self.ask(EVERYWHERE, e.disj([reach.as_written, reach.late, reach.held])) is None:
            return ""
        if not self.scope.regions:
            return self.scope.why or "no state is known from which to look"
        pulses = self.first(reach.as_written)
        if pulses is not None:
            found = self._pulse(pulses)
            if found is not None:
                return found
        passes = self.first(reach.held)
        if passes is not None:
            return self._passed(passes)
        late = self.first(e.bvand(reach.late, e.bvnot(reach.as_written)))
        if late is not None:
            self.dues.append(_order_due(self.ports, reach, late))
        return self.scope.why

    def _passed(self, state: State) -> str:
        """Why nothing is told of an output that hangs on what a latch lets through, or a loop of gates keeps."""
        values = dict(zip(self.reach.whole.names, state, strict=True)) | self.model
        goals = [goal for _, goal in self.reach.holders]
        for v in e.variables(goals):
            values.setdefault(v.name, 0)
        hits = zip(self.reach.holders, e.evaluate(goals, values), strict=True)
        name = next(name for (name, _), hit in hits if hit)
        return f"what {name} takes on may pulse while it is open, at {_step(self.reach, state, every=True)}"

    def _pulse(self, state: State) -> Glitch | str | None:
        """What becomes of a pulse of the gates as written: a glitch, or something due."""
        reach = self.reach
        if reach.loose or reach.whole.choices:
            return "it hangs on a value that x stands for"
        shows = self.first(reach.by_function)
        if shows is not None:
            return self._shown(shows, "function")
        if reach.network.order:
            shows = state if reach.network.plain else self.first(reach.by_gates)
            if shows is not None:
                return self._shown(shows, "gates")
        self.dues.append(_gates_due(self.ports, reach, state))
        return None

    def _shown(self, state: State, kind: Literal["function", "gates"]) -> Glitch | str:
        orbit = self.follow(state)
        if orbit is None:
            return "a state that pulses, of which it is not certain that it is good"
        replay = Replay(self.reach, state)
        arrivals = replay.by_function(self.model) if kind == "function" else replay.by_gates()
        if arrivals is None:
            return "no order of arrival was found that shows a pulse of the gates"
        return replay.glitch(kind, arrivals, orbit, self.ports.output_where)


# -- what is due -------------------------------------------------------------------------------------------


def _gates_due(ports: Ports, reach: Reach, state: State) -> Due:
    replay = Replay(reach, state)
    moving = [
        bit_name(reach.whole.design, *bit)
        for number in range(len(replay.moments) - 1)
        if replay.may_pulse(number)
        for bit in replay.moving(number)
    ]
    text = (
        f"the gates that drive {ports.output} have to be free of hazards, as where {', '.join(moving)} "
        f"change{'s' * (len(moving) == 1)} at {_step(reach, state)}: the expression, read as gates, may pulse there, "
        "though its function does not"
    )
    return Due(text, ports.output_where, ports.output)


def _order_due(ports: Ports, reach: Reach, state: State) -> Due:
    replay = Replay(reach, state)
    groups = [
        [bit_name(reach.whole.design, *bit) for bit in replay.moving(number)]
        for number in range(len(replay.moments) - 1)
    ]
    order = " before ".join(", ".join(group) for group in groups if group)
    text = (
        f"changes have to reach {ports.output} in the order in which one causes the other: {order} at "
        f"{_step(reach, state)}"
    )
    return Due(text, ports.output_where, ports.output)


def _step(reach: Reach, state: State, every: bool = False) -> str:
    """The step from a state, in words: the registers that the output is made of, or every one."""
    whole = reach.whole
    edge = "falling" if state[-1] else "rising"
    used = {v.name for v in reach.inputs}
    values = whole.describe(state).items()
    told = ", ".join(f"{n}={v}" for n, v in values if n != whole.clock and (every or n in used))
    return f"the {edge} edge of {whole.clock}" + (f" from {told}" if told else "")
