"""The table of constructs: what is accepted steps as in the event simulator (Icarus Verilog), from every power-up
state, and its loops, recovery and verdict are those that plain enumeration finds on the simulator's own map; what is
refused names the construct and its line."""

from __future__ import annotations

import re
from fractions import Fraction
from pathlib import Path

import pytest
from agreement import brute
from agreement.constructs import REFUSED, SURVEY, SYSTEM, VERILOG, Accepted, Refused
from agreement.simulator import Bench, Register
from agreement.stepping import differences, power_up_states, simulated_registers

from prover import Spec, check, read
from prover.errors import UserError
from prover.findings import Report

HALF_CYCLES = 24
ACCEPTED = [*SURVEY, *VERILOG, *SYSTEM]


def written(folder: Path, text: str, name: str = "d.v") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8", errors="surrogateescape")
    return path


@pytest.mark.parametrize("row", ACCEPTED, ids=[row.name for row in ACCEPTED])
def test_an_accepted_construct(row: Accepted, tmp_path: Path) -> None:
    path = written(tmp_path, row.text)
    # These are about reading: a decode that may pulse on the way is read all the same.
    waivers = {"glitch-free": "not what this is about"}
    spec = Spec(
        ratio=Fraction(row.ratio),
        high=row.high,
        output="tick",
        start="any",
        holds=dict(row.holds),
        waivers=waivers,
    )
    report = check([path], spec)
    system = report.rhythm.system
    assert not system.choices
    bench = Bench(
        sources=[written(tmp_path, row.plain, "plain.v") if row.plain else path],
        top=report.ports.design.top,
        clock=report.ports.clock,
        output="tick",
        registers=[placed(r, report) for r in simulated_registers(report.ports.design)],
        holds=dict(report.ports.running.values),
        language="2012" if row.system else "2005",
    )
    states = power_up_states(system)
    told, step, output = differences(system, bench, states, HALF_CYCLES)
    assert not told, "\n".join(told[:5])
    found = brute.analyse(step, output, spec.period, spec.high_half_cycles)
    compare(report, found)
    assert report.verdict == ("refuted" if row.wrong else "proved")
    assert any(loop.good for loop in found.loops), "no loop of the claimed wave: the row says nothing"
    if row.note:
        assert any(f"{path}:{row.line}: " in note and row.note in note for note in report.notes), report.notes


def placed(register: Register, report: Report) -> Register:
    """A word of a memory, which a simulator can't force, as the part of a vector that the plain source has."""
    match = re.fullmatch(r"(\w+)\[(\d+)\]", register.path)
    if match and match[1] not in report.ports.design.signals:
        return Register(match[1], register.width, int(match[2]) * register.width)
    return register


def compare(report: Report, found: brute.BruteResult[tuple[int, ...]]) -> None:
    """Loops with period and high time in half-cycles, and the worst recovery."""
    rhythm = report.rhythm
    assert rhythm.complete
    ours = [(a.length, a.wave.period, a.wave.high, a.good) for a in rhythm.loops]
    theirs = [(len(b.states), b.period_half_cycles, b.high_half_cycles, b.good) for b in found.loops]
    assert sorted(ours, key=str) == sorted(theirs, key=str)
    assert rhythm.recovery is not None
    assert rhythm.recovery.worst == found.worst_half_cycles
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    assert verdicts["no-stuck"] == ("refuted" if found.stuck else "proved")
    assert verdicts["recovery"] == ("refuted" if found.lost_states else "proved")
    assert (
        verdicts["ratio"] == ("refuted" if found.false_loops else "proved")
        or verdicts["high-time"] == "refuted"
    )


@pytest.mark.parametrize("row", REFUSED, ids=[row.name for row in REFUSED])
def test_a_refused_construct(row: Refused, tmp_path: Path) -> None:
    path = written(tmp_path, row.text)
    with pytest.raises(UserError) as caught:
        read([path])
    error = caught.value
    for word in row.words.split():
        assert word in str(error)
    assert error.where is not None
    assert (error.where.file, error.where.line) == (str(path), row.line)
    assert error.hint
