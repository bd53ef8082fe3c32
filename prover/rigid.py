"""A divider with some inputs as rigid variables: one machine for all their values, and each value's own.

A rigid variable is one that no step moves. As a register it lets the micro-steps be bounded, and the ports be
recognised, for every value at once; taken out of the state again it stays in the step as a variable.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from prover import certificate, reset
from prover import expr as e
from prover.analyse import checked, starts_of
from prover.design import Design
from prover.domain import Domain, Values, claimed_at, rigid
from prover.effort import Effort
from prover.expr import Expr
from prover.family import Origin, Unfit
from prover.forms import Poly, at_least, condition
from prover.ports import Ports, recognise
from prover.rhythm import Scope
from prover.settling import Settling, settle
from prover.spec import Spec
from prover.system import State, System, cone


class Machines:
    """The divider for all values, and for each: the claim's domain, what it says, and the machine.

    with_inputs, whole, system  the machine with the inputs as registers, without them, and what the output hangs on
    settling  what is known of its micro-steps, for every value
    pulses    steps that hang on the order of events, in words, each with a value at which that is so
    """

    def __init__(self, design: Design, spec: Spec, domain: Domain, effort: Effort) -> None:
        self.design, self.spec, self.domain, self.effort = design, spec, domain, effort
        self.inputs = [(name, design.inputs[name]) for name, _ in domain.inputs]
        self.ports: Ports = recognise(rigid(design, spec.each), spec)
        ports = self.ports
        whole, settling = settle(ports.design, ports.clock, ports.running, ports.output_value, effort)
        self.settling: Settling = checked(settling, effort)
        # Where the outcome hangs on the order of events, at some value of the inputs.
        self.pulses = [
            (race.text, {name: race.state[whole.names.index(name)] for name, _ in self.inputs})
            for race in self.settling.races
            if race.kind == "pulse"
        ]
        self.with_inputs = whole
        self.whole = _without(whole, spec.each)
        self.system = cone(self.whole)
        self._origin: Origin | None = None
        self._known: dict[
            tuple[int, ...], tuple[Spec, System, Scope, tuple[State, ...], reset.Held | None]
        ] = {}

    def admitted(self) -> Expr:
        """One bit: the inputs are of the domain. Raises Beyond."""
        parts = []
        names = {name: Poly.atom(name, width) for name, width in self.inputs}
        names |= {name: Poly.const(value) for name, value in self.domain.fixed.items()}
        for name, ranges in self.domain.inputs:
            inside = (
                e.bvand(at_least(names[name], Poly.const(low)), at_least(Poly.const(high), names[name]))
                for low, high in ranges
            )
            parts.append(e.disj(inside))
        return e.conj([*parts, *(condition(each, names) for each in self.domain.where)])

    def origin(self) -> Origin:
        """What start states are derived from. Raises Unfit where reset does not settle, or x takes part."""
        if self._origin is None:
            seen = reset.seen_by(self.ports)
            limit = max(self.settling.depth or 0, 2 * len(self.ports.design.registers) + 8)
            resetting = None
            if seen.reset is not None and self.spec.start != "initial":
                system, settling = settle(
                    seen.design, seen.clock, seen.resetting, seen.output_value, self.effort, races=False
                )
                if checked(settling, self.effort).depth is None or system.choices:
                    raise Unfit("the registers do not settle while reset is held, or hang on x")
                resetting = _without(system, self.spec.each)
            self._origin = Origin(seen.design, tuple(self.spec.each), self.system, resetting, limit)
        return self._origin

    def spec_at(self, values: Values) -> Spec:
        return claimed_at(self.spec, {**self.domain.fixed, **values}, values)

    def at(self, values: Values) -> tuple[System, Scope, tuple[State, ...], reset.Held | None]:
        """The machine at a value; where its claim begins, its start states, one for each state that reset leaves, and
        how long reset is held."""
        key = tuple(values.values())
        if key not in self._known:
            spec = self.spec_at(values)
            ports = recognise(self.design, spec)
            whole, settling = settle(
                ports.design, ports.clock, ports.running, ports.output_value, self.effort, races=False
            )
            scope, starts, held = starts_of(ports, spec, whole, settling, self.effort)
            held = held if scope == "reset" else None
            if held is not None and not held.problem:
                limit = max(settling.depth or 0, 2 * len(ports.design.registers) + 8)
                singly = (
                    reset.released(whole, replace(held, states=(state,)), ports.resetting, limit)
                    for state in held.states
                )
                starts = tuple(start for each in singly if not isinstance(each, str) for start in each)
            machine = _restricted(whole, self.system.names)
            places = [whole.names.index(name) for name in machine.names]
            states = tuple(tuple(start.state[i] for i in places) for start in starts)
            self._known[key] = spec, machine, scope, states, held
        return self._known[key][1:]


def _without(system: System, names: Mapping[str, object]) -> System:
    """The machine with some of its registers taken for values that nothing moves."""
    kept = [i for i, name in enumerate(system.names) if name not in names]
    return replace(
        system,
        variables=tuple(system.variables[i] for i in kept),
        step=tuple(system.step[i] for i in kept),
    )


def _restricted(system: System, names: Sequence[str]) -> System:
    """The machine of some of its registers, which depend on no others."""
    kept = [i for i, name in enumerate(system.names) if name in names]
    here = replace(
        system,
        variables=tuple(system.variables[i] for i in kept),
        step=tuple(system.step[i] for i in kept),
    )
    rest = {v.name for v in e.variables([system.settled])} - set(names)
    return here if not rest else replace(here, settled=certificate.part(system, set(names)).settled)
