"""From a report to the evidence for a certificate: what the engines found, in the form that others can check.

Most of it is there already. What a small machine's state graph found is written as a table; a larger graph would
be too long for one, so paths that cover its states are looked for instead, as for a wide machine. Where neither can
be had the evidence says nothing, and the certificate leaves open what the report may have proved.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from itertools import product
from typing import TypeVar

from prover import expr as e
from prover import glitch, graph, linear, path, recode, reset, tables
from prover.analyse import follow
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.evidence import Evidence, Hold, Lasso, Layer, Matrix, Track, layers_of
from prover.expr import Expr
from prover.findings import Report
from prover.good import scope_of
from prover.rebuild import good_of, orbit_of
from prover.rhythm import Goal, Orbit, Rhythm, goal_of
from prover.settling import settle
from prover.solve import Model, find
from prover.system import State, System, cone, lies_at
from prover.tables import Ranking, Rounds

Found = TypeVar("Found")


def collect(report: Report, effort: Effort, glitches: bool = True) -> Evidence:
    """The evidence for the report's verdicts, as far as it can be written; without that on glitches if so told."""
    ports, spec, rhythm = report.ports, report.spec, report.rhythm
    answers = rhythm.settling.answers
    if rhythm.settling.depth is None:
        return Evidence(answers, False, False, (), (), None, None, (), None, (), (), None)
    whole, _ = settle(
        ports.design, ports.clock, ports.running, ports.output_value, effort, ask=repeated(answers)
    )
    hold = _within(lambda: _hold(rhythm, effort))
    followed = rhythm.scope != "reset" or hold is not None
    goal = goal_of(spec, [*(orbit.wave() for orbit in rhythm.orbits), *(loop.wave for loop in rhythm.loops)])
    adds = rhythm.accumulator
    found = replace(
        of_machine(rhythm.system, whole, answers),
        reset=hold,
        starts=tuple(track(orbit) for orbit in rhythm.orbits) if followed else (),
        everywhere=adds or _within(lambda: _everywhere(rhythm, goal, effort)),
        lassos=() if adds else _within(lambda: _lassos(report, whole, effort)) or (),
    )
    return _with_glitches(report, whole, found, goal, effort) if glitches else found


def of_machine(machine: System, whole: System, answers: tuple[Model | None, ...]) -> Evidence:
    """Evidence of nothing but the machine that the engines worked on, as derived from the whole divider."""
    kept = len(machine.describe((0,) * len(machine.variables)))
    inner = cone(whole) if kept < len(whole.variables) or machine.slices else whole
    return Evidence(
        settling=answers,
        cone=inner is not whole,
        parts=kept < len(inner.variables) or bool(machine.slices),
        gray=tuple(register for _, register in machine.grays),
        word=machine.words[0][1] if machine.words else (),
        matrix=_matrix(machine, inner),
        reset=None,
        starts=(),
        everywhere=None,
        lassos=(),
        glitches=(),
        pulse=None,
    )


def _with_glitches(report: Report, whole: System, found: Evidence, goal: Goal, effort: Effort) -> Evidence:
    """The evidence with answers about glitches, asked of the good states that it has, and the run that shows one."""
    rhythm = report.rhythm
    machine, known = rhythm.system, rhythm.glitches
    if known is None or known.open:
        return found
    tracks = [orbit_of(each, machine, "starts") for each in found.starts]
    rhythm = replace(rhythm, orbits=tuple(tracks))
    good = good_of(rhythm, found.everywhere, goal)
    pulse = first = None
    if known.found is not None:
        first = tuple(known.found.state[name] for name in whole.names)
        pulse = Lasso(track(known.found.orbit), first)

    def follows(state: State) -> Orbit | None:
        return known.found.orbit if known.found is not None and state == first else None

    asked = glitch.find(
        report.ports,
        whole,
        scope_of(whole, machine, good, first),
        follows,
        lambda question: find(question, effort),
    )
    if (asked.found is None) != (pulse is None):
        # The time ran out on the way: the certificate leaves it open.
        return found
    return replace(found, glitches=asked.answers, pulse=pulse)


def _within(work: Callable[[], Found]) -> Found | None:
    """What comes of some work within the effort; what does not is left out of the evidence."""
    try:
        return work()
    except OutOfEffort:
        return None


def repeated(answers: Sequence[Model | None]) -> Callable[[Expr], Model | None]:
    """The answers once more, without asking the solver."""
    rest = iter(answers)

    def answer(goal: Expr) -> Model | None:
        if goal.is_const:
            return {} if goal.value else None
        try:
            return next(rest)
        except StopIteration:
            raise OutOfEffort("not answered") from None

    return answer


def _matrix(machine: System, inner: System) -> Matrix | None:
    """What the machine counts, if it is a linear register; which edge and which level show in what it is made of."""
    logs = machine.logs
    if logs is None:
        return None
    for moving, level in product((0, 1), (0, 1)):
        made = linear.counter(inner, logs, moving, level)
        if (made.step, made.output) == (machine.step, machine.output):
            return Matrix(logs.columns, logs.fixed, logs.start, moving, level)
    raise InternalError("a count of steps that is none")


def track(orbit: Orbit) -> Track:
    """The orbit, shorter where an engine followed it beat by beat."""
    lead, loop = (path.folded(items, orbit.widths) for items in (orbit.lead, orbit.loop))
    return Track(lead, loop)


def _hold(rhythm: Rhythm, effort: Effort) -> Hold | None:
    """The states that reset leaves and the runs after its releases, where they are certain."""
    release = rhythm.release
    if release is None or not release.held.states:
        return None
    ports = reset.seen_by(release.ports)
    _, settling = settle(ports.design, ports.clock, ports.resetting, ports.output_value, effort, races=False)
    starts = {start.state for start in rhythm.starts}
    runs = [each.orbit for each in release.runs if each.orbit and each.orbit.start not in starts]
    held, short = release.held, release.short
    return Hold(
        held.needs,
        held.slowest,
        held.states,
        settling.answers,
        None if short is None else short.start,
        tuple(track(run) for run in {run.start: run for run in runs}.values()),
    )


def _everywhere(rhythm: Rhythm, goal: Goal, effort: Effort) -> tuple[Layer, ...] | Ranking | Rounds | None:
    system, recovery = rhythm.system, rhythm.recovery
    recovers = recovery is not None and recovery.worst is not None
    if rhythm.stages and recovers:
        return layers_of(rhythm.stages)
    if not graph.fits(system) or not (recovers or rhythm.complete):
        return None
    if system.bits <= tables.MOST_BITS:
        return _table(system, goal, effort)
    if system.bits <= tables.MOST_BITS_IF_REGULAR:
        table = _table(system, goal, effort)
        if table is not None and _is_regular(system, table):
            return table
    return _covered(rhythm, goal, effort) if recovers and not system.choices else None


def _is_regular(system: System, table: Ranking | Rounds) -> bool:
    if isinstance(table, Ranking):
        return tables.is_regular(system, [table.phase, table.rank])
    following = [-1] * len(table.distance)
    for states in table.members:
        for number, then in zip(states, (*states[1:], states[0]), strict=True):
            following[number] = then
    return tables.is_regular(system, [table.distance, following])


def _table(system: System, goal: Goal, effort: Effort) -> Ranking | Rounds | None:
    states = graph.build(system, effort)
    if system.choices:
        ranks = graph.ranks_with_choices(states, goal, effort)
        if ranks is None or (states.start & (ranks.rank < 0)).any():
            return None
    else:
        found = graph.basins(states, effort, goal)
        ranks = graph.ranks(states, found, goal)
        if (states.start & (ranks.rank < 0)).any():
            return _rounds(states, found)
    bound = int(ranks.rank[states.start].max())
    return Ranking(tuple(ranks.phase.tolist()), tuple(ranks.rank.tolist()), bound)


def _rounds(states: graph.Graph, found: graph.Basins) -> Rounds:
    import numpy as np

    listed = np.zeros(len(states.output), dtype=bool)
    listed[[number for numbers in found.members for number in numbers]] = True
    # What no power-up state leads to may run into loops that are not listed: nothing is claimed of it.
    known = listed[found.entry]
    distance = np.where(known, found.distance, -1)
    levels = tuple(tuple(states.output[numbers].tolist()) for numbers in found.members)
    return Rounds(tuple(tuple(numbers) for numbers in found.members), levels, tuple(distance.tolist()))


def _covered(rhythm: Rhythm, goal: Goal, effort: Effort) -> tuple[Layer, ...] | None:
    from prover import wide

    effort.say("covering all states for the certificate")
    system = rhythm.system
    seeds = [orbit.start for orbit in rhythm.orbits]
    found = wide.cover_in_stages(system, goal, seeds, effort)
    if found is None or not found.claims:
        found = wide.cover(system, goal, system.settled, seeds, effort)
    return layers_of(found.claims) if found.claims and found.worst is not None else None


def _lassos(report: Report, whole: System, effort: Effort) -> tuple[Lasso, ...]:
    """The runs from power-up states that refute something, and the slowest one."""
    rhythm = report.rhythm
    runs: list[Orbit] = []
    recovery = rhythm.recovery
    if recovery is not None and recovery.lost is not None:
        runs.append(recovery.lost)
    if rhythm.stuck is not None:
        runs.append(rhythm.stuck)
    if recovery is not None and recovery.worst is not None and recovery.slowest is not None:
        runs.append(follow(rhythm.system, recovery.slowest, effort))
    if rhythm.scope == "any":
        runs += [f.counterexample.orbit for f in report.findings if f.counterexample is not None]
    out: dict[Lasso, None] = {}
    for run in runs:
        start = _whole(run.start, whole, rhythm.system, effort)
        if start is not None:
            out[Lasso(track(run), start)] = None
    return tuple(out)


def _whole(state: State, whole: System, machine: System, effort: Effort) -> State | None:
    """A power-up state of the whole divider that is this one in the machine; None if there is none."""
    values = machine.describe(state)
    model = find(e.bvand(whole.settled, lies_at(machine, state, whole)), effort)
    if model is None:
        return None
    found = tuple(values.get(name, model.get(name, 0)) for name in whole.names)
    return found if recode.placed(found, whole, machine) == state else None
