"""All orders in which simultaneous changes can arrive, by plain enumeration: the reference that glitches are held
against. It knows nothing of the program but how expressions evaluate on integers."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from itertools import pairwise, product

from prover import expr as e
from prover.design import Design

Values = Mapping[str, int]
Bit = tuple[str, int]
Output = Callable[[Values], int]


def moments(design: Design, clock: str, before: Values) -> list[dict[str, int]]:
    """The registers and inputs before an edge of the clock, after it, and after each reaction to what came before."""
    then: dict[str, int] = dict(before)
    now = {**then, clock: 1 - then[clock]}
    out = [then, now]
    while True:
        after = dict(now)
        for register in design.registers:
            clocks = [edge.clock for edge in register.edges]
            forces = [force.when for force in register.forces]
            was, on = e.evaluate([*clocks, *forces], then), e.evaluate([*clocks, *forces], now)
            n = len(clocks)
            active = [i for i in range(len(forces)) if on[n + i]]
            if active:
                (after[register.name],) = e.evaluate([register.forces[active[0]].value], now)
            elif not any(was[n:]):
                for i in range(n):
                    if on[i] and not was[i]:
                        (after[register.name],) = e.evaluate([register.edges[i].data], now)
                        break
        if after == now:
            return out
        then, now = now, after
        out.append(now)


def moving(then: Values, now: Values) -> list[Bit]:
    """The bits that are not the same at two moments."""
    return [(name, i) for name in then for i in range(max(then[name], now[name]).bit_length())
            if (then[name] ^ now[name]) >> i & 1]  # fmt: skip


def most_changes(output: Output, steps: Sequence[Values]) -> int:
    """How often the output changes at most, from the first moment to the last, if what changes between two neighbours
    comes in any order and the neighbours in theirs."""
    return sum(_between(output, then, now) for then, now in pairwise(steps))


def _between(output: Output, then: Values, now: Values) -> int:
    return _longest(output, then, [[bit] for bit in moving(then, now)])


def most_changes_in_any_order(output: Output, steps: Sequence[Values]) -> int:
    """The same if each bit's own changes keep their order, and nothing else does."""
    bits = dict.fromkeys(bit for pair in pairwise(steps) for bit in moving(*pair))
    sequences = [[bit] * sum(bit in moving(*pair) for pair in pairwise(steps)) for bit in bits]
    return _longest(output, steps[0], sequences)


def _longest(output: Output, begin: Values, sequences: Sequence[Sequence[Bit]]) -> int:
    """The most changes over all ways of taking the sequences' bits, each inverted in its turn."""
    best: dict[tuple[int, ...], int] = {}
    level: dict[tuple[int, ...], int] = {}
    for taken in product(*(range(len(sequence) + 1) for sequence in sequences)):
        values = dict(begin)
        for count, sequence in zip(taken, sequences, strict=True):
            for name, i in sequence[:count]:
                values[name] ^= 1 << i
        level[taken] = output(values)
        before = [(*taken[:i], count - 1, *taken[i + 1 :]) for i, count in enumerate(taken) if count]
        best[taken] = max((best[b] + (level[b] != level[taken]) for b in before), default=0)
    return best[tuple(len(sequence) for sequence in sequences)]
