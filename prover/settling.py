"""Micro-steps: how many suffice for every step, and where the outcome hangs on the order of events.

The bound is found by asking, for one more micro-step at a time, whether some state still changes (a
completeness threshold in the sense of bounded model checking; here the diameter of the chain). Events that
happen at once may come in any order in hardware, so three things are looked for besides: a clock edge in the
micro-step in which the register's clear is released; data that the same input edge has changed before a
derived clock samples it; and a clock or clear net that can pulse while several of its inputs change together
(a function hazard). The first two are obligations that a timing engineer can discharge. The third is not.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

from prover import expr as e
from prover.design import Design, Force, Register
from prover.effort import Effort, OutOfEffort
from prover.errors import Where
from prover.expr import Expr
from prover.solve import Model, find
from prover.system import Inputs, Moment, State, System, build, micro_step, same, settled_when, start, unroll

Ask = Callable[[Expr], Model | None]
"""Values that make a one-bit expression true, or None."""

LONGEST = 4096
"""Micro-steps after which a concrete run that neither settles nor repeats is given up."""


@dataclass(frozen=True, slots=True)
class Race:
    """An outcome that hangs on the order of events.

    kind       "release" (clear against clock), "clear" (a clear that ends itself), "hold" (data against a derived
               clock) or "pulse" (hazard on a clock or clear net)
    register   the register whose value depends on it
    state      a settled state whose next step shows it
    via        the nets on the path, each with where it is driven
    """

    kind: str
    register: str
    where: Where
    state: State
    text: str
    via: tuple[tuple[str, Where], ...] = ()


@dataclass(frozen=True, slots=True)
class Unsettled:
    """A state from which the micro-steps go on for ever.

    `power_up` says that the register values never settle even without a clock edge; otherwise the next edge
    starts it. `cycle` is one round of the register values, a micro-step each."""

    state: State
    power_up: bool
    cycle: tuple[State, ...]


@dataclass(frozen=True, slots=True)
class Settling:
    """What is known about the micro-steps of a system.

    depth      micro-steps within which every step settles, None if unsettled or not known
    at_rest    micro-steps within which any register values settle before the first edge
    by_form    the bound follows from the form of the expressions, without a solver
    goals      what must not be satisfiable for the depth and the absence of further races, to be checked again
    open       why the depth or the races are not known, "" when they are
    answers    the answers to all questions asked on the way, in order; from them it can be found again
    """

    depth: int | None
    at_rest: int | None
    by_form: bool
    unsettled: Unsettled | None
    races: tuple[Race, ...]
    open: str = ""
    goals: tuple[Expr, ...] = ()
    answers: tuple[Model | None, ...] = ()


def settle(
    design: Design,
    clock: str,
    inputs: Inputs,
    output: Expr,
    effort: Effort,
    edge_wins: bool = False,
    ask: Ask | None = None,
    races: bool = True,
) -> tuple[System, Settling]:
    """The system with the number of micro-steps that it needs, and what was found on the way.

    When something never settles, or the effort runs out, the system is built as far as was tried. `ask` answers
    the questions in place of the solver. Without `races` none are looked for.
    """
    effort.say("bounding the micro-steps of a step")
    before, now = start(design, clock, inputs)
    assumed = settled_when(design.registers, before)
    depth = at_rest = None
    unsettled = None
    hanging: tuple[Race, ...] = ()
    why = ""
    by_form = False
    limit = len(design.registers) + 2
    goals: list[Expr] = []
    answers: list[Model | None] = []

    def none(goal: Expr) -> Model | None:
        """The answer; where it is that there is none, the question is kept."""
        model = ask(goal) if ask else find(goal, effort)
        if not goal.is_const:
            answers.append(model)
            if model is None:
                goals.append(goal)
        return model

    try:
        rest_chain, at_rest, _ = bound(design, before, before, e.TRUE, none, edge_wins)
        if at_rest is None:
            unsettled = _witness(design, clock, rest_chain, before, before, e.TRUE, none)
        else:
            chain, depth, by_form = bound(design, before, now, assumed, none, edge_wins)
            limit = len(chain)
            if depth is None:
                unsettled = _witness(design, clock, chain, before, now, assumed, none)
            else:
                limit = max(depth, 1)
    except OutOfEffort as out:
        why = str(out)
    system = build(design, clock, inputs, output, limit, edge_wins)
    if depth is not None and races and not edge_wins:
        try:
            effort.say("looking for outcomes that hang on the order of events")
            hanging = tuple(find_races(system, none))
        except OutOfEffort as out:
            why = str(out)
    found = Settling(depth, at_rest, by_form, unsettled, hanging, why, tuple(goals), tuple(answers))
    return system, found


def bound(
    design: Design, before: Moment, now: Moment, assumed: Expr, ask: Ask, edge_wins: bool = False
) -> tuple[list[Moment], int | None, bool]:
    """The chain, the number of micro-steps that suffice under the assumption (None: some state goes on
    beyond what is worth unrolling), and whether the form of the expressions alone shows it."""
    limit = 2 * len(design.registers) + 8
    chain = unroll(design, before, now, 1, edge_wins)
    count = len(chain) - 1
    if count == 0:
        return chain, 0, True
    while count <= limit:
        longer = unroll(design, before, now, count + 1, edge_wins)
        if len(longer) == len(chain):
            return chain, count, True
        moves = e.bvand(assumed, e.bvnot(same(design.registers, longer[-1], longer[-2])))
        if ask(moves) is None:
            return chain, count, False
        chain, count = longer, count + 1
    return chain, None, False


def _witness(
    design: Design,
    clock: str,
    chain: Sequence[Moment],
    before: Moment,
    now: Moment,
    assumed: Expr,
    ask: Ask,
) -> Unsettled:
    """A state whose micro-steps repeat for ever, replayed on values."""
    moves = e.bvand(assumed, e.bvnot(same(design.registers, chain[-1], chain[-2])))
    model = ask(moves)
    names = [*(r.name for r in design.registers), clock]
    state = tuple((model or {}).get(name, 0) for name in names)
    values = {name: e.const(v, before[name].width) for name, v in zip(names, state, strict=True)}
    was = dict(zip(before, e.substitute(list(before.values()), values), strict=True))
    new = dict(zip(now, e.substitute(list(now.values()), values), strict=True))
    seen: dict[tuple[State, State], int] = {}
    run: list[State] = []
    while len(run) < LONGEST:
        pair = (_values(names, was), _values(names, new))
        if pair[0] == pair[1] and run:
            # It comes to rest after all: longer chains than were unrolled, which is no proof of anything.
            raise OutOfEffort(f"a step that takes more than {len(chain) - 1} micro-steps")
        if pair in seen:
            return Unsettled(state, before is now, tuple(run[seen[pair] :]))
        seen[pair] = len(run)
        run.append(pair[1])
        was, new = new, _zero_choices(micro_step(design, was, new))
    raise OutOfEffort(f"a step that has not settled after {LONGEST} micro-steps")


def _values(names: Sequence[str], moment: Moment) -> State:
    return tuple(e.evaluate([moment[name] for name in names], {}))


def _zero_choices(moment: Moment) -> Moment:
    names = e.variables(list(moment.values()))
    zeros = {v.name: e.const(0, v.width) for v in names}
    return dict(zip(moment, e.substitute(list(moment.values()), zeros), strict=True))


# -- races ---------------------------------------------------------------------------------------------------


def find_races(system: System, ask: Ask) -> Iterator[Race]:
    """Every register whose value after a step hangs on the order of events, once a register and kind."""
    before, _ = start(system.design, system.clock, system.inputs)
    moments = [before, *system.chain]
    told: set[Expr] = set()
    for register in system.design.registers:
        searches: tuple[Callable[[System, Sequence[Moment], Register, Ask], Race | None], ...]
        searches = (_release_race, _hold_race, _pulse, _transient)
        for search in searches:
            race = search(system, moments, register, ask)
            if race:
                yield race
                if race.kind in ("release", "pulse"):
                    told |= {force.when for force in register.forces}
    yield from _self_ending(system, moments, told, ask)


def _state_of(system: System, model: Mapping[str, int]) -> State:
    return tuple(model.get(name, 0) for name in system.names)


def _release_race(system: System, moments: Sequence[Moment], register: Register, ask: Ask) -> Race | None:
    """An edge that comes with the release of the register's own clear, and would change what it holds."""
    if not register.edges or not register.forces:
        return None
    for then, now in pairwise(moments):
        was = e.disj(e.substitute([f.when for f in register.forces], then))
        still = e.disj(e.substitute([f.when for f in register.forces], now))
        released = e.bvand(was, e.bvnot(still))
        for edge in register.edges:
            (low,) = e.substitute([edge.clock], then)
            high, data = e.substitute([edge.clock, edge.data], now)
            changes = e.bvnot(e.eq(data, now[register.name]))
            goal = e.conj([released, e.bvnot(low), high, changes, system.settled])
            model = ask(goal)
            if model is not None:
                clear = _Clear.of(system.design, register)
                text = (
                    f"the clock edge that clearing makes at {register.name} has to arrive while the clear of "
                    f"{register.name} is still active; {clear.text}"
                )
                state = _state_of(system, model)
                return Race("release", register.name, register.where, state, text, clear.via)
    return None


def _self_ending(system: System, moments: Sequence[Moment], told: set[Expr], ask: Ask) -> Iterator[Race]:
    """Clears that are active on the way and end by what they clear, once a net, but where more is told of it."""
    for register in system.design.registers:
        for force in register.forces:
            if register.kind != "flip-flop" or force.when in told or not force.value.is_const:
                continue
            told.add(force.when)
            deciding = {v.name for v in e.variables([force.when])}
            own = [
                r.name
                for r in system.design.registers
                if r.name in deciding and any(f.when is force.when for f in r.forces)
            ]
            ends = e.FALSE
            for then, now in pairwise(moments[1:]):
                (was,), (still,) = e.substitute([force.when], then), e.substitute([force.when], now)
                moved = e.disj(e.bvnot(e.eq(then[name], now[name])) for name in own)
                ends = e.bvor(ends, e.conj([was, e.bvnot(still), moved]))
            model = ask(e.bvand(ends, system.settled))
            if model is not None:
                clear = _Clear.of(system.design, register)
                state = _state_of(system, model)
                yield Race("clear", register.name, force.where, state, clear.text, clear.via)


@dataclass(frozen=True, slots=True)
class _Clear:
    """A clear that ends by its own effect: what has to hold of it in words, and the nets on its path."""

    text: str
    via: tuple[tuple[str, Where], ...]

    @staticmethod
    def of(design: Design, register: Register) -> _Clear:
        """The clear of a register, of those that other registers decide."""
        names = {r.name for r in design.registers}
        decides = (f for f in register.forces if names & {v.name for v in e.variables([f.when])})
        force = next(decides, register.forces[0])
        cleared = [r for r in design.registers if any(f.when is force.when for f in r.forces)]
        deciding = {v.name for v in e.variables([force.when])}
        decoded = [r.name for r in design.registers if r.name in deciding]
        nets = (s for s in design.signals.values() if s.value in (force.when, e.bvnot(force.when)))
        net = next(((s.name, s.driven) for s in nets if s.driven is not None), ("the clear", force.where))
        whose = (
            f" that {_listed(decoded)} make{'s' * (len(decoded) == 1)} through {net[0]}" if decoded else ""
        )
        text = (
            f"the clear{whose} ends by its own effect, and has to last until the slowest of "
            f"{_listed([r.name for r in cleared])} has cleared"
        )
        return _Clear(text, (net, *((r.name, r.where) for r in cleared)))


def _listed(names: Sequence[str]) -> str:
    """Names in a sentence."""
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def _hold_race(system: System, moments: Sequence[Moment], register: Register, ask: Ask) -> Race | None:
    """A derived clock that samples data which the same input edge has already changed, if only for a moment."""
    for place, (then, now) in enumerate(pairwise(moments)):
        if place == 0:
            continue
        for edge in register.edges:
            (low,) = e.substitute([edge.clock], then)
            high, data = e.substitute([edge.clock, edge.data], now)
            forced = e.disj(e.substitute([f.when for f in register.forces], now))
            # What the register itself holds is no data launched by another register.
            since = [{**moment, register.name: now[register.name]} for moment in moments[1 : place + 1]]
            moves = e.disj(e.bvnot(e.eq(data, e.substitute([edge.data], past)[0])) for past in since)
            fires = e.conj([e.bvnot(low), high, e.bvnot(forced), system.settled])
            model = ask(e.bvand(fires, moves))
            if model is not None:
                text = (
                    f"{register.name} samples data launched by the same input edge that makes its derived clock: "
                    "the clock path has to be longer than the data path by the hold time"
                )
                return Race("hold", register.name, register.where, _state_of(system, model), text)
    return _latch_race(system, moments, register, ask)


def _latch_race(system: System, moments: Sequence[Moment], register: Register, ask: Ask) -> Race | None:
    """A latch that closes as its data changes, or after data that the same input edge has already changed."""
    if register.kind != "latch":
        return None
    for place, (then, now) in enumerate(pairwise(moments)):
        for force in register.forces:
            was_open, old = e.substitute([force.when, force.value], then)
            (still,) = e.substitute([force.when], now)
            since = [now, *moments[1 : place + 1]]
            moves = e.disj(e.bvnot(e.eq(old, e.substitute([force.value], past)[0])) for past in since)
            model = ask(e.conj([was_open, e.bvnot(still), moves, system.settled]))
            if model is not None:
                text = (
                    f"the latch {register.name} closes with the input edge that changes its data: which comes first, "
                    "the closing or the change, has to be as the micro-steps have it, by the hold time"
                )
                return Race("hold", register.name, register.where, _state_of(system, model), text)
    return None


@dataclass(frozen=True, slots=True)
class _Net:
    """A net that a register reacts to: a clock, or the enable of a forced value."""

    value: Expr
    role: str
    where: Where
    force: Force | None


def _nets(system: System, register: Register) -> Iterator[tuple[_Net, list[Expr]]]:
    """The nets of a register that several bits of the state make, with the registers that these are."""
    nets = [_Net(edge.clock, "clock", register.where, None) for edge in register.edges]
    role = "enable" if register.kind == "latch" else "clear"
    if register.kind != "loop":
        nets += [_Net(force.when, role, force.where, force) for force in register.forces]
    for net in nets:
        inputs = [v for v in e.variables([net.value]) if v.name in system.names]
        if sum(v.width for v in inputs) > 1:
            yield net, inputs


def _matters(net: _Net, register: Register, moments: Sequence[Moment]) -> Expr:
    """One bit: seen or not seen makes a difference, because the register is not all the time what it is forced to."""
    if net.force is None:
        return e.TRUE
    forced = [e.substitute([net.force.value], moment)[0] for moment in moments]
    pairs = zip(forced, moments, strict=True)
    return e.disj(e.bvnot(e.eq(value, moment[register.name])) for value, moment in pairs)


def _pulse(system: System, moments: Sequence[Moment], register: Register, ask: Ask) -> Race | None:
    """A clock or clear net that may pulse while several of its inputs change in one micro-step."""
    for net, inputs in _nets(system, register):
        for i, (then, now) in enumerate(pairwise(moments)):
            hazard = _hazard(net.value, inputs, then, now, net.force is None)
            model = ask(e.conj([hazard, _matters(net, register, moments[i:]), system.settled]))
            if model is None:
                continue
            values = _padded(model, then, now)
            moving = [v.name for v in inputs if len(set(e.evaluate([then[v.name], now[v.name]], values))) > 1]
            text = (
                f"the {net.role} of {register.name} may pulse while {', '.join(moving)} change together: "
                "the outcome hangs on which arrives first"
            )
            return Race("pulse", register.name, net.where, _state_of(system, model), text)
    return None


def _transient(system: System, moments: Sequence[Moment], register: Register, ask: Ask) -> Race | None:
    """A clock or clear net that is active on the way only, as a ripple passes through the values that it decodes.

    A counter that clears itself ends its own clear, and a flip-flop that turns its own clock over ends its own edge;
    those are meant. So the chain is followed on from where the net becomes active without what it then does: a net
    that is inactive once all has settled would have been so whether or not anything had seen it."""
    for net, _ in _nets(system, register):
        for i, (then, now) in enumerate(pairwise(moments[:-1])):
            (low,), (high,) = e.substitute([net.value], then), e.substitute([net.value], now)
            rises = e.bvand(e.bvnot(low), high)
            if rises is e.FALSE:
                continue
            (last,) = e.substitute([net.value], _unseen(system.design, then, now, net.value))
            goal = e.conj([rises, e.bvnot(last), _matters(net, register, moments[i:]), system.settled])
            model = ask(goal)
            if model is not None:
                text = (
                    f"the {net.role} of {register.name} is active for a moment on the way: whether that is seen "
                    "hangs on how fast its net is"
                )
                return Race("pulse", register.name, net.where, _state_of(system, model), text)
    return None


def _unseen(design: Design, then: Moment, now: Moment, net: Expr) -> Moment:
    """Where the micro-steps lead from the two moments if nothing reacts to the net as a clock, nor to a set, a clear
    or a latch's enable that was not active before."""
    was: dict[str, Expr] = {}
    registers = []
    for register in design.registers:
        edges = tuple(edge for edge in register.edges if edge.clock is not net)
        forces = []
        for force in register.forces:
            if register.kind != "loop":
                label = f"!was{len(was)}"
                (was[label],) = e.substitute([force.when], then)
                force = replace(force, when=e.bvand(force.when, e.var(label, 1)))
            forces.append(force)
        registers.append(replace(register, edges=edges, forces=tuple(forces)))
    blind = replace(design, registers=tuple(registers))
    return unroll(blind, then | was, now | was, 2 * len(registers) + 8)[-1]


def _padded(model: Mapping[str, int], *moments: Moment) -> dict[str, int]:
    names = e.variables([value for moment in moments for value in moment.values()])
    return {v.name: model.get(v.name, 0) for v in names}


def _hazard(net: Expr, inputs: Sequence[Expr], then: Moment, now: Moment, is_clock: bool) -> Expr:
    """One bit: some order of the changing bits gives the net a pulse that the settled values don't show."""
    (first,) = e.substitute([net], then)
    (last,) = e.substitute([net], now)
    if first is last and all(then[v.name] is now[v.name] for v in inputs):
        return e.FALSE
    early = _mixed(net, inputs, then, now, "early")
    if not is_clock:
        return e.conj([e.bvnot(first), e.bvnot(last), early[0]])
    late = _mixed(net, inputs, then, now, "late")
    ordered = e.conj(
        e.eq(e.bvand(a, e.bvnot(b)), e.const(0, a.width)) for a, b in zip(early[1], late[1], strict=True)
    )
    # A rise that the settled values don't have: low, then high, where the net ends low or began high.
    static = e.bvand(e.eq(first, last), e.bvxor(early[0], first))
    double = e.conj([e.bvnot(first), last, early[0], e.bvnot(late[0]), ordered])
    fall = e.conj([first, e.bvnot(last), e.bvnot(early[0]), late[0], ordered])
    return e.disj([static, double, fall])


def _mixed(
    net: Expr, inputs: Sequence[Expr], then: Moment, now: Moment, label: str
) -> tuple[Expr, list[Expr]]:
    """The net while the bits chosen by free masks have changed already, and the masks."""
    masks = [e.var(f"!{label}.{v.name}", v.width) for v in inputs]
    values = {**now}
    for v, mask in zip(inputs, masks, strict=True):
        kept = e.bvand(then[v.name], e.bvnot(mask))
        values[v.name] = e.bvor(kept, e.bvand(now[v.name], mask))
    (value,) = e.substitute([net], values)
    return value, masks
