"""A divider for all values of some inputs, and each value's own machine: what families are guessed from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from prover import certificate, reset
from prover import expr as e
from prover.analyse import checked, starts_of
from prover.design import Design
from prover.domain import Domain, Values, claimed_at
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Scope
from prover.rigid import Rigid
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System


class Machines(Rigid):
    """The divider for all values, its micro-steps checked, and for each."""

    def __init__(self, design: Design, spec: Spec, domain: Domain, effort: Effort) -> None:
        super().__init__(design, spec, domain, effort)
        self.settling = checked(self.settling, effort)
        self._known: dict[
            tuple[int, ...], tuple[Spec, System, Scope, tuple[State, ...], reset.Held | None]
        ] = {}

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
