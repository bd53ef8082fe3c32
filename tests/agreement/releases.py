"""What follows a release of reset, counted on levels that are written out one by one: for comparisons with the property."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from itertools import groupby

from agreement import brute

from prover.spec import Spec
from prover.system import State

Map = Mapping[State, State]
Run = tuple[int, int]
"""A level, and for how many halves of a half-cycle."""


def walk(
    state: State, step: Map, output: Mapping[State, int], found: brute.BruteResult[State], spec: Spec
) -> list[int]:
    """The output from a state on, three periods beyond where it is right, or beyond all states."""
    recovery = found.recovery_half_cycles[state]
    length = 3 * spec.period + (len(step) if recovery is None else recovery)
    levels = []
    for _ in range(length):
        levels.append(output[state])
        state = step[state]
    return levels


def joined(before: int, early: Sequence[int], levels: Sequence[int]) -> Iterator[Run]:
    """Runs in halves of a half-cycle: the one that goes on from before the release, and the others. The first level
    lasts for half a half-cycle, because the release is in the middle of one."""
    halves = [*early, levels[0], *(level for level in levels[1:] for _ in range(2))]
    goes_on = 0
    while goes_on < len(halves) and halves[goes_on] == before:
        goes_on += 1
    yield before, goes_on
    for level, group in groupby(halves[goes_on:]):
        yield level, len(list(group))


def whole(runs: Sequence[Run]) -> list[Run]:
    return list(runs[1:-1])


def off(runs: Sequence[Run], spec: Spec) -> list[Run]:
    """The whole pulses and gaps that have another length than they should."""
    return [run for run in whole(runs) if run[1] != 2 * nominal(run[0], spec)]


def nominal(level: int, spec: Spec) -> int:
    return spec.high_half_cycles if level else spec.period - spec.high_half_cycles


def faults(state: State, runs: Sequence[Run], found: brute.BruteResult[State], spec: Spec) -> Iterator[str]:
    if found.recovery_half_cycles[state] is None:
        yield f"{state} is never right"
    elif any(length < 2 * nominal(level, spec) for level, length in whole(runs)):
        yield f"a short pulse after {state}"
