"""Engine: what holds between two dividers side by side, mined from runs and made inductive.

Runs from the start show what registers and inputs have in common: affine relations over bits and over words, ranges,
orders, implications between bits, and the pairs of values that small registers take. The solver looks for a state in
which all of that holds, and the outputs agree, from which a step leads to where it does not; that state is taken in
like one from a run, until there is none. So each kind of relation ends as the strongest that goes on holding, the
least fixpoint in its domain (Reps, Sagiv and Yorsh 2004); equal registers are found on the way, as are counts with a
fixed sum and codes that are linear in each other (signal correspondence, van Eijk 1998, with more than equality).
Where a step needs to look back further, the relations have to hold for several half-cycles first (k-induction,
Sheeran, Singh and Stålmarck 2000).

Limits: what needs a relation of none of these kinds is left open.
"""

from __future__ import annotations

import random
from collections.abc import Callable, Collection, Iterator, Sequence
from functools import partial
from itertools import combinations, product
from typing import Protocol

from prover import expr as e
from prover.affine import BitHull, Equation, WordHull
from prover.effort import Effort, OutOfEffort
from prover.equality import Invariant
from prover.expr import Expr
from prover.joint import Joint
from prover.lockstep import Frames, State, Stepper, random_start, walked

DEPTHS = (1, 2, 4, 8)
"""Half-cycles in a row after which the next is shown, tried in this order."""

KINDS = (
    frozenset({"words", "ranges", "orders"}),
    frozenset({"bits", "tables"}),
    frozenset({"words", "ranges", "orders", "bits", "tables", "implications"}),
)
"""Kinds of relations that are looked for together, tried in this order: the fewer, the sooner found."""

LEAST_EFFORT = 2.0
"""Seconds that each kind of relation has at least, if there are so many."""

WALKS = 24
"""Runs that relations are mined from, at first."""

WALKED = 400
"""Half-cycles of each of them."""

ONWARD = 24
"""Half-cycles that are walked on from a state that the solver found."""

MOST_TRIED = 32
"""Relations that are needed, as far as the solver tells, up to which it is tried to do without each."""

MOST_WORDS = 48
MOST_FLAGS = 48
MOST_ATOMS = 64
MOST_ENTRIES = 96
"""Pairs of values of two small registers that are kept; with more, the two are taken for unrelated."""


def invariant(joint: Joint, effort: Effort) -> Invariant | None:
    """What shows that the outputs agree for ever, or None if none of these relations does.

    It is the search's word only: `equality.invariant_faults` checks it. Raises OutOfEffort."""
    mined = _Mined(joint, effort)
    for depth, kinds in product(DEPTHS, KINDS):
        if "words" in kinds and not mined.words:
            continue
        part = effort.share(max(effort.left / 2, LEAST_EFFORT))
        try:
            found = _fixpoint(joint, mined.fresh(kinds), depth, part)
        except OutOfEffort:
            # Other relations may do, and sooner.
            effort.check()
            continue
        if found is not None:
            return Invariant(_needed(joint, found, depth, effort), depth)
    return None


# -- domains -----------------------------------------------------------------------------------------------


class Domain(Protocol):
    """One kind of relation between what is looked at of a state."""

    def add(self, point: Sequence[int]) -> bool:
        """Take a point in; whether less holds now."""

    def parts(self) -> list[Expr]:
        """What holds of all points taken in."""


class _Bits:
    """Affine relations over GF(2) between single bits."""

    def __init__(self, bits: Sequence[Expr]) -> None:
        self.bits = bits
        self.hull = BitHull(len(bits))

    def add(self, point: Sequence[int]) -> bool:
        return self.hull.add(sum(bit << i for i, bit in enumerate(point)))

    def parts(self) -> list[Expr]:
        return [self._part(equation) for equation in self.hull.equations()]

    def _part(self, equation: Equation) -> Expr:
        total = e.FALSE
        for place, _ in equation.terms:
            total = e.bvxor(total, self.bits[place])
        return e.bvnot(e.bvxor(total, e.const(equation.total, 1)))


class _Words:
    """Affine relations over Z/2^w between words, shorter ones extended by zeros."""

    def __init__(self, words: Sequence[Expr]) -> None:
        self.width = max(word.width for word in words)
        self.words = [e.resize(word, self.width, False) for word in words]
        self.hull = WordHull(len(words), self.width)

    def add(self, point: Sequence[int]) -> bool:
        return self.hull.add(point)

    def parts(self) -> list[Expr]:
        out = []
        for equation in self.hull.equations():
            sides = [e.const(0, self.width), e.const(equation.total, self.width)]
            for place, times in equation.terms:
                # What is taken away stands on the other side, so that factors are small.
                negative = times >> (self.width - 1) and times != 1 << (self.width - 1)
                factor = (-times if negative else times) & ((1 << self.width) - 1)
                term = e.bvmul(self.words[place], e.const(factor, self.width))
                sides[bool(negative)] = e.bvadd(sides[bool(negative)], term)
            out.append(e.eq(sides[0], sides[1]))
        return out


class _Range:
    """The range of a word; once it is no longer `exact`, it grows to the next number that the design speaks of."""

    def __init__(self, word: Expr, landmarks: Sequence[int]) -> None:
        self.word = word
        self.landmarks = landmarks
        self.low: int | None = None
        self.high = 0
        self.exact = True

    def add(self, point: Sequence[int]) -> bool:
        (value,) = point
        if self.low is None:
            self.low = self.high = value
            return True
        if self.low <= value <= self.high:
            return False
        top = (1 << self.word.width) - 1
        if value > self.high:
            above = (x for x in self.landmarks if x >= value)
            self.high = value if self.exact else min(above, default=top)
        else:
            below = (x for x in self.landmarks if x <= value)
            self.low = value if self.exact else max(below, default=0)
        return True

    def parts(self) -> list[Expr]:
        if self.low is None:
            return []
        width = self.word.width
        out = []
        if self.low:
            out.append(e.bvule(e.const(self.low, width), self.word))
        if self.high < (1 << width) - 1:
            out.append(e.bvule(self.word, e.const(self.high, width)))
        return out


class _Candidates:
    """Formulas that have held of every point so far; each is told by what it says of the values."""

    def __init__(self, made: Sequence[tuple[Callable[[Sequence[int]], bool], Callable[[], Expr]]]) -> None:
        self.held = list(made)
        self.empty = True

    def add(self, point: Sequence[int]) -> bool:
        kept = [each for each in self.held if each[0](point)]
        grown = self.empty or len(kept) < len(self.held)
        self.held, self.empty = kept, False
        return grown

    def parts(self) -> list[Expr]:
        return [make() for _, make in self.held]


class _Table:
    """The combinations of values that a few small registers take."""

    def __init__(self, words: Sequence[Expr]) -> None:
        self.words = words
        self.entries: set[tuple[int, ...]] | None = set()

    def add(self, point: Sequence[int]) -> bool:
        if self.entries is None or tuple(point) in self.entries:
            return False
        self.entries.add(tuple(point))
        if len(self.entries) > MOST_ENTRIES:
            self.entries = None
        return True

    def parts(self) -> list[Expr]:
        if self.entries is None or len(self.entries) == 1 << sum(word.width for word in self.words):
            return []
        rows = (
            e.conj(e.eq(word, e.const(x, word.width)) for word, x in zip(self.words, entry, strict=True))
            for entry in sorted(self.entries)
        )
        return [e.disj(rows)]


# -- what is looked at -------------------------------------------------------------------------------------


class _Mined:
    """What is looked at of a state, and what runs from the start have shown of it."""

    def __init__(self, joint: Joint, effort: Effort) -> None:
        effort.say("mining relations between the dividers")
        self.joint = joint
        self.stepper = Stepper(joint)
        self.clock = joint.names.index(joint.both.clock)
        variables = [e.var(name, width) for i, (name, width) in enumerate(joint.variables) if i != self.clock]
        self.flags = [v for v in variables if v.width == 1][:MOST_FLAGS]
        self.words = [v for v in variables if v.width > 1]
        self.bits = [e.extract(v, i, i) for v in variables for i in range(v.width)]
        self.atoms = self._atoms()
        self.landmarks = self._landmarks()
        watched = [*variables, *self.bits, *self.atoms]
        self.places = {x: i for i, x in enumerate(watched)}
        self.look = e.compile_step(watched, joint.names)
        rng = random.Random(0)
        self.states: list[State] = []
        for _ in range(WALKS):
            _, _, state = random_start(joint, rng)
            self.states += walked(self.stepper, rng, state, WALKED, rng.choice((0.5, 0.95, 0.99)))
            effort.check()
        self.rng = rng

    def _atoms(self) -> list[Expr]:
        """Conditions that the step hangs on, over the state alone, and their neighbours: a flag is often one of
        them half an input cycle later."""
        known = set(self.joint.names)
        out: dict[Expr, None] = {}
        for node in e.topological(self.joint.step):
            if node.op not in ("eq", "bvult", "bvslt") or {v.name for v in e.variables([node])} - known:
                continue
            out[node] = None
            a, b = node.args
            if node.op == "eq" and b.is_const:
                for slip in (1, -1):
                    out[e.eq(a, e.const(b.value + slip, b.width))] = None
        return [x for x in out if not x.is_const and x.op != "var"][:MOST_ATOMS]

    def _landmarks(self) -> list[int]:
        found = {node.value for node in e.topological(self.joint.step) if node.is_const and node.width > 1}
        near = {x + slip for x in found for slip in (-1, 0, 1)} | {(1 << i) - 1 for i in range(1, 65)}
        return sorted(x for x in near if x >= 0)

    def fresh(self, kinds: Collection[str]) -> _State:
        """Nothing but what the runs have shown, as relations of some kinds."""
        state = _State(self, kinds)
        for each in self.states:
            state.add(each)
        state.guess()
        return state


class _State:
    """Every domain at either level of the clock, with the points taken in so far."""

    def __init__(self, mined: _Mined, kinds: Collection[str]) -> None:
        self.mined = mined
        self.domains = [self._domains(kinds), self._domains(kinds)]
        self.made: list[list[list[Expr] | None]] = [[None] * len(each) for each in self.domains]

    def _domains(self, kinds: Collection[str]) -> list[tuple[Domain, list[int]]]:
        mined = self.mined
        out: list[tuple[Domain, Sequence[Expr]]] = []
        if "bits" in kinds:
            looked = [*mined.bits, *mined.atoms]
            out.append((_Bits(looked), looked))
        if "words" in kinds:
            affine = [*mined.words, *mined.flags][:MOST_WORDS]
            out.append((_Words(affine), affine))
        if "ranges" in kinds:
            out += [(_Range(word, mined.landmarks), [word]) for word in mined.words]
        if "orders" in kinds:
            out.append((_Candidates(_orders(mined.words)), mined.words))
        if "implications" in kinds:
            flags = [*mined.flags, *mined.atoms][:MOST_FLAGS]
            out.append((_Candidates(_implications(flags)), flags))
        if "tables" in kinds:
            out += [(_Table(group), group) for group in _groups(mined.joint)]
        return [(domain, [mined.places[x] for x in over]) for domain, over in out]

    def guess(self) -> None:
        """From now on ranges grow in large steps, so that there are few of them."""
        for domains in self.domains:
            for domain, _ in domains:
                if isinstance(domain, _Range):
                    domain.exact = False

    def add(self, state: State) -> bool:
        """Take a state in; whether less holds now."""
        level = state[self.mined.clock]
        seen = self.mined.look(*state)
        grown = False
        for number, (domain, places) in enumerate(self.domains[level]):
            if domain.add([seen[place] for place in places]):
                self.made[level][number] = None
                grown = True
        return grown

    def parts(self) -> list[Expr]:
        """What holds of all states taken in."""
        clock = e.var(self.mined.joint.both.clock, 1)
        out: dict[Expr, None] = {}
        for level, domains in enumerate(self.domains):
            for number, (domain, _) in enumerate(domains):
                made = self.made[level][number]
                if made is None:
                    here = clock if level else e.bvnot(clock)
                    made = [e.implies(here, part) for part in domain.parts()]
                    self.made[level][number] = made
                out |= dict.fromkeys(part for part in made if not part.is_const)
        return list(out)


def _orders(words: Sequence[Expr]) -> list[tuple[Callable[[Sequence[int]], bool], Callable[[], Expr]]]:
    """x < y and x <= y, for words in any order."""

    def pair(i: int, j: int) -> Iterator[tuple[Callable[[Sequence[int]], bool], Callable[[], Expr]]]:
        width = max(words[i].width, words[j].width)
        a, b = (e.resize(x, width, False) for x in (words[i], words[j]))
        yield (lambda point: point[i] < point[j]), (lambda: e.bvult(a, b))
        yield (lambda point: point[i] <= point[j]), (lambda: e.bvule(a, b))

    places = range(min(len(words), 16))
    return [each for i, j in product(places, places) if i != j for each in pair(i, j)]


def _implications(flags: Sequence[Expr]) -> list[tuple[Callable[[Sequence[int]], bool], Callable[[], Expr]]]:
    """Of two bits one has one value or the other has another, for all pairs and values."""

    def clause(i: int, j: int, x: int, y: int) -> tuple[Callable[[Sequence[int]], bool], Callable[[], Expr]]:
        def made() -> Expr:
            a, b = flags[i], flags[j]
            return e.bvor(a if x else e.bvnot(a), b if y else e.bvnot(b))

        return (lambda point: point[i] == x or point[j] == y), made

    pairs = combinations(range(len(flags)), 2)
    return [clause(i, j, x, y) for i, j in pairs for x in (0, 1) for y in (0, 1)]


def _groups(joint: Joint) -> list[list[Expr]]:
    """Small registers of each divider, flags of one side together; and each of the old with each of the new."""
    small: list[list[list[Expr]]] = []
    for side in ("old.", "new."):
        mine = [e.var(n, w) for n, w in joint.variables if n.startswith(side)]
        flags = [v for v in mine if v.width == 1]
        groups = [[v] for v in mine if 1 < v.width <= 16]
        small.append([*groups, *([flags] if 1 < len(flags) <= 12 else [])])
    pairs = [[*a, *b] for a, b in product(*small)]
    return [*small[0], *small[1], *pairs][:64]


# -- induction ---------------------------------------------------------------------------------------------


def _fixpoint(joint: Joint, state: _State, depth: int, effort: Effort) -> list[Expr] | None:
    """The relations that go on holding where they have held for so many half-cycles; None as soon as it shows that
    with them the outputs need not agree."""
    base = Frames(joint, effort)
    for _ in range(depth - 1):
        base.onward()
    chain = _Chain(joint, effort, depth)
    grown = True
    while grown:
        grown = False
        found_by: list[Callable[[Sequence[Expr]], State | None]]
        found_by = [*(partial(_at_start, base, frame) for frame in range(depth)), chain.leaves]
        for leaves in found_by:
            parts = state.parts()
            while (found := leaves(parts)) is not None:
                effort.say(f"relations that go on holding: {len(parts)}")
                _take(state, found)
                grown = True
                parts = state.parts()
                # Less and less holds: what does not suffice now never will.
                if not chain.agrees(parts):
                    return None
    return parts if chain.agrees(parts) else None


def _at_start(base: Frames, frame: int, parts: Sequence[Expr]) -> State | None:
    """A state so soon after the start in which a relation does not hold."""
    return base.find_state(_broken(parts), frame)


def _broken(parts: Sequence[Expr]) -> Expr:
    return e.disj(e.bvnot(part) for part in parts)


def _take(state: _State, found: State) -> None:
    """Take in a state and some that follow, which have to be in as well: from where the outputs differ none has."""
    mined = state.mined
    for each in walked(mined.stepper, mined.rng, found, ONWARD, agreeing=True):
        state.add(each)


def _needed(joint: Joint, parts: list[Expr], depth: int, effort: Effort) -> tuple[Expr, ...]:
    """The relations that are needed for the outputs to agree, and for each other."""
    step = _Chain(joint, effort, depth)
    needed = set(step.why_agrees(parts))
    todo = list(needed)
    while todo:
        for part in step.why_holds(parts, todo.pop()):
            if part not in needed:
                needed.add(part)
                todo.append(part)
    kept = [part for part in parts if part in needed]
    if len(kept) <= MOST_TRIED:
        for part in list(kept):
            fewer = [each for each in kept if each is not part]
            if step.leaves(fewer) is None and step.agrees(fewer):
                kept = fewer
    return tuple(kept)


class _Chain:
    """So many half-cycles in a row in which relations hold and the outputs agree, and one more."""

    def __init__(self, joint: Joint, effort: Effort, depth: int) -> None:
        self.depth = depth
        self.frames = Frames(joint, effort, started=False)
        self.good = e.bvnot(e.bvor(joint.differs, joint.differs_at_edge))
        for _ in range(depth):
            self.frames.assume(self.good, self.frames.count)
            self.frames.onward()

    def _before(self, parts: Sequence[Expr]) -> Expr:
        return e.conj(self.frames.here(part, frame) for frame in range(self.depth) for part in parts)

    def leaves(self, parts: Sequence[Expr]) -> State | None:
        """A state to which a step leads from where all relations hold, and in which one of them does not."""
        return self.frames.find_state(_broken(parts), self.depth, self._before(parts))

    def agrees(self, parts: Sequence[Expr]) -> bool:
        """Whether the outputs agree one half-cycle later."""
        return self.frames.find_state(e.bvnot(self.good), self.depth, self._before(parts)) is None

    def why_agrees(self, parts: Sequence[Expr]) -> list[Expr]:
        """Relations from which that follows."""
        return self._core(parts, e.bvnot(self.good))

    def why_holds(self, parts: Sequence[Expr], part: Expr) -> list[Expr]:
        """Relations from which it follows that one of them goes on holding."""
        return self._core(parts, e.bvnot(part))

    def _core(self, parts: Sequence[Expr], goal: Expr) -> list[Expr]:
        labelled = {f"part {i}": part for i, part in enumerate(parts)}
        held = {
            label: e.conj(self.frames.here(part, frame) for frame in range(self.depth))
            for label, part in labelled.items()
        }
        core = self.frames.core(held, self.frames.here(goal, self.depth))
        return [labelled[label] for label in core]
