"""From a design and its ports to its rhythm: where the engines are tried, one line each, and their words checked.

An engine's answer is used only after `certificate` has checked it. What fails the check because a step hangs on
a value that x stands for is left open; any other failure is a fault of this program.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from dataclasses import replace

from prover import accumulator, certificate, glitch, graph, linear, orbit, path, recode, reset, tables
from prover import expr as e
from prover.accumulator import Accumulator
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError, UserError
from prover.expr import Expr
from prover.good import good_since, of_runs, scope_of
from prover.ports import Ports
from prover.release import Freed, Release, after_release, differs, releases, some_releases, too_short, unknown
from prover.rhythm import (
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
    Wave,
    goal_of,
)
from prover.settling import Settling, settle
from prover.solve import find
from prover.spec import Spec
from prover.system import State, System, cone, lies_at, project

GRAPH_FIRST = 19
"""Bits of a state, the clock's level among them, up to which the graph is no slower than a cover may be."""

MOST_LOOPS_FOLLOWED = 64
"""Loops of a large graph that are followed state by state to look at their steps."""

SMALL = 13
"""Bits of a state, the clock's level among them, up to which the graph is built without looking for more."""


def rhythm_of(ports: Ports, spec: Spec, effort: Effort) -> Rhythm:
    """Everything the engines find out about the divider within the effort."""
    rhythm, system, held, under = _begun(ports, spec, effort)
    if rhythm.settling.depth is None:
        return rhythm
    goal = _goal(spec, rhythm)
    try:
        if held is not None and spec.ratio is not None:
            why = held.problem or "the time ran out before reset was released"
            rhythm = replace(rhythm, release=replace(unknown(ports, why), held=held))
            if under is not None:
                rhythm = replace(rhythm, release=_release(rhythm, ports, spec, system, held, under, effort))
        rhythm = _with_power_up(rhythm, system, goal, effort)
    except OutOfEffort as out:
        rhythm = replace(rhythm, recovery=Recovery(None, False, open=str(out)), open=rhythm.open or str(out))
    return rhythm if spec.ratio is None else _with_glitches(rhythm, ports, spec, system, effort)


def from_starts(ports: Ports, starts: Sequence[Start], effort: Effort) -> Rhythm:
    """What the engines find out from states of the whole divider alone, with its reset released."""
    system, settling = settle(ports.design, ports.clock, ports.running, ports.output_value, effort)
    settling = checked(settling, effort)
    if settling.depth is None:
        why = settling.open or "the micro-steps do not settle"
        return Rhythm(system, settling, "initial", (), (), (), False, None, None, False, open=why)
    machine, placed = _machine(system, tuple(starts), effort)
    # States that differ only in what the output does not depend on are one.
    placed = tuple({start.state: start for start in placed}.values())
    orbits = _orbits(machine, placed, effort)
    return Rhythm(machine, settling, "initial", placed, orbits, (), False, None, None, False)


def from_power_up(ports: Ports, spec: Spec, goal: Goal | None, effort: Effort) -> Rhythm:
    """What the engines find out about all power-up states, and how long these take until they show a wave."""
    rhythm, system, _, _ = _begun(ports, spec, effort)
    if rhythm.settling.depth is None:
        return rhythm
    return _with_power_up(rhythm, system, goal, effort)


def _begun(
    ports: Ports, spec: Spec, effort: Effort
) -> tuple[Rhythm, System, reset.Held | None, System | None]:
    """The rhythm from the start states; the divider as a machine; what reset leaves, and the machine under it."""
    design = ports.design
    system, settling = settle(design, ports.clock, ports.running, ports.output_value, effort)
    settling = checked(settling, effort)
    held, under = _held(ports, spec, settling, effort)
    scope, starts, held = _starts(ports, spec, system, settling, held)
    if settling.depth is None:
        why = settling.open or "the micro-steps do not settle"
        return _nothing_known(ports, spec, system, settling, scope, why), system, held, under
    won = _races_won(ports, settling, starts, effort)
    machine, starts = _machine(system, starts, effort)
    adding = _accumulator(machine, spec, starts, effort)
    adds, orbits = adding or (None, _orbits(machine, starts, effort))
    methods = {"orbit": "orbit of each start state, traced with jumps; every step checked"}
    rhythm = Rhythm(
        system=machine,
        settling=settling,
        scope=scope,
        starts=starts,
        orbits=orbits,
        loops=(),
        complete=False,
        recovery=None,
        stuck=None,
        never_stuck=False,
        reset_half_cycles=held.half_cycles if held else None,
        unforced=held.unforced if held else (),
        open=held.problem if held else "",
        methods=methods if adds is None else {"orbit": adds.method(), "power-up": adds.method()},
        races_won=won,
        accumulator=adds,
    )
    return rhythm, system, held, under


def _machine(system: System, starts: tuple[Start, ...], effort: Effort) -> tuple[System, tuple[Start, ...]]:
    """What the engines work on, with the start states in it: the whole system while its graph is small enough,
    else what the output depends on, ripple chains read as words."""
    if system.bits <= SMALL:
        return system, starts
    inner = cone(system)
    counted = linear.logs(inner, effort)
    if counted is not None and counted.logs is not None:
        faults = certificate.linear_faults(inner, counted.logs, effort)
        if faults:
            raise InternalError(f"a matrix fails its check: {'; '.join(faults)}")
        placed = (linear.moved(project(system, s.state, inner), inner, counted) for s in starts)
        return counted, tuple(replace(s, state=state) for s, state in zip(starts, placed, strict=True))
    if graph.fits(system):
        return system, starts
    machine = inner if graph.fits(inner) else recode.live(inner)
    if not graph.fits(machine):
        machine = recode.words(_decoded(machine, effort), effort)
    placed = (project(system, s.state, machine) for s in starts)
    return machine, tuple(replace(s, state=state) for s, state in zip(starts, placed, strict=True))


def _decoded(system: System, effort: Effort) -> System:
    """The system with registers in Gray code read as numbers, if that can be shown to be right."""
    machine, known = recode.gray(system)
    claims = certificate.gray_obligations(system, machine, known)
    return machine if all(certificate.discharge(claim, effort) for claim in claims) else system


def checked(settling: Settling, effort: Effort) -> Settling:
    """The micro-steps' bound and the absence of races, with each of their questions asked again from its text."""
    try:
        for number, goal in enumerate(settling.goals):
            if not certificate.discharge(certificate.Obligation(f"micro-steps {number}", goal), effort):
                raise InternalError("a bound on the micro-steps fails its check")
    except OutOfEffort as out:
        return replace(settling, depth=None, open=str(out))
    return settling


def _nothing_known(
    ports: Ports, spec: Spec, system: System, settling: Settling, scope: Scope, why: str
) -> Rhythm:
    recovery = Recovery(None, False, open=why)
    release = unknown(ports, why) if ports.reset is not None and spec.ratio is not None else None
    return Rhythm(
        system, settling, scope, (), (), (), False, recovery, None, False, open=why, release=release
    )


def _orbits(system: System, starts: Sequence[Start], effort: Effort) -> tuple[Orbit, ...]:
    """The start states' orbits; a loop that they share is traced and checked once."""
    known: orbit.Places = {}
    refuted: set[Expr] = set()
    found = []
    for start in starts:
        run = follow(system, start.state, effort, known, refuted)
        known |= orbit.onward(run.loop)
        found.append(run)
    return tuple(found)


def _accumulator(
    system: System, spec: Spec, starts: Sequence[Start], effort: Effort
) -> tuple[Accumulator, tuple[Orbit, ...]] | None:
    """What shows a claim on average of a machine too wide for its graph, and the first pulses from the start states;
    None where it is not so from the start."""
    if spec.ratio is None or not spec.mean or graph.fits(system) or not starts:
        return None
    from prover import circle

    try:
        ours, mean = effort.share(effort.left / 3), Mean(spec.ratio, spec.high)
        found = circle.look(system, starts[0].state, mean, ours)
        if found is None:
            return None
        runs = tuple(circle.first_pulses(system, start.state, found, ours) for start in starts)
    except OutOfEffort:
        return None
    return (found, runs) if all(accumulator.starts_well(system, found, run) for run in runs) else None


def follow(
    system: System,
    start: State,
    effort: Effort,
    known: orbit.Places | None = None,
    refuted: set[Expr] | None = None,
) -> Orbit:
    """A start state's orbit, checked. It is left unclosed, with the reason, where the check can't be made.

    `known` are loops found before, and `refuted` obligations discharged before, on the same system."""
    found = orbit.trace(system, start, effort, known)
    try:
        faults = certificate.orbit_faults(system, found, effort, refuted)
    except OutOfEffort as out:
        return _start_only(system, start, str(out))
    if faults and system.choices:
        why = f"the run hangs on a value that x stands for, at {faults[0]}"
        return _start_only(system, start, why)
    if faults:
        raise InternalError(f"an orbit's certificate fails: {'; '.join(faults[:3])}")
    return found


def _start_only(system: System, start: State, why: str) -> Orbit:
    """An orbit of which nothing but the start is certain."""
    widths = tuple(width for _, width in system.variables)
    return Orbit((path.Beat(start, system.out(start)),), (), widths, why)


# -- where from --------------------------------------------------------------------------------------------


def starts_of(
    ports: Ports, spec: Spec, system: System, settling: Settling, effort: Effort
) -> tuple[Scope, tuple[Start, ...], reset.Held | None]:
    """Where the claim begins, the start states there, and what reset leaves where there is one."""
    held, _ = _held(ports, spec, settling, effort)
    return _starts(ports, spec, system, settling, held)


def _starts(
    ports: Ports, spec: Spec, system: System, settling: Settling, held: reset.Held | None
) -> tuple[Scope, tuple[Start, ...], reset.Held | None]:
    if settling.depth is None:
        return spec.start or ("reset" if ports.reset else "any"), (), held
    if spec.start == "any":
        return "any", (), held
    limit = _limit(ports, settling)
    if held is not None and spec.start in (None, "reset"):
        starts = reset.released(system, held, ports.resetting, limit)
        if held.problem or isinstance(starts, str):
            return "reset", (), replace(held, states=(), problem=held.problem or str(starts))
        return "reset", starts, held
    found = reset.initial(system, limit)
    if isinstance(found, str):
        if spec.start == "initial":
            raise UserError(f"--start initial: {found}", hint="give initial values, or use --start any")
        return "any", (), held
    return "initial", found, held


def _limit(ports: Ports, settling: Settling) -> int:
    """Micro-steps within which all settles, around a release as well."""
    return max(settling.depth or 0, 2 * len(ports.design.registers) + 8)


def _held(
    ports: Ports, spec: Spec, settling: Settling, effort: Effort
) -> tuple[reset.Held | None, System | None]:
    """What reset leaves and how long that takes, checked, and the system under reset; None for what there is not."""
    if ports.reset is None:
        if spec.start == "reset":
            hint = "name it with --reset PORT=LEVEL"
            raise UserError("--start reset: no reset was recognised", hint=hint)
        if spec.reset_cycles is not None:
            raise UserError("--reset-cycles: no reset was recognised", hint="name it with --reset PORT=LEVEL")
        return None, None
    if settling.depth is None:
        return None, None
    try:
        return _held_long(ports, effort)
    except OutOfEffort as out:
        return unknown(ports, str(out)).held, None


def _held_long(ports: Ports, effort: Effort) -> tuple[reset.Held, System | None]:
    ports = reset.seen_by(ports)
    design = ports.design
    under, settled = settle(design, ports.clock, ports.resetting, ports.output_value, effort, races=False)
    held = reset.hold(design, ports.clock, ports.resetting, effort)
    if settled.depth is None:
        # Where the micro-steps were cut short, what the registers hold is not known.
        why = settled.open or "the registers do not settle while reset is held"
        return replace(held, states=(), problem=why), None
    if held.states:
        held = reset.exactly(under, held, lambda *place: _leaves(under, held, *place).goal, effort)
    for level, count in enumerate(held.needs if held.states else ()):
        if not certificate.discharge(_leaves(under, held, level, count), effort):
            raise InternalError("reset does not lead where it was found to lead")
    return held, under


def _leaves(under: System, held: reset.Held, level: int, count: int) -> certificate.Obligation:
    return certificate.reset_goal(under, level, count, held.states)


def _release(
    rhythm: Rhythm,
    ports: Ports,
    spec: Spec,
    whole: System,
    held: reset.Held,
    under: System,
    effort: Effort,
) -> Release:
    """Every release of reset, followed as long as there is time."""
    adds = rhythm.accumulator
    effort.say("releasing reset")
    limit = _limit(ports, rhythm.settling)
    found = releases(ports, under, held, limit)
    machine = rhythm.system
    known: orbit.Places = {}
    done = {start.state: (run, run.wave()) for start, run in zip(rhythm.starts, rhythm.orbits, strict=True)}
    for run in rhythm.orbits:
        known |= orbit.onward(run.loop)
    refuted: set[Expr] = set()
    ours = Effort(effort.left / 4)

    if not held.states:
        found = some_releases(ports, under, held, _left_by(under, ours), limit)

    def followed(freed: Freed) -> Freed:
        everything = after_release(whole, held, freed, ports.resetting, limit)
        if everything is None:
            return freed
        state = recode.placed(everything, whole, machine)
        if adds is not None:
            from prover import circle

            run = circle.first_pulses(machine, state, adds, ours)
            return replace(freed, orbit=run, right=accumulator.gets_right(machine, adds, state))
        if state not in done:
            run = follow(machine, state, ours, known, refuted)
            done[state] = run, run.wave()
            known.update(orbit.onward(run.loop))
        return freed.followed(*done[state])

    found = replace(
        found,
        on_time=tuple(followed(each) for each in found.on_time),
        late=tuple(followed(each) for each in found.late),
    )
    if spec.reset_cycles is None or not found.on_time:
        return found
    for start in _slow_states(held, under, spec.reset_cycles):
        short = too_short(found, under, start, spec.reset_cycles)
        if short is None:
            continue
        short = followed(short)
        if differs(found, short):
            return replace(found, short=short)
    return found


def _left_by(under: System, effort: Effort) -> list[tuple[State, State]]:
    """A few states on loops under reset, each with the state an input cycle before it."""
    found: dict[State, State] = {}
    for level in (0, 1):
        for number in range(reset.SAMPLES // 2):
            run = follow(under, reset.any_at_rest(under, level, number), effort)
            for place in (0, 1) if run.closed else ():
                at = run.lead_half_cycles + run.loop_half_cycles + place
                found.setdefault(run.state(at), run.state(at - 2))
    return [(start, state) for state, start in found.items()]


def _slow_states(held: reset.Held, under: System, cycles: int) -> Iterator[State]:
    """States at rest under reset that so many input cycles may be too short for, the slowest first."""
    for level in (0, 1):
        slowest = held.slowest[level]
        if held.needs[level] > 2 * cycles and slowest is not None:
            yield slowest
            for number in range(reset.SAMPLES):
                yield reset.any_at_rest(under, level, number)


def _races_won(ports: Ports, settling: Settling, starts: Sequence[Start], effort: Effort) -> tuple[str, ...]:
    """What the output would do if the edge won each race against a clear that is being released."""
    if not any(race.kind == "release" for race in settling.races):
        return ()
    system, other = settle(
        ports.design, ports.clock, ports.running, ports.output_value, effort, edge_wins=True
    )
    if other.depth is None:
        return ("never settles",)
    # Without a start state of its own, the divider is followed from the states that show the races.
    states = [start.state for start in starts] or [race.state for race in settling.races]
    told = [_told(orbit.trace(system, state, effort).wave()) for state in states]
    return tuple(dict.fromkeys(told))


def _told(wave: Wave | None) -> str:
    if wave is None:
        return "not known"
    if wave.stuck:
        return f"stuck at {wave.runs[0][0]}"
    return f"period {wave.period} half-cycles, high {wave.high}"


# -- within a half-cycle -----------------------------------------------------------------------------------


def _with_glitches(rhythm: Rhythm, ports: Ports, spec: Spec, whole: System, effort: Effort) -> Rhythm:
    """The rhythm completed with what happens on the way from one half-cycle to the next."""
    machine = rhythm.system
    goal = goal_of(spec, [*(orbit.wave() for orbit in rhythm.orbits), *(loop.wave for loop in rhythm.loops)])
    good = rhythm.good or of_runs(rhythm, (), False, goal)

    def follows(state: State) -> Orbit | None:
        run = follow(machine, recode.placed(state, whole, machine), effort)
        return run if good.none or good_since(run, goal) == 0 else None

    try:
        effort.say("looking for glitches")
        found = glitch.find(
            ports, whole, scope_of(whole, machine, good), follows, lambda goal: find(goal, effort)
        )
        for number, claim in enumerate(found.goals):
            if not certificate.discharge(certificate.Obligation(f"glitches {number}", claim), effort):
                raise InternalError("the absence of a glitch fails its check")
    except OutOfEffort as out:
        found = glitch.Glitches(open=str(out))
    return replace(rhythm, glitches=found)


# -- from everywhere ---------------------------------------------------------------------------------------


def _goal(spec: Spec, rhythm: Rhythm) -> Goal | Mean | None:
    """The claim, or when measuring the wave that the first start runs into, if it has one high run a period. A mean
    stays one where no start state runs into a wave that has it."""
    waves = [orbit.wave() for orbit in rhythm.orbits]
    if spec.ratio is not None and spec.mean:
        mean = Mean(spec.ratio, spec.high)
        return mean.among(waves) or mean
    if spec.ratio is not None:
        return Goal(spec.period, spec.high_half_cycles)
    wave = waves[0] if waves else None
    if wave is None or wave.stuck or len(wave.runs) != 2:
        return None
    return Goal.of(wave)


def _with_power_up(rhythm: Rhythm, whole: System, goal: Goal | Mean | None, effort: Effort) -> Rhythm:
    """The rhythm completed with every power-up state, by the first engine that can take the machine."""
    adds = rhythm.accumulator
    if adds is not None:
        recovery = Recovery(adds.worst, adds.slowest is not None, adds.slowest)
        return replace(rhythm, recovery=recovery, never_stuck=True)
    found = _by_either(rhythm, goal, effort)
    lost = found.recovery.lost if found.recovery else None
    for run in (lost, found.stuck):
        if run is not None and not _is_power_up(whole, rhythm.system, run.start, effort):
            why = "a state that would be lost, if registers beside it could power up so"
            return replace(
                found, recovery=Recovery(None, False, open=why), stuck=None, never_stuck=False, open=why
            )
    return found


def _by_either(rhythm: Rhythm, goal: Goal | Mean | None, effort: Effort) -> Rhythm:
    """Small machines by their graph; middling ones by a cover if that is soon found, and by their graph if not.

    Covers know waves of one pulse only."""
    several = isinstance(goal, Mean) or (goal is not None and bool(goal.runs))
    uneven = goal is None and any(wave and len(wave.runs) > 2 for wave in map(Orbit.wave, rhythm.orbits))
    if (several or uneven or rhythm.system.bits <= GRAPH_FIRST) and graph.fits(rhythm.system):
        return _by_graph(rhythm, goal, effort)
    if several or isinstance(goal, Mean):
        why = (
            f"{rhythm.system.bits - 1} register bits: too many for their graph, and a wave of several pulses"
        )
        return replace(rhythm, recovery=Recovery(None, False, open=why), open=rhythm.open or why)
    if not graph.fits(rhythm.system) or rhythm.system.logs is not None:
        return _by_cover(rhythm, goal, effort)
    found = _by_cover(rhythm, goal, Effort(effort.left / 4))
    return found if found.complete else _by_graph(rhythm, goal, effort)


def _is_power_up(whole: System, machine: System, state: State, effort: Effort) -> bool:
    """Whether a state of the cone is part of a power-up state of the whole machine."""
    if whole is machine:
        return True
    return find(e.bvand(whole.settled, lies_at(machine, state, whole)), effort) is not None


def _loops_of(rhythm: Rhythm, more: Sequence[Orbit], goal: Goal | None) -> tuple[Loop, ...]:
    """The loops of the start states' orbits and of more, each once."""
    loops: dict[State, Loop] = {}
    for run in (*rhythm.orbits, *more):
        wave = run.wave()
        if wave is None:
            continue
        example = path.first_state(run.loop)
        good = goal is not None and goal.fits(wave)
        loops.setdefault(
            min(beat.state for beat in path.beats(run.loop)),
            Loop(example, run.loop_half_cycles, wave, good),
        )
    return tuple({(loop.length, loop.wave): loop for loop in loops.values()}.values())


def _by_cover(rhythm: Rhythm, goal: Goal | None, effort: Effort) -> Rhythm:
    """The power-up states of a machine too wide for its graph."""
    from prover import wide

    system = rhythm.system
    seeds = [orbit.start for orbit in rhythm.orbits]
    starts = [*seeds, *corners(system)]
    found = wide.cover_in_stages(system, goal, starts, effort)
    if found is None:
        found = wide.cover(system, goal, system.settled, starts, effort)
    lines = [line.orbit for line in found.lines]
    loops = _loops_of(rhythm, lines, goal)
    methods = {**rhythm.methods, "power-up": found.method}
    good = of_runs(rhythm, lines, False, goal) if goal else None
    rhythm = replace(rhythm, loops=loops, methods=methods, good=good)
    stuck = next((line.orbit for line in found.lines if _frozen(line.orbit)), None)
    lost = next((line.orbit for line in found.lines if line.recovery is None), None)
    for run in (stuck, lost):
        if run is not None and certificate.orbit_faults(system, run, effort):
            raise InternalError("the orbit of a lost state does not replay")
    if lost is not None:
        why = rhythm.open or "the search ended with the first power-up state that never becomes good"
        return replace(rhythm, recovery=Recovery(None, False, lost=lost), stuck=stuck, open=why)
    if found.worst is None:
        why = f"{system.bits - 1} register bits: {found.why}"
        recovery = Recovery(None, False, open=why) if goal is not None else None
        return replace(rhythm, recovery=recovery, stuck=stuck, open=rhythm.open or why)
    faults = certificate.stage_faults(system, found.claims, found.worst, effort)
    if faults and system.choices:
        # The search takes x for one value on the way; the check does not.
        why = "the paths that cover all states hang on a value that x stands for"
        return replace(rhythm, recovery=Recovery(None, False, open=why), open=rhythm.open or why)
    if faults:
        # The search may know more than its claim says; what the check does not uphold is not claimed.
        why = f"the check does not uphold the paths that were found: {'; '.join(faults[:3])}"
        return replace(rhythm, recovery=Recovery(None, False, open=why), open=rhythm.open or why)
    exact = found.slowest is not None
    if goal and exact and found.slowest is not None and found.worst > 0:
        run = follow(system, found.slowest, effort)
        if run.closed and certificate.good_from(run, found.worst - 1, goal):
            raise InternalError("a start state that does not need as long as it was found to")
        # Where the effort does not suffice to follow it, nothing shows that it needs so long.
        exact = run.closed
    worst = Recovery(found.worst, exact, found.slowest if exact else None)
    # Every state gets on one of the lines, so their loops are all there are.
    return replace(
        rhythm,
        complete=True,
        recovery=worst if goal else None,
        stuck=stuck,
        never_stuck=stuck is None,
        stages=found.claims,
        good=of_runs(rhythm, lines, True, goal) if goal else None,
    )


def _frozen(run: Orbit) -> bool:
    wave = run.wave()
    return wave is not None and wave.stuck


def corners(system: System) -> list[State]:
    """Start states that are often lost: all zeros, all ones, a single one, and a few at random."""
    rng = random.Random(0)
    widths = [width for _, width in system.variables]
    zeros, ones = tuple(0 for _ in widths), tuple((1 << w) - 1 for w in widths)
    return [zeros, ones, (1, *zeros[1:]), *(tuple(rng.getrandbits(w) for w in widths) for _ in range(2))]


def _by_graph(rhythm: Rhythm, goal: Goal | Mean | None, effort: Effort) -> Rhythm:
    system = rhythm.system
    states = graph.build(system, effort)
    methods = {
        **rhythm.methods,
        "power-up": f"state graph of all {1 << system.bits} states; every step checked",
    }
    rhythm = replace(rhythm, methods=methods)
    if not states.start.any():
        why = "no power-up state is at rest"
        return replace(rhythm, recovery=Recovery(None, False, open=why), open=why)
    if system.choices:
        return _by_graph_with_choices(rhythm, states, goal, effort)
    found = graph.basins(states, effort, goal if isinstance(goal, Goal) else None)
    if isinstance(goal, Mean):
        aim = goal.among(loop.wave for loop in found.loops)
        if aim is not None:
            found = graph.basins(states, effort, aim)
        goal = aim or NOWHERE
    faults = certificate.loop_faults(system, found.members, found.distance, effort)
    if faults:
        raise InternalError(f"a list of loops fails its check: {'; '.join(faults)}")
    first_stuck = next((loop for loop in found.loops if loop.stuck), None)
    stuck = follow(system, first_stuck.example, effort) if first_stuck else None
    rhythm = replace(rhythm, loops=found.loops, complete=True, stuck=stuck, never_stuck=stuck is None)
    if goal is None:
        return replace(rhythm, census=graph.census(states, found, None))
    table = graph.ranks(states, found, goal)
    rhythm = replace(rhythm, census=graph.census(states, found, table))
    recovery = _graph_recovery(system, states, found, table, goal, effort)
    return replace(rhythm, recovery=recovery, good=_graph_good(rhythm, states, table, goal, effort))


def _graph_good(rhythm: Rhythm, states: graph.Graph, table: graph.Ranks, goal: Goal, effort: Effort) -> Good:
    """The good states as a table while that is short, else as the runs round their loops."""
    system = rhythm.system
    if (states.start & (table.phase >= 0)).any() and system.bits <= tables.MOST_BITS_IF_REGULAR:
        phases = tuple(table.phase.tolist())
        if system.bits <= tables.MOST_BITS or tables.is_regular(system, [phases]):
            return Good(phases, (), "every good state")
    listed = [loop for loop in rhythm.loops if loop.good] or rhythm.loops
    runs = [follow(system, loop.example, effort) for loop in listed[:MOST_LOOPS_FOLLOWED]]
    return of_runs(rhythm, runs, rhythm.complete and len(listed) <= MOST_LOOPS_FOLLOWED, goal)


def _graph_recovery(
    system: System,
    states: graph.Graph,
    found: graph.Basins,
    table: graph.Ranks,
    goal: Goal,
    effort: Effort,
) -> Recovery:
    import numpy as np

    illegal = int((states.start & (table.rank != 0)).sum())
    lost = np.flatnonzero(states.start & (table.rank < 0))
    if len(lost):
        # A state on a false loop says most; the shortest lead-in otherwise.
        nearest = lost[np.argmin(found.distance[lost], axis=0)]
        return Recovery(None, False, lost=follow(system, states.state(int(nearest)), effort), illegal=illegal)
    faults = certificate.rank_faults(system, table.phase, table.rank, goal, effort)
    if faults:
        raise InternalError(f"a recovery certificate fails: {'; '.join(faults)}")
    at_power_up = np.where(states.start, table.rank, -1)
    slowest = int(at_power_up.argmax())
    return Recovery(int(at_power_up[slowest]), True, states.state(slowest), illegal=illegal)


def _by_graph_with_choices(
    rhythm: Rhythm, states: graph.Graph, goal: Goal | Mean | None, effort: Effort
) -> Rhythm:
    system = rhythm.system
    if isinstance(goal, Mean):
        why = "no wave with the mean is known, and x makes others"
        return replace(rhythm, recovery=Recovery(None, False, open=why), open=rhythm.open or why)
    frozen = [graph.held_level_with_choices(states, level) & states.start for level in (0, 1)]
    never = not any(bool(f.any()) for f in frozen)
    why = "" if never else "a value that x stands for may freeze the output"
    loops = _loops_of(rhythm, (), goal)
    rhythm = replace(rhythm, loops=loops, never_stuck=never, open=rhythm.open or why)
    if goal is None:
        return rhythm
    table = graph.ranks_with_choices(states, goal, effort)
    if table is None:
        return replace(rhythm, recovery=Recovery(None, False, open="too many states with x to cover"))
    rhythm = replace(rhythm, good=_graph_good(rhythm, states, table, goal, effort))
    if (states.start & (table.rank < 0)).any():
        why = "a value that x stands for may keep some power-up state from recovering"
        return replace(rhythm, recovery=Recovery(None, False, open=why))
    faults = certificate.rank_faults(system, table.phase, table.rank, goal, effort)
    if faults:
        raise InternalError(f"a recovery certificate fails: {'; '.join(faults)}")
    worst = int(table.rank[states.start].max())
    slowest = int((states.start & (table.rank == worst)).argmax())
    illegal = int((states.start & (table.rank != 0)).sum())
    recovery = Recovery(worst, True, states.state(slowest), illegal=illegal)
    return replace(rhythm, recovery=recovery, complete=True)
