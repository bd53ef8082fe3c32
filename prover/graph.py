"""The state graph: every state's successor at once, and from it every loop, every basin, the exact recovery.

With inputs held a divider is a map on a finite set, so its graph is a set of loops with trees that lead into
them. Composing the map with itself n times over (pointer doubling) leaves the loops as its image after as many
compositions as the state has bits, and carries distances along the trees. Where a step depends on a choice (a
value that x stands for), a state has several successors; then good is a greatest fixpoint, and a state is lost
if some choice keeps it from ever being good.

Limits: `MOST_BITS` of state and choices together.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import groupby
from typing import TYPE_CHECKING

from prover import expr as e
from prover.effort import Effort
from prover.rhythm import Census, Goal, Loop, Wave
from prover.system import State, System

if TYPE_CHECKING:
    import numpy as np

MOST_BITS = 21
"""Bits of a state (clock level included) together with choices up to which the graph is built."""


@dataclass(frozen=True)
class Graph:
    """The graph of a system.

    successors  shape (choices, states): the state's number after one edge, for each value of the choices
    output      the output in each state, 0 or 1
    start       which states are settled, that is power-up states
    A state's number has the first register in its lowest bits and the clock's level in its highest.
    """

    system: System
    successors: np.ndarray
    output: np.ndarray
    start: np.ndarray

    def state(self, number: int) -> State:
        """The state with that number."""
        out = []
        for _, width in self.system.variables:
            out.append(number & ((1 << width) - 1))
            number >>= width
        return tuple(out)

    def number(self, state: State) -> int:
        """The number of that state."""
        total, at = 0, 0
        for value, (_, width) in zip(state, self.system.variables, strict=True):
            total |= value << at
            at += width
        return total


def fits(system: System) -> bool:
    """Whether the graph is small enough to build."""
    return system.bits + sum(width for _, width in system.choices) <= MOST_BITS


def build(system: System, effort: Effort) -> Graph:
    """Every state's successors, output and settledness."""
    import numpy as np

    count = 1 << system.bits
    effort.say(f"building the graph of {count} states")
    numbers = np.arange(count, dtype=np.uint64)
    values: dict[str, np.ndarray] = {}
    at = 0
    for name, width in system.variables:
        values[name] = (numbers >> np.uint64(at)) & np.uint64((1 << width) - 1)
        at += width
    rows = []
    choice_bits = sum(width for _, width in system.choices)
    for choice in range(1 << choice_bits):
        for name, width in system.choices:
            values[name] = np.full(count, choice & ((1 << width) - 1), dtype=np.uint64)
            choice >>= width
        rows.append(_encoded(system, e.arrays(system.step, values)))
        effort.check()
    output, settled = e.arrays([system.output, system.settled], values)
    return Graph(system, np.array(rows), output.astype(np.int8), settled.astype(bool))


def _encoded(system: System, parts: list[np.ndarray]) -> np.ndarray:
    import numpy as np

    total = np.zeros(len(parts[0]), dtype=np.int64)
    at = 0
    for part, (_, width) in zip(parts, system.variables, strict=True):
        total |= part.astype(np.int64) << at
        at += width
    return total


@dataclass(frozen=True)
class Basins:
    """The loops of a graph without choices.

    loops      every loop that a settled state runs into; `members` the numbers of the states on each, in order
    entry      for each state, the loop state it first meets
    distance   half-cycles until it meets it
    on_loop    index into `loops` for states on one, else −1
    position   index of such a state in its loop's members
    """

    loops: tuple[Loop, ...]
    members: tuple[list[int], ...]
    entry: np.ndarray
    distance: np.ndarray
    on_loop: np.ndarray
    position: np.ndarray


def basins(graph: Graph, effort: Effort, goal: Goal | None) -> Basins:
    """All loops, and where every state enters one. A loop is good if it has the goal's wave."""
    import numpy as np

    after = graph.successors[0]
    count = len(after)
    effort.say("finding the loops")
    # Composing doubles the number of steps each time; after `bits` compositions every state is on a loop.
    ahead = after
    for _ in range(graph.system.bits):
        ahead = ahead[ahead]
    cyclic = np.zeros(count, dtype=bool)
    cyclic[ahead[graph.start]] = True
    # Close over the loops: a power of the map may skip states of a loop.
    while True:
        more = after[cyclic]
        if cyclic[more].all():
            break
        cyclic[more] = True
    on_loop = np.full(count, -1, dtype=np.int64)
    position = np.zeros(count, dtype=np.int64)
    loops: list[Loop] = []
    members: list[list[int]] = []
    todo = np.flatnonzero(cyclic).tolist()
    step = after.tolist()
    level = graph.output.tolist()
    visited = bytearray(count)
    for first in todo:
        if visited[first]:
            continue
        states = []
        at = first
        while not visited[at]:
            visited[at] = 1
            states.append(at)
            at = step[at]
        wave = Wave.of_round((bit, len(list(run))) for bit, run in groupby(level[s] for s in states))
        good = goal is not None and goal.fits(wave)
        on_loop[states] = len(loops)
        position[states] = np.arange(len(states))
        loops.append(Loop(graph.state(min(states)), len(states), wave, good))
        members.append(states)
        if len(loops) % 4096 == 0:
            effort.check()
    entry, distance = walk_to(after, cyclic, graph.system.bits)
    return Basins(tuple(loops), tuple(members), entry, distance, on_loop, position)


def walk_to(after: np.ndarray, target: np.ndarray, bits: int) -> tuple[np.ndarray, np.ndarray]:
    """For each state the first target state on its way (or wherever it is after 2^(bits+1) steps), and how
    many half-cycles that takes."""
    import numpy as np

    ahead = np.where(target, np.arange(len(after)), after)
    steps = np.where(target, 0, 1).astype(np.int64)
    for _ in range(bits + 1):
        steps = steps + steps[ahead]
        ahead = ahead[ahead]
    return ahead, steps


@dataclass(frozen=True)
class Ranks:
    """Good states and how far the others are from them.

    phase   φ of each good state, in half-cycles from where the wave begins; −1 for a state that is not good
    rank    ρ: half-cycles until good; −1 for a state that never is
    """

    phase: np.ndarray
    rank: np.ndarray


def level_at(goal: Goal, phase: np.ndarray) -> np.ndarray:
    """The goal's output in each phase: runs alternate, the first one is high."""
    import numpy as np

    ends = np.cumsum([length for _, length in goal.pulses])
    return 1 - np.searchsorted(ends, phase, side="right") % 2


def ranks(graph: Graph, found: Basins, goal: Goal) -> Ranks:
    """The phase of every good state and the rank of every other, without choices."""
    import numpy as np

    after, period = graph.successors[0], goal.period
    phase_on_loop = np.full(len(after), -1, dtype=np.int64)
    if not any(loop.good for loop in found.loops):
        # The period may be too long for a word.
        return Ranks(phase_on_loop, phase_on_loop)
    for loop, states in zip(found.loops, found.members, strict=True):
        if loop.good:
            levels = graph.output[states].astype(np.uint8)[:period]
            # Where the wave begins, once round the loop. Good loops are whole periods long.
            wanted = np.concatenate([np.full(n, v, dtype=np.uint8) for v, n in goal.pulses])
            rise = bytes(np.concatenate([levels, levels])).find(bytes(wanted))
            phase_on_loop[states] = (np.arange(len(states)) - rise) % period
    entered = phase_on_loop[found.entry]
    phase = np.where(entered >= 0, (entered - found.distance) % period, -1)
    # A state is good if its own output and that of all states behind it fit the phase.
    fits_here = (phase >= 0) & (graph.output == level_at(goal, phase))
    last = last_misfit(after, ~fits_here & (phase >= 0), graph.system.bits)
    rank = np.where(phase >= 0, last, -1)
    return Ranks(np.where(rank == 0, phase, -1), rank)


def last_misfit(after: np.ndarray, misfit: np.ndarray, bits: int) -> np.ndarray:
    """Half-cycles until the last misfit on each state's way is behind, where there is none on a loop: carried
    backwards along the trees by doubling."""
    import numpy as np

    last = np.where(misfit, 1, 0).astype(np.int64)
    ahead, jumped = after, 1
    for _ in range(bits + 1):
        beyond = last[ahead]
        last = np.where(beyond > 0, beyond + jumped, last)
        ahead, jumped = ahead[ahead], jumped * 2
    return last


def census(graph: Graph, found: Basins, table: Ranks | None) -> Census:
    """How many power-up states run into each loop, and how many need how long until they are good."""
    import numpy as np

    reached = found.on_loop[found.entry[graph.start]]
    leading = np.bincount(reached, minlength=len(found.loops))
    needed = np.bincount(table.rank[graph.start & (table.rank >= 0)]) if table is not None else np.array([])
    return Census(tuple(leading.tolist()), tuple((k, int(n)) for k, n in enumerate(needed) if n))


# -- with choices ------------------------------------------------------------------------------------------


def ranks_with_choices(graph: Graph, goal: Goal, effort: Effort) -> Ranks | None:
    """The same where a step depends on choices; None if the table of states and phases would be too large."""
    import numpy as np

    count = len(graph.output)
    if count * goal.period > 1 << 24:
        return None
    effort.say("finding the good states under every choice")
    valid = graph.output[:, None] == level_at(goal, np.arange(goal.period))[None, :]
    while True:
        kept = valid.copy()
        for row in graph.successors:
            kept &= np.roll(valid[row], -1, axis=1)
        effort.check()
        if (kept == valid).all():
            break
        valid = kept
    phase = np.where(valid.any(axis=1), valid.argmax(axis=1), -1)
    rank = np.where(phase >= 0, 0, -1).astype(np.int64)
    while True:
        onward = rank[graph.successors]
        ready = (onward >= 0).all(axis=0) & (rank < 0)
        effort.check()
        if not ready.any():
            return Ranks(phase, rank)
        rank[ready] = onward.max(axis=0)[ready] + 1


def held_level_with_choices(graph: Graph, level: int) -> np.ndarray:
    """The states from which some choices keep the output at the level for ever."""
    stays: np.ndarray = graph.output == level
    while True:
        kept = stays & stays[graph.successors].any(axis=0)
        if (kept == stays).all():
            return stays
        stays = kept
