"""Random dividers in the event simulator (Icarus Verilog): from every power-up state, for 60 half-cycles each.

Registers and output have to be System's at the end of every half-cycle. Where System and the simulator part ways, the
settling property must have said that the outcome hangs on the order of simultaneous events; a clear that is released
as its clock rises is no such excuse, for there the gates that make the clear have one unit of delay.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from agreement.dividers import Divider, divider
from agreement.simulator import Bench
from agreement.stepping import differences, machine, power_up_states, simulated_registers

from prover.api import read
from prover.ports import recognise
from prover.spec import Spec

HALF_CYCLES = 60
BATCH = 12
BATCHES = 36
LEAST_COMPARED = 8
"""Dividers of a batch on whose every state System and simulator are bound to agree: 288 of 432 at least."""


@pytest.mark.parametrize("batch", range(BATCHES))
def test_random_dividers_step_as_in_the_simulator(batch: int, tmp_path: Path) -> None:
    compared = 0
    for seed in range(batch * BATCH, (batch + 1) * BATCH):
        compared += agrees(seed, divider(seed), tmp_path)
    assert compared >= LEAST_COMPARED


def agrees(seed: int, made: Divider, folder: Path) -> bool:
    """Whether the divider was compared without an excuse. Fails with its source where it differs without one."""
    path = folder / f"divider{seed}.v"
    path.write_text(made.text, encoding="utf-8")
    about = f"seed {seed}\n{made.text}"
    design = read([path])
    reset = {} if made.idle is None else {name: made.idle for name in design.inputs if name != "clk"}
    spec = Spec(clock="clk", output="tick", holds=reset)
    ports = recognise(design, spec)
    system, settling = machine(ports)
    if settling.depth is None:
        assert settling.unsettled is not None, about
        return False
    assert not settling.open, about
    assert not system.choices, about
    excused = any(race.kind != "release" for race in settling.races)
    bench = Bench(
        sources=[path],
        top="divider",
        clock="clk",
        output="tick",
        registers=simulated_registers(design),
        holds=reset,
        delayed=made.delayed,
    )
    states = power_up_states(system)
    assert states, about
    told, _, _ = differences(system, bench, states, HALF_CYCLES)
    if told and not excused:
        pytest.fail(
            "\n".join([*told[:3], f"{len(told)} of {len(states)} states differ", about]), pytrace=False
        )
    return not excused
