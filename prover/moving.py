"""The machine while inputs move: two relations in place of one map, and where its runs begin.

A half-cycle begins with an edge of the input clock, under the inputs as they are. In its middle the inputs may move,
and the machine settles once more (see trace). So a half-cycle is `edge`, then `move`; what a divider does for itself
at a move is nothing for most, and a new output or a new register value where the input is a clear, a gate or part of
what the output is decoded from. Inputs that could move but are kept where they are in a question are rigid: registers
that nothing changes, so that one question covers all their values.

This derives; it searches nothing. Engines and the check of their claims share it, as they share `system`.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

from prover import expr as e
from prover.design import Design
from prover.domain import rigid
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.ports import Ports
from prover.rhythm import Scope
from prover.settling import Ask, bound
from prover.solve import find
from prover.system import Inputs, Moment, System, build, change_inputs, settled_when, start

MOST_UNFORCED_BITS = 10
"""Bits that neither reset nor initial values force up to which runs from every value of theirs are followed."""

AFTER = "'"
"""Ends the name of an input's value after its move."""


@dataclass(frozen=True, slots=True)
class Begin:
    """A set of start states: one for each value of the free variables.

    state  value of every register, rigid input and the clock, by name, over the inputs, rigid ones and free variables
    free   variables besides the inputs, with their widths: bits that nothing forces
    cause  how it comes about
    """

    state: Mapping[str, Expr]
    free: tuple[tuple[str, int], ...]
    cause: str


@dataclass(frozen=True)
class Machine:
    """A divider whose inputs move.

    design      the design with its inputs as they were read; `held` are those that neither move nor are rigid
    rigid, moving  inputs that keep any one value, and those that move, with their widths
    variables   registers that the output depends on, rigid inputs, and last the clock, with their widths
    edge        their values after an edge, over them and the moving inputs
    move        their values after the moving inputs have moved, over the same and the new values, named with AFTER
    output      one bit over the variables and the moving inputs
    begins      where runs begin
    depth       micro-steps within which every edge, every move and every release settles
    reactions   micro-steps within which every edge does
    """

    design: Design
    clock: str
    held: Inputs
    rigid: tuple[tuple[str, int], ...]
    moving: tuple[tuple[str, int], ...]
    variables: tuple[tuple[str, int], ...]
    edge: tuple[Expr, ...]
    move: tuple[Expr, ...]
    output: Expr
    begins: tuple[Begin, ...]
    depth: int
    reactions: int

    @cached_property
    def names(self) -> list[str]:
        return [name for name, _ in self.variables]

    @property
    def bits(self) -> int:
        """Bits of a state, the clock's level and rigid inputs among them."""
        return sum(width for _, width in self.variables)

    @property
    def moving_bits(self) -> int:
        return sum(width for _, width in self.moving)

    @cached_property
    def choices(self) -> list[tuple[str, int]]:
        """Values that x stands for on which an edge, a move or the output depends, with their widths."""
        found = e.variables([*self.edge, *self.move, self.output])
        return [(v.name, v.width) for v in found if v.name.startswith("?")]

    @cached_property
    def moves_nothing(self) -> bool:
        """Whether by its form a move changes neither a register nor the output."""
        still = all(
            after.op == "var" and after.name == name
            for name, after in zip(self.names, self.move, strict=True)
        )
        inputs = {name for name, _ in self.moving}
        return still and not any(v.name in inputs for v in e.variables([self.output]))

    def output_after(self) -> Expr:
        """The output when the inputs have moved and all has settled, over what `move` is over."""
        values = dict(zip(self.names, self.move, strict=True)) | {
            n: e.var(n + AFTER, w) for n, w in self.moving
        }
        return e.substitute([self.output], values)[0]

    def output_at_edge(self) -> Expr:
        """The output after an edge, before the inputs move, over what `edge` is over."""
        return e.substitute([self.output], dict(zip(self.names, self.edge, strict=True)))[0]


def machine_of(
    ports: Ports,
    moving: Iterable[str],
    kept: Iterable[str],
    held: Mapping[str, int],
    scope: Scope,
    effort: Effort,
    ask: Ask | None = None,
) -> Machine:
    """The machine of a divider: the inputs `moving` move, those `kept` are rigid, the others are held.

    `ask` answers the questions about micro-steps in place of the solver. Raises OutOfEffort with the reason where
    something does not settle, or runs have no certain beginning.
    """
    effort.say("deriving the machine while inputs move")
    design, clock = ports.design, ports.clock
    for name in (*(r.name for r in design.registers), *design.inputs):
        if name.startswith("!") or name.endswith(AFTER):
            raise OutOfEffort(f"the name {name} may be taken for one that stands for a move")
    names = list(moving)
    fixed = list(kept)
    inputs = Inputs.of({name: value for name, value in held.items() if name not in (*names, *fixed)})
    frozen = rigid(design, fixed)
    asked = ask or (lambda goal: find(goal, effort))
    before, now = start(frozen, clock, inputs)
    at_edge = _settled(frozen, before, now, settled_when(frozen.registers, before), asked, "a step")
    moved = before | {name: e.var(name + AFTER, design.inputs[name]) for name in names}
    at_move = _settled(
        frozen, before, moved, settled_when(frozen.registers, before), asked, "a move of an input"
    )
    begins, depth = _begins(ports, frozen, inputs, set(fixed), scope, asked)
    reactions = max(len(at_edge) - 1, 1)
    system = build(frozen, clock, inputs, ports.output_value, reactions)
    needed = _needed(system, at_move[-1]) | set(fixed)
    variables = tuple((name, width) for name, width in system.variables if name in needed)
    return Machine(
        design=design,
        clock=clock,
        held=inputs,
        rigid=tuple((name, design.inputs[name]) for name in fixed),
        moving=tuple((name, design.inputs[name]) for name in names),
        variables=variables,
        edge=tuple(after for name, after in zip(system.names, system.step, strict=True) if name in needed),
        move=tuple(at_move[-1][name] for name, _ in variables),
        output=system.output,
        begins=begins,
        depth=max(len(at_edge), len(at_move), depth),
        reactions=reactions,
    )


def _settled(design: Design, before: Moment, now: Moment, assumed: Expr, ask: Ask, what: str) -> list[Moment]:
    """The moments of a change up to its end."""
    chain, depth, _ = bound(design, before, now, assumed, ask, edge_wins=False)
    if depth is None:
        raise OutOfEffort(f"{what} does not settle")
    return chain


def _needed(system: System, moved: Moment) -> set[str]:
    """The clock and the registers on which the output depends, now or later, at edges or moves."""
    after = dict(zip(system.names, system.step, strict=True))
    kept = {system.clock}
    todo = [system.output]
    while todo:
        for v in e.variables([todo.pop()]):
            if v.name in after and v.name not in kept:
                kept.add(v.name)
                todo += [after[v.name], moved[v.name]]
    return kept


# -- where runs begin --------------------------------------------------------------------------------------


def _begins(
    ports: Ports, design: Design, inputs: Inputs, rigid: set[str], scope: Scope, ask: Ask
) -> tuple[tuple[Begin, ...], int]:
    """The start states of the scope, and the micro-steps that suffice there."""
    if scope == "reset":
        return _released(ports, design, inputs, rigid, ask)
    if scope == "initial":
        return _initial(ports, design, inputs, rigid, ask)
    return (), 0


def _released(
    ports: Ports, design: Design, inputs: Inputs, rigid: set[str], ask: Ask
) -> tuple[tuple[Begin, ...], int]:
    """Reset held from any state until what can become known is known, then released, at either level of the clock.

    What the registers are by then is an expression over the inputs, and over the bits that reset never forces:
    holding it longer leaves no other states. The inputs stand still meanwhile."""
    reset = ports.reset
    if reset is None:
        raise OutOfEffort("there is no reset")
    active = Inputs.of({**dict(inputs.values), reset.port: reset.active})
    clock = ports.clock
    before, now = start(design, clock, active)
    names = [*(r.name for r in design.registers), clock]
    free: Moment = {r.name: e.var(r.name, r.width) for r in design.registers} | active.moment(design.inputs)
    assumed = settled_when(design.registers, before)
    applied = _settled(
        design, free | {clock: e.var(clock, 1)}, free | {clock: e.var(clock, 1)}, e.TRUE, ask, "a reset"
    )
    stepped = _settled(design, before, now, assumed, ask, "a step under reset")
    depth = max(len(applied), len(stepped))
    inside = set(ports.design.inputs)
    runs: list[list[list[Expr]]] = []
    for level in (0, 1):
        moment = change_inputs(design, clock, free | {clock: e.const(level, 1)}, active, len(applied))
        runs.append([_known([moment[name] for name in names], rigid, inside, ask, f"{level}")])

    def longer(run: list[list[Expr]], label: int) -> None:
        at = dict(zip(names, run[-1], strict=True))
        after = e.substitute([stepped[-1][name] for name in names], at)
        run.append(_known(after, rigid, inside, ask, f"{label}.{len(run)}"))

    for label, run in enumerate(runs):
        while _unknown(run[-1], rigid, ports.design.inputs) and len(run) < 4 * len(design.registers) + 8:
            longer(run, label)
    enough = max(len(run) for run in runs)
    begins: dict[tuple[Expr, ...], Begin] = {}
    for label, run in enumerate(runs):
        # Once more, so that the clock has either level at the release.
        while len(run) < enough + 1:
            longer(run, label)
        for values in run[-2:]:
            moment = active.moment(design.inputs) | dict(zip(names, values, strict=True))
            released = {**moment, **inputs.moment(design.inputs)}
            chain = _settled(design, moment, released, e.TRUE, ask, "the release of the reset")
            depth = max(depth, len(chain))
            ends = [chain[-1][name] for name in names]
            cause = f"reset released while the clock is {'high' if ends[-1] is e.TRUE else 'low'}"
            begins.setdefault(tuple(ends), _begin(names, ends, rigid, ports.design.inputs, cause))
    return tuple(begins.values()), depth


def _unknown(values: Sequence[Expr], rigid: set[str], inputs: Mapping[str, int]) -> list[Expr]:
    """The variables that stand for what a register was in the beginning, and choices."""
    return [v for v in e.variables(values) if v.name not in rigid and v.name not in inputs]


def _known(values: Sequence[Expr], rigid: set[str], inputs: set[str], ask: Ask, label: str) -> list[Expr]:
    """The values with every variable left out on which they don't depend, and choices named anew."""
    out = []
    for value in values:
        for v in _unknown([value], rigid, dict.fromkeys(inputs, 0)):
            zero, other = {v.name: e.const(0, v.width)}, {v.name: e.var(f"{v.name}!other", v.width)}
            (without,), (elsewhere,) = e.substitute([value], zero), e.substitute([value], other)
            if ask(e.bvnot(e.eq(without, elsewhere))) is None:
                value = without
        out.append(value)
    fresh = {
        v.name: e.var(f"{v.name}#{label}", v.width)
        for v in e.variables(out)
        if v.name.startswith("?") and "#" not in v.name
    }
    return e.substitute(out, fresh)


def _begin(
    names: Sequence[str], values: Sequence[Expr], rigid: set[str], inputs: Mapping[str, int], cause: str
) -> Begin:
    """The start states with the free variables named apart from the registers."""
    free = _unknown(values, rigid, inputs)
    if sum(v.width for v in free) > MOST_UNFORCED_BITS:
        raise OutOfEffort(f"{cause}: nothing forces {', '.join(v.name for v in free)}")
    renamed = {v.name: e.var(f"!start.{v.name}", v.width) for v in free}
    state = dict(zip(names, e.substitute(values, renamed), strict=True))
    return Begin(state, tuple((f"!start.{v.name}", v.width) for v in free), cause)


def _initial(
    ports: Ports, design: Design, inputs: Inputs, rigid: set[str], ask: Ask
) -> tuple[tuple[Begin, ...], int]:
    """What declared initial values leave at power-up, at either level of the clock; registers without take any."""
    clock = ports.clock
    names = [*(r.name for r in design.registers), clock]
    begins, depth = [], 0
    for level in (0, 1):
        moment: Moment = {
            r.name: e.const(r.initial, r.width) if r.initial is not None else e.var(r.name, r.width)
            for r in design.registers
        }
        moment |= inputs.moment(design.inputs) | {clock: e.const(level, 1)}
        chain = _settled(design, moment, moment, e.TRUE, ask, "what the initial values leave")
        depth = max(depth, len(chain))
        cause = f"initial values, the clock {'high' if level else 'low'} at power-up"
        ends = [chain[-1][name] for name in names]
        begins.append(_begin(names, ends, rigid, ports.design.inputs, cause))
    return tuple(begins), depth
