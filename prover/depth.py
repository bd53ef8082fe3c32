"""How deep in the clock chain each register is: how many registers lie between the input clock and its own clock.

A flip-flop that the input clock clocks, gated or not, has depth 0; one that such a flip-flop clocks has depth 1, and
so on through a ripple chain. A gate is told by its form: with the input clock fixed at one of its levels the net
stands still. Latches are as deep as what opens them; a net in a loop is as deep as what drives it.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from prover import expr as e
from prover.design import Register
from prover.expr import Expr
from prover.system import System


def depths(system: System) -> dict[str, int]:
    """The depth of each register, in the design's order; without those whose clock depends on itself."""
    held = system.inputs.moment(system.design.inputs)
    sources = {r.name: _sources(r, held, system.clock) for r in system.design.registers}
    nets = {r.name for r in system.design.registers if r.kind == "loop"}
    found: dict[str, int] = {}
    before = -1
    while len(found) > before:
        before = len(found)
        for name, needed in sources.items():
            if name not in found and all(other in found for other in needed):
                # What a register clocks is one deeper than the register; a net adds nothing.
                found[name] = max((found[other] + (other not in nets) for other in needed), default=0)
    return {name: found[name] for name in sources if name in found and name not in nets}


def _sources(register: Register, held: Mapping[str, Expr], clock: str) -> list[str]:
    """The registers whose changes can make the register react to its clock, or to its enable."""
    nets = [edge.clock for edge in register.edges]
    if register.kind != "flip-flop":
        nets += [force.when for force in register.forces]
    if register.kind == "loop":
        nets += [force.value for force in register.forces]
    out: dict[str, None] = {}
    for net in e.substitute(nets, held):
        out |= dict.fromkeys(_moving(net, clock))
    return list(out)


def _moving(net: Expr, clock: str) -> Iterable[str]:
    names = {v.name for v in e.variables([net])}
    if clock in names:
        still = [e.substitute([net], {clock: e.const(level, 1)})[0] for level in (0, 1)]
        if any(value.is_const for value in still):
            return
        names = {v.name for v in e.variables(still)}
    yield from sorted(name for name in names if name != clock and not name.startswith("?"))
