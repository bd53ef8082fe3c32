"""The step of a divider as its output sees it: goals that say where it may change more than once.

The micro-steps of a step (`System.chain`) say what changes together: first the clock, then the registers that it
moves, then those that these move. Within one micro-step everything may arrive at the output in any order, through
gates of any delay, so each is looked at as `hazard` has it. What changes in a later micro-step is caused by what
changed before, and is taken to arrive later, unless a goal says otherwise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

from prover import expr as e
from prover.design import Gate
from prover.expr import Expr
from prover.hazard import Network, Swing, as_written, by_function, clean
from prover.ports import Ports
from prover.system import Moment, System, start
from prover.verilog.words import reads


def network_of(ports: Ports) -> Network:
    """What the output is made of: gates as written, expressions in between, down to registers and the clock."""
    design = ports.design
    fixed = ports.running.moment(design.inputs)
    (root,) = e.substitute([ports.output_written], fixed)
    gates = {
        net: Gate(gate.kind, tuple(e.substitute(gate.pins, fixed)), gate.where)
        for net, gate in design.gates.items()
    }
    return Network(root, gates, frozenset(r.name for r in design.registers))


@dataclass(frozen=True)
class Reach:
    """The step of a divider as its output sees it.

    The goals are bits over the state before the edge, true where the output may change more than once:
    as_written  by the gates as written, an expression's operators read as gates
    by_gates    by the gates as written, if the expressions between them have no hazard that can be avoided
    by_function by what is computed, whatever the gates; over masks that say which order shows it
    late        by the gates as written, if also what later micro-steps change may arrive before what caused it
    held        what a latch lets through, or a combinational loop keeps, may pulse
    """

    whole: System
    output: Expr
    network: Network

    @cached_property
    def moments(self) -> list[Moment]:
        """Before the edge, after it, and after each reaction."""
        before, _ = start(self.whole.design, self.whole.clock, self.whole.inputs)
        return [before, *self.whole.chain]

    @cached_property
    def inputs(self) -> list[Expr]:
        """What the output hangs on at once: registers, the clock, and choices."""
        return list(dict.fromkeys([*self.network.inputs, *e.variables([self.output])]))

    @cached_property
    def read(self) -> dict[str, int]:
        """The bits of these words that are read, a mask each."""
        return reads([*self.network.expressions, self.output])

    def _swings(self, words: Sequence[Expr], then: Moment, now: Moment) -> dict[str, Swing]:
        return {v.name: clean(then[v.name], now[v.name]) for v in words if v.name in then}

    @cached_property
    def changes(self) -> list[tuple[int, dict[str, Swing]]]:
        """What the inputs do in each micro-step in which any of them may move; what hangs on x always may."""
        out = []
        for number, (then, now) in enumerate(pairwise(self.moments)):
            swings = self._swings(self.inputs, then, now)
            if self.loose or any(s.first is not s.last for s in swings.values()):
                out.append((number, swings))
        return out

    @cached_property
    def levels(self) -> list[Expr]:
        """The output at rest at each moment."""
        return [e.substitute([self.output], moment)[0] for moment in self.moments]

    @cached_property
    def twice(self) -> Expr:
        """One bit: the micro-steps by themselves change the output more than once."""
        return _bits_more_than_once(self.levels)

    @cached_property
    def loose(self) -> bool:
        """Whether the output may be what it likes: it hangs on a choice."""
        return any(v.name.startswith("?") for v in self.inputs)

    @cached_property
    def as_written(self) -> Expr:
        return e.disj([self.twice, *(self.network.as_written(s).hazard for _, s in self.changes)])

    @cached_property
    def by_gates(self) -> Expr:
        hazards = (self.network.by_gates(s, f"gates{k}").hazard for k, s in self.changes)
        return e.disj([self.twice, *hazards])

    @cached_property
    def by_function(self) -> Expr:
        hazards = (by_function(self.output, s, f"order{k}").hazard for k, s in self.changes)
        return e.disj([self.twice, *hazards])

    @cached_property
    def late(self) -> Expr:
        if len(self.changes) < 2:
            return e.FALSE
        swings: dict[str, Swing] = {}
        for v in self.inputs:
            if v.name in self.moments[0]:
                values = [moment[v.name] for moment in self.moments]
                swings[v.name] = Swing(values[0], values[-1], _bits_more_than_once(values))
        return self.network.as_written(swings).hazard

    @cached_property
    def holders(self) -> list[tuple[str, Expr]]:
        """Latches, and whatever else is set to more than a constant, that the output hangs on; for each one bit that
        is true where its data may pulse while it is open, so that it hands the pulse on."""
        registers = {r.name: r for r in self.whole.design.registers}
        todo = [v.name for v in self.network.inputs if v.name in registers]
        seen = set(todo)
        out: list[tuple[str, Expr]] = []
        fixed = self.whole.inputs.moment(self.whole.design.inputs)
        while todo:
            name = todo.pop()
            for force in registers[name].forces:
                if force.value.is_const:
                    continue
                when, value = e.substitute([force.when, force.written or force.value], fixed)
                data = Network(value, self.network.gates, frozenset(registers))
                for then, now in pairwise(self.moments):
                    swings = self._swings([*data.inputs, *e.variables([when])], then, now)
                    shut = as_written([when], swings)[0].zero
                    passed = e.bvand(e.bvnot(shut), e.nonzero(data.as_written(swings).hazard))
                    out.append((name, passed))
                fresh = [v.name for v in data.inputs if v.name in registers and v.name not in seen]
                seen |= set(fresh)
                todo += fresh
        return out

    @cached_property
    def held(self) -> Expr:
        return e.disj(goal for _, goal in self.holders)


def _bits_more_than_once(values: Sequence[Expr]) -> Expr:
    """The bits in which more than one pair of neighbours differ."""
    once = twice = e.const(0, values[0].width)
    for a, b in pairwise(values):
        changed = e.bvxor(a, b)
        twice = e.bvor(twice, e.bvand(once, changed))
        once = e.bvor(once, changed)
    return twice
