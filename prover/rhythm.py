"""Rhythm: what a divider does from a set of start states. The engines' common answer; properties read it.

Wave      the output's runs, (level, half-cycles), a lead-in and a round that repeats for ever
Orbit     one start state's run: a path into a loop, and the loop
Loop      a cycle of states that the machine settles into
Recovery  how long until a state is good, over all power-up states
Census    how many power-up states run where, and how many need how long
Rhythm    all of it together
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from math import ceil, floor
from typing import TYPE_CHECKING, Literal

from prover import path
from prover.path import Path, Run
from prover.settling import Settling
from prover.system import State, System

if TYPE_CHECKING:
    from prover.accumulator import Accumulator
    from prover.certificate import Stage
    from prover.glitch import Glitches
    from prover.release import Release
    from prover.spec import Spec

LONGEST_ROUND = 200_000
"""Runs in a wave's round beyond which the round is not written out."""


@dataclass(frozen=True, slots=True)
class Wave:
    """The round of a periodic output: runs from a rise on, or one run if the output never changes.

    `runs` covers one smallest period; lengths are half-cycles."""

    runs: tuple[Run, ...]

    @staticmethod
    def of_round(runs: Iterable[Run]) -> Wave:
        """The wave of a loop whose output, once round from anywhere, is `runs`."""
        joined = list(path.merged(runs))
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


def _least_rotation(runs: list[Run]) -> list[Run]:
    """The rotation, by whole high-low pairs, that sorts first: the same loop reads the same from anywhere.

    Booth's algorithm (1980), linear in the number of runs."""
    pairs = list(zip(runs[::2], runs[1::2], strict=True))
    twice = [*pairs, *pairs]
    back = [-1] * len(twice)
    best = 0
    for j in range(1, len(twice)):
        pair = twice[j]
        i = back[j - best - 1]
        while i != -1 and pair != twice[best + i + 1]:
            if pair < twice[best + i + 1]:
                best = j - i - 1
            i = back[i]
        if pair != twice[best + i + 1]:
            if pair < twice[best]:
                best = j
            back[j - best] = -1
        else:
            back[j - best] = i + 1
    best %= len(pairs)
    return [run for pair in [*pairs[best:], *pairs[:best]] for run in pair]


@dataclass(frozen=True, slots=True)
class Orbit:
    """The run of one start state: a lead-in, then a loop that repeats for ever.

    `loop` is empty where the search ended before the run closed; `why` then says so, and `lead` is what was
    covered. `widths` are those of the state's components. `lead_half_cycles` is the time before the loop is
    entered (or all that is known of a run that did not close), `loop_half_cycles` that once round (0 then)."""

    lead: Path
    loop: Path
    widths: tuple[int, ...]
    why: str = ""
    lead_half_cycles: int = field(init=False)
    loop_half_cycles: int = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "lead_half_cycles", path.length(self.lead))
        object.__setattr__(self, "loop_half_cycles", path.length(self.loop))

    @property
    def closed(self) -> bool:
        """Whether the run is known for ever."""
        return bool(self.loop)

    @property
    def start(self) -> State:
        return path.first_state(self.lead or self.loop)

    def runs(self, rounds: int) -> Iterator[Run]:
        """The output's runs: lead-in, then the loop `rounds` times."""

        def parts() -> Iterator[Run]:
            yield from path.pieces(self.lead)
            for _ in range(rounds if self.loop else 0):
                yield from path.pieces(self.loop)

        return path.merged(parts())

    def abridged(self, skips: list[tuple[int, int]]) -> Iterator[Run]:
        """The output's runs where the lead-in and thrice the loop are abridged as by `path.abridged`."""
        return path.merged(path.abridged((*self.lead, *self.loop * path.SHOWN), skips))

    def wave(self) -> Wave | None:
        """The loop's wave, None for a run that did not close or a round too long to write out."""
        if not self.loop or path.changes(self.loop, LONGEST_ROUND) > LONGEST_ROUND:
            return None
        return Wave.of_round(path.pieces(self.loop))

    def place(self, half_cycle: int) -> path.Place:
        """Where the run is that many half-cycles after its start; IndexError where that is not known."""
        lead = self.lead_half_cycles
        if half_cycle < lead or not self.loop:
            return path.place(self.lead, half_cycle, self.widths)
        return path.place(self.loop, (half_cycle - lead) % self.loop_half_cycles, self.widths)

    def state(self, half_cycle: int) -> State:
        """The state that many half-cycles after the start."""
        return self.place(half_cycle).state


@dataclass(frozen=True, slots=True)
class Goal:
    """The wave that is good: one high run of `high` in every `period` half-cycles; where it has several pulses,
    `runs` is one period of it, as a Wave has them, and `high` is the sum of its high runs."""

    period: int
    high: int
    runs: tuple[Run, ...] = ()

    @staticmethod
    def of(wave: Wave) -> Goal:
        """The goal that is this wave, which has to change."""
        return Goal(wave.period or 0, wave.high or 0, wave.runs if len(wave.runs) > 2 else ())

    @property
    def pulses(self) -> tuple[Run, ...]:
        """One period of the wave, from a rise on."""
        return self.runs or ((1, self.high), (0, self.period - self.high))

    def fits(self, wave: Wave) -> bool:
        """Whether a loop's wave is this one, at whatever phase."""
        return wave.runs == self.pulses


@dataclass(frozen=True, slots=True)
class Mean:
    """A ratio that holds on average: which wave it is has to be seen.

    Every gap from rise to rise is one of the two whole numbers next to the ratio, of input cycles, or of half-cycles
    where rises fall on both edges of the input clock, and once round the wave the gaps have the ratio as their mean;
    `high`, if it is given, is the length of every high run in half-cycles."""

    ratio: Fraction
    high: int | None = None

    def lengths(self, gaps: Iterable[int]) -> tuple[int, int]:
        """The two lengths in half-cycles that gaps like these may have."""
        if any(gap % 2 for gap in gaps):
            return floor(2 * self.ratio), ceil(2 * self.ratio)
        return 2 * floor(self.ratio), 2 * ceil(self.ratio)

    def fits(self, wave: Wave) -> bool:
        """Whether a loop's wave is one of these."""
        if wave.period is None or (self.high is not None and any(n != self.high for v, n in wave.runs if v)):
            return False
        gaps = [a + b for (_, a), (_, b) in zip(wave.runs[::2], wave.runs[1::2], strict=True)]
        return set(gaps) <= set(self.lengths(gaps)) and wave.period == 2 * self.ratio * len(gaps)

    def among(self, waves: Iterable[Wave | None]) -> Goal | None:
        """The first wave that is one of these, as what is good from then on."""
        return next((Goal.of(wave) for wave in waves if wave is not None and self.fits(wave)), None)


NOWHERE = Goal(1, 1)
"""What is good where no loop has the mean that is claimed: no wave has a low run of 0, so nothing is."""


def goal_of(spec: Spec, waves: Iterable[Wave | None]) -> Goal:
    """What is good by the claim; for a mean, the first of the waves that has it."""
    if spec.ratio is None or not spec.mean:
        return Goal(spec.period, spec.high_half_cycles)
    return Mean(spec.ratio, spec.high).among(waves) or NOWHERE


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


@dataclass(frozen=True, slots=True)
class Good:
    """The good states, as far as they can be written down; in their place, where there is none, what is claimed of.

    phases  by number of state (first register lowest, the clock highest): φ, −1 for one that is not good; else None
    runs    orbits, each with the half-cycle from which on it is looked at
    told    what is written down, in words
    none    no state is good: the runs are those that the ratio is claimed of
    """

    phases: tuple[int, ...] | None
    runs: tuple[tuple[Orbit, int], ...]
    told: str
    none: bool = False


@dataclass(frozen=True, slots=True)
class Census:
    """How many power-up states there are of each sort, of a machine whose graph was built.

    leading   for each loop of the rhythm, the power-up states that run into it, those on it among them
    recovery  pairs of half-cycles and the number of power-up states that need exactly so many until they are good;
              states that never become good are in none of them. Empty where nothing says what good means
    """

    leading: tuple[int, ...]
    recovery: tuple[tuple[int, int], ...]


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
    stages     where wide states are covered: what the cover claims, stage by stage
    shown      orbits of some power-up states, such as examples of loops, for findings to be shown by
    good       the good states; None where they are not known
    glitches   whether the output may pulse within a half-cycle; None where nothing was claimed
    accumulator  what shows the claim on average of every state, and stands for a round that is too long to follow
    release    what reset does; None for a divider without one, and where nothing is claimed
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
    stages: tuple[Stage, ...] = ()
    census: Census | None = None
    shown: Mapping[State, Orbit] = field(default_factory=dict)
    good: Good | None = None
    glitches: Glitches | None = None
    release: Release | None = None
    accumulator: Accumulator | None = None

    def orbit_from(self, state: State) -> Orbit:
        """The orbit of a state: one that is shown, or followed now."""
        if state in self.shown:
            return self.shown[state]
        from prover.analyse import follow
        from prover.effort import Effort

        return follow(self.system, state, Effort(30))
