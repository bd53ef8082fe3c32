"""Rhythm: what a divider does from a set of start states. The engines' common answer; properties read it.

Wave      the output's runs, (level, half-cycles), a lead-in and a round that repeats for ever
Stretch   a piece of an orbit along which each input cycle adds the same vector to the registers
Orbit     one start state's path into its loop, as a short list of stretches
Loop      a cycle of states that the machine settles into
Recovery  how long until a state is good, over all power-up states
Rhythm    all of it together
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from itertools import groupby
from typing import Literal

from prover.settling import Settling
from prover.system import State, System

Run = tuple[int, int]
"""A level and the number of half-cycles for which the output keeps it."""

LONGEST_ROUND = 200_000
"""Runs in a wave's round beyond which the round is not written out."""


def merged(runs: Iterable[Run]) -> Iterator[Run]:
    """Neighbouring runs of one level joined."""
    for level, group in groupby(runs, key=lambda run: run[0]):
        yield level, sum(length for _, length in group)


@dataclass(frozen=True, slots=True)
class Wave:
    """The round of a periodic output: runs from a rise on, or one run if the output never changes.

    `runs` covers one smallest period; lengths are half-cycles."""

    runs: tuple[Run, ...]

    @staticmethod
    def of_round(runs: Iterable[Run]) -> Wave:
        """The wave of a loop whose output, once round from anywhere, is `runs`."""
        joined = list(merged(runs))
        if len(joined) == 1:
            return Wave(((joined[0][0], 1),))
        if joined[0][0] == joined[-1][0]:
            joined[0] = (joined[0][0], joined[0][1] + joined.pop()[1])
        if joined[0][0] == 0:
            joined = joined[1:] + joined[:1]
        for size in range(2, len(joined) + 1, 2):
            if len(joined) % size == 0 and joined == joined[:size] * (len(joined) // size):
                return Wave(tuple(_least_rotation(joined[:size])))
        return Wave(tuple(joined))

    @property
    def stuck(self) -> bool:
        return len(self.runs) == 1

    @property
    def period(self) -> int | None:
        """Half-cycles of the smallest period; None if the output never changes."""
        return None if self.stuck else sum(length for _, length in self.runs)

    @property
    def high(self) -> int | None:
        """Half-cycles per period in which the output is 1; None if it never changes."""
        return None if self.stuck else sum(length for level, length in self.runs if level)

    def divides_by(self, period: int, high: int) -> bool:
        """Whether this is one high run of `high` in every `period` half-cycles."""
        return self.runs == ((1, high), (0, period - high))


def _least_rotation(runs: list[Run]) -> list[Run]:
    """The rotation, by whole high-low pairs, that sorts first: the same loop reads the same from anywhere."""
    if len(runs) > 2000:
        return runs
    return min(runs[i:] + runs[:i] for i in range(0, len(runs), 2))


@dataclass(frozen=True, slots=True)
class Stretch:
    """`cycles` input cycles of an orbit, each of which adds `stride` to the state (mod 2^width each).

    start   the state at the first half-cycle, at the clock level of the orbit's start
    middle  the state one half-cycle later
    levels  the output in the first and in the second half-cycle of every cycle of the stretch
    """

    start: State
    middle: State
    stride: State
    cycles: int
    levels: tuple[int, int]

    def runs(self) -> Iterator[Run]:
        first, second = self.levels
        if first == second:
            yield first, 2 * self.cycles
        else:
            for _ in range(self.cycles):
                yield first, 1
                yield second, 1

    def state(self, half_cycle: int, widths: tuple[int, ...]) -> State:
        """The state `half_cycle` half-cycles after the stretch's start."""
        times, odd = divmod(half_cycle, 2)
        base = self.middle if odd else self.start
        return tuple(
            (value + times * step) % (1 << width)
            for value, step, width in zip(base, self.stride, widths, strict=True)
        )


@dataclass(frozen=True, slots=True)
class Orbit:
    """The path of one start state: stretches, of which those from index `loop_from` on repeat for ever.

    `loop_from` is None where the search ended before the orbit closed; `why` then says so."""

    stretches: tuple[Stretch, ...]
    loop_from: int | None
    widths: tuple[int, ...]
    why: str = ""

    @property
    def start(self) -> State:
        return self.stretches[0].start

    @property
    def lead_half_cycles(self) -> int:
        """Half-cycles before the loop is entered."""
        lead = self.stretches[: self.loop_from]
        return sum(2 * stretch.cycles for stretch in lead)

    @property
    def loop_half_cycles(self) -> int | None:
        """Half-cycles once round the loop; None for an orbit that has not closed."""
        if self.loop_from is None:
            return None
        return sum(2 * stretch.cycles for stretch in self.stretches[self.loop_from :])

    def runs(self, rounds: int) -> Iterator[Run]:
        """The output's runs: lead-in, then the loop `rounds` times (once as far as known if not closed)."""

        def pieces() -> Iterator[Run]:
            for stretch in self.stretches[: self.loop_from]:
                yield from stretch.runs()
            if self.loop_from is not None:
                for _ in range(rounds):
                    for stretch in self.stretches[self.loop_from :]:
                        yield from stretch.runs()

        return merged(pieces())

    def wave(self) -> Wave | None:
        """The loop's wave, None for an orbit that has not closed or a round too long to write out."""
        if self.loop_from is None:
            return None
        loop = self.stretches[self.loop_from :]
        if sum(2 * s.cycles for s in loop if s.levels[0] != s.levels[1]) > LONGEST_ROUND:
            return None
        return Wave.of_round(run for stretch in loop for run in stretch.runs())

    def state(self, half_cycle: int) -> State:
        """The state that many half-cycles after the start."""
        total = self.lead_half_cycles
        if self.loop_from is not None and half_cycle >= total:
            loop = self.loop_half_cycles or 1
            half_cycle = total + (half_cycle - total) % loop
        for stretch in self.stretches:
            if half_cycle < 2 * stretch.cycles:
                return stretch.state(half_cycle, self.widths)
            half_cycle -= 2 * stretch.cycles
        raise IndexError("beyond the end of an orbit that has not closed")


@dataclass(frozen=True, slots=True)
class Loop:
    """A cycle of states. `length` is in half-cycles, `example` the state on it that sorts first."""

    example: State
    length: int
    wave: Wave
    good: bool

    @property
    def stuck(self) -> bool:
        return self.wave.stuck


@dataclass(frozen=True, slots=True)
class Recovery:
    """How long until a state is good, over all power-up states.

    worst      half-cycles that every state recovers within, None where some state never does or not known
    exact      `slowest` really needs that long
    slowest    a state that needs `worst` half-cycles
    lost       the orbit of a state that never becomes good
    illegal    number of power-up states that are not good, None if not counted
    open       why nothing is known, "" otherwise
    """

    worst: int | None
    exact: bool
    slowest: State | None = None
    lost: Orbit | None = None
    illegal: int | None = None
    open: str = ""


Scope = Literal["reset", "initial", "any"]


@dataclass(frozen=True, slots=True)
class Start:
    """A state from which the ratio is claimed, and how it comes about."""

    state: State
    cause: str


@dataclass(frozen=True, slots=True)
class Rhythm:
    """Everything the engines found out about a divider.

    scope      where the ratio and the high time are claimed from
    starts     the start states of that scope (empty for "any")
    orbits     their orbits, in the same order
    reset_half_cycles  how long reset has to be held, in half-cycles, to force these starts
    unforced   registers that reset never forces
    loops      the loops of all power-up states, as far as found
    complete   whether these are all loops
    recovery   None until a specification says what good means
    stuck      the orbit of a state on which the output freezes
    never_stuck  whether it is known that there is none
    methods    by question ("orbit", "power-up"): how it was answered
    races_won  the wave from reset if the edge won each race against a clear; None where there is no race
    """

    system: System
    settling: Settling
    scope: Scope
    starts: tuple[Start, ...]
    orbits: tuple[Orbit, ...]
    loops: tuple[Loop, ...]
    complete: bool
    recovery: Recovery | None
    stuck: Orbit | None
    never_stuck: bool
    open: str = ""
    reset_half_cycles: int | None = None
    unforced: tuple[str, ...] = ()
    methods: dict[str, str] = field(default_factory=dict)
    races_won: tuple[str, ...] = ()
