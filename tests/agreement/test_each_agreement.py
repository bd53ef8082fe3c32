"""The long run of random programmable dividers, each claimed for every value, against every value enumerated."""

from __future__ import annotations

from pathlib import Path

import pytest
from test_family import says_nothing_false

from prover import each, generalise


@pytest.mark.parametrize("seed", range(80))
def test_nothing_false_is_said_of_many_programmable_dividers(
    seed: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(each, "ENUMERATED", 0)
    monkeypatch.setattr(each, "MOST_ENUMERATED", 0)
    monkeypatch.setattr(generalise, "LEFT", 3)
    says_nothing_false(100 + seed, tmp_path, 4 + seed % 3)
