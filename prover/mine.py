"""Candidates for invariants of a watched machine, mined from runs.

Runs with random moves are looked at where the one-bit registers have the same values. There, the words that count and
the words that hold a limit often stand in a linear relation, and an exact one is seen in the data (Sharma and others,
ESOP 2013). What a nominal pulse comes to is read from runs whose inputs stand still, the divider's own rhythm, where
it is an equation; with moving inputs the equation becomes the two inequalities between which the nominal pulses lie.
Nothing here is certain: `inductive` finds out which lines hold.

Limits: lines have two or three words, and are linear. A count in Gray code or a shift register has no such lines.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import combinations, permutations, product
from math import lcm

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.moving import AFTER
from prover.unrolled import Broken
from prover.watch import BY_MOVE, CHANGES, EDGES, FIRST, HELD, LEAST, MOST, SEEN, Line, Seed, Watch

RUNS, STEPS = 64, 256
"""Random runs, and half-cycles of each."""

MOST_BITS = 12
"""One-bit variables by whose values the samples are told apart."""

MOST_WORDS = 9
"""Words among which relations are looked for."""

Sample = tuple[int, ...]


@dataclass(frozen=True)
class Sampled:
    """What random runs come by: values of the variables, where inputs moved and where they stood still; or a run that
    breaks the claim."""

    moving: list[Sample]
    steady: list[Sample]
    broken: Broken | None = None


# -- runs --------------------------------------------------------------------------------------------------


def sampled(system: Watch, effort: Effort, seeds: Sequence[Seed] = (), number: int = 1) -> Sampled:
    """Samples of random runs, up to the first that breaks the claim. Some begin at the seeds."""
    runner = _Runner(system, seeds, number)
    found: dict[bool, dict[Sample, None]] = {True: {}, False: {}}
    for steady, count in ((True, RUNS // 2), (False, RUNS)):
        for _ in range(4 * count if seeds else count):
            effort.check()
            samples, broken = runner.go(steady)
            found[steady] |= dict.fromkeys(samples)
            if broken is not None:
                return Sampled([], [], broken)
    return Sampled(list(found[False]), list(found[True]))


class _Runner:
    """Runs of a watch on numbers."""

    def __init__(self, system: Watch, seeds: Sequence[Seed], number: int) -> None:
        self.system, self.rng = system, random.Random(number)
        machine = system.machine
        names = {name for name, _ in machine.variables}
        self.seeds = [seed for seed in seeds if not machine.rigid and names <= set(seed.registers)]
        self.bits = e.compile_step(list(system.bits.values()), machine.names)
        choices = [name for name, _ in machine.choices]
        self.zeros = [0] * len(choices)
        self.moves = [name for name, _ in system.moves]
        wanted = [*system.step, system.broken, system.allowed]
        self.step = e.compile_step(wanted, [*system.names, *self.moves, *choices])
        nominal = [system.nominal.low, system.nominal.high, system.nominal.domain]
        self.nominal = e.compile_step(nominal, [name for name, _ in (*machine.rigid, *machine.moving)])
        self.begins = []
        for values, given in system.begins:
            free = e.variables([*values, given])
            self.begins.append((free, e.compile_step([*values, given], [v.name for v in free])))

    def word(self, width: int) -> int:
        """Mostly a small number, so that pulses end soon."""
        if self.rng.random() < 0.85:
            return self.rng.randrange(1 << min(width, self.rng.randint(1, 3)))
        return self.rng.getrandbits(self.rng.randint(1, width))

    def inside(self, rigid: Mapping[str, int]) -> dict[str, int]:
        """Values of the moving inputs for which the claim is made."""
        for _ in range(200):
            values = {name: self.word(width) for name, width in self.system.machine.moving}
            if self.nominal(*rigid.values(), *values.values())[2]:
                return values
        raise OutOfEffort("no values of the inputs were found for which the claim is made")

    def go(self, steady: bool) -> tuple[list[Sample], Broken | None]:
        """The samples of one run, or how it breaks the claim. Steady: the inputs never move."""
        if self.seeds and self.rng.random() < 0.8:
            return self.from_seed(steady)
        rng, machine = self.rng, self.system.machine
        rigid = {name: self.word(width) for name, width in machine.rigid}
        pool = [self.inside(rigid) for _ in range(1 if steady else rng.randint(1, 4))]
        first, now = rng.choice(pool), rng.choice(pool)
        given = {**rigid, **now, **{FIRST + name: value for name, value in first.items()}}
        lengths = [self.nominal(*rigid.values(), *values.values()) for values in pool]
        for level in (0, 1):
            given[LEAST[level]] = min(each[level] for each in lengths)
            given[MOST[level]] = max(each[level] for each in lengths)
        number = rng.randrange(len(self.begins))
        free, begin = self.begins[number]
        # Choices that x leaves are 0 in a run: a trace of it has them so.
        rest = {v.name: 0 if v.name.startswith("?") else rng.getrandbits(v.width) for v in free}
        given = {v.name: given.get(v.name, rest[v.name]) for v in free} | rigid
        *sample, allowed = begin(*(given[v.name] for v in free))
        if not allowed:
            return [], None
        started = {
            name: value for name, value in given.items() if name in rigid or name.startswith("!start")
        } | first
        return self.onward(tuple(sample), Broken(number, started, (now,)), pool)

    def from_seed(self, steady: bool) -> tuple[list[Sample], Broken | None]:
        """The same from a place on an orbit, which is a run's beginning; the pulse there has begun before."""
        seed = self.rng.choice(self.seeds)
        machine = self.system.machine
        pool = [dict(seed.inputs)] if steady else [dict(seed.inputs), self.inside({}), self.inside({})]
        values = {**seed.registers, **seed.inputs, EDGES: seed.edges, SEEN: 1, BY_MOVE: 0}
        bits = self.bits(*(seed.registers[name] for name in machine.names))
        values |= dict(zip(self.system.bits, bits, strict=True))
        sample = tuple(values[name] for name in self.system.names)
        return self.onward(sample, Broken(seed, dict(seed.inputs), (dict(seed.inputs),)), pool)

    def onward(
        self, sample: Sample, begun: Broken, pool: Sequence[dict[str, int]]
    ) -> tuple[list[Sample], Broken | None]:
        """From a first sample on, with inputs from the pool."""
        rng = self.rng
        samples, moves = [sample], list(begun.moves)
        now = dict(rng.choice(pool))
        restless = rng.choice((0.02, 0.1, 0.5))
        for _ in range(STEPS):
            values = dict(zip(self.system.names, samples[-1], strict=True))
            if rng.random() < restless and not values.get(HELD):
                now = rng.choice(pool)
            chosen = {name + AFTER: value for name, value in now.items()}
            if HELD in values:
                chosen[HELD + AFTER] = int(rng.random() < restless / 2)
            *after, broken, allowed = self.step(
                *samples[-1], *(chosen[name] for name in self.moves), *self.zeros
            )
            if not allowed:
                break
            moves.append(chosen)
            if broken:
                return samples, replace(begun, moves=tuple(moves))
            samples.append(tuple(after))
        return samples, None


# -- candidates --------------------------------------------------------------------------------------------

Where = tuple[tuple[str, int], ...]
Terms = tuple[tuple[str, int], ...]
Columns = Mapping[str, Sequence[int]]

NOMINAL = "!nominal"
"""The nominal pulse for the inputs' values, where a relation with it is looked for."""

SPREAD = 4
"""How far a sum may vary that is fixed elsewhere and still be bounded."""


def candidates(system: Watch, found: Sampled, all_of_them: bool) -> list[Line]:
    """Lines that none of the samples contradicts, with as little said of where they hold as the samples allow; and
    bounds as they were found in a place, too, if all are wanted: what samples don't come near, they can't tell where
    it holds."""
    table = _Samples(system, found)
    related = dict.fromkeys(table.relations())
    lines = [*table.never(), *table.bounds(), *table.orders(), *related, *table.caught_up()]
    kept = [line for line in related if all_of_them and not line.equal]
    return list(dict.fromkeys([*(table.general(line) for line in lines), *kept]))


class _Samples:
    """The samples by variable, and by the values of the one-bit variables."""

    def __init__(self, system: Watch, found: Sampled) -> None:
        self.system = system
        widths = dict(system.variables)
        apart = {*LEAST, *MOST}
        self.bits = [n for n, w in system.variables if (w == 1 or n == CHANGES) and n not in apart][
            -MOST_BITS:
        ]
        rest = [
            n for n, w in system.variables if n not in apart and n not in self.bits and (w > 1 or n == EDGES)
        ]
        self.words = rest[:MOST_WORDS]
        self.moving = {name for name, _ in system.machine.moving}
        self.widths = widths
        self.every = self.columns([*found.moving, *found.steady])
        self.steady = self.columns(found.steady)
        # Most does not hang on whether the inputs are held from now on: what does is looked for by itself.
        apart = {HELD, CHANGES}
        self.places = self.by_bits(self.every, [name for name in self.bits if name not in apart])
        self.steady_places = self.by_bits(self.steady, [name for name in self.bits if name not in apart])

    def columns(self, samples: Sequence[Sample]) -> Columns:
        """Each variable's values; of samples without a move the nominal pulses besides, by level."""
        values = dict(zip(self.system.names, zip(*samples, strict=True), strict=True)) if samples else {}
        return {name: list(values.get(name, ())) for name in self.system.names}

    def by_bits(self, columns: Columns, bits: Sequence[str]) -> dict[Where, list[int]]:
        """The numbers of the samples in which these variables have these values."""
        out: dict[Where, list[int]] = {}
        for number, values in enumerate(zip(*(columns[name] for name in bits), strict=True)):
            out.setdefault(tuple(zip(bits, values, strict=True)), []).append(number)
        return out

    def totals(self, terms: Terms, numbers: Sequence[int] | None = None) -> list[int]:
        """The sums in these samples, or in all."""
        columns = [(self.every[name], by) for name, by in terms]
        chosen = range(len(self.every[EDGES])) if numbers is None else numbers
        return [sum(by * column[number] for column, by in columns) for number in chosen]

    # -- what is not seen --

    def never(self) -> Iterator[Line]:
        """Values of one, two or three bits that are never seen together, unless fewer of them say so."""
        told: set[frozenset[tuple[str, int]]] = set()
        for size in (1, 2, 3):
            for names in combinations(self.bits, size):
                seen = set(zip(*(self.every[name] for name in names), strict=True))
                for values in product(*(range(1 << self.widths[name]) for name in names)):
                    cube = frozenset(zip(names, values, strict=True))
                    if values in seen or any(smaller < cube for smaller in told):
                        continue
                    told.add(cube)
                    yield Line(tuple(zip(names, values, strict=True)), (), -1, False)

    def bounds(self) -> Iterator[Line]:
        """What words never exceed; with a word for the longest nominal pulse, how far they stay below it."""
        for name in self.words:
            yield Line((), ((name, -1),), max(self.every[name]), False)
            for most in (most for most in MOST if most in self.every):
                for by in (1, 2):
                    room = min(self.totals(((name, -by), (most, 1))))
                    if room >= 0:
                        yield Line((), ((name, -by), (most, 1)), -room, False)

    def orders(self) -> Iterator[Line]:
        """Words that never exceed others or twice as much, but for a little; wherever, or in a place."""
        for low, high in permutations(self.words, 2):
            for by in (2, 1):
                terms = ((high, by), (low, -1))
                least = min(self.totals(terms))
                if least >= -SPREAD:
                    yield Line((), terms, max(0, -least), False)
            if least >= 0:
                continue
            for where, numbers in self.places.items():
                if min(self.totals(terms, numbers)) >= 0:
                    yield Line(where, terms, 0, False)

    # -- relations --

    def relations(self) -> Iterator[Line]:
        """Exact relations; where a sum that is fixed elsewhere is not, its bounds; and what is left of relations of
        the rhythm while inputs move."""
        # What the moving inputs are is of no use where they may move on: the words that they went into are looked
        # for.
        words = [name for name in self.words if name not in self.moving or self.system.kind == "whole"]
        fixed: dict[Terms, None] = {}
        rhythm: dict[tuple[Terms, int], None] = {}
        for where, numbers in self.places.items():
            for terms, offset in _relations(self.every, words, numbers):
                fixed[terms] = None
                yield Line(where, terms, offset, True)
                if self.system.kind == "whole":
                    # While the output is parked, edges go on being counted: what looks exact may hold on one side
                    # only.
                    yield Line(where, terms, offset, False)
                    yield Line(where, tuple((name, -by) for name, by in terms), -offset, False)
            steady = self.steady_places.get(where, [])
            fixed |= {terms: None for terms, _ in _relations(self.steady, words, steady)}
        for terms in fixed:
            yield from self.bounded(terms)
        kept = [name for name in words if name not in self.moving]
        for nominal, limits in self.limits():
            columns = {**self.steady, NOMINAL: nominal}
            for numbers in self.steady_places.values():
                rhythm |= dict.fromkeys(_relations(columns, kept, numbers, NOMINAL))
            for (terms, offset), where in product(rhythm, self.places):
                for above, limit in limits:
                    yield from self.limited(where, terms, offset, above, limit)

    def caught_up(self) -> Iterator[Line]:
        """What holds between words and inputs once these are held and the output has changed so many times."""
        if self.system.kind != "after":
            return
        for where, numbers in self.by_bits(self.every, [name for name in self.bits if name != HELD]).items():
            if not dict(where)[CHANGES]:
                continue
            for terms, offset in _relations(self.every, self.words, numbers):
                if any(name in self.moving for name, _ in terms):
                    yield Line(where, terms, offset, True)
            for low, high in permutations(self.words, 2):
                terms = ((high, 1), (low, -1))
                if (low in self.moving) != (high in self.moving) and min(self.totals(terms, numbers)) >= 0:
                    yield Line(where, terms, 0, False)

    def bounded(self, terms: Terms) -> Iterator[Line]:
        """The bounds of a sum in each place where it varies little."""
        for where, numbers in self.places.items():
            totals = self.totals(terms, numbers)
            low, high = min(totals), max(totals)
            if high - low > 0:
                turned = tuple((name, -by) for name, by in terms)
                if high - low <= SPREAD or self.system.kind == "whole":
                    yield Line(where, terms, -low, False)
                    yield Line(where, turned, high, False)

    def limits(self) -> Iterator[tuple[Sequence[int], list[tuple[bool, str | int]]]]:
        """The nominal pulses in the steady samples, and what they lie above or below while inputs move."""
        for level in (0, 1):
            least, most = LEAST[level], MOST[level]
            if least in self.every:
                yield self.steady[least], [(True, least), (False, most)]
            elif self.system.kind == "after":
                yield self.nominal(level), [(False, self.system.longest[level])]

    def nominal(self, level: int) -> list[int]:
        """The nominal pulse in each steady sample."""
        names = [name for name, _ in (*self.system.machine.rigid, *self.system.machine.moving)]
        run = e.compile_step([self.system.nominal.of(level)], names)
        return [run(*values)[0] for values in zip(*(self.steady[name] for name in names), strict=True)]

    def limited(
        self, where: Where, terms: Terms, offset: int, above: bool, limit: str | int
    ) -> Iterator[Line]:
        """The sum without its nominal pulse is at least one limit, or at most another, where no sample says no."""
        by = -dict(terms)[NOMINAL]
        rest = tuple((name, factor if above else -factor) for name, factor in terms if name != NOMINAL)
        line = Line(where, rest, offset if above else -offset, False)
        sign = -by if above else by
        if isinstance(limit, int):
            line = replace(line, offset=line.offset + sign * limit)
        else:
            line = replace(line, terms=(*rest, (limit, sign)))
        if min(self.totals(line.terms, self.places[where])) + line.offset >= 0:
            yield line

    def general(self, line: Line) -> Line:
        """The line with as few conditions as the samples allow."""
        if not line.terms or not line.where:
            return line
        totals = self.totals(line.terms)
        wrong = [
            i
            for i, total in enumerate(totals)
            if (total + line.offset != 0 if line.equal else total + line.offset < 0)
        ]
        for name, _ in line.where:
            fewer = tuple(pair for pair in line.where if pair[0] != name)
            if not any(all(self.every[n][i] == x for n, x in fewer) for i in wrong):
                line = replace(line, where=fewer)
        return line


def _relations(
    columns: Columns, words: Sequence[str], numbers: Sequence[int], target: str | None = None
) -> Iterator[tuple[Terms, int]]:
    """Exact linear relations of one, two or three words, or of the target and one or two words, in these samples:
    terms and an offset that add up to 0. None has words of which fewer are related already."""
    if len(numbers) < 4:
        return
    chosen = {name: [columns[name][i] for i in numbers] for name in (*words, *([target] if target else []))}
    told: list[set[str]] = []
    for size in (1, 2) if target else (1, 2, 3):
        for names in combinations(words, size):
            if any(smaller <= set(names) for smaller in told):
                continue
            wanted, given = (target, names) if target else (names[-1], names[:-1])
            fitted = _fit(chosen[wanted], [chosen[name] for name in given])
            if fitted is None or not all(fitted[:-1]):
                continue
            told.append(set(names))
            by = lcm(*(x.denominator for x in fitted))
            terms = [(name, int(x * by)) for name, x in zip(given, fitted, strict=False)]
            yield (*sorted(terms), (wanted, -by)), int(fitted[-1] * by)


def _fit(wanted: Sequence[int], given: Sequence[Sequence[int]]) -> list[Fraction] | None:
    """Factors and offset with which the columns add up to the one wanted, if they do so everywhere."""
    size = len(given) + 1
    rows: list[list[Fraction]] = []
    for number in range(len(wanted)):
        row = [*(Fraction(column[number]) for column in given), Fraction(1), Fraction(wanted[number])]
        reduced = _reduced(row, rows)
        lead = next((i for i, x in enumerate(reduced) if x), None)
        if lead == size:
            return None
        if lead is not None:
            rows.append([x / reduced[lead] for x in reduced])
            if len(rows) == size:
                break
    if len(rows) < size:
        return None
    solution = _solved(rows, size)
    for number in range(len(wanted)):
        total = sum((x * column[number] for x, column in zip(solution, given, strict=False)), solution[-1])
        if total != wanted[number]:
            return None
    return solution


def _reduced(row: list[Fraction], rows: Sequence[Sequence[Fraction]]) -> list[Fraction]:
    for other in rows:
        lead = next(i for i, x in enumerate(other) if x)
        if row[lead]:
            row = [a - row[lead] * b for a, b in zip(row, other, strict=True)]
    return row


def _solved(rows: Sequence[list[Fraction]], size: int) -> list[Fraction]:
    """The solution of as many equations, each with its leading factor 1."""
    out = [Fraction(0)] * size
    by_lead = {next(i for i, x in enumerate(row) if x): row for row in rows}
    for lead in sorted(by_lead, reverse=True):
        row = by_lead[lead]
        out[lead] = row[-1] - sum((row[i] * out[i] for i in range(lead + 1, size)), Fraction(0))
    return out
