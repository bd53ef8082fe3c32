"""Evidence to verdicts, without any engine: the rhythm that it shows, and the obligations that this hangs on.

The machine is derived anew from the ports. What the evidence says of it either follows by computing with its
numbers, or becomes an obligation that no assignment may fulfil; anything else is `Rejected`. Writing a certificate
and checking one both come this way, so the two can be compared word for word.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from prover import accumulator, certificate, glitch, linear, path, recode, release, reset, tables
from prover import expr as e
from prover.accumulator import Accumulator
from prover.certificate import CoverClaim, Obligation, Stage
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.evidence import Evidence, Hold, Lasso, Layer, Matrix, Track
from prover.expr import Expr
from prover.good import good_since, of_runs, scope_of
from prover.path import Beat, Item, Step
from prover.ports import Ports
from prover.rhythm import (
    LONGEST_ROUND,
    NOWHERE,
    Goal,
    Good,
    Loop,
    Mean,
    Orbit,
    Recovery,
    Rhythm,
    Scope,
    Start,
    goal_of,
)
from prover.settling import Settling, settle
from prover.solve import Model
from prover.spec import Spec
from prover.system import Inputs, State, System, cone
from prover.tables import Ranking, Rounds

HOLD_PER_BIT = 8
"""Half-cycles of reset, for each bit of state, that are unrolled; searching for them ends earlier."""


class Rejected(Exception):
    """The evidence does not show what it is to show; the message says what is wrong."""


@dataclass(frozen=True, slots=True)
class Rebuilt:
    """What evidence comes to, provided that no obligation can be fulfilled.

    whole    the divider as a machine, `rhythm.system` the part of it that the evidence speaks of"""

    whole: System
    rhythm: Rhythm
    obligations: tuple[Obligation, ...]


def rebuild(ports: Ports, spec: Spec, evidence: Evidence, effort: Effort) -> Rebuilt:
    """The rhythm that the evidence shows of the divider, and its obligations. Raises Rejected, and UserError for a
    scope that the divider doesn't have."""
    owed = Owed()
    ask = Replay(evidence.settling, "micro-steps", owed)
    whole, settling = settle(
        ports.design, ports.clock, ports.running, ports.output_value, effort, ask=ask.answer
    )
    ask.finish()
    known = None
    if settling.depth is not None and evidence.reset is not None:
        known = _held(ports, evidence.reset, owed, effort)
    scope, starts, why = _starts(ports, spec, whole, settling, known)
    if settling.depth is None:
        if evidence != Evidence(evidence.settling, False, False, (), (), None, None, (), None, (), (), None):
            raise Rejected("evidence about a divider of which nothing is known")
        return Rebuilt(whole, _nothing_known(ports, whole, settling, scope), owed.listed())
    machine = machine_of(whole, evidence, owed)
    starts = tuple(replace(s, state=recode.placed(s.state, whole, machine)) for s in starts)
    rhythm = _followed(Rhythm(
        system=machine, settling=settling, scope=scope, starts=starts, orbits=(), loops=(), complete=False,
        recovery=None, stuck=None, never_stuck=False, open=why,
    ), evidence.starts, owed)  # fmt: skip
    rhythm = _adding(rhythm, spec, evidence.everywhere, owed)
    rhythm = _with_release(rhythm, ports, spec, whole, evidence.reset, known, owed)
    lassos = [_lasso(whole, machine, lasso, owed) for lasso in evidence.lassos]
    listed = evidence.everywhere.waves() if isinstance(evidence.everywhere, Rounds) else []
    goal = goal_of(spec, [*(run.wave() for run in rhythm.orbits), *listed, *(run.wave() for run in lassos)])
    if rhythm.accumulator is None:
        rhythm = _everywhere(rhythm, evidence, goal, lassos, machine is whole, owed)
    elif lassos:
        raise Rejected("lassos: beside an accumulator, which leaves no state out")
    rhythm = _with_glitches(ports, whole, rhythm, evidence, goal, owed)
    return Rebuilt(whole, rhythm, owed.listed())


class Owed:
    """Obligations so far, each goal once; what is false by its form is kept for what its name tells."""

    def __init__(self) -> None:
        self._made: dict[Expr | str, Obligation] = {}

    def add(self, obligations: Iterable[Obligation]) -> None:
        for each in obligations:
            if each.goal.is_const and each.goal.value:
                raise Rejected(f"{each.name}: does not hold")
            self._made.setdefault(each.name if each.goal.is_const else each.goal, each)

    def listed(self) -> tuple[Obligation, ...]:
        return tuple(self._made.values())


class Replay:
    """Answers questions as the evidence does. That there is no such state is owed; values for one are put in."""

    def __init__(self, answers: Sequence[Model | None], name: str, owed: Owed) -> None:
        self.answers = answers
        self.name = name
        self.owed = owed
        self.asked = 0

    def answer(self, goal: Expr) -> Model | None:
        if goal.is_const:
            return {} if goal.value else None
        if self.asked == len(self.answers):
            raise OutOfEffort(f"the evidence leaves a question about {self.name} open")
        model = self.answers[self.asked]
        name = f"{self.name}, question {self.asked}"
        self.asked += 1
        if model is None:
            self.owed.add([Obligation(name, goal)])
            return None
        used = {v.name: v.width for v in e.variables([goal])}
        if list(model) != list(used) or any(model[name] >> width for name, width in used.items()):
            raise Rejected(f"{name}: not values of {', '.join(used)}")
        if e.evaluate([goal], model) != [1]:
            raise Rejected(f"{name}: the values do not fulfil it")
        here = e.conj(e.eq(e.var(v, used[v]), e.const(x, used[v])) for v, x in model.items())
        self.owed.add([Obligation(f"{name}, answered", e.bvand(here, e.bvnot(goal)))])
        return model

    def finish(self) -> None:
        if self.asked != len(self.answers):
            raise Rejected(f"{self.name}: {len(self.answers)} answers to {self.asked} questions")


def _nothing_known(ports: Ports, whole: System, settling: Settling, scope: Scope) -> Rhythm:
    why = settling.open or "the micro-steps do not settle"
    recovery = Recovery(None, False, open=why)
    freed = release.unknown(ports, why) if ports.reset is not None else None
    return Rhythm(whole, settling, scope, (), (), (), False, recovery, None, False, open=why, release=freed)


# -- within a half-cycle -----------------------------------------------------------------------------------


def good_of(
    rhythm: Rhythm, known: tuple[Layer, ...] | Ranking | Rounds | Accumulator | None, goal: Goal
) -> Good:
    """The good states as the evidence has them, or what is looked at in their place."""
    machine = rhythm.system
    if isinstance(known, Ranking):
        hanging = " whatever x stands for" if machine.choices else ""
        return Good(known.phase, (), f"every state that is good{hanging}")
    loops: list[Orbit] = []
    if isinstance(known, Rounds):
        loops = known.orbits(machine)
    elif isinstance(known, Accumulator):
        known = None
    elif known is not None:
        loops = [orbit_of(each.track, machine, "a stage's orbit") for each in known[-1].orbits]
    return of_runs(rhythm, loops, known is not None, goal)


def _with_glitches(
    ports: Ports,
    whole: System,
    rhythm: Rhythm,
    evidence: Evidence,
    goal: Goal,
    owed: Owed,
) -> Rhythm:
    """The rhythm with what the answers say of glitches, owing that there are no others."""
    good = good_of(rhythm, evidence.everywhere, goal)
    ask = Replay(evidence.glitches, "glitches", owed)
    first = run = None
    if evidence.pulse is not None:
        first, run = evidence.pulse.start, _lasso(whole, rhythm.system, evidence.pulse, owed)
        if not good.none and good_since(run, goal) != 0:
            raise Rejected("pulse: not from a good state")

    def follow(state: State) -> Orbit | None:
        return run if state == first else None

    found = glitch.find(ports, whole, scope_of(whole, rhythm.system, good, first), follow, ask.answer)
    ask.finish()
    if (found.found is None) != (evidence.pulse is None):
        raise Rejected("pulse: it shows none")
    return replace(rhythm, good=good, glitches=found)


# -- the machine that the evidence speaks of ---------------------------------------------------------------


def machine_of(whole: System, evidence: Evidence, owed: Owed) -> System:
    """The machine without the registers that are left out, and with those that are read as a word joined."""
    inner = cone(whole) if evidence.cone else whole
    if evidence.cone and inner is whole:
        raise Rejected("registers are said to be left out that the output depends on")
    if evidence.matrix is not None:
        if evidence.word or evidence.parts or evidence.gray:
            raise Rejected("registers in other coordinates besides a matrix")
        return _counted(inner, evidence.matrix, owed)
    kept = recode.live(inner) if evidence.parts else inner
    if evidence.parts and kept is inner:
        raise Rejected("parts of registers are said to be left out that the output depends on")
    numbered = _numbered(kept, evidence.gray, owed)
    if not evidence.word:
        return numbered
    single = {name for name, width in numbered.variables if width == 1 and name != numbered.clock}
    if len(set(evidence.word)) != len(evidence.word) or not set(evidence.word) <= single:
        raise Rejected("word: not registers of one bit, each once")
    return recode.joined(numbered, evidence.word)


def _numbered(system: System, registers: Sequence[str], owed: Owed) -> System:
    """The system with registers in Gray code read as numbers, owing that this is what its steps come to."""
    if not registers:
        return system
    numbered, known = recode.gray(system)
    if [register for _, register in numbered.grays] != list(registers):
        raise Rejected("gray: not the registers that hold a Gray code")
    owed.add(certificate.gray_obligations(system, numbered, known))
    return numbered


def _counted(inner: System, matrix: Matrix, owed: Owed) -> System:
    """The machine as a count of the matrix's powers, owing that this is what its step and its output come to."""
    logs = linear.Logs(inner.variables[:-1], matrix.columns, matrix.fixed, matrix.start)
    if len(matrix.columns) > linear.WIDEST:
        raise Rejected("matrix: too wide")
    faults = certificate.linear_form_faults(inner, logs)
    if faults:
        raise Rejected(f"matrix: {faults[0]}")
    for obligations in certificate.linear_obligations(inner, logs, matrix.moving, matrix.level):
        owed.add(obligations)
    return linear.counter(inner, logs, matrix.moving, matrix.level)


def orbit_of(track: Track, system: System, where: str, looked_through: bool = True) -> Orbit:
    """A track as an orbit of the system. Raises Rejected where its states are none of the system's, or its output
    changes too often to be looked through where it has to be."""
    widths = tuple(width for _, width in system.variables)
    for items in (track.lead, track.loop):
        _check_items(items, widths, where)
    if not track.lead and not track.loop:
        raise Rejected(f"{where}: no states")
    made = Orbit(track.lead, track.loop, widths, "" if track.loop else "not followed to its loop")
    changes = max(path.changes(items, LONGEST_ROUND) for items in (track.lead, track.loop))
    if looked_through and changes > LONGEST_ROUND:
        raise Rejected(f"{where}: its output changes too often to be looked through")
    return made


def _check_items(items: Sequence[Item], widths: Sequence[int], where: str) -> None:
    todo = list(items)
    most = 1 << sum(widths)
    while todo:
        item = todo.pop()
        values = item.state if isinstance(item, Beat) else item.stride
        if len(values) != len(widths) or any(v >> w for v, w in zip(values, widths, strict=True)):
            raise Rejected(f"{where}: {values} is no state of the machine")
        if not isinstance(item, Beat):
            if item.times > most:
                raise Rejected(f"{where}: a repeat of more rounds than there are states")
            todo.extend(item.body)


# -- start states ------------------------------------------------------------------------------------------


Under = tuple[reset.Held, System]
"""What reset leaves, and the system under reset."""


def _limit(ports: Ports, settling: Settling) -> int:
    return max(settling.depth or 0, 2 * len(ports.design.registers) + 8)


def _starts(
    ports: Ports, spec: Spec, whole: System, settling: Settling, known: Under | None
) -> tuple[Scope, tuple[Start, ...], str]:
    """Where the claim begins, the start states there, and why there are none."""
    if settling.depth is None:
        return spec.start or ("reset" if ports.reset else "any"), (), ""
    limit = _limit(ports, settling)
    if spec.start != "any" and ports.reset is not None and spec.start in (None, "reset"):
        if known is None:
            return "reset", (), "the states that reset leaves are not certain"
        return "reset", _released(ports, whole, known[0], limit), ""
    found = reset.initial(whole, limit) if spec.start != "any" else ""
    return ("any", (), "") if isinstance(found, str) else ("initial", found, "")


def _held(ports: Ports, hold: Hold, owed: Owed, effort: Effort) -> Under:
    """What reset leaves, owing that it leaves these states from everywhere, that each of them really occurs, and that
    it needs as long as is said."""
    ports = reset.seen_by(ports)
    ask = Replay(hold.settling, "micro-steps under reset", owed)
    system, settling = settle(
        ports.design, ports.clock, ports.resetting, ports.output_value, effort, ask=ask.answer, races=False
    )
    ask.finish()
    if ports.reset is None or settling.depth is None:
        raise Rejected("reset: held, though there is none or the machine does not settle then")
    if max(hold.needs) > HOLD_PER_BIT * (system.bits + 4):
        raise Rejected(f"reset: {max(hold.needs)} half-cycles are more than it needs")
    for state in hold.states:
        _check_items([Beat(state, 0)], [w for _, w in system.variables], "reset")
    steps = [_step(system, state) for state in hold.states]
    # States that the machine under reset merely permutes go on occurring, however long it is held.
    if sorted(step.target for step in steps) != sorted(hold.states) or not hold.states:
        raise Rejected("reset: the states do not follow one another while it is held")
    owed.add(certificate.single_obligations(system, steps, "reset held"))
    for level, count in enumerate(hold.needs):
        owed.add([certificate.reset_goal(system, level, count, hold.states)])
        slowest = hold.slowest[level]
        if slowest is not None:
            taken = _taken(system, slowest, count - 1, owed)
            if taken[-1] in hold.states or slowest[-1] != level:
                raise Rejected("reset: a state that is said to need long does not")
    unforced = reset.several_values(system.names, hold.states)
    return reset.Held(tuple(system.names), hold.states, hold.needs, unforced, hold.slowest), system


def _step(system: System, state: State) -> Step:
    *after, level = system.run(*state, *[0] * len(system.choices))
    return Step(state, tuple(after), level, ())


def _taken(system: System, start: State, count: int, owed: Owed) -> list[State]:
    """The states that so many half-cycles lead through from a state at rest, owing that they do."""
    _check_items([Beat(start, 0)], [w for _, w in system.variables], "reset")
    if count < 0 or e.evaluate([system.settled], dict(zip(system.names, start, strict=True))) != [1]:
        raise Rejected("reset: held from a state that is not at rest, or not at all")
    steps: list[Step] = []
    states = [start]
    for _ in range(count):
        steps.append(_step(system, states[-1]))
        states.append(steps[-1].target)
    owed.add(certificate.single_obligations(system, steps, "reset held from a state"))
    return states


def _released(ports: Ports, whole: System, held: reset.Held, limit: int) -> tuple[Start, ...]:
    """The start states after reset."""
    try:
        starts = reset.released(whole, held, ports.resetting, limit)
    except InternalError:
        raise Rejected("reset: its release hangs on a value that x stands for") from None
    if isinstance(starts, str):
        raise Rejected(f"reset: {starts}")
    return starts


def _with_release(
    rhythm: Rhythm,
    ports: Ports,
    spec: Spec,
    whole: System,
    hold: Hold | None,
    known: Under | None,
    owed: Owed,
) -> Rhythm:
    """The rhythm with every release of reset, owing the runs after them."""
    if ports.reset is None:
        return rhythm
    if hold is None or known is None:
        return replace(rhythm, release=release.unknown(ports, "the certificate has no evidence about reset"))
    held, under = known
    limit = _limit(ports, rhythm.settling)
    found = release.releases(ports, under, held, limit)
    machine = rhythm.system
    if hold.short is not None:
        cycles = spec.reset_cycles
        if cycles is None or cycles > release.LONGEST_SHORT:
            raise Rejected("reset: too short, though nothing is said of how long it is held")
        _taken(under, hold.short, 2 * cycles, owed)
        short = release.too_short(found, under, hold.short, cycles)
        if short is None:
            raise Rejected("reset: not too short for the state that is to show it")
        found = replace(found, short=short)
    done = {start.state: run for start, run in zip(rhythm.starts, rhythm.orbits, strict=True)}
    places = {each: _in_machine(each, held, ports.resetting, whole, machine, limit) for each in found.runs}
    wanted = [state for state in dict.fromkeys(places.values()) if state not in done]
    if len(hold.runs) > len(wanted):
        raise Rejected(f"reset: {len(hold.runs)} runs after {len(wanted)} releases")
    # A release without its run stays open.
    wanted = wanted[: len(hold.runs)]
    for number, (state, track) in enumerate(zip(wanted, hold.runs, strict=True)):
        run = orbit_of(track, machine, f"reset/runs/{number}")
        if run.start != state:
            raise Rejected(f"reset/runs/{number}: begins elsewhere than the release")
        done[state] = run
    owe_orbits(machine, [done[state] for state in wanted], "release", owed)

    waves = {state: run.wave() for state, run in done.items()}

    adds = rhythm.accumulator

    def followed(each: release.Freed) -> release.Freed:
        state = places[each]
        right = adds is not None and state in done and accumulator.gets_right(machine, adds, state)
        return replace(each.followed(done.get(state), waves.get(state)), right=right)

    found = replace(
        found,
        on_time=tuple(followed(each) for each in found.on_time),
        late=tuple(followed(each) for each in found.late),
        short=followed(found.short) if found.short is not None else None,
    )
    if found.short is not None and not release.differs(found, found.short):
        raise Rejected("reset: too short, though the output does not show it")
    return replace(rhythm, release=found)


def _in_machine(
    freed: release.Freed, held: reset.Held, active: Inputs, whole: System, machine: System, limit: int
) -> State:
    everything = release.after_release(whole, held, freed, active, limit)
    if everything is None:
        raise Rejected("reset: a release that does not settle")
    return recode.placed(everything, whole, machine)


def _followed(rhythm: Rhythm, tracks: Sequence[Track], owed: Owed) -> Rhythm:
    """The rhythm with the start states' orbits, owing their steps."""
    if len(tracks) != len(rhythm.starts):
        raise Rejected(f"starts: {len(tracks)} runs of {len(rhythm.starts)} start states")
    orbits = []
    for number, (track, start) in enumerate(zip(tracks, rhythm.starts, strict=True)):
        orbit = orbit_of(track, rhythm.system, f"starts/{number}")
        if orbit.start != start.state:
            raise Rejected(f"starts/{number}: begins elsewhere than the start state")
        orbits.append(orbit)
    owe_orbits(rhythm.system, orbits, "starts", owed)
    return replace(rhythm, orbits=tuple(orbits))


def owe_orbits(system: System, orbits: Sequence[Orbit], name: str, owed: Owed) -> None:
    """Owe every step of the orbits, single ones together."""
    singles: dict[Step, None] = {}
    for orbit in orbits:
        singles |= dict.fromkeys(step for step in certificate.orbit_steps(orbit) if not step.axes)
    owed.add(certificate.single_obligations(system, list(singles), name))
    for number, orbit in enumerate(orbits):
        for each in certificate.orbit_obligations(system, orbit):
            owed.add([Obligation(f"{name}/{number}, {each.name}", each.goal)])


def _adding(rhythm: Rhythm, spec: Spec, found: object, owed: Owed) -> Rhythm:
    """The rhythm with an accumulator that shows the claim of every state, owing that it does."""
    if not isinstance(found, Accumulator):
        return rhythm
    machine = rhythm.system
    if spec.ratio is None or not spec.mean or (found.register, found.width) not in machine.variables[:-1]:
        raise Rejected("accumulator: no register, or beside a claim on a mean")
    if not found.has(Mean(spec.ratio, spec.high)):
        raise Rejected("accumulator: of another mean, or with several waves")
    if machine.choices or not all(accumulator.starts_well(machine, found, run) for run in rhythm.orbits):
        raise Rejected("accumulator: not from every start state")
    if found.slowest is not None and not accumulator.needs_long(machine, found, found.slowest):
        raise Rejected("accumulator: a state that is said to need long does not")
    owed.add(accumulator.obligations(machine, found))
    recovery = Recovery(found.worst, found.slowest is not None, found.slowest)
    methods = {"orbit": found.method(), "power-up": found.method()}
    return replace(rhythm, accumulator=found, recovery=recovery, never_stuck=True, methods=methods)


# -- all power-up states -----------------------------------------------------------------------------------


def _lasso(whole: System, machine: System, lasso: Lasso, owed: Owed) -> Orbit:
    """A lasso as an orbit, owing that it is one and that its start is a power-up state."""
    _check_items([Beat(lasso.start, 0)], [w for _, w in whole.variables], "lassos")
    orbit = orbit_of(lasso.track, machine, "lassos")
    if orbit.start != recode.placed(lasso.start, whole, machine):
        raise Rejected("lassos: begins elsewhere than its start")
    here = e.conj(
        e.eq(e.var(name, width), e.const(value, width))
        for (name, width), value in zip(whole.variables, lasso.start, strict=True)
    )
    told = f"a power-up state, {orbit.lead_half_cycles} half-cycles from a loop of {orbit.loop_half_cycles}"
    owed.add([Obligation(told, e.bvand(here, e.bvnot(whole.settled)))])
    owe_orbits(machine, [orbit], "lassos", owed)
    return orbit


def _everywhere(
    rhythm: Rhythm,
    evidence: Evidence,
    goal: Goal,
    lassos: Sequence[Orbit],
    is_whole: bool,
    owed: Owed,
) -> Rhythm:
    """The rhythm completed with what is known of all power-up states.

    A list of loops may be longer than what power-up states run into. It proves what holds on all of them, but what a
    loop refutes hangs on its states being power-up states."""
    known = evidence.everywhere
    bound: int | None = None
    listed: list[Orbit] = []
    if isinstance(known, Rounds):
        listed = _rounds(rhythm.system, known, owed)
        if is_whole:
            owed.add([tables.rounds_at_rest(rhythm.system, known)])
    elif isinstance(known, Ranking):
        bound = _ranking(rhythm.system, known, goal, owed)
    elif known is not None and not isinstance(known, Accumulator):
        bound, listed = _cover(rhythm.system, known, goal, owed)
    complete = known is not None
    lost = next((run for run in lassos if _is_lost(run, goal)), None)
    stuck = next((run for run in lassos if _is_stuck(run)), None)
    if (lost and bound is not None) or (stuck and complete and bound is not None):
        raise Rejected("a state is lost, though every state recovers")
    loops, shown = _loops([*listed, *(() if complete else (*rhythm.orbits, *lassos))], goal)
    if isinstance(known, Rounds) and not is_whole:
        backed = {
            loop.example for loop in loops if loop.good or any(_goes_round(run, loop) for run in lassos)
        }
        complete = len(backed) == len(loops)
        loops = tuple(loop for loop in loops if loop.example in backed)
    why = "the certificate has no evidence about all power-up states"
    recovery = Recovery(None, False, open=why)
    if lost:
        recovery = Recovery(None, False, lost=lost)
    elif bound is not None:
        slowest = next((run for run in lassos if _needs(run, bound, goal)), None)
        recovery = Recovery(bound, slowest is not None, slowest.start if slowest else None)
        if slowest:
            shown[slowest.start] = slowest
    return replace(
        rhythm,
        loops=loops,
        complete=complete,
        recovery=recovery,
        stuck=stuck,
        never_stuck=complete and not any(loop.stuck for loop in loops),
        open=rhythm.open or ("" if complete else why),
        shown=shown,
    )


def _is_lost(run: Orbit, goal: Goal) -> bool:
    wave = run.wave()
    return wave is not None and not goal.fits(wave)


def _goes_round(run: Orbit, loop: Loop) -> bool:
    return run.closed and any(beat.state == loop.example for beat in path.beats(run.loop))


def _is_stuck(run: Orbit) -> bool:
    wave = run.wave()
    return wave is not None and wave.stuck


def _needs(run: Orbit, bound: int, goal: Goal) -> bool:
    """Whether the run is good after so many half-cycles and no earlier."""
    if not run.closed or not certificate.good_from(run, bound, goal):
        return False
    return bound == 0 or not certificate.good_from(run, bound - 1, goal)


def _loops(runs: Iterable[Orbit], goal: Goal) -> tuple[tuple[Loop, ...], dict[State, Orbit]]:
    """The loops of the runs, each once, and for an example state on each its orbit."""
    loops: dict[tuple[int, State], Loop] = {}
    shown: dict[State, Orbit] = {}
    for run in runs:
        wave = run.wave()
        if wave is None:
            continue
        example = path.first_state(run.loop)
        least = min(beat.state for beat in path.beats(run.loop))
        if (run.loop_half_cycles, least) not in loops:
            good = goal.fits(wave)
            loops[run.loop_half_cycles, least] = Loop(example, run.loop_half_cycles, wave, good)
            shown[example] = Orbit((), run.loop, run.widths)
    return tuple(loops.values()), shown


def _rounds(system: System, known: Rounds, owed: Owed) -> list[Orbit]:
    if system.bits > tables.MOST_BITS_IF_REGULAR:
        raise Rejected("a table of too many states")
    _none([*tables.rounds_form_faults(system, known)])
    owed.add(tables.rounds_obligations(system, known))
    return known.orbits(system)


def _ranking(system: System, known: Ranking, goal: Goal, owed: Owed) -> int:
    if system.bits > tables.MOST_BITS_IF_REGULAR:
        raise Rejected("a table of too many states")
    _none([*tables.ranking_form_faults(system, known, goal.period)])
    owed.add(tables.ranking_obligations(system, known, goal))
    if not system.choices:
        owed.add([tables.every_good_state(system, known, goal)])
    return known.bound


def _cover(system: System, layers: Sequence[Layer], goal: Goal, owed: Owed) -> tuple[int, list[Orbit]]:
    """The bound that the cover shows, and the last stage's orbits."""
    if goal.runs or goal == NOWHERE:
        raise Rejected("a cover for a wave of several pulses")
    stages = [_stage(system, layer, layer is layers[-1], goal) for layer in layers]
    bound = sum(stage.claim.bound for stage in stages)
    _none(certificate.stage_form_faults(system, stages, bound))
    for number, (stage, ours, assumed) in enumerate(certificate.claimed_stages(system, stages)):
        claim = stage.claim
        owe_orbits(ours, claim.orbits, f"stage {number}", owed)
        after = "at once" if claim.unrolled is None else f"after {claim.unrolled} half-cycles"
        pairs = zip(claim.orbits, claim.recoveries, strict=True)
        good = ", ".join(f"{k} of {run.lead_half_cycles}+{run.loop_half_cycles}" for run, k in pairs)
        told = f"{after}, joining within {claim.merge}, good within {claim.bound}; its orbits after {good}"
        for each in certificate.cover_obligations(ours, assumed, claim):
            owed.add([Obligation(f"stage {number}, {each.name}: {told}", each.goal)])
    return bound, list(stages[-1].claim.orbits)


def _stage(system: System, layer: Layer, last: bool, goal: Goal) -> Stage:
    names = set(layer.registers)
    if not names <= set(system.names) or system.clock not in names:
        raise Rejected("a stage of registers that there are not")
    ours = system if last else certificate.part(system, names)
    if tuple(ours.names) != layer.registers:
        raise Rejected("a stage whose registers are not in the machine's order")
    orbits = tuple(orbit_of(each.track, ours, "a stage's orbit") for each in layer.orbits)
    for each in layer.orbits:
        if each.spread is not None:
            count, stride = each.spread
            _check_items([Beat(stride, 0)], [w for _, w in ours.variables], "spread")
            if not each.track.lead or not each.track.loop or count > 1 << ours.bits:
                raise Rejected("a spread of nothing, or of more than there is")
    claim = CoverClaim(
        orbits=orbits,
        recoveries=tuple(each.recovery for each in layer.orbits),
        spreads=tuple(each.spread for each in layer.orbits),
        unrolled=layer.unrolled,
        merge=layer.merge,
        bound=layer.bound,
        period=goal.period if last else 0,
        high=goal.high if last else 0,
    )
    return Stage(ours, claim)


def _none(faults: Sequence[str]) -> None:
    if faults:
        raise Rejected(f"everywhere: {faults[0]}")
