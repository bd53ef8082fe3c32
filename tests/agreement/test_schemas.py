"""JUnit XML and SARIF of the whole of cases/, valid by the published schemas.

The schemas stand beside this project, in ../shared/schemas from its root; SUBHARMONIC_SCHEMAS names another folder.
"""

from __future__ import annotations

import json
import os
from collections.abc import Iterator
from dataclasses import replace
from datetime import UTC, datetime
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from agreement.test_cases_agreement import spec_of
from cases_format import CASES, Case, cases, read_case
from jsonschema import Draft7Validator
from long_runs import LONG
from lxml import etree

from prover.api import check
from prover.errors import Where
from prover.report import junit, sarif
from prover.several import Lapse, Outcome, failed

WHEN = datetime(2031, 5, 6, 7, 8, 9, tzinfo=UTC)
WIDE_EFFORT = 2.0
"""Seconds for a wide case, after which it is left open: what is open has to be valid, too."""


def schema(name: str) -> Path:
    folder = Path(os.environ.get("SUBHARMONIC_SCHEMAS") or Path(__file__).parents[3] / "shared" / "schemas")
    path = folder / name
    if not path.is_file():
        pytest.fail(f"there is no {path}: name the folder of the schemas with SUBHARMONIC_SCHEMAS")
    return path


@cache
def junit_schema() -> Any:
    return etree.XMLSchema(etree.parse(schema("JUnit.xsd")))


@cache
def sarif_schema() -> Any:
    read = json.loads(schema("sarif-schema-2.1.0.json").read_text(encoding="utf-8"))
    Draft7Validator.check_schema(read)
    return Draft7Validator(read, format_checker=Draft7Validator.FORMAT_CHECKER)


def found(case: Case) -> Iterator[Outcome]:
    """What comes of each group of the case."""
    for group in case.groups:
        try:
            spec = spec_of(group)
        except Exception:
            # Options that mean nothing end the command before there is anything to report.
            if not group.error:
                raise
            continue
        if case.path.parent.name == "wide":
            spec = replace(spec, effort=WIDE_EFFORT)
        files = (str(case.path),)
        try:
            yield Outcome(files, check(files, spec))
        except Exception as fault:
            yield failed(files, fault)


EVERY = [*cases(), *(read_case(path) for path in sorted((CASES / "wide").glob("*.v")))]
ALL = EVERY if LONG else EVERY[::4]
"""Every case in the long run, else every third."""


@pytest.mark.parametrize("case", ALL, ids=[case.name for case in ALL])
def test_a_case_is_valid_by_both_schemas(case: Case) -> None:
    outcomes = list(found(case))
    document = etree.fromstring(junit.render(outcomes, WHEN).encode())
    junit_schema().assertValid(document)
    log = json.loads(sarif.render(outcomes))
    told = [f"{list(error.absolute_path)}: {error.message}" for error in sarif_schema().iter_errors(log)]
    assert not told
    # What the schema leaves to the prose of the standard.
    results = log["runs"][0]["results"]
    assert all((result["level"] == "none") == (result["kind"] != "fail") for result in results)


def test_expired_waivers_are_valid_by_both_schemas() -> None:
    lapse = Lapse("third: recovery", "the waiver expired on 2020-01-01: <old>", Where("subharmonic.toml", 4))
    outcomes = list(found(read_case(CASES / "gauge" / "chopper_by_2.v")))
    junit_schema().assertValid(etree.fromstring(junit.render(outcomes, WHEN, [lapse]).encode()))
    assert not list(sarif_schema().iter_errors(json.loads(sarif.render(outcomes, [lapse]))))


def test_the_schemas_reject_what_they_should() -> None:
    outcomes = list(found(read_case(CASES / "faulty" / "two_pulses.v")))
    document = etree.fromstring(junit.render(outcomes, WHEN).encode())
    del document[0].attrib["hostname"]
    assert not junit_schema().validate(document)
    log = json.loads(sarif.render(outcomes))
    log["runs"][0]["results"][0]["kind"] = "failed"
    assert list(sarif_schema().iter_errors(log))
