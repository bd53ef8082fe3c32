"""The report for machines, against its contract and against figures known from elsewhere."""

from __future__ import annotations

import json
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from jsonschema import validate
from texts import BY_3, RING, SECOND, SHIFT, SPINS, STICKS_AT_7, checked, measured

from properties import NAMES
from prover import Spec, check, formula
from prover.report.json import render

NUMBER = {"type": ["integer", "null"]}
TEXT = {"type": "string"}
WAVE = {
    "type": "array",
    "items": {"type": "array", "prefixItems": [{"enum": [0, 1]}, {"type": "integer", "minimum": 1}]},
}


def closed(properties: dict[str, Any], *further: str) -> dict[str, Any]:
    """An object with all of these keys; `further` ones may be there as well."""
    return {
        "type": "object",
        "required": list(properties),
        "properties": {**properties, **{key: {} for key in further}},
        "additionalProperties": False,
    }


SPAN = {"type": "array", "prefixItems": [{"type": "integer"}] * 2, "minItems": 2, "items": False}
NAMES_LISTED = {"type": "array", "items": TEXT}
EACH = closed(
    {
        "inputs": {"type": "object", "additionalProperties": {"type": "array", "items": SPAN}},
        "where": NAMES_LISTED,
        "high": {"type": ["string", "null"]},
        "values": {"type": ["integer", "null"]},
        "judged": {"type": "integer"},
        "shapes": {"type": "integer"},
        "shown": {"type": "object", "additionalProperties": {"type": "integer"}},
        "rows": {
            "type": "array",
            "minItems": 1,
            "items": closed(
                {
                    "values": {"type": "object", "additionalProperties": SPAN},
                    "together": {"type": "boolean"},
                    "verdict": {"enum": ["proved", "refuted", "open"]},
                    "refuted": NAMES_LISTED,
                    "open": NAMES_LISTED,
                    "ratios": {"type": "array", "items": TEXT, "minItems": 2, "maxItems": 2},
                    "worst_recovery_half_cycles": {"type": ["integer", "null"]},
                }
            ),
        },
    }
)

# The contract: every key of it, its type, and what may stand beside it.
CONTRACT = closed(
    {
        "schema": {"const": "subharmonic/report-1"},
        "verdict": {"enum": ["proved", "refuted", "open", None]},
        "design": closed(
            {
                "top": TEXT,
                "files": {"type": "array", "items": TEXT, "minItems": 1},
                "clock": TEXT,
                "reset": {
                    "anyOf": [
                        {"type": "null"},
                        closed(
                            {
                                "port": TEXT,
                                "active": {"enum": [0, 1]},
                                "kind": {"enum": ["asynchronous", "synchronous"]},
                            }
                        ),
                    ]
                },
                "output": TEXT,
                "parameters": {"type": "object"},
                "holds": {"type": "object"},
                "state_bits": {"type": "integer"},
                "sha256": {"type": "string", "pattern": "^[0-9a-f]{64}$"},
            }
        ),
        "spec": closed(
            {
                "mean": {"type": "boolean"},
                "ratio": {"type": ["string", "null"]},
                "period_half_cycles": NUMBER,
                "high_half_cycles": NUMBER,
                "within": NUMBER,
            },
            "reset_cycles",
            "moving",
        ),
        "measured": closed(
            {
                "from_reset": {
                    "anyOf": [
                        {"type": "null"},
                        closed(
                            {
                                "period_half_cycles": {"type": "integer"},
                                "high_half_cycles": {"type": "integer"},
                                "wave": WAVE,
                            },
                            "wave_cut",
                        ),
                    ]
                },
                "loops": {
                    "type": "array",
                    "items": closed(
                        {
                            "period_half_cycles": NUMBER,
                            "high_half_cycles": NUMBER,
                            "good": {"type": "boolean"},
                            "stuck": {"type": "boolean"},
                            "example": {"type": "object", "additionalProperties": {"type": "integer"}},
                        },
                        "states",
                    ),
                },
                "complete": {"type": "boolean"},
            },
            "loops_found",
            "scope",
            "reset_half_cycles",
            "starts",
            "open",
        ),
        "properties": {
            "type": "array",
            "items": closed(
                {
                    "name": TEXT,
                    "verdict": {"enum": ["proved", "refuted", "open"]},
                    "claim": TEXT,
                    "method": TEXT,
                    "bound": TEXT,
                    "facts": {"type": "object"},
                    "obligations": {"type": "array"},
                    "waived": {"type": ["string", "null"]},
                },
                "says",
                "counterexample",
                "trace",
                "unsettled",
                "glitch",
            ),
        },
        "each": {"anyOf": [{"type": "null"}, EACH]},
        "assumptions": {"type": "array", "items": TEXT, "minItems": 1},
        "seconds": {"type": "number"},
    },
    "facts",
    "notes",
    "limits",
)


@pytest.mark.parametrize(
    ("text", "ratio"),
    [
        (BY_3, "3"),
        (BY_3, "4"),
        (STICKS_AT_7, "5"),
        (SPINS, "2"),
        (SECOND, "50000000"),
        (RING, "4"),
        (SHIFT, "2"),
    ],
)
def test_every_report_keeps_the_contract(tmp_path: Path, text: str, ratio: str) -> None:
    report = json.loads(render(checked(tmp_path, text, ratio)))
    validate(report, CONTRACT)
    judged = [name for name in NAMES if name != "reset" or report["design"]["reset"]]
    assert [p["name"] for p in report["properties"]] == judged


def test_the_figures_of_a_third(tmp_path: Path) -> None:
    report = json.loads(render(checked(tmp_path, BY_3, "3", fin=Fraction(50_000_000))))
    assert report["verdict"] == "proved"
    claim = {"ratio": "3", "mean": False, "period_half_cycles": 6, "high_half_cycles": 3}
    assert report["spec"] == {**claim, "within": None, "reset_cycles": None, "moving": None}
    reset = report["measured"]["from_reset"]
    assert (reset["period_half_cycles"], reset["high_half_cycles"]) == (6, 3)
    assert reset["wave"] == [[1, 3], [0, 3]]
    assert report["design"]["reset"] == {"port": "rst", "active": 1, "kind": "synchronous"}
    assert report["design"]["state_bits"] == 3
    recovery = next(p for p in report["properties"] if p["name"] == "recovery")
    assert recovery["facts"]["exact"] is True
    assert isinstance(recovery["facts"]["worst_half_cycles"], int)


def test_the_loops_of_a_ring(tmp_path: Path) -> None:
    """Necklaces of four beads in two colours: six, of which two are one colour (OEIS A000031)."""
    report = json.loads(render(measured(tmp_path, RING)))
    validate(report, CONTRACT)
    loops = report["measured"]["loops"]
    assert report["verdict"] is None
    assert report["measured"]["complete"] is True
    assert report["measured"]["from_reset"] is None
    assert len(loops) == report["measured"]["loops_found"] == 6
    assert sum(loop["stuck"] for loop in loops) == 2
    assert sorted(loop["period_half_cycles"] or 0 for loop in loops) == [0, 0, 4, 8, 8, 8]


def test_a_long_wave_is_cut_and_says_so(tmp_path: Path) -> None:
    """x^15 + x^14 + 1 is primitive: 2^15 − 1 states, in which 2^13 runs of ones and as many of zeros."""
    reset = json.loads(render(measured(tmp_path, SHIFT)))["measured"]["from_reset"]
    assert reset["period_half_cycles"] == 2 * (2**15 - 1)
    assert reset["high_half_cycles"] == 2 * 2**14
    assert reset["wave_cut"] == 2 * 2**13
    assert len(reset["wave"]) == 64


def test_a_stuck_counterexample_names_its_state(tmp_path: Path) -> None:
    report = json.loads(
        render(checked(tmp_path, STICKS_AT_7, "5", high=4, waivers={"recovery": "reset at power-up"}))
    )
    stuck = next(p for p in report["properties"] if p["name"] == "no-stuck")
    assert stuck["counterexample"]["start"]["stage0.count"] == 7
    recovery = next(p for p in report["properties"] if p["name"] == "recovery")
    assert (recovery["verdict"], recovery["waived"]) == ("refuted", "reset at power-up")


def test_a_report_on_each_value_keeps_the_contract() -> None:
    path = Path(__file__).parents[1] / "cases" / "gauge" / "radio_swallow.v"
    ratio, high = formula.read("4*b+a", "--ratio"), formula.read("10 if a > 0 else 8", "--high")
    where = (formula.read("a < 4 and b < 4", "--where"),)
    spec = Spec(ratio_formula=ratio, high_formula=high, each={"b": ((2, 15),), "a": None}, where=where)
    report = json.loads(render(check([path], spec)))
    validate(report, CONTRACT)
    assert report["spec"]["ratio"] == "4*b+a"
    told = report["each"]
    assert told["inputs"] == {"b": [[2, 15]], "a": [[0, 7]]}
    assert (told["values"], told["judged"], told["shown"]) == (8, 8, {"b": 2, "a": 3})
    # By 11 is 2·4 + 3, with a greater than b: the only one that fails.
    failing = [row for row in told["rows"] if row["verdict"] == "refuted"]
    assert [row["values"] for row in failing] == [{"b": [2, 2], "a": [3, 3]}]


def test_the_same_input_gives_the_same_report_but_for_the_seconds(tmp_path: Path) -> None:
    first, second = (render(checked(tmp_path, STICKS_AT_7, "5", high=4)).splitlines() for _ in range(2))
    assert '  "seconds":' in first[-2]
    assert first[:-2] == second[:-2]
