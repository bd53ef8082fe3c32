"""Affine hulls hold exactly the points that plain enumeration puts into them."""

from __future__ import annotations

import random
from itertools import product

from prover.affine import BitHull, WordHull


def test_the_equations_of_a_hull_of_bits_are_fulfilled_by_its_points_alone() -> None:
    rng = random.Random(3)
    for _ in range(200):
        size = rng.randint(1, 6)
        points = [rng.getrandbits(size) for _ in range(rng.randint(1, 4))]
        hull = BitHull(size)
        grown = [hull.add(point) for point in points]
        inside = {points[0]}
        for number, point in enumerate(points):
            assert grown[number] == (number == 0 or point not in inside)
            inside |= {x ^ point ^ points[0] for x in inside}
        equations = hull.equations()
        fulfilling = {
            x
            for x in range(1 << size)
            if all(sum(x >> place & 1 for place, _ in each.terms) % 2 == each.total for each in equations)
        }
        assert fulfilling == inside


def test_the_equations_of_a_hull_of_words_are_fulfilled_by_its_points_alone() -> None:
    rng = random.Random(3)
    for _ in range(300):
        size, width = rng.randint(1, 3), rng.randint(1, 3)
        count = 1 << width
        points = [tuple(rng.randrange(count) for _ in range(size)) for _ in range(rng.randint(1, 4))]
        hull = WordHull(size, width)
        for point in points:
            hull.add(point)
        steps = [[(a - b) % count for a, b in zip(p, points[0], strict=True)] for p in points[1:]]
        inside = {
            tuple(
                (points[0][i] + sum(k * step[i] for k, step in zip(times, steps, strict=True))) % count
                for i in range(size)
            )
            for times in product(range(count), repeat=len(steps))
        }
        equations = hull.equations()
        fulfilling = {
            x
            for x in product(range(count), repeat=size)
            if all((sum(a * x[i] for i, a in e.terms) - e.total) % count == 0 for e in equations)
        }
        assert fulfilling == inside
        outside = next((x for x in product(range(count), repeat=size) if x not in inside), None)
        assert not hull.add(points[-1])
        assert outside is None or hull.add(outside)


def test_counts_with_a_fixed_sum_are_one_equation() -> None:
    hull = WordHull(2, 25)
    for i in (0, 1, 2, 24999999):
        hull.add((i, 24999999 - i))
    (equation,) = hull.equations()
    assert equation.terms == ((0, 1), (1, 1))
    assert equation.total == 24999999
