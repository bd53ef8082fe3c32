"""Two thousand random machines: graph against plain enumeration, and the cover engine against the graph. A thousand
with a reset, held and released, against enumeration.

Needs no simulator; it stands here because it takes minutes.
"""

from __future__ import annotations

from collections import Counter

import pytest
from forced import compared
from test_engines import agrees_with_enumeration
from test_reset import agrees_with_enumeration as reset_agrees

BATCH = 100


@pytest.mark.parametrize("batch", range(20))
def test_engines_agree_on_random_machines(batch: int) -> None:
    came: Counter[str] = Counter()
    for seed in range(10_000 + batch * BATCH, 10_000 + (batch + 1) * BATCH):
        # A few machines of each batch are large.
        bits = 14 if seed % 50 == 0 else 10 if seed % 10 == 0 else 7
        agrees_with_enumeration(seed, bits)
        came[compared(seed, min(bits, 8))] += 1
    assert came["proved"] >= 20
    assert came["open"] <= 4


@pytest.mark.parametrize("batch", range(10))
def test_reset_agrees_on_random_machines(batch: int) -> None:
    first = 10_000 + batch * BATCH
    came = Counter(reset_agrees(seed) for seed in range(first, first + BATCH))
    assert came["proved"] >= 10
    assert came["refuted"] >= 10
