"""What is claimed of an output while inputs move, and the check of every claim.

A pulse is a stretch between two neighbouring changes of the output. It begins and ends with an edge of the input
clock, or in the middle of a half-cycle where the inputs move; when in the half-cycle that is, nothing is known. So a
pulse is as short as the whole half-cycles that lie in it, and as long as the half-cycles that it touches. A pulse
that begins and ends with edges has one length. What comes before the first change of a run is no pulse.

The inputs' values so far, the one at the start among them, are those that a run has seen. While the ratio changes, a
pulse must be no shorter than the shortest nominal pulse of its level among the values seen, and no longer than the
longest. To claim that of every run, a limit T is fixed beforehand and the inputs may only take values whose nominal
pulse is at least (at most) T: then none may be shorter (longer) than T. Runs that see other values are runs for
another T.

How near a run is to breaking such a claim is one number, its danger: nothing more of its past matters, and where two
runs meet, the one in greater danger breaks the claim no later. So what has to be known of all runs is the greatest
danger with which each state is reached, a table that is checked by one step from every entry.

Nothing here searches.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from prover import expr as e
from prover.expr import Expr
from prover.moving import AFTER, Begin, Machine
from prover.rhythm import Goal, Wave
from prover.trace import Rest

if TYPE_CHECKING:
    import numpy as np


@dataclass(frozen=True, slots=True)
class Nominal:
    """The nominal pulses, as half-cycles, and the values for which they are claimed.

    high, low  words of one width over the inputs that move or are rigid
    domain     one bit over the same: a value that the claim is about
    """

    high: Expr
    low: Expr
    domain: Expr

    def of(self, level: int) -> Expr:
        return self.high if level else self.low


@dataclass(frozen=True, slots=True)
class Pulse:
    """A stretch of one level between two changes.

    begins, ends  half-cycles in which the output changed
    by_move, to_move  whether the inputs' move made it, and ended it
    """

    level: int
    begins: int
    ends: int
    by_move: bool
    to_move: bool

    @property
    def whole(self) -> int:
        """Half-cycles that lie in it for certain: it is not shorter."""
        return max(0, self.ends - self.begins - self.by_move)

    @property
    def touched(self) -> int:
        """Half-cycles that it may reach into: it is not longer."""
        return self.ends - self.begins + self.to_move


def pulses(rests: Sequence[Rest], output: str) -> list[Pulse]:
    """The pulses of a trace that begin and end in it."""
    found: list[Pulse] = []
    since: tuple[int, bool] | None = None
    for before, now in itertools.pairwise(rests):
        level = before.outputs[output]
        if now.outputs[output] == level:
            continue
        if since is not None:
            found.append(Pulse(level, since[0], now.half_cycle, since[1], now.moved))
        since = (now.half_cycle, now.moved)
    return found


@dataclass(frozen=True, slots=True)
class Breach:
    """What breaks the claim at the end of a run: from one half-cycle up to another (exclusive), in words."""

    begins: int
    ends: int
    text: str


def breach(rests: Sequence[Rest], output: str, nominal: Nominal, varies: bool) -> Breach | None:
    """What the last rest of a run shows to be wrong: the pulse that ends there is too short or, while the ratio
    changes, the pulse that goes on there is too long. None if nothing is."""
    changes = [b for a, b in itertools.pairwise(rests) if a.outputs[output] != b.outputs[output]]
    last = rests[-1]
    seen = {tuple(rest.inputs.items()): rest.inputs for rest in rests}
    claimed = [e.evaluate([nominal.low, nominal.high], inputs) for inputs in seen.values()]
    if changes and changes[-1] is last:
        ended = pulses(rests, output)
        pulse = ended[-1] if ended else None
        least = min(lengths[pulse.level] for lengths in claimed) if pulse else 0
        if pulse is None or pulse.whole >= least:
            return None
        text = f"a {LEVEL[pulse.level]} pulse {_length(pulse)}, shorter than {least}, {_which(varies, 'shortest')}"
        return Breach(pulse.begins, max(pulse.ends, pulse.begins + 1), text)
    if not changes or not varies:
        return None
    level, begins = last.outputs[output], changes[-1].half_cycle
    most = max(lengths[level] for lengths in claimed)
    touched = last.half_cycle - begins + 1
    if touched <= most:
        return None
    text = f"a {LEVEL[level]} pulse goes on after {most} half-cycles, {_which(varies, 'longest')}"
    return Breach(begins, last.half_cycle + 1, text)


def repeats(rests: Sequence[Rest], output: str, nominal: Nominal | None) -> Breach | None:
    """What goes on for ever at the end of a run, if that is not the nominal wave: the last rest is one that has been
    before, and the inputs have not moved since. Without a nominal wave any change of the output is wrong."""
    last = rests[-1]
    same = [rest for rest in rests[:-1] if rest.registers == last.registers and rest.inputs == last.inputs]
    if not same or last.moved:
        return None
    round_ = rests[rests.index(same[-1]) + 1 :]
    if any(rest.moved for rest in round_):
        return None
    wave = Wave.of_round((rest.outputs[output], 1) for rest in round_)
    begins = same[-1].half_cycle
    for_ever = f"from half-cycle {begins} on, for ever, in rounds of {len(round_)}"
    if nominal is None:
        text = f"the output goes on changing {for_ever}"
        return None if wave.stuck else Breach(begins, last.half_cycle, text)
    low, high = e.evaluate([nominal.low, nominal.high], last.inputs)
    if Goal(low + high, high).fits(wave):
        return None
    told = f"stays {wave.runs[0][0]}" if wave.stuck else f"has period {wave.period} and is high {wave.high}"
    text = f"the output {told} {for_ever}, not high {high} of {low + high} half-cycles"
    return Breach(begins, last.half_cycle, text)


LEVEL = ("low", "high")


def _which(varies: bool, word: str) -> str:
    return f"the {word} nominal one of the values so far" if varies else "the nominal one"


def _length(pulse: Pulse) -> str:
    """How long a pulse is, with what is not certain of it."""
    if pulse.whole == pulse.touched:
        return f"of {pulse.whole} half-cycle{'s' * (pulse.whole != 1)}"
    if pulse.whole == 0 and pulse.touched == 1:
        return "of part of a half-cycle"
    return f"of more than {pulse.whole} and less than {pulse.touched} half-cycles"


# -- danger tables -----------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Limits:
    """A claim for each of several limits, on one machine: the row number is the first index of its tables.

    longest  whether no pulse may be longer, or none shorter
    level    the level of the pulses
    limit    T in half-cycles, shape (rows, 1) or (rows, states)
    allowed  which values the inputs may take, shape (rows, values)
    domain   where the claim is made, by the inputs' values, rigid ones among them: shape (values, states)

    A danger of 0 is none: the pulse is of the other level, or its beginning was not seen, or it is long enough. For a
    shortest pulse it is the whole half-cycles that are still missing, and one more after a beginning by a move; for a
    longest pulse one more than the edges since its beginning.
    """

    longest: np.ndarray
    level: np.ndarray
    limit: np.ndarray
    allowed: np.ndarray
    domain: np.ndarray

    def at(self, rows: np.ndarray, states: np.ndarray) -> np.ndarray:
        """The limits of these rows in these states."""
        found: np.ndarray = self.limit[rows, states if self.limit.shape[1] > 1 else 0]
        return found


@dataclass(frozen=True)
class Table:
    """A machine's relations as tables.

    A state's number has the first variable in its lowest bits, a value's number the first input.

    edge    the state after an edge, shape (values, states)
    move    the state after a move, shape (values before, values after, states); None where no state moves
    output  shape (values, states)
    """

    edge: np.ndarray
    move: np.ndarray | None
    output: np.ndarray

    @property
    def values(self) -> int:
        return int(self.edge.shape[0])

    @property
    def states(self) -> int:
        return int(self.edge.shape[1])

    def moved(self, before: np.ndarray, after: np.ndarray, states: np.ndarray) -> np.ndarray:
        """The states after moves between these values."""
        found: np.ndarray = states if self.move is None else self.move[before, after, states]
        return found


def tables(machine: Machine, choice: int = 0) -> Table:
    """The machine's relations for every state and every value, where the bits that x stands for are those of a
    number."""
    import numpy as np

    states, values = 1 << machine.bits, 1 << machine.moving_bits
    count = states * values
    numbers = np.arange(count, dtype=np.uint64)
    columns = _columns(machine.variables, numbers % np.uint64(states))
    columns |= _columns(machine.moving, numbers // np.uint64(states))
    columns |= _columns(machine.choices, np.full(count, choice, dtype=np.uint64))
    *edge, output = e.arrays([*machine.edge, machine.output], columns)
    shape = (values, states)
    move = None
    if any(
        after.op != "var" or after.name != name
        for name, after in zip(machine.names, machine.move, strict=True)
    ):
        rows = []
        for value in range(values):
            there = np.full(count, value, dtype=np.uint64)
            new = {name + AFTER: column for name, column in _columns(machine.moving, there).items()}
            rows.append(_number(machine.variables, e.arrays(machine.move, columns | new)).reshape(shape))
        move = np.stack(rows, axis=1)
    return Table(_number(machine.variables, edge).reshape(shape), move, output.astype(np.int8).reshape(shape))


def _columns(variables: Sequence[tuple[str, int]], numbers: np.ndarray) -> dict[str, np.ndarray]:
    """The variables' values in the states or values with these numbers."""
    import numpy as np

    out, at = {}, 0
    for name, width in variables:
        out[name] = (numbers >> np.uint64(at)) & np.uint64((1 << width) - 1)
        at += width
    return out


def _number(variables: Sequence[tuple[str, int]], parts: Sequence[np.ndarray]) -> np.ndarray:
    import numpy as np

    total: np.ndarray = np.zeros(len(parts[0]), dtype=np.int64)
    at = 0
    for part, (_, width) in zip(parts, variables, strict=True):
        total |= part.astype(np.int64) << at
        at += width
    return total


def everywhere(machine: Machine, wanted: Sequence[Expr]) -> list[np.ndarray]:
    """Expressions over the inputs and the variables, for every value and state: shape (values, states)."""
    import numpy as np

    states, values = 1 << machine.bits, 1 << machine.moving_bits
    numbers = np.arange(states * values, dtype=np.uint64)
    columns = _columns(machine.variables, numbers % np.uint64(states))
    columns |= _columns(machine.moving, numbers // np.uint64(states))
    return [a.astype(np.int64).reshape(values, states) for a in e.arrays(wanted, columns)]


def start_values(machine: Machine, place: int) -> tuple[Begin, Mapping[str, int]]:
    """The beginning that a place in `starts` is of, and the values of the inputs and of its free variables there."""
    for begin in machine.begins:
        free = [*machine.moving, *machine.rigid, *begin.free]
        count = 1 << sum(width for _, width in free)
        if place < count:
            return begin, named(free, place)
        place -= count
    raise IndexError(place)


def starts(machine: Machine) -> tuple[np.ndarray, np.ndarray]:
    """Every start: its state and its value, as numbers."""
    import numpy as np

    states, values = [], []
    for begin in machine.begins:
        free = [*machine.moving, *machine.rigid, *begin.free]
        every = np.arange(1 << sum(width for _, width in free), dtype=np.uint64)
        columns = _columns(free, every)
        found = e.arrays([begin.state[name] for name in machine.names], columns)
        states.append(_number(machine.variables, found))
        values.append((every % np.uint64(1 << machine.moving_bits)).astype(np.int64))
    return np.concatenate(states), np.concatenate(values)


def danger_faults(machine: Machine, limits: Limits, danger: np.ndarray, choice: int = 0) -> list[str]:
    """What is wrong with the claim that no run breaks any of the limits, and that each of the (rows, values, states)
    is reached with the danger given at most, or not at all where that is −1: after the inputs have moved. The claim
    is looked at where the bits that x stands for are those of `choice`, and has to hold for each."""
    import numpy as np

    table = tables(machine, choice)
    plain = table if choice == 0 else tables(machine)
    faults = []
    row, value, state = np.nonzero(danger >= 0)
    if not limits.allowed[row, value].all():
        faults.append("a value that is not allowed")
    after = table.edge[value, state]
    was, now = table.output[value, state], table.output[value, after]
    if (table.output != plain.output)[value, state].any() or (now != plain.output[value, after]).any():
        faults.append("an output that hangs on what x stands for")
    at_edge, broken = after_edge(limits, row, after, was, now, danger[row, value, state])
    if broken.any():
        faults.append("a limit that an edge breaks")
    first, given = starts(machine)
    for number in range(len(limits.level)):
        begins = limits.allowed[number, given] & limits.domain[given, first]
        rows = np.full(int(begins.sum()), number)
        more = (rows, given[begins], first[begins], np.zeros(len(rows), dtype=np.int64))
        picked = row == number
        groups = [more, (row[picked], value[picked], after[picked], at_edge[picked])]
        for to in np.flatnonzero(limits.allowed[number]):
            for rows, values, states, near in groups:
                target = table.moved(values, np.full(len(values), to), states)
                was, now = table.output[values, states], table.output[to, target]
                if (now != plain.output[to, target]).any():
                    faults.append("an output that hangs on what x stands for")
                gone, broken = after_move(limits, rows, target, was, now, near)
                if broken.any():
                    faults.append("a limit that a move breaks")
                if (danger[number, to, target] < gone).any():
                    faults.append("a state in greater danger than claimed")
    return list(dict.fromkeys(faults))


def after_edge(
    limits: Limits, row: np.ndarray, state: np.ndarray, was: np.ndarray, now: np.ndarray, danger: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """The danger after an edge that leads to the states, and whether a limit is broken."""
    import numpy as np

    limit, longest = limits.at(row, state), limits.longest[row]
    ticked = np.where(longest, danger + (danger > 0), np.maximum(danger - 1, 0))
    over = np.where(longest, (was == now) & (ticked > limit), (was != now) & (ticked > 0))
    begun = np.where(now == limits.level[row], np.where(longest, 1, limit), 0)
    return np.where(was == now, ticked, begun), over


def after_move(
    limits: Limits, row: np.ndarray, state: np.ndarray, was: np.ndarray, now: np.ndarray, danger: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """The danger after a move that leads to the states, and whether a limit is broken."""
    import numpy as np

    limit, longest = limits.at(row, state), limits.longest[row]
    over = ~longest & (was != now) & (danger > 0)
    begun = np.where(now == limits.level[row], np.where(longest, 1, limit + 1), 0)
    return np.where(was == now, danger, begun), over


def rank_faults(
    table: Table,
    reached: np.ndarray,
    phase: np.ndarray,
    rank: np.ndarray,
    period: np.ndarray,
    high: np.ndarray,
) -> list[str]:
    """What is wrong with the claim that with the inputs held every reached state becomes good within its rank.

    All have shape (values, states); phase −1 says not good, `period` and `high` are half-cycles."""
    import numpy as np

    value = np.arange(table.values)[:, None]
    after = table.edge
    faults = []
    if (reached & (rank < 0)).any():
        faults.append("a state without a rank")
    claimed, good = rank >= 0, rank == 0
    if (good != (phase >= 0)).any():
        faults.append("a rank of zero where there is no phase, or the other way round")
    if (good & (table.output != (phase < high))).any():
        faults.append("a good state whose output does not fit its phase")
    if (good & (phase[value, after] != (phase + 1) % np.maximum(period, 1))).any():
        faults.append("a good state whose successor has another phase than the next")
    nearer = (rank[value, after] >= 0) & (rank[value, after] < rank)
    if (claimed & ~good & ~nearer).any():
        faults.append("a state whose successor has no lower rank")
    return faults


def still_faults(table: Table, reached: np.ndarray, level: np.ndarray, still: np.ndarray) -> list[str]:
    """What is wrong with the claim that with the inputs held the output of every reached state stays at its level
    after so many half-cycles. All have shape (values, states)."""
    import numpy as np

    value = np.arange(table.values)[:, None]
    then, left = level[value, table.edge], still[value, table.edge]
    faults = []
    if (reached & (still < 0)).any():
        faults.append("a state whose output is not said to come to stay")
    claimed = still >= 0
    if (claimed & ((then != level) | (left < 0) | (left > np.maximum(still - 1, 0)))).any():
        faults.append("a state whose successor comes to stay no sooner, or elsewhere")
    if ((still == 0) & (table.output != level)).any():
        faults.append("an output that is not at its level")
    return faults


def named(variables: Sequence[tuple[str, int]], number: int) -> Mapping[str, int]:
    """The values of a state or value by its number."""
    out = {}
    for name, width in variables:
        out[name] = number & ((1 << width) - 1)
        number >>= width
    return out
