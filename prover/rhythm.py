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
from typing import TYPE_CHECKING, Literal

from prover import path
from prover.path import Path, Run
from prover.settling import Settling
from prover.system import State, System

if TYPE_CHECKING:
    from prover.certificate import Stage
    from prover.glitch import Glitches

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

    def divides_by(self, period: int, high: int) -> bool:
        """Whether this is one high run of `high` in every `period` half-cycles."""
        return self.runs == ((1, high), (0, period - high))


def _least_rotation(runs: list[Run]) -> list[Run]:
    """The rotation, by whole high-low pairs, that sorts first: the same loop reads the same from anywhere."""
    if len(runs) > 2000:
        return runs
    return min(runs[i:] + runs[:i] for i in range(0, len(runs), 2))


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
    """The wave that is good: half-cycles per period and of high time."""

    period: int
    high: int


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

    def orbit_from(self, state: State) -> Orbit:
        """The orbit of a state: one that is shown, or followed now."""
        if state in self.shown:
            return self.shown[state]
        from prover.analyse import follow
        from prover.effort import Effort

        return follow(self.system, state, Effort(30))
