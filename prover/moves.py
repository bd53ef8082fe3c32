"""What is known of a divider while some of its inputs move: from ports to an answer that is checked.

Two questions are asked. While the ratio changes (its inputs move): is no pulse shorter or longer than the nominal
ones of the values so far, and when does the last of them hold? While an enable moves: is no pulse shorter than
nominal, where does the output park, and when is the ratio back? The engines of `monitor` answer; what they say is
used after `observer` has checked it. What they say is about rests; `within` looks at the ways between these."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from prover import analyse, certificate, inductive, mine, monitor, observer, orbit, trace, unrolled
from prover import expr as e
from prover import watch as watched
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr
from prover.findings import Obligation
from prover.moving import AFTER, Begin, Machine, machine_of
from prover.observer import Breach, Limits, Nominal
from prover.ports import Ports, with_holds
from prover.rhythm import Goal, Scope
from prover.settling import settle
from prover.solve import find
from prover.spec import Spec
from prover.system import Inputs
from prover.trace import Rest, Trace
from prover.unrolled import Broken
from prover.watch import Line, Seed, Watch, watch
from prover.within import Found, Ways

if TYPE_CHECKING:
    import numpy as np

    from prover.arrival import Glitch


@dataclass(frozen=True, slots=True)
class Question:
    """Which inputs move, which keep any one value, at what the others are held, and the nominal pulses.

    varies   the nominal pulses hang on the inputs that move: the ratio changes. Else the input is an enable
    scope    where runs begin
    seeds    places on orbits with the inputs held, near changes of the output
    active   the value of an enable at which the divider runs
    steady   nothing pulses within a half-cycle while the inputs are held; else that is not looked at again here
    recovers half-cycles within which the output is right from every state, at every value at which the divider runs,
             where that is proved of the divider with nothing moving
    """

    moving: tuple[str, ...]
    rigid: tuple[str, ...]
    held: Mapping[str, int]
    nominal: Nominal
    varies: bool
    scope: Scope
    recovers: int | None = None
    seeds: tuple[Seed, ...] = ()
    active: int | None = None
    steady: bool = True


COUNTED = 60
"""Bits of a nominal length, in half-cycles, up to which tables can hold it."""


@dataclass(frozen=True, slots=True)
class Moves:
    """The answer.

    proved   no run breaks the claim
    trace    a run that does
    glitch   where it does so within a half-cycle, by a pulse of the output, an order of arrival that shows it
    owed     timing obligations under which it is proved
    back     half-cycles after the last move within which the output is right for good, None where not known
    exact    some state really needs that long
    parked   levels at which the output stays while the divider is not enabled
    still    half-cycles within which it does
    method   how it was decided
    open     why it was not, "" otherwise
    """

    question: Question
    proved: bool
    trace: Trace | None = None
    glitch: Glitch | None = None
    owed: tuple[Obligation, ...] = ()
    back: int | None = None
    exact: bool = False
    parked: tuple[int, ...] = ()
    still: int | None = None
    method: str = ""
    open: str = ""


def answer(ports: Ports, question: Question, effort: Effort) -> Moves:
    """Everything that is found out within the effort."""
    try:
        machine = machine_of(ports, question.moving, question.rigid, question.held, question.scope, effort)
        if not machine.begins:
            return Moves(
                question, False, open="runs have no beginning: there is neither a reset nor an initial value"
            )
        nominal = question.nominal
        counted = max(nominal.high.width, nominal.low.width) <= COUNTED
        if counted and monitor.fits(machine, limit_rows(machine, question)):
            return _searched(ports, machine, question, effort)
        return _watched(ports, machine, question, effort)
    except OutOfEffort as out:
        return Moves(question, False, open=str(out))


# -- small machines ----------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Claimed:
    """The nominal pulses as tables of shape (values, states)."""

    high: np.ndarray
    low: np.ndarray
    domain: np.ndarray

    @staticmethod
    def of(machine: Machine, nominal: Nominal) -> _Claimed:
        high, low, domain = observer.everywhere(machine, [nominal.high, nominal.low, nominal.domain])
        return _Claimed(high, low, domain == 1)


def limit_rows(machine: Machine, question: Question) -> int:
    """Limits that the claim comes to, at most."""
    most = 4 << machine.moving_bits if question.varies else 2
    if monitor.fits(machine, most) or machine.bits + machine.moving_bits > MOST_COUNTED_BITS:
        return most
    return len(limits_of(machine, question).level)


MOST_COUNTED_BITS = 18
"""Bits of a state and the moving inputs up to which the different nominal lengths are counted."""


def limits_of(machine: Machine, question: Question) -> Limits:
    """Every limit that the claim comes to."""
    import numpy as np

    claimed = _Claimed.of(machine, question.nominal)
    every = claimed.domain.any(axis=1)
    if not question.varies:
        # An enable moves freely; the nominal pulses are those of the rigid inputs.
        limit = np.stack([claimed.low[0], claimed.high[0]])
        both = np.array([False, False])
        return Limits(both, np.array([0, 1]), limit, np.stack([every, every]), claimed.domain)
    rows: list[tuple[bool, int, int, np.ndarray]] = []
    for level, nominal in enumerate((claimed.low[:, 0], claimed.high[:, 0])):
        for limit in sorted(set(nominal[every].tolist())):
            rows.append((False, level, limit, every & (nominal >= limit)))
            rows.append((True, level, limit, every & (nominal <= limit)))
    longest, levels, numbers, allowed = zip(*rows, strict=True)
    return Limits(
        np.array(longest), np.array(levels), np.array(numbers)[:, None], np.stack(allowed), claimed.domain
    )


def _searched(ports: Ports, machine: Machine, question: Question, effort: Effort) -> Moves:
    limits = limits_of(machine, question)
    table = observer.tables(machine)
    found = monitor.search(machine, table, limits, effort)
    if found.broken is not None:
        moves = [dict(observer.named(machine.moving, value)) for value in found.broken.values]
        rests, cause = _replayed(ports, machine, found.broken.start, moves)
        breach = observer.breach(rests, ports.output, question.nominal, question.varies)
        shown = _shown(rests, breach, cause, _lasts(ports, machine, rests, breach))
        return Moves(question, False, trace=shown, method=SHORTEST)
    for choice in range(_choices(machine)):
        faults = observer.danger_faults(machine, limits, found.danger, choice)
        if faults and choice:
            return Moves(question, False, open=f"a value that x stands for decides: {faults[0]}")
        if faults:
            raise InternalError(f"a table of dangers fails its check: {'; '.join(faults)}")
    claimed = _Claimed.of(machine, question.nominal)
    held = monitor.held(table, found.reached, claimed.high + claimed.low, claimed.high, effort)
    answered = _settled(ports, machine, question, found, held, claimed)
    if not (answered.proved and question.steady):
        return answered
    ways = Ways(ports, machine, question.nominal, effort)
    pulse = ways.first(found)
    if pulse is None:
        return _under(answered, ways.reached(found))
    moves = [dict(observer.named(machine.moving, value)) for value in (*pulse.values, pulse.values[-1])]
    rests, cause = _replayed(ports, machine, pulse.start, moves)
    return _pulsed(question, ways, rests, cause, SHORTEST)


def _under(found: Moves, way: Found) -> Moves:
    """The answer about rests with what happens between them."""
    why = way.open or (f"{way.text}; whether a run gets there is not known" if way.text else "")
    return replace(found, proved=False, open=why) if why else replace(found, owed=way.owed)


def _pulsed(question: Question, ways: Ways, rests: tuple[Rest, ...], cause: str, method: str) -> Moves:
    """The answer that on the last edge of a run something pulses."""
    before, last = rests[-2:]
    found = ways.at({**before.inputs, **before.registers})
    if not found.text:
        return Moves(question, False, open="a pulse within a half-cycle that hangs on what x stands for")
    shown = Trace(rests, last.half_cycle, last.half_cycle + 1, found.text, cause, on_the_way=True)
    return Moves(question, False, trace=shown, glitch=found.glitch, method=method)


SHORTEST = "breadth-first search of all runs: no shorter one shows the like; replayed on the machine"


def _settled(
    ports: Ports,
    machine: Machine,
    question: Question,
    found: monitor.Search,
    held: monitor.Held,
    claimed: _Claimed,
) -> Moves:
    """What comes once the inputs stand still: the right wave again, or an output that stays."""
    import numpy as np

    table = observer.tables(machine)
    reached = found.reached
    runs, parks = reached.copy(), np.zeros_like(reached)
    if not question.varies:
        first, given = observer.starts(machine)
        here = claimed.domain[given, first]
        active = [value for value in (0, 1) if (held.rank[value, first[here & (given == value)]] >= 0).all()]
        if not active:
            return Moves(question, False, open="at neither value is the output the one claimed")
        for value in {0, 1} - set(active):
            runs[value], parks[value] = False, reached[value]
    for wrong, nominal in ((runs & (held.rank < 0), question.nominal), (parks & (held.still < 0), None)):
        if wrong.any():
            run = found.path(wrong)
            state = _state_after(machine, table, run)
            lead, loop = monitor.lead_and_loop(table, run.values[-1], state)
            values = [*run.values, *[run.values[-1]] * (lead + loop)]
            moves = [dict(observer.named(machine.moving, value)) for value in values]
            rests, cause = _replayed(ports, machine, run.start, moves)
            breach = observer.repeats(rests, ports.output, nominal)
            return Moves(question, False, trace=_shown(rests, breach, cause), method=SHORTEST)
    for choice in range(_choices(machine)):
        other = table if choice == 0 else observer.tables(machine, choice)
        period = claimed.high + claimed.low
        faults = observer.rank_faults(other, runs, held.phase, held.rank, period, claimed.high)
        faults += observer.still_faults(other, parks, held.level, held.still)
        if faults and choice:
            return Moves(question, False, open=f"a value that x stands for decides: {faults[0]}")
        if faults:
            raise InternalError(
                f"a table of what comes after the last move fails its check: {'; '.join(faults)}"
            )
    return Moves(
        question,
        True,
        back=int(held.rank[runs].max()),
        exact=True,
        parked=tuple(sorted(set(held.level[parks].tolist()))),
        still=int(held.still[parks].max()) if parks.any() else None,
        method=f"all {int(reached.sum())} states and values that any run reaches; every step checked",
    )


def _choices(machine: Machine) -> int:
    """How many values the bits have that x stands for."""
    return 1 << sum(width for _, width in machine.choices)


def _state_after(machine: Machine, table: observer.Table, run: monitor.Run) -> int:
    """The number of the state after the last move of a run."""
    first, given = observer.starts(machine)
    state, value = int(first[run.start]), int(given[run.start])
    for number, to in enumerate(run.values):
        if number > 0:
            state = int(table.edge[value, state])
        state = state if table.move is None else int(table.move[value, to, state])
        value = to
    return state


# -- large machines ----------------------------------------------------------------------------------------

MOST_CHANGES = 4
"""Changes of the output after the last move within which the ratio is looked for."""


def _watched(ports: Ports, machine: Machine, question: Question, effort: Effort) -> Moves:
    """What unrolling and induction come to."""

    def made(bits: int) -> Watch:
        return watch(machine, question.nominal, "range" if question.varies else "whole", bits=bits)

    found, broken = _invariants(made, "while inputs move", effort.share(effort.left / 2), question.seeds)
    seeds = question.seeds if broken is not None and isinstance(broken.begin, Seed) else None
    looked = unrolled.shortest(made(0), effort.share(effort.left / 3), MOST_DEPTH if broken else 0, seeds)
    if found is None and broken is None:
        looked = unrolled.shortest(made(0), effort.share(effort.left / 2))
    broken = looked.broken or broken
    if broken is not None:
        method = BY_CHANCE if looked.broken is None else UNROLLED if seeds is None else FROM_ORBIT
        return Moves(question, False, trace=_broken(ports, machine, question, broken), method=method)
    if found is None:
        why = f"no invariants were found that show it; no run of up to {looked.covered} half-cycles breaks it"
        return Moves(question, False, open=why)
    pulse = _pulsing(ports, machine, question, found, effort) if question.steady else Moves(question, True)
    if not pulse.proved:
        return pulse
    back = _back(machine, question, len(found[1]), effort)
    return replace(back if question.varies else _idle(ports, question, back, found, effort), owed=pulse.owed)


def _pulsing(
    ports: Ports,
    machine: Machine,
    question: Question,
    found: tuple[Watch, tuple[Line, ...]],
    effort: Effort,
) -> Moves:
    """What happens within a half-cycle, where lines are known that hold of all runs."""
    ways = Ways(ports, machine, question.nominal, effort.share(effort.left / 2))
    way = ways.under(*found)
    if way.text:
        system = ways.pulsing(found[0], way)
        for seeds, method in ((None, UNROLLED), (question.seeds, FROM_ORBIT)):
            looked = unrolled.shortest(system, effort.share(effort.left / 3), seeds=seeds)
            if looked.broken is not None:
                rests, cause = _run(ports, machine, looked.broken)
                return _pulsed(question, ways, rests, cause, method)
    return _under(Moves(question, True), way)


def _idle(
    ports: Ports, question: Question, found: Moves, invariant: tuple[Watch, tuple[Line, ...]], effort: Effort
) -> Moves:
    """The answer with what the output does while the divider is stopped: it stays, on every loop of every state, or
    by what holds of all runs."""
    why = found.open or "where the output parks was not found out"
    if not found.proved or question.active is None:
        return replace(found, proved=False, open=why)
    if not question.rigid:
        still = with_holds(ports, {question.moving[0]: 1 - question.active})
        rhythm = analyse.rhythm_of(still, Spec(start="any"), effort.share(effort.left / 2))
        (low, high) = e.evaluate([question.nominal.low, question.nominal.high], {})
        if rhythm.complete and rhythm.loops:
            if all(loop.stuck for loop in rhythm.loops):
                return replace(found, parked=tuple(sorted({loop.wave.runs[0][0] for loop in rhythm.loops})))
            if all(Goal(low + high, high).fits(loop.wave) for loop in rhythm.loops):
                return found
        why = f"{why}: {rhythm.open or 'there are several kinds of loops'}"
    try:
        parked = _parked(question, *invariant, effort)
    except OutOfEffort as out:
        return replace(found, proved=False, open=str(out))
    if parked is None:
        return replace(found, proved=False, open=why)
    levels, within = parked
    return replace(found, parked=levels, still=within)


MOST_SETTLING = 6
"""Half-cycles after a stop, as synchronisers take them, from which on the output is looked at."""


def _parked(
    question: Question, system: Watch, lines: Sequence[Line], effort: Effort
) -> tuple[tuple[int, ...], int] | None:
    """The levels that the output keeps for good some half-cycles after a stop, wherever lines hold that every step
    keeps, and half-cycles within which it is at one; None where this is not shown.

    A level is kept if no further edge leaves it. One that is not has to end: no pulse of it that goes on while the
    divider is stopped is longer than nominal."""
    machine, nominal = system.machine, question.nominal
    if machine.choices:
        return None
    effort.say("looking at where the output parks")
    widths = dict(system.variables)
    active = e.var(question.moving[0], 1)
    stopped = e.eq(active, e.const(1 - (question.active or 0), 1))
    inside = e.conj([system.within, *(line.expr(widths) for line in lines), stopped])

    def never(*goal: Expr) -> bool:
        question = e.conj([inside, *goal])
        if find(question, effort) is not None:
            return False
        if not certificate.discharge(certificate.Obligation("where the output parks", question), effort):
            raise InternalError("where the output parks fails its check")
        return True

    state: Sequence[Expr] = [e.var(name, width) for name, width in machine.variables]
    levels = [machine.output]
    for settled in range(MOST_SETTLING + 1):
        state = e.substitute(machine.edge, dict(zip(machine.names, state, strict=True)))
        levels += e.substitute([machine.output], dict(zip(machine.names, state, strict=True)))
        was, then = levels[-2:]
        kept = [at for at in (0, 1) if never(e.eq(was, e.const(at, 1)), e.eq(then, e.const(1 - at, 1)))]
        if len(kept) == 2:
            return (0, 1), settled
        if kept:
            leaves = e.const(1 - kept[0], 1)
            edges = e.bvadd(
                e.zero_extend(e.var(watched.EDGES, widths[watched.EDGES]), 1),
                e.const(1, widths[watched.EDGES] + 1),
            )
            longest = e.resize(nominal.of(1 - kept[0]), edges.width, False)
            if never(e.eq(levels[0], leaves), e.eq(levels[1], leaves), e.bvule(longest, edges)):
                return (kept[0],), settled + _greatest(nominal.of(1 - kept[0]), nominal.domain, effort)
    return None


Make = Callable[[int], Watch]


def _invariants(
    make: Make, name: str, effort: Effort, seeds: Sequence[Seed] = ()
) -> tuple[tuple[Watch, tuple[Line, ...]] | None, Broken | None]:
    """Lines from which a claim follows, checked; or a run that breaks it; or neither. `make` gives the system with so
    many of the machine's comparisons told."""
    effort.say("looking at random runs")
    for number, bits in itertools.product(SAMPLES, (0, MOST_COMPARED)):
        system = make(bits)
        found = mine.sampled(system, effort, seeds, number)
        if found.broken is not None:
            return None, found.broken
        for all_of_them in (False, True):
            try:
                lines = mine.candidates(system, found, all_of_them)
                proved = inductive.proof(system, lines, effort.share(effort.left / 2))
            except OutOfEffort:
                if effort.left <= 0:
                    return None, None
                continue
            if proved is not None:
                _check(system, proved, name, effort)
                return (system, proved), None
    return None, None


SAMPLES = (1, 2, 3)
"""Random numbers with which runs are drawn: one lot may have missed what another shows."""

MOST_COMPARED = 4
"""Comparisons of the machine's own by which states are told apart where less does not do."""


FROM_ORBIT = "unrolled from places on the orbit: none of them has a shorter run that shows the like; replayed"

BY_CHANCE = "random runs; replayed on the machine"

UNROLLED = "unrolled half-cycle by half-cycle: no shorter run shows the like; replayed on the machine"

MOST_DEPTH = 200
"""Half-cycles that are unrolled where it is known that some run breaks the claim."""


def _check(system: Watch, lines: Sequence[Line], name: str, effort: Effort) -> None:
    """Raise InternalError unless the claim follows from the lines."""
    effort.say("checking invariants")
    for obligation in watched.obligations(system, lines, name):
        if not certificate.discharge(obligation, effort):
            raise InternalError(f"an invariant fails its check: {obligation.name}")


def _back(machine: Machine, question: Question, count: int, effort: Effort) -> Moves:
    """The bound on the time until the last ratio holds: that from any state, or a closer one where pulses that begin
    with some change of the output after the last move are exact, and none before is longer than the longest."""
    proved = f"induction with {count} linear invariants"
    back, why = question.recovers, "no bound was found on the time until the last ratio holds"
    if back is not None:
        proved, effort = f"{proved}, recovery from every state", effort.share(effort.left / 4)
    try:
        closer = _after_changes(machine, question, effort) if question.varies else None
    except OutOfEffort as out:
        closer, why = None, str(out)
    if closer is not None and (back is None or closer[0] < back):
        back, proved = closer[0], f"induction with {count} and {closer[1]} linear invariants"
    if back is None:
        return Moves(question, False, open=why)
    return Moves(question, True, back=back, method=f"{proved}; every obligation checked")


def _after_changes(machine: Machine, question: Question, effort: Effort) -> tuple[int, int] | None:
    """Half-cycles after the last move within which all is exact, and the number of invariants that this takes."""
    nominal = question.nominal
    low, high = (_greatest(word, nominal.domain, effort) for word in (nominal.low, nominal.high))
    for changes in range(1, MOST_CHANGES + 1):

        def made(bits: int, changes: int = changes) -> Watch:
            return watch(machine, nominal, "after", changes, (low, high), bits)

        found, _ = _invariants(made, "after the last move", effort.share(effort.left / 2))
        if found is not None:
            return changes // 2 * (low + high) + changes % 2 * max(low, high), len(found[1])
    return None


def _greatest(word: Expr, domain: Expr, effort: Effort) -> int:
    """The greatest value of a word within a domain."""
    low, high = 0, (1 << word.width) - 1
    while low < high:
        middle = (low + high + 1) // 2
        model = find(e.bvand(domain, e.bvule(e.const(middle, word.width), word)), effort)
        if model is None:
            high = middle - 1
        else:
            full = {v.name: 0 for v in e.variables([word])} | model
            low = max(middle, e.evaluate([word], full)[0])
    return low


def _beginning(machine: Machine, begin: int | Seed) -> Begin:
    if not isinstance(begin, Seed):
        return machine.begins[begin]
    widths = {r.name: r.width for r in machine.design.registers} | {machine.clock: 1}
    return Begin(
        {name: e.const(begin.registers[name], width) for name, width in widths.items()}, (), begin.cause
    )


def _run(ports: Ports, machine: Machine, broken: Broken) -> tuple[tuple[Rest, ...], str]:
    """The run that was found by unrolling or by chance, up to the edge of its last half-cycle, and how it begins."""
    begin = _beginning(machine, broken.begin)
    names = [name for name, _ in machine.moving]
    moves = [broken.moves[0], *({name: move[name + AFTER] for name in names} for move in broken.moves[1:])]
    rests = replayed(ports, machine, begin, broken.given, moves)
    return (rests[:-1] if rests[-1].moved else rests), begin.cause


def _broken(ports: Ports, machine: Machine, question: Question, broken: Broken) -> Trace:
    """The trace of a run that was found by unrolling or by chance."""
    begin = _beginning(machine, broken.begin)
    names = [name for name, _ in machine.moving]
    moves = [broken.moves[0], *({name: move[name + AFTER] for name in names} for move in broken.moves[1:])]
    rests = replayed(ports, machine, begin, broken.given, moves)
    breach = observer.breach(rests, ports.output, question.nominal, question.varies)
    if breach is None:
        # The last move need not have been the one that broke it: its half-cycle's edge was.
        rests = rests[:-1] if rests[-1].moved else rests
        breach = observer.breach(rests, ports.output, question.nominal, question.varies)
    return _shown(rests, breach, begin.cause, _lasts(ports, machine, rests, breach))


# -- traces ------------------------------------------------------------------------------------------------


def _replayed(
    ports: Ports, machine: Machine, start: int, moves: Sequence[Mapping[str, int]]
) -> tuple[tuple[Rest, ...], str]:
    """The run of the design from a start along the inputs' values in each half-cycle, and how the start comes
    about."""
    begin, given = observer.start_values(machine, start)
    return replayed(ports, machine, begin, given, moves), begin.cause


def replayed(
    ports: Ports,
    machine: Machine,
    begin: Begin,
    given: Mapping[str, int],
    moves: Sequence[Mapping[str, int]],
) -> tuple[Rest, ...]:
    """The run from a beginning, with the inputs and the free variables as given there."""
    design, outputs = machine.design, {ports.output: ports.output_value}
    names = [*(r.name for r in design.registers), machine.clock]
    # Choices that x leaves are 0, as in all of the trace.
    given = {v.name: 0 for v in e.variables([*begin.state.values(), ports.output_value])} | dict(given)
    registers = dict(zip(names, e.evaluate([begin.state[name] for name in names], given), strict=True))
    inputs = {**dict(machine.held.values), **{n: given[n] for n, _ in (*machine.rigid, *machine.moving)}}
    (level,) = e.evaluate([ports.output_value], {**given, **inputs, **registers})
    first = Rest(0, False, inputs, registers, {ports.output: level})
    return trace.run(design, machine.clock, outputs, first, list(moves), machine.depth)


def _shown(rests: tuple[Rest, ...], breach: Breach | None, cause: str, more: str = "") -> Trace:
    """The run with what it shows. Raises InternalError if that is nothing."""
    if breach is None:
        raise InternalError("a run that breaks no claim")
    return Trace(rests, breach.begins, breach.ends, breach.text + more, cause)


SOON = 5.0
"""Seconds for following a pulse that is too long to its end."""


def _lasts(ports: Ports, machine: Machine, rests: Sequence[Rest], breach: Breach | None) -> str:
    """How long a pulse that goes on at the end of a run lasts in all if the inputs stand still from there on; ""
    where it does not go on, or that is not found out soon."""
    last = rests[-1]
    if breach is None or rests[-2].outputs != last.outputs:
        return ""
    effort = Effort(SOON)
    inputs = Inputs.of(last.inputs)
    try:
        system, settling = settle(
            machine.design, machine.clock, inputs, ports.output_value, effort, races=False
        )
        state = tuple(last.registers[name] for name in system.names)
        run = orbit.trace(system, state, effort)
    except OutOfEffort:
        return ""
    stay = ", ".join(f"{name} stays {last.inputs[name]}" for name, _ in machine.moving)
    wave = run.wave()
    runs = list(itertools.islice(run.runs(rounds=2), 2))
    if settling.depth is None or system.choices or not run.closed:
        return ""
    if len(runs) < 2 and wave is not None and wave.stuck:
        return f"; it never ends if {stay}"
    return (
        f"; it lasts {last.half_cycle - breach.begins + runs[0][1]} half-cycles if {stay}"
        if len(runs) == 2
        else ""
    )
