"""Brute force on a finite map: the loops, good states and recovery of a divider, by plain enumeration.

An independent reference for the tests: it knows nothing of Verilog, of solvers or of the engines. The map takes every
power-up state (any hashable value that includes the clock's level) to the state one half-cycle later; the output takes
every state to 0 or 1. All times are half-cycles.
"""

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Generic, TypeVar

State = TypeVar("State", bound=Hashable)


@dataclass(frozen=True)
class BruteLoop(Generic[State]):
    """A cycle of states, begun where the map's order meets it first."""

    states: tuple[State, ...]
    wave: tuple[int, ...]  # output of each state of the cycle
    good: bool

    @property
    def stuck(self) -> bool:
        """Whether the output never changes on this loop."""
        return len(set(self.wave)) == 1

    @property
    def period_half_cycles(self) -> int | None:
        """Least period of the output in half-cycles, None when it never changes."""
        return None if self.stuck else least_period(self.wave)

    @property
    def high_half_cycles(self) -> int | None:
        """Half-cycles at 1 in one period (all high runs together), None when the output never changes."""
        period = self.period_half_cycles
        return None if period is None else sum(self.wave[:period])

    @property
    def high_runs(self) -> int:
        """Number of high runs in one period of the output."""
        period = self.period_half_cycles
        if period is None:
            return 0
        return sum(self.wave[i] == 1 and self.wave[i - 1] == 0 for i in range(period))


@dataclass(frozen=True)
class BruteResult(Generic[State]):
    """What enumeration says of one map under one claim (period and high time, in half-cycles)."""

    loops: tuple[BruteLoop[State], ...]
    recovery_half_cycles: Mapping[State, int | None]  # None: never becomes good

    @property
    def false_loops(self) -> int:
        """Number of loops whose states aren't good."""
        return sum(not loop.good for loop in self.loops)

    @property
    def stuck(self) -> bool:
        """Whether the output freezes on some loop."""
        return any(loop.stuck for loop in self.loops)

    @property
    def lost_states(self) -> tuple[State, ...]:
        """States that never become good."""
        return tuple(state for state, time in self.recovery_half_cycles.items() if time is None)

    @property
    def worst_half_cycles(self) -> int | None:
        """Worst recovery over all states; None when some state never recovers."""
        worst = 0
        for time in self.recovery_half_cycles.values():
            if time is None:
                return None
            worst = max(worst, time)
        return worst


def least_period(wave: Sequence[int]) -> int:
    """Least p for which the endless repetition of `wave` repeats every p half-cycles."""
    size = len(wave)
    for period in range(1, size + 1):
        if size % period == 0 and all(wave[i] == wave[i - period] for i in range(size)):
            return period
    raise ValueError("an empty wave has no period")


def find_loops(step: Mapping[State, State]) -> list[tuple[State, ...]]:
    """Every cycle of the map. Raises KeyError when a successor isn't a state of the map."""
    finished: set[State] = set()
    loops: list[tuple[State, ...]] = []
    for start in step:
        place: dict[State, int] = {}
        path: list[State] = []
        state = start
        while state not in finished and state not in place:
            place[state] = len(path)
            path.append(state)
            state = step[state]
        if state in place:
            loops.append(tuple(path[place[state] :]))
        finished.update(path)
    return loops


def loop_phases(wave: Sequence[int], period: int, high: int) -> list[int] | None:
    """Phase of each place of a loop's wave (0 where a high run begins), None when the wave isn't the claimed one."""
    if len(wave) % period:
        return None
    rises = [i for i in range(len(wave)) if wave[i] == 1 and wave[i - 1] == 0]
    if not rises:
        return None
    phases = [(i - rises[0]) % period for i in range(len(wave))]
    right = all(level == int(phase < high) for level, phase in zip(wave, phases, strict=True))
    return phases if right else None


def good_phases(
    step: Mapping[State, State], output: Mapping[State, int], period: int, high: int
) -> dict[State, int]:
    """Phase of every good state: 0 in the first half-cycle of the high run, up to `period` - 1.

    Walks back from the right loops: a state is good when its successor is and its own output fits one phase earlier.
    """
    if not 0 < high < period:
        raise ValueError(f"high time {high} must lie between 0 and the period {period}, both in half-cycles")
    before: dict[State, list[State]] = {}
    for state, successor in step.items():
        before.setdefault(successor, []).append(state)
    phase: dict[State, int] = {}
    for loop in find_loops(step):
        phases = loop_phases([output[state] for state in loop], period, high)
        if phases is not None:
            phase.update(zip(loop, phases, strict=True))
    pending = list(phase)
    while pending:
        successor = pending.pop()
        earlier = (phase[successor] - 1) % period
        for state in before.get(successor, ()):
            if state not in phase and output[state] == int(earlier < high):
                phase[state] = earlier
                pending.append(state)
    return phase


def recovery_times(step: Mapping[State, State], good: Mapping[State, int]) -> dict[State, int | None]:
    """Fewest half-cycles until each state is good; None for those that never are."""
    times: dict[State, int | None] = dict.fromkeys(good, 0)
    for start in step:
        path: list[State] = []
        on_path: set[State] = set()
        state = start
        while state not in times and state not in on_path:
            path.append(state)
            on_path.add(state)
            state = step[state]
        time = times.get(state)
        for earlier in reversed(path):
            time = None if time is None else time + 1
            times[earlier] = time
    return times


def analyse(
    step: Mapping[State, State], output: Mapping[State, int], period: int, high: int
) -> BruteResult[State]:
    """Loops and recovery of a map under the claim of `period` and `high` half-cycles.

    Raises KeyError when a successor isn't a state, ValueError when the claim is impossible (0 < high < period fails).
    """
    good = good_phases(step, output, period, high)
    loops = tuple(
        BruteLoop(states, tuple(output[state] for state in states), states[0] in good)
        for states in find_loops(step)
    )
    return BruteResult(loops, recovery_times(step, good))


def rises(wave: Sequence[int]) -> list[int]:
    """Places of an endlessly repeated wave at which it rises."""
    return [i for i in range(len(wave)) if wave[i] == 1 and wave[i - 1] == 0]


def rise_gaps(wave: Sequence[int]) -> list[int]:
    """The gaps between neighbouring rises, once round, in half-cycles."""
    at = rises(wave)
    return [(b - a - 1) % len(wave) + 1 for a, b in zip(at, at[1:] + at[:1], strict=True)]


def has_mean(wave: Sequence[int], ratio: Fraction) -> bool:
    """Whether every gap is a whole number of input cycles (or of half-cycles) next to the ratio, and their mean is the
    ratio in input cycles."""
    gaps = rise_gaps(wave)
    if not gaps or Fraction(sum(gaps), 2 * len(gaps)) != ratio:
        return False
    unit = 1 if any(gap % 2 for gap in gaps) else 2
    return all(abs(Fraction(gap - 2 * ratio, unit)) < 1 for gap in gaps)


def analyse_wave(
    step: Mapping[State, State], output: Mapping[State, int], wave: Sequence[int]
) -> BruteResult[State]:
    """Loops and recovery where good means this wave, one period of it, at whatever phase.

    A state is good if what it shows is some rotation of the wave for as long as it takes to be sure: until every state
    and the wave have been gone through."""
    size = len(step) + len(wave)
    endless = "".join(map(str, wave)) * (size // len(wave) + 3)
    good: dict[State, int] = {}
    for start in step:
        shown, state = "", start
        for _ in range(size):
            shown, state = shown + str(output[state]), step[state]
        if shown in endless:
            good[start] = endless.index(shown)
    loops = tuple(
        BruteLoop(states, tuple(output[state] for state in states), states[0] in good)
        for states in find_loops(step)
    )
    return BruteResult(loops, recovery_times(step, good))
