"""Whether two dividers have the same output in every half-cycle: where the engines are tried.

Without free inputs each divider is followed on its own and the two outputs are compared as they are written; so too
for every value of inputs that are held, while these are few. Otherwise both run side by side: all states that they
can be in together while these are few, else the shortest difference by unrolling, and what holds between them by
induction. What any engine says is checked by `equality` before `compared` makes a verdict of it.
"""

from __future__ import annotations

import random
from collections.abc import Iterator
from dataclasses import replace
from itertools import product

from prover import analyse, compared, equality, lockstep, relations
from prover import expr as e
from prover.compared import Apiece, Comparison, Followed, Outcome, Run, Together
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.joint import Joint, build, starts_apart
from prover.pair import Pair, Pairing
from prover.ports import Ports
from prover.rhythm import Goal, Rhythm, Start
from prover.solve import Model
from prover.spec import Spec
from prover.system import State

LISTED = 8
"""Bits of held inputs up to which each of their values is a comparison of its own."""

FEW_STEPS = 150_000
"""Steps within which all states of both together are looked for before anything else is tried."""

MANY_STEPS = 3_000_000
"""The same when nothing else has answered."""

FRAMES = 12
"""Half-cycles that are unrolled before an invariant is looked for."""

FURTHEST = 16
"""Half-cycles up to which a lag is looked for where inputs move or have many values."""


def compare(pair: Pair, pairing: Pairing, effort: Effort) -> Comparison:
    """The verdict on two dividers, with what a report tells of it; how long it took is left to the caller."""
    outcome = judge(pair, pairing, effort)
    notes = tuple(
        f"{note.where}: {note.message}" for ports in (pair.old, pair.new) for note in ports.design.notes
    )
    claim, assumed = compared.claim(pair, pairing), compared.assumptions(pair, outcome)
    return Comparison(pair, pairing, claim, outcome, assumed, notes, 0.0)


def judge(pair: Pair, pairing: Pairing, effort: Effort) -> Outcome:
    """Whether the outputs are equal in the sense that is asked for."""
    try:
        if pairing.settled:
            return _settled(pair, pairing, effort)
        if not any(each.moving for each in pair.inputs) and pair.input_bits <= LISTED:
            found = compared.of_runs(_each_value(pair, effort), pairing.lag, effort)
            # Orbits that are not followed to their ends may have a relation between them all the same.
            if found.verdict != "open" or pairing.lag is None:
                return found
        return _side_by_side(pair, pairing, effort)
    except OutOfEffort as out:
        return Outcome("open", str(out))


def _each_value(pair: Pair, effort: Effort) -> Apiece:
    """Both followed from their starts, for every value of the shared inputs."""
    joint = build(pair, 0, effort, races=False)
    followed = []
    for inputs in _values(pair):
        ports = pair.held_at(inputs)
        begun = starts_apart(joint, inputs)
        old = analyse.from_starts(ports[0], [Start(state, cause) for cause, state, _ in begun], effort)
        new = analyse.from_starts(ports[1], [Start(state, cause) for cause, _, state in begun], effort)
        followed.append(Followed(inputs, ports, (old, new)))
    return Apiece(tuple(followed), joint)


def _values(pair: Pair) -> Iterator[Model]:
    """Every value of the shared inputs."""
    for values in product(*(range(1 << each.width) for each in pair.inputs)):
        yield {each.name: value for each, value in zip(pair.inputs, values, strict=True)}


# -- once both have settled --------------------------------------------------------------------------------


def _settled(pair: Pair, pairing: Pairing, effort: Effort) -> Outcome:
    """The loops that all power-up states of each run into, for every value of the shared inputs."""
    if pair.input_bits > LISTED:
        return Outcome("open", f"{pair.input_bits} bits of inputs: too many values to follow each")
    values = [(inputs, pair.held_at(inputs)) for inputs in _values(pair)]
    sides = [
        (ports, replace(spec, start="any"))
        for _, both in values
        for ports, spec in zip(both, (pairing.old, pairing.new), strict=True)
    ]
    found = [analyse.from_power_up(*side, None, effort) for side in sides]
    for place, (side, rhythm) in enumerate(zip(sides, found, strict=True)):
        part = effort.share(effort.left / (len(sides) - place + 1))
        found[place] = _with_loops(_timed(*side, rhythm, part), effort)
    pairs = zip(found[::2], found[1::2], strict=True)
    followed = tuple(Followed(*value, both) for value, both in zip(values, pairs, strict=True))
    return compared.of_loops(Apiece(followed), pairing.lag, effort)


def _timed(ports: Ports, spec: Spec, rhythm: Rhythm, effort: Effort) -> Rhythm:
    """How long any state takes to show the wave, where all loops show one; as it is where that is not found out."""
    waves = {loop.wave for loop in rhythm.loops}
    if not rhythm.complete or len(waves) != 1:
        return rhythm
    (wave,) = waves
    if len(wave.runs) != 2:
        return rhythm
    try:
        goal = Goal(wave.period or 0, wave.high or 0)
        timed = analyse.from_power_up(ports, spec, goal, effort)
    except OutOfEffort:
        return rhythm
    return timed if timed.complete else rhythm


def _with_loops(rhythm: Rhythm, effort: Effort) -> Rhythm:
    """The rhythm with states on its loops, one of each sort, as starts."""
    if not rhythm.complete:
        return rhythm
    shown = dict(rhythm.shown)
    seen: set[compared.Sort] = set()
    for loop in rhythm.loops:
        sort = compared.sort_of(rhythm, loop)
        if sort not in seen and len(seen) < compared.MOST_LOOPS:
            seen.add(sort)
            shown[loop.example] = analyse.follow(rhythm.system, loop.example, effort)
    return compared.on_loops(replace(rhythm, shown=shown))


# -- side by side ------------------------------------------------------------------------------------------


def _side_by_side(pair: Pair, pairing: Pairing, effort: Effort) -> Outcome:
    if pairing.lag is not None:
        return _at_lag(pair, pairing.lag, effort)
    for lag in _likely_lags(build(pair, 0, effort)):
        found = _at_lag(pair, lag, effort)
        if found.verdict == "proved":
            return found
        if found.verdict == "open":
            return replace(found, says=f"with the new output {lag} half-cycles late: {found.says}")
    why = f"the outputs differ at every lag from {-FURTHEST} to {FURTHEST} half-cycles; no other was tried"
    return Outcome("open", why)


def _likely_lags(joint: Joint) -> list[int]:
    """Lags at which random runs show no difference, the least first."""
    rng = random.Random(0)
    stepper = lockstep.Stepper(joint)
    look = e.compile_step(joint.outputs, joint.names)
    lags = sorted(range(-FURTHEST, FURTHEST + 1), key=lambda lag: (abs(lag), lag < 0))
    for _ in range(24):
        _, _, state = lockstep.random_start(joint, rng)
        walk = lockstep.walked(stepper, rng, state, 600, rng.choice((0.5, 0.95, 0.99)))
        old, new = zip(*(look(*each) for each in walk), strict=True)
        lags = [lag for lag in lags if _same(old[max(-lag, 0) :], new[max(lag, 0) :])]
    return lags


def _same(a: tuple[int, ...], b: tuple[int, ...]) -> bool:
    return all(x == y for x, y in zip(a, b, strict=False))


def _at_lag(pair: Pair, lag: int, effort: Effort) -> Outcome:
    """The verdict for one lag, by the first engine that has it."""
    joint = build(pair, lag, effort)
    small = lockstep.reach(joint, effort, FEW_STEPS)
    if small is not None:
        return _of_states(joint, lag, small, effort)
    frames, found = lockstep.unrolled(joint, effort, FRAMES)
    if found is not None:
        return _different(joint, lag, found)
    try:
        claim = relations.invariant(joint, effort.share(0.6 * effort.left))
        if claim is not None:
            return _by_invariant(joint, lag, claim, effort)
        why = "no relation between the two was found that goes on holding"
    except OutOfEffort as out:
        why = str(out)
    try:
        large = lockstep.reach(joint, effort.share(0.5 * effort.left), MANY_STEPS)
        if large is not None:
            return _of_states(joint, lag, large, effort)
    except OutOfEffort:
        pass
    return _unrolled_further(joint, lag, frames, why, effort)


def _unrolled_further(joint: Joint, lag: int, frames: lockstep.Frames, why: str, effort: Effort) -> Outcome:
    """The shortest difference, or as many half-cycles without one as the effort allows."""
    try:
        while True:
            frames, found = lockstep.unrolled(joint, effort, frames.count + 1, frames)
            if found is not None:
                return _different(joint, lag, found)
    except OutOfEffort:
        return Outcome("open", f"{why}; equal for the first {frames.count} half-cycles of every run")


def _by_invariant(joint: Joint, lag: int, claim: equality.Invariant, effort: Effort) -> Outcome:
    faults = equality.invariant_faults(joint, claim, effort)
    if faults:
        raise InternalError(f"an invariant fails its check: {'; '.join(faults[:3])}")
    return compared.of_both(Together(joint, claim), lag)


def _of_states(joint: Joint, lag: int, found: set[State] | lockstep.Divergence, effort: Effort) -> Outcome:
    if isinstance(found, lockstep.Divergence):
        return _different(joint, lag, found)
    faults = equality.reach_faults(joint, found, effort)
    if faults:
        raise InternalError(f"a set of states fails its check: {'; '.join(faults[:3])}")
    return compared.of_both(Together(joint, frozenset(found)), lag)


def _different(joint: Joint, lag: int, found: lockstep.Divergence) -> Outcome:
    """A difference, with inputs left where they are wherever that shows it too."""
    known = {v.name for v in e.variables(found.start.rest)}
    values = {name: value for name, value in found.values.items() if name in known}
    moves = found.moves if joint.moves else ()
    run = Run(joint.starts.index(found.start), values, moves, found.half_cycle)
    return compared.of_both(Together(joint, _calmed(joint, run)), lag)


def _calmed(joint: Joint, run: Run) -> Run:
    """The run with inputs left where they are in every half-cycle in which that shows the same."""
    names = [name.removesuffix(" moved") for name, _ in joint.moves]
    start = joint.starts[run.start]
    zeros = {v.name: 0 for v in e.variables(start.rest)}
    at_rest = dict(zip(joint.names, e.evaluate(start.rest, zeros | run.values), strict=True))
    first = tuple(at_rest[name] for name in names)
    stepper = lockstep.Stepper(joint)
    moves = list(run.moves)
    for place in range(len(moves)):
        calm = [*moves[:place], moves[place - 1] if place else first, *moves[place + 1 :]]
        if lockstep.differs_at(stepper, start, run.values, calm, run.half_cycle) == run.half_cycle:
            moves = calm
    return replace(run, moves=tuple(moves))
