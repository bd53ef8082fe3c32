"""Accumulators found by samples: a register's circle and stride, and the arc on which the output is 1.

A register that goes on by one stride each input cycle, or by one of two that differ by a whole circle, is a
candidate; where its circle begins is found by bisection, and so are the ends of the arc. What is found is asked
about, and checked as everything: see `accumulator`.
"""

from __future__ import annotations

import random
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise
from math import ceil

from prover import certificate, orbit, path
from prover import expr as e
from prover.accumulator import BEHIND, JOINED, Accumulator, Steps, obligations, onward, wrong
from prover.effort import Effort
from prover.errors import InternalError
from prover.expr import Expr
from prover.rhythm import Mean, Orbit
from prover.solve import find
from prover.system import State, System

LEAST_BITS = 8
"""Bits of a register from which it is looked at as an accumulator."""

MOST_BEATS = 4000
"""Half-cycles up to which the beginning of a run is followed one by one."""

MOST_ITEMS = 200
"""Cycles and repeats of them of which the beginning of a run is made."""

SAMPLED = 512
"""Input cycles of a run, and places on the circle, that are looked at."""


def look(system: System, start: State, mean: Mean, effort: Effort) -> Accumulator | None:
    """An accumulator with the mean that decides the output, checked; None if there is none of which that is shown.

    Raises OutOfEffort."""
    effort.say("looking for an accumulator")
    if system.choices:
        return None
    start = onward(system, start, 4 * BEHIND)
    for place, (name, width) in enumerate(system.variables):
        if width < LEAST_BITS:
            continue
        for level in (0, 1):
            begins = start if start[-1] == level else system.next(start)
            circle = _circle(system, begins, place, width, mean.ratio)
            if circle is None:
                continue
            base, modulus, stride = circle
            arc = _arc(system, begins, place, width, circle)
            if arc is None:
                continue
            for late in (False, True):
                found = Accumulator(name, width, base, modulus, stride, level, arc, late, BEHIND)
                proved = _proved(system, found, effort) if found.has(mean) else None
                if proved is not None:
                    return proved
    return None


def first_pulses(system: System, state: State, found: Accumulator, effort: Effort) -> Orbit:
    """The beginning of a run whose round is not followed: its first few pulses, every step checked."""
    room = found.worst + 8 * ceil(found.mean)
    widths = tuple(width for _, width in system.variables)
    if room <= MOST_BEATS:
        beats: list[path.Item] = []
        for _ in range(room):
            beats.append(path.Beat(state, system.out(state)))
            state = system.next(state)
        lead = path.folded(beats, widths)
    else:
        run = orbit.trace(system, state, effort, most=MOST_ITEMS)
        lead, _ = path.split((*run.lead, *run.loop), room, widths)
    begun = Orbit(lead, (), widths, "a round that is not followed")
    if certificate.orbit_faults(system, begun, effort):
        raise InternalError("the first pulses of an orbit fail their check")
    return begun


def _circle(
    system: System, state: State, place: int, width: int, ratio: Fraction
) -> tuple[int, int, int] | None:
    """Base, modulus and stride of a register that goes on by a stride once an input cycle, and back by what makes the
    ratio's circle of it; None for one that does not. The state is one whose next edge moves the register."""
    size = 1 << width
    values = []
    for _ in range(SAMPLED):
        values.append(state[place])
        held = system.next(state)
        state = system.next(held)
        if held[place] != state[place]:
            # It moves with the other edge.
            return None
    for stride in dict.fromkeys((b - a) % size for a, b in pairwise(values)):
        modulus = ratio * stride
        if not 0 < stride < modulus <= size or modulus.denominator != 1:
            continue
        base = 0 if modulus == size else _base(system, state, place, size, stride, modulus.numerator)
        if base is not None and all((value - base) % size < modulus for value in values):
            return base, modulus.numerator, stride
    return None


def _base(system: System, state: State, place: int, size: int, stride: int, modulus: int) -> int | None:
    """The least value on the circle: where it lands from the first value that goes back."""
    back = (stride - modulus) % size

    def moves(value: int) -> int:
        there = (*state[:place], value, *state[place + 1 :])
        return (onward(system, there, 2)[place] - value) % size

    spots = sorted({x * size // SAMPLED for x in range(SAMPLED)} | {state[place]})
    moved = [moves(value) for value in spots]
    for (low, was), (high, now) in pairwise(zip(spots, moved, strict=True)):
        if (was, now) != (stride, back):
            continue
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (low, middle) if moves(middle) == back else (middle, high)
        return (high + back) % size
    return None


def _arc(
    system: System, state: State, place: int, width: int, circle: tuple[int, int, int]
) -> tuple[int, int] | None:
    """Where on the circle the output is 1, by samples and bisection; None where that is no one arc."""
    base, modulus, stride = circle

    def level(x: int) -> int:
        """The output where the accumulator is at x, and has been going on for a while."""
        before = (base + (x - BEHIND // 2 * stride) % modulus) % (1 << width)
        there = (*state[:place], before, *state[place + 1 :])
        return system.out(onward(system, there, BEHIND))

    rng = random.Random(0)
    spots = sorted(
        {rng.randrange(modulus) for _ in range(SAMPLED)} | {x * modulus // SAMPLED for x in range(SAMPLED)}
    )
    levels = [level(x) for x in spots]
    edges: dict[int, list[int]] = {0: [], 1: []}
    for (low, was), (high, now) in pairwise(
        [*zip(spots, levels, strict=True), (spots[0] + modulus, levels[0])]
    ):
        if was == now:
            continue
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (middle, high) if level(middle % modulus) == was else (low, middle)
        edges[now].append(high % modulus)
    if [len(edges[value]) for value in (0, 1)] != [1, 1]:
        return None
    return edges[1][0], (edges[0][0] - edges[1][0]) % modulus


def _proved(system: System, found: Accumulator, effort: Effort) -> Accumulator | None:
    """The accumulator with all that is known of its power-up states, checked; None if it fails."""
    steps, at = Steps(system), system.names.index(found.register)
    first = found.on_circle(steps[0][at])
    behind = next((n for n in range(BEHIND + 1) if _never(first, steps, found, at, n, effort)), None)
    joined = 0
    while find(e.bvand(system.settled, e.bvnot(found.on_circle(steps[joined][at]))), effort) is not None:
        joined += 1
        if joined > JOINED:
            return None
    if behind is None:
        return None
    # On the circle the place says what the output has to be, at every half-cycle that follows.
    worst = behind + joined
    late = None
    while worst > joined and late is None:
        late = find(e.bvand(system.settled, wrong(steps, found, at, worst - 1)), effort)
        worst -= late is None
    if worst == 0:
        late = find(system.settled, effort) or {}
    slowest = None if late is None else tuple(late.get(name, 0) for name in system.names)
    done = replace(found, behind=behind, joined=joined, worst=worst, slowest=slowest)
    # That it goes on by one stride is only a guess until now.
    return done if all(certificate.discharge(owed, effort) for owed in obligations(system, done)) else None


def _never(first: Expr, steps: Steps, found: Accumulator, at: int, count: int, effort: Effort) -> bool:
    return find(e.bvand(first, wrong(steps, found, at, count)), effort) is None
