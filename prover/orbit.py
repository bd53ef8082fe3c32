"""The orbit of one start state, traced with jumps (loop acceleration).

Follow the machine one input cycle at a time. When several cycles in a row add the same vector to the registers,
ask the solver for the least number of cycles after which the next one no longer does, or the output changes,
and jump there. A counter's pass from zero to its limit becomes one repeat whatever the limit. When whole blocks
of such items recur, each moved by the same vector (a prescaler's rounds, as the next counter counts them), the
block becomes the body of a repeat in the same way, so a cascade of counters costs no more than its depth.
Acceleration of guarded counters is due to Comon and Jurski (1998) and Finkel and Leroux (2002); here the guard
is whatever the solver says it is.

Limits: an orbit that never adds the same vector twice (a shift register, a Gray counter) is followed state by
state, and one that runs through more items than the effort allows is left open.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise

from prover import expr as e
from prover import path
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.path import Beat, Item, Path, Repeat
from prover.rhythm import Orbit
from prover.solve import fresh_solver
from prover.system import State, System

PATIENCE = 6
"""Cycles with the same stride that are followed one by one before a jump is tried: short counters, the
common case, never need the solver."""

BLOCK = 128
"""Items up to which a recurring block is looked for."""

PACE = 64
"""Cycles followed one by one after which it is looked for whether several of them together go on with one stride."""

GAIT = 12
"""Cycles that are looked at together for that: a fast toggle beside a counter takes two."""


Places = dict[State, tuple[Path, int]]
"""States on loops found before: the loop, and the index of the item that begins with the state."""


def trace(
    system: System, start: State, effort: Effort, known: Places | None = None, most: int | None = None
) -> Orbit:
    """The orbit of `start`, as far as the effort allows and in at most so many items; it is not closed if that did
    not suffice.

    A loop that is `known` is not traced again. The path is the search's word only: `certificate` checks it.
    """
    search = _Search(system, effort, known or {}, most)
    try:
        search.follow(start)
    except OutOfEffort as out:
        return Orbit(path.joined(search.items), (), search.widths, str(out))
    if search.joins:
        return Orbit(path.joined(search.items), search.joins, search.widths)
    lead, loop = search.items[: search.loop_from], search.items[search.loop_from :]
    return Orbit(path.joined(lead), path.joined(loop), search.widths)


def onward(loop: Path) -> Places:
    """The place of the state at each item of a loop."""
    return {path.first_state((item,)): (loop, i) for i, item in enumerate(loop)}


Shape = tuple[object, ...]


class _Search:
    """The orbit as found so far: one item a cycle (a pair of beats as a repeat of one round) or a jump.

    `seen` gives for the state at an item's start the item's index; `jumps` for the shape of a repeat the
    indices where it stands."""

    def __init__(self, system: System, effort: Effort, known: Places, most: int | None) -> None:
        self.most = most
        self.system = system
        self.known = known
        self.joins: Path = ()
        self.widths = tuple(width for _, width in system.variables)
        self.effort = effort
        self.items: list[Repeat] = []
        self.seen: dict[State, int] = {}
        self.jumps: dict[Shape, list[int]] = {}
        self.loop_from = 0
        self.short: dict[State, int] = {}
        self.stumbles = 0

    def follow(self, state: State) -> None:
        run, choices = self.system.run, [0] * len(self.system.choices)
        previous: State | None = None
        repeats = 0
        count = 0
        while state not in self.seen:
            if state in self.known:
                loop, at = self.known[state]
                self.joins = (*loop[at:], *loop[:at])
                return
            count += 1
            if count % 1024 == 0:
                self.effort.say(f"following an orbit, cycle {count}")
            if self.most is not None and len(self.items) > self.most:
                raise OutOfEffort(f"an orbit of more than {self.most} items")
            *middle_list, first = run(*state, *choices)
            middle = tuple(middle_list)
            *after_list, second = run(*middle, *choices)
            after = tuple(after_list)
            stride = tuple(
                (b - a) & ((1 << w) - 1) for a, b, w in zip(state, after, self.widths, strict=True)
            )
            repeats = repeats + 1 if stride == previous else 0
            previous = stride
            cycle = Repeat(1, stride, (Beat(state, first), Beat(middle, second)))
            self.seen[state] = len(self.items)
            if any(stride) and repeats >= PATIENCE << min(self.short.get(stride, 0), 8):
                jump = self._extended(cycle)
                if jump.times < 4:
                    # Perhaps this stride never holds for long: be more patient with it from now on.
                    self.short[stride] = self.short.get(stride, 0) + 1
                    repeats = 0
                if jump.times > 1:
                    repeats, previous = 0, None
                    state = self._append_jump(jump)
                    continue
            self.items.append(cycle)
            state = after
            if count % (PACE << self.stumbles) == 0:
                together = self._together(state)
                if together is not None:
                    repeats, previous = 0, None
                    state = self._append_jump(together)
        self.loop_from = self.seen[state]

    def _together(self, state: State) -> Repeat | None:
        """The last few cycles repeated, if these together have gone on with one stride up to the state and surely do
        so for long; they are taken off the items."""
        for size in range(2, GAIT + 1):
            block = self._gait(size)
            if block is None or path.moved(path.first_state((block,)), block.stride, 1, self.widths) != state:
                continue
            jump = self._extended(block)
            if jump.times >= 8:
                self._forget(len(self.items) - size)
                self.seen[path.first_state((jump,))] = len(self.items)
                return jump
            self.stumbles = min(self.stumbles + 1, 8)
        return None

    def _gait(self, size: int) -> Repeat | None:
        """The last `size` cycles, if each of the last three times as many is the one so far before it, moved by one
        vector."""
        last = self.items[-4 * size :]
        if len(last) < 4 * size or any(item.times != 1 for item in last):
            return None
        stride: State | None = None
        for before, after in zip(last, last[size:], strict=False):
            a, b = path.first_state((before,)), path.first_state((after,))
            moved = tuple((y - x) & ((1 << w) - 1) for x, y, w in zip(a, b, self.widths, strict=True))
            if (stride is not None and moved != stride) or _levels(before) != _levels(after):
                return None
            stride = moved
        if stride is None or not any(stride):
            return None
        return Repeat(1, stride, tuple(path.joined(last[-size:])))

    def _forget(self, begins: int) -> None:
        """Take items off from one on."""
        for state, index in list(self.seen.items()):
            if index >= begins:
                del self.seen[state]
        for known in self.jumps.values():
            while known and known[-1] >= begins:
                known.pop()
        del self.items[begins:]

    def _extended(self, block: Repeat) -> Repeat:
        """The block repeated as often as it surely holds."""
        self.effort.say(f"jumping along an orbit, item {len(self.items)}")
        return Repeat(least_break(self.system, block, self.effort), block.stride, block.body)

    def _append_jump(self, jump: Repeat) -> State:
        """Append a repeat, and fold it with the blocks before it as long as these recur; the state after it."""
        while True:
            at = len(self.items)
            self.items.append(jump)
            shape = _shape(jump)
            places = self.jumps.setdefault(shape, [])
            places.append(at)
            block = self._recurring(places)
            if block is None:
                break
            folded = self._extended(block)
            if folded.times < 2:
                break
            # The last block goes into the repeat; what stood there is forgotten.
            self._forget(places[-2] + 1)
            self.seen[path.first_state((folded,))] = len(self.items)
            jump = folded
        return path.moved(path.first_state((jump,)), jump.stride, jump.times, self.widths)

    def _recurring(self, places: Sequence[int]) -> Repeat | None:
        """The block that ends with the last item, if the two blocks before it are the same moved by one vector."""
        if len(places) < 4:
            return None
        size = places[-1] - places[-2]
        if size > BLOCK or places[-2] - places[-3] != size or places[-3] - places[-4] != size:
            return None
        blocks = [self.items[p - size + 1 : p + 1] for p in places[-3:]]
        if any([_shape(i) for i in b] != [_shape(i) for i in blocks[0]] for b in blocks[1:]):
            return None
        starts = [path.first_state(b) for b in blocks]
        strides = [
            tuple((y - x) & ((1 << w) - 1) for x, y, w in zip(a, b, self.widths, strict=True))
            for a, b in pairwise(starts)
        ]
        if strides[0] != strides[1] or not any(strides[0]):
            return None
        return Repeat(1, strides[0], tuple(path.joined(blocks[-1])))


def _levels(cycle: Repeat) -> list[int | None]:
    return [item.steady for item in cycle.body]


def _shape(item: Item) -> Shape:
    """What two items share that differ by a constant vector only."""
    if isinstance(item, Beat):
        return (item.level,)
    return (item.times, item.stride, *(_shape(inner) for inner in item.body))


# -- how far a repeat holds --------------------------------------------------------------------------------


def least_break(system: System, block: Repeat, effort: Effort, then: State | None = None) -> int:
    """The greatest number of rounds for which the block surely repeats, or until it returns to its start.

    A round is broken if a step in it is not as in the first, moved by the stride, or leads elsewhere than to
    the next round, which is `then` away (the stride itself unless given)."""
    widths = tuple(width for _, width in system.variables)
    size = max(w for w, d in zip(widths, block.stride, strict=True) if d)
    # The block is back at its own start after this many rounds; more would go round the loop several times.
    returns = max((1 << w) // (d & -d) for w, d in zip(widths, block.stride, strict=True) if d)
    likely = _likely_break(system, block, returns, then or block.stride)
    return least(lambda count: broken_round(system, block, count, then or block.stride), size, likely, effort)


def least(broken: Callable[[Expr], Expr], size: int, likely: int, effort: Effort) -> int:
    """The least number from 1 on for which a formula over a word of size + 1 bits is true; `likely` if there is
    none below that. Asks for any, then for a lesser one, halving the range as it goes."""
    import z3

    solver = fresh_solver()
    (formula,) = e.z3_terms([broken(e.var("!round", size + 1))], context=solver.ctx)
    index = z3.BitVec("!round", size + 1, solver.ctx)
    solver.add(formula == 1)
    low, high = 1, likely

    def any_below(bound: int) -> int | None:
        effort.check()
        solver.push()
        solver.set("timeout", max(1, int(effort.left * 1000)))
        solver.add(z3.ULE(low, index), z3.ULT(index, bound))
        answer = solver.check()
        model = solver.model() if answer == z3.sat else None
        solver.pop()
        if answer == z3.unknown:
            raise OutOfEffort(f"the solver gave up while {effort.doing}")
        return int(model.eval(index, model_completion=True).as_long()) if model is not None else None

    found = any_below(high)
    while found is not None:
        high = found
        if low >= high:
            break
        # An unbroken half is excluded at once; otherwise the number found is a better bound.
        half = (low + high) // 2
        below = any_below(half) if half > low else None
        if below is None:
            low = max(half, low)
            found = any_below(high)
        else:
            found = below
    return high


def _likely_break(system: System, block: Repeat, limit: int, then: State) -> int:
    """A round that is broken, or the limit: guessed from the constants of the design and from powers of two, and
    tried. The solver then only has to show that there is none before it."""
    widths = tuple(width for _, width in system.variables)
    start = path.first_state(block.body)
    constants = {node.value for node in e.topological(system.step) if node.is_const and node.width > 1}
    guesses: set[int] = set()
    for value, step, width in zip(start, block.stride, widths, strict=True):
        if step in (1, (1 << width) - 1):
            sign = 1 if step == 1 else -1
            powers = {1 << i for i in range(width)}
            near = {c + slip for c in constants | powers for slip in (-1, 0, 1)}
            guesses |= {sign * (c - value) % (1 << width) for c in near}
    following = path.moved(start, then, 1, widths)
    claims = list(path.steps(block.body, widths, following))
    zeros = [0] * len(system.choices)
    for rounds in sorted(guess for guess in guesses if 0 < guess < limit):
        for claim in claims:
            source = path.moved(claim.source, block.stride, rounds, widths)
            target = path.moved(claim.target, block.stride, rounds, widths)
            if system.run(*source, *zeros) != (*target, claim.level):
                return rounds
    return limit


def broken_round(system: System, block: Repeat, count: Expr, then: State) -> Expr:
    """One bit: in round number `count` some step or some level of the block is another than in its first."""
    widths = tuple(width for _, width in system.variables)
    following = path.moved(path.first_state(block.body), then, 1, widths)
    wrong: list[Expr] = []
    for claim in path.steps(block.body, widths, following):
        indices = [(count, block.stride)]
        bounds = e.TRUE
        for i, (times, stride) in enumerate(claim.axes):
            size = times.bit_length() + 1
            inner = e.var(f"!inner{i}.{size}", size)
            bounds = e.bvand(bounds, e.bvult(inner, e.const(times, size)))
            indices.append((inner, stride))
        here, there = _along(system, claim.source, indices), _along(system, claim.target, indices)
        values = dict(zip(system.names, here, strict=True))
        *stepped, out = e.substitute([*system.step, system.output], values)
        differs = e.disj(e.bvnot(e.eq(a, b)) for a, b in zip(stepped, there, strict=True))
        differs = e.bvor(differs, e.bvnot(out) if claim.level else out)
        wrong.append(e.bvand(bounds, differs))
    return e.disj(wrong)


def _along(system: System, base: State, indices: Sequence[tuple[Expr, State]]) -> list[Expr]:
    out: list[Expr] = []
    for i, (_, width) in enumerate(system.variables):
        total = e.const(base[i], width)
        for index, stride in indices:
            scaled = e.bvmul(e.resize(index, width, False), e.const(stride[i], width))
            total = e.bvadd(scaled, total)
        out.append(total)
    return out


def least_break_backwards(system: System, block: Repeat, stride: State, effort: Effort) -> int:
    """How many rounds the block can be extended backwards by, its own first counted: the greatest k so that for
    all rounds below k, moved back by the stride, every step is as in the first round."""
    return least_break(system, Repeat(1, stride, block.body), effort, then=block.stride)
