"""Wide dividers whose ratio moves: proved for every value. Needs no simulator; it stands here because it takes long."""

from __future__ import annotations

from pathlib import Path

import pytest
from cases_format import CASES
from test_moves import asked

from prover import moves
from prover.effort import Effort

GAUGE = CASES / "gauge"


@pytest.mark.parametrize("width", [8, 16, 24])
@pytest.mark.parametrize(
    "path", [GAUGE / "sample_wrap.v", GAUGE / "sample_at_least.v", GAUGE / "sample_by_div.v"]
)
def test_a_safe_divider_is_proved_for_every_value(path: Path, width: int) -> None:
    # By hand: the pulse at hand runs out, and the next one is right. The longest has 2·2^W half-cycles.
    ports, question = asked(path, "--set", f"W={width}", "--moving", "div", "--ratio", "2*(div+1)")
    found = moves.answer(ports, question, Effort(300))
    assert (found.proved, found.back) == (True, 2 << width), found.open
