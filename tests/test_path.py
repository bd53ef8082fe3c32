"""Paths written short: cut and folded, they stand for the same half-cycles as written out."""

from __future__ import annotations

import random
from collections.abc import Iterator

import pytest

from prover import path as paths
from prover.path import Beat, Item, Path, Places, Repeat, folded, length, place, shifted, split

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


def test_places_looked_up_one_after_another_are_those_of_single_look_ups(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(paths, "FEW", 0)
    rng = random.Random(7)
    for _ in range(100):
        path = random_path(rng, 2)
        places = Places(path, WIDTHS)
        for at, beat in enumerate(written_out(path)):
            found = places.at(at)
            assert (found.state, found.level) == (beat.state, beat.level)
            assert found == place(path, at, WIDTHS)
        with pytest.raises(IndexError):
            places.at(length(path))


def test_looking_up_every_place_passes_over_each_item_a_few_times() -> None:
    passed = 0

    class Counted(tuple[Item, ...]):
        def __iter__(self) -> Iterator[Item]:
            nonlocal passed
            for item in tuple.__iter__(self):
                passed += 1
                yield item

    path = Counted(Beat((i % 32, i % 8), i % 2) for i in range(5000))
    places = Places(path, WIDTHS)
    assert [places.at(i).state[0] for i in range(5000)] == [i % 32 for i in range(5000)]
    assert passed <= 10 * len(path)
