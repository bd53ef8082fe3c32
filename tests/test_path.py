"""Paths written short: cut and folded, they stand for the same half-cycles as written out."""

from __future__ import annotations

import random

from prover.path import Beat, Item, Path, Repeat, folded, length, shifted, split

WIDTHS = (5, 3)


def written_out(path: Path) -> list[Beat]:
    """Every half-cycle of the path as a beat of its own, by the meaning of a repeat."""
    out: list[Beat] = []
    for item in path:
        if isinstance(item, Beat):
            out.append(item)
        else:
            for i in range(item.times):
                out += written_out(tuple(shifted(part, item.stride, i, WIDTHS) for part in item.body))
    return out


def random_path(rng: random.Random, depth: int) -> Path:
    out: list[Item] = []
    for _ in range(rng.randint(1, 3)):
        if depth and rng.random() < 0.6:
            stride = (rng.randrange(32), rng.randrange(8))
            out.append(Repeat(rng.randint(1, 4), stride, random_path(rng, depth - 1)))
        else:
            out.append(Beat((rng.randrange(32), rng.randrange(8)), rng.randrange(2)))
    return tuple(out)


def test_a_path_cut_in_two_is_the_same_half_cycles() -> None:
    rng = random.Random(5)
    for _ in range(100):
        path = random_path(rng, 2)
        beats = written_out(path)
        assert length(path) == len(beats)
        for at in range(len(beats) + 1):
            before, after = split(path, at, WIDTHS)
            assert written_out(before) == beats[:at]
            assert written_out(after) == beats[at:]


def test_a_folded_path_is_the_same_half_cycles_and_shorter() -> None:
    rng = random.Random(6)
    for _ in range(100):
        path = tuple(written_out(random_path(rng, 2)))
        assert written_out(folded(path, WIDTHS)) == list(path)
    counting = tuple(Beat((i // 2 % 32, 3), i % 2) for i in range(60))
    assert len(folded(counting, WIDTHS)) == 1
