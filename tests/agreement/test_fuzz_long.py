"""The 2 000 fuzzed sources whose first 200 tests/test_fuzz.py runs: too many for every run, and most are errors."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pytest
from long_runs import LONG
from test_fuzz import FEW, survives

MANY = 2_000 if LONG else 400
BATCH = 200


@pytest.mark.parametrize("first", range(FEW, MANY, BATCH))
def test_fuzzed_sources_end_in_a_verdict_or_an_error(
    first: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    statuses = Counter(survives(seed, tmp_path) for seed in range(first, first + BATCH))
    # Most of what is done to a source is noticed, and not all of it.
    assert statuses[2] > BATCH // 4
    assert statuses[0] + statuses[1] > BATCH // 50
