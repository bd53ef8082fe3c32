"""Runs whose inputs move: replayed, and told apart from what is no run."""

from __future__ import annotations

from dataclasses import replace

from small import toggle

from prover.expr import var
from prover.trace import Rest, Trace, faults, run

OUTPUTS = {"tick": var("tick", 1)}


def released_at(half_cycle: int, ends: int) -> Trace:
    """÷4 by a counter to 1 and a toggle, its reset released in the middle of that half-cycle."""
    design = toggle(1, 1)
    first = Rest(0, False, {"rst": 1}, {"count": 1, "tick": 1, "clk": 0}, {"tick": 1})
    moves = [{"rst": 0} if at == half_cycle else None for at in range(ends)]
    return Trace(run(design, "clk", OUTPUTS, first, moves, 4), 0, ends, "", "")


def test_a_run_with_a_release_is_what_the_code_says() -> None:
    # By hand: the first rising edge (half-cycle 1) clears, the release comes in half-cycle 2, and the toggle turns
    # with every second rising edge from the one that begins half-cycle 3 on.
    trace = released_at(2, 12)
    at_edges = [(r.half_cycle, r.outputs["tick"]) for r in trace.rests if not r.moved]
    assert at_edges == [
        (0, 1),
        *((h, 0) for h in range(1, 5)),
        *((h, 1) for h in range(5, 9)),
        *((h, 0) for h in (9, 10, 11)),
    ]
    assert [r.half_cycle for r in trace.rests if r.moved] == [2]
    assert not faults(toggle(1, 1), "clk", OUTPUTS, trace, 4)


def test_an_altered_run_does_not_replay() -> None:
    trace = released_at(2, 12)
    for at in range(1, len(trace.rests)):
        rest = trace.rests[at]
        other = replace(rest, registers={**rest.registers, "count": 1 - rest.registers["count"]})
        rests = (*trace.rests[:at], other, *trace.rests[at + 1 :])
        assert faults(toggle(1, 1), "clk", OUTPUTS, replace(trace, rests=rests), 4)
