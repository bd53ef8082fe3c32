"""Inputs that move: monitored reachability, the engine behind `ratio-change` and `enable`.

The machine runs beside an observer that measures the pulse at hand (see observer). Small machines are searched whole,
breadth first over states, values and the observer's danger: what comes out is the shortest run that breaks a claim,
or a table that shows that none does. With the inputs held from then on, a machine is a map, and from its graph the
half-cycles are read that it takes from any state reached until the output is right again.

Limits: `MOST_ENTRIES` of the table, `MOST_MOVES` of a machine's moves. Beyond them `unrolled` looks for a short run
that breaks a claim and `inductive` for invariants that show that none does.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import groupby
from typing import TYPE_CHECKING

from prover import observer
from prover.effort import Effort
from prover.errors import InternalError
from prover.graph import last_misfit, walk_to
from prover.moving import Machine
from prover.observer import Limits, Table
from prover.rhythm import Goal, Wave

if TYPE_CHECKING:
    import numpy as np

MOST_ENTRIES = 1 << 22
"""Limits times values times states up to which all is searched."""

MOST_MOVES = 1 << 22
"""Values before, values after and states up to which a machine's moves are laid out as a table."""

MOST_CHOICE_BITS = 4
"""Bits that x stands for up to which a machine is searched: they are 0 in the search, and no run may hang on them."""

AT_ONCE = 1 << 20
"""Moves that are looked at together."""


@dataclass(frozen=True, slots=True)
class Run:
    """A run that breaks a limit.

    start    its place in `observer.starts`
    values   the inputs' values in each half-cycle after its move; the last is that of the half-cycle of the break
    row      the limit that it breaks
    by_move  whether it is the move of the last half-cycle that breaks it, or its edge
    """

    start: int
    values: tuple[int, ...]
    row: int
    by_move: bool


@dataclass(frozen=True)
class Search:
    """What is reached: the greatest danger by limit, value and state, −1 for what is not; or a run that breaks one.

    frontiers  what each half-cycle was the first to reach: row, value, state, danger, place in the frontier before
    """

    danger: np.ndarray
    broken: Run | None
    frontiers: tuple[Frontier, ...]

    @property
    def reached(self) -> np.ndarray:
        """Which states are reached with which values, after a move: shape (values, states)."""
        import numpy as np

        found: np.ndarray = np.any(self.danger >= 0, axis=0)
        return found

    def path(self, wanted: np.ndarray) -> Run:
        """A shortest run to a place of those wanted, of shape (values, states), after the move of its last half-
        cycle."""
        import numpy as np

        for number, (row, value, state, _, before) in enumerate(self.frontiers):
            for place in np.flatnonzero(wanted[value, state])[:1]:
                end = (int(row[place]), int(value[place]), int(before[place]))
                return _run(end, True, self.frontiers[:number])
        raise InternalError("no run leads there")


Frontier = tuple["np.ndarray", "np.ndarray", "np.ndarray", "np.ndarray", "np.ndarray"]


def fits(machine: Machine, rows: int) -> bool:
    """Whether so many limits of the machine can be searched whole."""
    entries = machine.bits + machine.moving_bits
    moves = machine.bits + 2 * machine.moving_bits
    few = sum(width for _, width in machine.choices) <= MOST_CHOICE_BITS
    return few and rows << entries <= MOST_ENTRIES and 1 << moves <= MOST_MOVES


def search(machine: Machine, table: Table, limits: Limits, effort: Effort) -> Search:
    """Breadth first from all starts, half-cycle by half-cycle, until a limit is broken or nothing new is reached."""
    import numpy as np

    effort.say("following all runs with moving inputs")
    rows = len(limits.level)
    shape = (rows, table.values, table.states)
    danger = np.full(rows * table.values * table.states, -1, dtype=np.int64)
    first, given = observer.starts(machine)
    row, place = np.nonzero(limits.allowed[:, given] & limits.domain[given, first][None, :])
    kept: list[Frontier] = []
    zeros = np.zeros(len(row), dtype=np.int64)
    here = (row, given[place], first[place], zeros)
    before = place
    while len(here[0]):
        found = _moves(table, limits, here, before, danger)
        if isinstance(found, tuple):
            return Search(danger.reshape(shape), _run(found, True, kept), tuple(kept))
        kept.append(found.frontier)
        effort.check()
        row, value, state, near, _ = found.frontier
        after = table.edge[value, state]
        was, now = table.output[value, state], table.output[value, after]
        near, over = observer.after_edge(limits, row, after, was, now, near)
        if over.any():
            worst = int(np.flatnonzero(over)[0])
            run = _run((int(row[worst]), int(value[worst]), worst), False, kept)
            return Search(danger.reshape(shape), run, tuple(kept))
        here, before = (row, value, after, near), np.arange(len(row))
    return Search(danger.reshape(shape), None, tuple(kept))


@dataclass(frozen=True, slots=True)
class _Moved:
    frontier: Frontier


def _moves(
    table: Table,
    limits: Limits,
    here: tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray],
    before: np.ndarray,
    danger: np.ndarray,
) -> _Moved | tuple[int, int, int]:
    """All moves from these rows, values, states and dangers; what they reach in greater danger than before is noted
    in `danger` and is the next frontier. Or a move that breaks a limit: its row, the new value, the place it came
    from."""
    import numpy as np

    row, value, state, near = here
    parts: list[Frontier] = []
    size = max(1, AT_ONCE // table.values)
    for begin in range(0, len(row), size):
        piece = slice(begin, begin + size)
        index, to = np.nonzero(limits.allowed[row[piece]])
        index += begin
        rows, target = row[index], table.moved(value[index], to, state[index])
        was, now = table.output[value[index], state[index]], table.output[to, target]
        gone, over = observer.after_move(limits, rows, target, was, now, near[index])
        if over.any():
            worst = int(np.flatnonzero(over)[0])
            return int(rows[worst]), int(to[worst]), int(before[index[worst]])
        key = (rows * table.values + to) * table.states + target
        better = np.flatnonzero(gone > danger[key])
        # Of several moves that lead to one place, the one in greatest danger counts.
        better = better[np.argsort(-gone[better], kind="stable")]
        _, chosen = np.unique(key[better], return_index=True)
        better = better[chosen]
        danger[key[better]] = gone[better]
        parts.append((rows[better], to[better], target[better], gone[better], before[index[better]]))
    joined = tuple(np.concatenate(column) for column in zip(*parts, strict=True))
    row, value, state, near, back = joined
    # A later piece may have reached the same place in greater danger.
    latest = danger[(row * table.values + value) * table.states + state] == near
    return _Moved((row[latest], value[latest], state[latest], near[latest], back[latest]))


def _run(end: tuple[int, int, int], by_move: bool, kept: Sequence[Frontier]) -> Run:
    """The run that leads to a break: its row, the value there, and the place it came from in the last frontier."""
    row, value, place = end
    values = [value]
    for frontier in reversed(kept):
        values.append(int(frontier[1][place]))
        place = int(frontier[4][place])
    return Run(place, tuple(reversed(values)), row, by_move)


# -- once the inputs stand still ---------------------------------------------------------------------------


@dataclass(frozen=True)
class Held:
    """What happens where the inputs are held: tables of shape (values, states).

    phase  φ of a good state in half-cycles from its rise, −1 for others
    rank   half-cycles until it is good; −1 where it never is
    level  at which the output comes to stay for good, −1 where it goes on changing
    still  half-cycles until it does; −1 where it never does
    """

    phase: np.ndarray
    rank: np.ndarray
    level: np.ndarray
    still: np.ndarray


def held(table: Table, reached: np.ndarray, period: np.ndarray, high: np.ndarray, effort: Effort) -> Held:
    """How long every reached state takes until its wave is the one claimed for its value, or until nothing changes.

    `period` and `high` are half-cycles, of the shape of `reached`, which is (values, states)."""
    import numpy as np

    effort.say("following every state with the inputs held")
    states = table.states
    after = (np.arange(table.values)[:, None] * states + table.edge).ravel()
    output, cycle, highs = table.output.ravel(), period.ravel(), high.ravel()
    bits = len(after).bit_length()
    phase = np.full(len(after), -1, dtype=np.int64)
    level = np.full(len(after), -1, dtype=np.int64)
    on_loop = np.zeros(len(after), dtype=bool)
    for loop in _loops(after, reached.ravel(), bits):
        on_loop[loop] = True
        levels = output[loop]
        wave = Wave.of_round((int(bit), len(list(run))) for bit, run in groupby(levels.tolist()))
        level[loop] = levels[0] if wave.stuck else -1
        size = int(cycle[loop[0]])
        if Goal(size, int(highs[loop[0]])).fits(wave):
            rise = int(np.flatnonzero((levels == 1) & (np.roll(levels, 1) == 0))[0])
            phase[loop] = (np.arange(len(loop)) - rise) % size
    effort.check()
    entry, distance = walk_to(after, on_loop, bits)
    entered = np.where(on_loop[entry], phase[entry], -1)
    phase = np.where(entered >= 0, (entered - distance) % np.maximum(cycle, 1), -1)
    fits_here = (phase >= 0) & (output == (phase < highs))
    last = last_misfit(after, ~fits_here & (phase >= 0), bits)
    rank = np.where(phase >= 0, last, -1)
    level = np.where(on_loop[entry], level[entry], -1)
    still = np.where(level >= 0, last_misfit(after, (level >= 0) & (output != level), bits), -1)
    # Of what no run reaches nothing is claimed: what is reached leads to nothing else.
    columns = (np.where(rank == 0, phase, -1), rank, level, still)
    return Held(*(np.where(reached, column.reshape(reached.shape), -1) for column in columns))


def lead_and_loop(table: Table, value: int, state: int) -> tuple[int, int]:
    """Half-cycles until a state that is held at a value gets on its loop, and those once round the loop."""
    seen: dict[int, int] = {}
    while state not in seen:
        seen[state] = len(seen)
        state = int(table.edge[value, state])
    return seen[state], len(seen) - seen[state]


def _loops(after: np.ndarray, begin: np.ndarray, bits: int) -> list[list[int]]:
    """The loops that these states run into."""
    import numpy as np

    ahead = after
    for _ in range(bits):
        ahead = ahead[ahead]
    todo = np.unique(ahead[begin]).tolist()
    seen: set[int] = set()
    loops = []
    for state in todo:
        loop = []
        while state not in seen:
            seen.add(state)
            loop.append(state)
            state = int(after[state])
        if loop:
            loops.append(loop)
    return loops
