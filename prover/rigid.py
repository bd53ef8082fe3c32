"""A divider with some inputs as rigid variables: one machine for all their values. Imports no engine.

A rigid variable is one that no step moves. As a register it lets the micro-steps be bounded, and the ports be
recognised, for every value at once; taken out of the state again it stays in the step as a variable.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace

from prover import expr as e
from prover import reset
from prover.certificate import Obligation
from prover.design import Design, Register
from prover.domain import Domain, rigid
from prover.effort import Effort
from prover.expr import Expr
from prover.family import Origin, Proof, Unfit, regions
from prover.findings import Obligation as Due
from prover.forms import Poly, at_least
from prover.glitch import Glitches
from prover.good import Region, Scope
from prover.ports import Ports, recognise
from prover.settling import Settling, settle
from prover.spec import Spec
from prover.system import Inputs, System, cone

Settled = Callable[[Ports, Inputs, bool], tuple[System, Settling]]
"""The machine of some ports with their inputs at these values, and what is known of its micro-steps; with or without
the races."""


class Rigid:
    """The divider for all values: the claim's domain, what it says, and the machine.

    with_inputs, whole, system  the machine with the inputs as registers, without them, and what the output hangs on
    settling  what is known of its micro-steps, for every value; `under_reset` the same while reset is held
    pulses    steps that hang on the order of events, in words, each with a value at which that is so
    """

    def __init__(
        self, design: Design, spec: Spec, domain: Domain, effort: Effort, settled: Settled | None = None
    ) -> None:
        self.design, self.spec, self.domain, self.effort = design, spec, domain, effort
        self.settled = settled or self._asked
        self.inputs = [(name, design.inputs[name]) for name, _ in domain.inputs]
        self.ports: Ports = recognise(rigid(design, spec.each), spec)
        self.with_inputs, self.settling = self.settled(self.ports, self.ports.running, True)
        self.under_reset: Settling | None = None
        names = self.with_inputs.names
        self.pulses = [
            (race.text, {name: race.state[names.index(name)] for name, _ in self.inputs})
            for race in self.settling.races
            if race.kind == "pulse"
        ]
        self.whole = without(self.with_inputs, spec.each)
        self.system = cone(self.whole)
        self._origin: Origin | None = None

    def _asked(self, ports: Ports, inputs: Inputs, races: bool) -> tuple[System, Settling]:
        return settle(ports.design, ports.clock, inputs, ports.output_value, self.effort, races=races)

    def admitted(self) -> Expr:
        """One bit: the inputs are of the domain. Raises Beyond."""
        return self.domain.admitted(dict(self.inputs))

    def origin(self) -> Origin:
        """What start states are derived from. Raises Unfit where reset does not settle, or x takes part."""
        if self._origin is None:
            seen = reset.seen_by(self.ports)
            limit = max(self.settling.depth or 0, 2 * len(self.ports.design.registers) + 8)
            resetting = None
            if seen.reset is not None and self.spec.start in (None, "reset"):
                system, self.under_reset = self.settled(seen, seen.resetting, False)
                if self.under_reset.depth is None or system.choices:
                    raise Unfit("the registers do not settle while reset is held, or hang on x")
                resetting = without(system, self.spec.each)
            self._origin = Origin(seen.design, tuple(self.spec.each), self.system, resetting, limit)
        return self._origin

    def premise(self, holds: Expr) -> Expr:
        """One bit: the inputs are of the domain, and of a piece of it."""
        return e.bvand(self.admitted(), holds)

    def on_loops(self, proof: Proof) -> Scope:
        """The states on the loops of the proof's courses, at every value: where glitches are looked for."""
        listed = [(piece, claim.courses) for piece, claim in proof.everywhere or ()]
        listed += [(piece, claim.courses) for piece, claim in proof.starts or ()]
        found: list[Region] = []
        for piece, courses in listed:
            found += regions(self.system, self.premise(piece.holds()), courses)
        return Scope(tuple(found), "every state on a loop, at every value")

    def too_short(self, proof: Proof) -> str:
        """Why reset may be held for less than it needs, "" where it is not."""
        cycles = self.spec.reset_cycles
        needs = [claim.held.half_cycles for _, claim in proof.starts or () if claim.held]
        late = cycles is not None and any(count > 2 * cycles for count in needs)
        return f"reset needs {max(needs)} half-cycles, which is more than it is held for" if late else ""

    def dues(self, glitches: Glitches | None) -> dict[str, tuple[Due, ...]]:
        """What timing analysis has to show, whatever the value: every register that sees the reset may be late."""
        races = self.settling.races
        return {
            "settling": tuple(Due(r.text, r.where, r.register) for r in races if r.kind != "pulse"),
            "reset": tuple(self._late()),
            "glitch-free": tuple(
                Due(d.text, d.where, d.register) for d in (glitches.dues if glitches else ())
            ),
        }

    def _late(self) -> list[Due]:
        ports = self.ports
        if ports.reset is None:
            return []
        port = ports.reset.port
        return [
            Due(
                f"the release of {port} has to meet recovery and removal at every flip-flop of {register.name} "
                "before the same clock edge as elsewhere: where one sees it an edge later, the first pulse or gap "
                "may have another length",
                register.where,
                register.name,
            )
            for register in ports.design.registers
            if register.kind != "loop" and _sees(register, port)
        ]


def bound_obligations(rigid: Rigid, proof: Proof, bound: int) -> list[Obligation]:
    """At no value does a state need longer than the bound, in half-cycles."""
    out = []
    for number, (piece, claim) in enumerate(proof.everywhere or ()):
        late = e.disj(at_least(each, Poly.const(bound + 1)) for each in claim.bounds)
        name = f"everywhere {number}, good within {bound} half-cycles"
        out.append(Obligation(name, e.bvand(rigid.premise(piece.holds()), late)))
    return out


def _sees(register: Register, port: str) -> bool:
    used = [x for edge in register.edges for x in (edge.clock, edge.data)]
    used += [x for force in register.forces for x in (force.when, force.value)]
    return any(v.name == port for v in e.variables(used))


def without(system: System, names: Mapping[str, object]) -> System:
    """The machine with some of its registers taken for values that nothing moves."""
    kept = [i for i, name in enumerate(system.names) if name not in names]
    return replace(
        system,
        variables=tuple(system.variables[i] for i in kept),
        step=tuple(system.step[i] for i in kept),
    )
