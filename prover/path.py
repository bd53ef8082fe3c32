"""Paths: what a machine runs through, written short with nested repetition.

A path is a sequence of items. A beat is one half-cycle: a state and the output's level in it. A repeat runs a
body a number of times and adds a constant vector to every state in it each time (mod 2^width). A counter's
pass is one repeat of two beats; a cascade's is a repeat whose body holds another. Times of billions cost
nothing, and every question here is answered without unrolling them.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from itertools import accumulate, groupby

State = tuple[int, ...]
Run = tuple[int, int]
"""A level and the number of half-cycles for which the output keeps it."""

FEW = 16
"""Items up to which passing over them is no slower than a table of where they end."""


@dataclass(frozen=True, slots=True)
class Beat:
    """One half-cycle: the state (with every enclosing repeat in its first round) and the output's level."""

    state: State
    level: int

    @property
    def length(self) -> int:
        return 1

    @property
    def steady(self) -> int | None:
        """The level, as for a repeat."""
        return self.level


@dataclass(frozen=True, slots=True)
class Repeat:
    """The body `times` times over, `stride` added to its states each time.

    `length` is in half-cycles; `steady` is the output's level if it never changes within, else None."""

    times: int
    stride: State
    body: tuple[Item, ...]
    length: int = field(init=False)
    steady: int | None = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "length", self.times * length(self.body))
        levels = {item.steady for item in self.body}
        object.__setattr__(self, "steady", levels.pop() if len(levels) == 1 else None)


Item = Beat | Repeat
Path = tuple[Item, ...]


def length(path: Sequence[Item]) -> int:
    """Half-cycles from the path's first beat to the end of its last."""
    return sum(item.length for item in path)


def joined(items: Sequence[Item]) -> Path:
    """The items as a path: repeats of a single round give way to their body."""
    out: list[Item] = []
    for item in items:
        out.extend(item.body if isinstance(item, Repeat) and item.times == 1 else (item,))
    return tuple(out)


def folded(path: Sequence[Item], widths: Sequence[int], longest: int = 32) -> Path:
    """The same path with stretches of beats that recur, each time moved by one vector, as repeats.

    Blocks of up to `longest` beats are tried, and a repeat made of four rounds or more."""
    out: list[Item] = []
    at = 0
    while at < len(path):
        best: Repeat | None = None
        for size in range(1, longest + 1):
            block = _recurring(path, at, size, widths)
            if block is not None and (best is None or block.length > best.length):
                best = block
        out.append(path[at] if best is None else best)
        at += 1 if best is None else best.length
    return tuple(out)


def _recurring(path: Sequence[Item], at: int, size: int, widths: Sequence[int]) -> Repeat | None:
    """The repeat of the block of so many beats there, if it recurs often enough."""
    first, then = path[at], path[at + size] if at + size < len(path) else None
    if not isinstance(first, Beat) or not isinstance(then, Beat):
        return None
    pairs = zip(first.state, then.state, widths, strict=True)
    stride = tuple((b - a) & ((1 << w) - 1) for a, b, w in pairs)
    end = at + size
    while end < len(path):
        here, before = path[end], path[end - size]
        if not isinstance(here, Beat) or not isinstance(before, Beat) or here.level != before.level:
            break
        if here.state != moved(before.state, stride, 1, widths):
            break
        end += 1
    times = (end - at) // size
    body = path[at : at + size]
    if times < 4 or not all(isinstance(item, Beat) for item in body):
        return None
    return Repeat(times, stride, tuple(body))


def merged(runs: Iterable[Run]) -> Iterator[Run]:
    """Neighbouring runs of one level joined."""
    for level, group in groupby(runs, key=lambda run: run[0]):
        yield level, sum(size for _, size in group)


def pieces(path: Sequence[Item]) -> Iterator[Run]:
    """The output's levels with their half-cycles, in order; neighbours may have one level."""
    for item in path:
        if item.steady is not None:
            yield item.steady, item.length
        elif isinstance(item, Repeat):
            for _ in range(item.times):
                yield from pieces(item.body)


SHOWN = 3
"""Rounds of a repeat after which what is measured between changes of the output goes on as it was: a round that has
both levels has a change within, and two neighbouring rounds have a rise."""


def abridged(path: Sequence[Item], skips: list[tuple[int, int]]) -> Iterator[Run]:
    """The output's levels with their half-cycles, where no repeat goes on for more than SHOWN rounds.

    Every gap and every pulse of the path is among those of the abridged one. What is left out is added to `skips`:
    where, in half-cycles of the abridged path, and how many half-cycles."""
    at = 0

    def walk(items: Sequence[Item]) -> Iterator[Run]:
        nonlocal at
        for item in items:
            if item.steady is not None:
                at += item.length
                yield item.steady, item.length
            elif isinstance(item, Repeat):
                for _ in range(min(item.times, SHOWN)):
                    yield from walk(item.body)
                if item.times > SHOWN:
                    skips.append((at, item.length // item.times * (item.times - SHOWN)))

    return walk(path)


def rises(loop: Sequence[Item]) -> int:
    """The number of rises of the output once round a loop."""
    _, last, count = _rises(loop)
    first = _rises(loop[:1])[0]
    return count + int(not last and first)


def _rises(path: Sequence[Item]) -> tuple[int, int, int]:
    """The first level of a path that is not empty, its last, and the rises within it."""
    first, before, total = -1, -1, 0
    for item in path:
        if item.steady is not None:
            begins, ends, count = item.steady, item.steady, 0
        else:
            assert isinstance(item, Repeat)
            begins, ends, count = _rises(item.body)
            count = item.times * count + (item.times - 1) * int(not ends and begins)
        total += count + int(before == 0 and begins == 1)
        first, before = (begins if first < 0 else first), ends
    return first, before, total


def changes(path: Sequence[Item], limit: int) -> int:
    """The number of pieces of the path's output, or more than the limit."""
    total = 0
    for item in path:
        if item.steady is not None or isinstance(item, Beat):
            total += 1
        else:
            total += item.times * changes(item.body, limit)
        if total > limit:
            return total
    return total


def moved(state: State, stride: State, times: int, widths: Sequence[int]) -> State:
    """state + times · stride, each component mod 2^width."""
    return tuple((v + times * d) & ((1 << w) - 1) for v, d, w in zip(state, stride, widths, strict=True))


def shifted(item: Item, stride: State, times: int, widths: Sequence[int]) -> Item:
    """The item with times · stride added to all its states."""
    if isinstance(item, Beat):
        return Beat(moved(item.state, stride, times, widths), item.level)
    return Repeat(item.times, item.stride, tuple(shifted(i, stride, times, widths) for i in item.body))


def split(path: Sequence[Item], at: int, widths: Sequence[int]) -> tuple[Path, Path]:
    """The path cut in two, `at` half-cycles after its start."""
    for number, item in enumerate(path):
        if at < item.length:
            if at == 0 or isinstance(item, Beat):
                return tuple(path[:number]), tuple(path[number:])
            rounds, rest = divmod(at, item.length // item.times)
            head, tail = split([shifted(i, item.stride, rounds, widths) for i in item.body], rest, widths)
            after = [shifted(i, item.stride, rounds + 1, widths) for i in item.body]
            first = [Repeat(rounds, item.stride, item.body)] if rounds else []
            last = [Repeat(left, item.stride, tuple(after))] if (left := item.times - rounds - 1) else []
            return joined([*path[:number], *first, *head]), joined([*tail, *last, *path[number + 1 :]])
        at -= item.length
    return tuple(path), ()


@dataclass(frozen=True, slots=True)
class Place:
    """Where in a path a half-cycle lies.

    state   the machine's state there
    level   the output there
    calm    half-cycles, this one included, until the path leaves the innermost repeat
    around  the innermost repeat; None outside any
    """

    state: State
    level: int
    calm: int
    around: Repeat | None


Cut = Callable[[Sequence[Item], int], tuple[Item, int]]
"""From items and half-cycles after their start to the item there, and the half-cycles after its own start."""


def place(path: Sequence[Item], at: int, widths: Sequence[int]) -> Place:
    """The place `at` half-cycles after the path's start. Raises IndexError beyond its end."""
    return _place(path, at, widths, _item_at)


class Places:
    """The places in a path, for looking up many: each is found in the logarithm of the number of items, where
    `place` passes over those before it."""

    def __init__(self, path: Path, widths: Sequence[int]) -> None:
        self._path, self._widths = path, widths
        # By the identity of a body, which the path keeps alive: where each of its items ends.
        self._ends: dict[int, list[int]] = {}

    def at(self, half_cycle: int) -> Place:
        """The place so many half-cycles after the path's start. Raises IndexError beyond its end."""
        return _place(self._path, half_cycle, self._widths, self._item_at)

    def _item_at(self, items: Sequence[Item], at: int) -> tuple[Item, int]:
        if len(items) < FEW:
            return _item_at(items, at)
        if id(items) not in self._ends:
            self._ends[id(items)] = list(accumulate(item.length for item in items))
        ends = self._ends[id(items)]
        number = bisect_right(ends, at)
        if number == len(items):
            raise IndexError("beyond the end of the path")
        return items[number], at - ends[number] + items[number].length


def _item_at(items: Sequence[Item], at: int) -> tuple[Item, int]:
    for item in items:
        if at < item.length:
            return item, at
        at -= item.length
    raise IndexError("beyond the end of the path")


def _place(path: Sequence[Item], at: int, widths: Sequence[int], cut: Cut) -> Place:
    offset: State = (0,) * len(widths)
    around: Repeat | None = None
    calm = 1
    items: Sequence[Item] = path
    while True:
        item, at = cut(items, at)
        if isinstance(item, Beat):
            return Place(moved(item.state, offset, 1, widths), item.level, calm, around)
        calm = item.length - at
        round_length = item.length // item.times
        times, at = divmod(at, round_length)
        offset = moved(offset, item.stride, times, widths)
        around = item
        items = item.body


def onward(path: Sequence[Item], at: int, widths: Sequence[int]) -> Path:
    """What is left of a path `at` half-cycles after its start."""
    for index, item in enumerate(path):
        if at >= item.length:
            at -= item.length
            continue
        if at == 0 or isinstance(item, Beat):
            return tuple(path[index:])
        rounds, at = divmod(at, item.length // item.times)
        begun = _shifted(item.body, item.stride, rounds, widths)
        left: list[Item] = [*onward(begun, at, widths)]
        if rounds + 1 < item.times:
            rest = _shifted(item.body, item.stride, rounds + 1, widths)
            left.append(Repeat(item.times - rounds - 1, item.stride, rest))
        return (*left, *path[index + 1 :])
    return ()


def _shifted(path: Sequence[Item], stride: State, times: int, widths: Sequence[int]) -> Path:
    """The path with a multiple of a vector added to every state."""
    return tuple(
        Beat(moved(item.state, stride, times, widths), item.level)
        if isinstance(item, Beat)
        else Repeat(item.times, item.stride, _shifted(item.body, stride, times, widths))
        for item in path
    )


def first_state(path: Sequence[Item]) -> State:
    """The state in the path's first half-cycle."""
    item = path[0]
    while isinstance(item, Repeat):
        item = item.body[0]
    return item.state


def last_beat(path: Sequence[Item], widths: Sequence[int]) -> Beat:
    """The path's last half-cycle, every repeat in it in its last round."""
    offset: State = (0,) * len(widths)
    item = path[-1]
    while isinstance(item, Repeat):
        offset = moved(offset, item.stride, item.times - 1, widths)
        item = item.body[-1]
    return Beat(moved(item.state, offset, 1, widths), item.level)


def beats(path: Sequence[Item]) -> Iterator[Beat]:
    """Every beat as written, each repeat's body once."""
    stack = list(reversed(path))
    while stack:
        item = stack.pop()
        if isinstance(item, Beat):
            yield item
        else:
            stack.extend(reversed(item.body))


@dataclass(frozen=True, slots=True)
class Step:
    """A claim of a path: for all indices within the axes, `source` steps to `target` and shows `level`.

    Both states have the sum of index · stride over the axes added to them. An axis is (count, stride)."""

    source: State
    target: State
    level: int
    axes: tuple[tuple[int, State], ...]


def steps(path: Sequence[Item], widths: Sequence[int], then: State | None) -> Iterator[Step]:
    """Everything that has to hold for the machine to run through the path, and from its end to `then`.

    Without `then` nothing is claimed of the last beat.
    """
    yield from _steps(path, widths, then, ())


def _steps(
    path: Sequence[Item], widths: Sequence[int], then: State | None, axes: tuple[tuple[int, State], ...]
) -> Iterator[Step]:
    for i, item in enumerate(path):
        following = first_state(path[i + 1 : i + 2]) if i + 1 < len(path) else then
        if isinstance(item, Repeat):
            inner = (*axes, (item.times, item.stride))
            yield from _steps(item.body, widths, None, inner)
            last = last_beat(item.body, widths)
            if item.times > 1:
                back = moved(first_state(item.body), item.stride, 1, widths)
                yield Step(last.state, back, last.level, (*axes, (item.times - 1, item.stride)))
            last = last_beat((item,), widths)
        else:
            last = item
        if following is not None:
            yield Step(last.state, following, last.level, axes)
