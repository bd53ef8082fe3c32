"""What happens within a half-cycle while inputs move: pulses on the way from one rest to the next.

Everything else that is claimed of moves is about the output at rest. On the way there it may pulse all the same, as
the clock does that is gated by a flip-flop of the same edge; and so may a clock, a clear or a latch's enable inside,
where what is seen of it hangs on how fast gates are. With the inputs held both are looked for by `glitch` and by
`settling`. Here they are looked for in what is reached while the inputs move: inputs are registers that no edge
moves, and a region says which states and values the edge may come from.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

from prover import certificate, domain, glitch, orbit, tables
from prover import expr as e
from prover.arrival import Glitch, told
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr
from prover.findings import Obligation
from prover.good import Region, Scope
from prover.monitor import Run, Search
from prover.moving import Machine
from prover.observer import Nominal
from prover.ports import Ports
from prover.reach import Reach, network_of
from prover.settling import find_races
from prover.solve import Model, find
from prover.system import State, System, build
from prover.watch import Line, Watch

if TYPE_CHECKING:
    import numpy as np

MOST_ENTRIES = 1 << 18
"""States with values up to which those that runs reach are told apart from others."""


@dataclass(frozen=True)
class Found:
    """What is known of the edges from a region.

    state  a state of the region, moving and rigid inputs among its registers, from whose edge something pulses
    text   what does, in words; "" where nothing does
    goal   one bit over the states, over masks too: something pulses so
    glitch where it is the output, an order of arrival by which it does
    owed   timing obligations under which nothing pulses
    open   why it is not known, "" where it is
    """

    state: State | None = None
    text: str = ""
    goal: Expr = e.FALSE
    glitch: Glitch | None = None
    owed: tuple[Obligation, ...] = ()
    open: str = ""

    @property
    def nothing(self) -> bool:
        """Whether nothing pulses, and nothing has to be shown for that."""
        return not (self.text or self.owed or self.open)


class Ways:
    """The edges of a machine, with all that happens on the way, at the values that a claim is about."""

    def __init__(self, ports: Ports, machine: Machine, nominal: Nominal, effort: Effort) -> None:
        self.machine, self.effort = machine, effort
        inputs = [name for name, _ in (*machine.rigid, *machine.moving)]
        design = domain.rigid(machine.design, inputs)
        wanted = {*machine.names, *inputs}
        design = replace(design, registers=tuple(r for r in design.registers if r.name in wanted))
        held = machine.held
        # A reset that has been released is an input like any other that is held.
        self.ports = replace(ports, design=design, holds=dict(held.values), reset=None, free=())
        self.whole: System = build(design, machine.clock, held, ports.output_value, machine.reactions)
        self.everywhere = self.look(nominal.domain)

    @cached_property
    def reach(self) -> Reach:
        return Reach(self.whole, self.whole.output, network_of(self.ports))

    def look(self, region: Expr) -> Found:
        """Whether anything pulses on an edge from a state at rest for which the region's bit is true. That nothing
        does is checked afresh. Raises OutOfEffort."""
        effort = self.effort
        effort.say("looking at what happens within a half-cycle while inputs move")
        asked: list[Expr] = []

        def ask(goal: Expr) -> Model | None:
            if goal is e.FALSE:
                return None
            asked.append(goal)
            return _answer(e.bvand(goal, region), effort)

        owed = []
        for race in find_races(self.whole, ask):
            if race.kind == "pulse":
                return Found(race.state, race.text, asked[-1])
            owed.append(Obligation(race.text, race.where, race.register, race.via))
        scope = Scope((Region(region),), "")
        found = glitch.find(
            self.ports,
            self.whole,
            scope,
            lambda state: orbit.trace(self.whole, state, effort, most=1),
            lambda goal: find(goal, effort),
        )
        if found.found is not None:
            pulse = found.found
            state = tuple(pulse.state[name] for name in self.whole.names)
            text = f"the output {told(pulse)}"
            return Found(state, text, self._goal(pulse), pulse)
        for goal in found.goals:
            _check(goal, effort)
        owed += [Obligation(due.text, due.where, due.register) for due in found.dues]
        return Found(owed=tuple(owed), open=found.open)

    def _goal(self, pulse: Glitch) -> Expr:
        """One bit: the output pulses as it does there."""
        reach = self.reach
        if pulse.kind == "function":
            goal = reach.by_function
        else:
            goal = reach.as_written if reach.network.plain else reach.by_gates
        return e.bvand(goal, self.whole.settled)

    def at(self, values: Mapping[str, int]) -> Found:
        """The same from one state, with the values of inputs."""
        here = (
            e.eq(e.var(name, width), e.const(values[name], width)) for name, width in self.whole.variables
        )
        return self.look(e.conj(here))

    # -- small machines: what runs reach is a table

    def first(self, search: Search) -> Run | None:
        """A shortest run to a state from whose edge something pulses, where none breaks a limit. The edge is not part
        of it."""
        if not self.everywhere.text:
            return None
        for _, value, state, *_ in search.frontiers:
            found = self.look(self._among(value, state))
            if found.state is not None:
                return search.path(self._only(found.state, search.reached))
        return None

    def reached(self, search: Search) -> Found:
        """What happens on the edges of all runs."""
        return (
            self.everywhere if self.everywhere.nothing else self.look(self._among(*search.reached.nonzero()))
        )

    def _among(self, value: np.ndarray, state: np.ndarray) -> Expr:
        """One bit: the state, with the inputs' values, is one of these numbers."""
        machine = self.machine
        count = 1 << machine.bits + machine.moving_bits
        if count > MOST_ENTRIES:
            raise OutOfEffort("too many states to tell which of them runs reach where something may pulse")
        row = [0] * count
        for number in ((value << machine.bits) + state).tolist():
            row[number] = 1
        return tables.lookup(replace(self.whole, variables=self._numbered), row, 1)

    def _only(self, state: State, reached: np.ndarray) -> np.ndarray:
        """A table of all values and states that is true of one state."""
        import numpy as np

        values, number, at = dict(zip(self.whole.names, state, strict=True)), 0, 0
        for name, width in self._numbered:
            number |= values[name] << at
            at += width
        only = np.zeros(reached.shape, dtype=bool)
        only[divmod(number, reached.shape[1])] = True
        return only

    @property
    def _numbered(self) -> tuple[tuple[str, int], ...]:
        """The variables in the order in which `observer` numbers states and values."""
        return (*self.machine.variables, *self.machine.moving)

    # -- large ones: what runs reach lies within invariants

    def under(self, system: Watch, lines: Sequence[Line]) -> Found:
        """What happens on the edges from where the lines hold."""
        if self.everywhere.nothing:
            return self.everywhere
        widths = dict(system.variables)
        return self.look(e.conj([system.within, *(line.expr(widths) for line in lines)]))

    def pulsing(self, system: Watch, found: Found) -> Watch:
        """The system in which it breaks the claim, too, that something pulses as was found."""
        known = {name for name, _ in (*system.variables, *system.moves, *system.machine.choices)}
        masks = [(v.name, v.width) for v in e.variables([found.goal]) if v.name not in known]
        return replace(system, moves=(*system.moves, *masks), broken=e.bvor(system.broken, found.goal))


def _answer(question: Expr, effort: Effort) -> Model | None:
    model = find(question, effort)
    if model is None:
        _check(question, effort)
    return model


def _check(question: Expr, effort: Effort) -> None:
    obligation = certificate.Obligation("nothing pulses within a half-cycle", question)
    if not certificate.discharge(obligation, effort):
        raise InternalError("the absence of a pulse within a half-cycle fails its check")
