"""System and the event simulator side by side: from every power-up state, half-cycle by half-cycle."""

from __future__ import annotations

import re
from collections.abc import Sequence
from itertools import product

from agreement import simulator
from agreement.simulator import Bench, Sample, Start

from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.ports import Ports
from prover.settling import Settling, settle
from prover.system import State, System

Map = dict[State, State]


def machine(ports: Ports) -> tuple[System, Settling]:
    """The machine with its ports' inputs held, and what is known of its micro-steps."""
    return settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(120))


def simulated_registers(design: Design) -> list[simulator.Register]:
    """Where the simulator keeps each of the design's registers: a whole variable or, by its name, a part of one."""
    return [_simulated(design, r.name, r.width) for r in design.registers]


def _simulated(design: Design, name: str, width: int) -> simulator.Register:
    whole = design.signals.get(name)
    if whole is not None:
        assert whole.value.width == width
        return simulator.Register(name, width)
    match = re.fullmatch(r"(.+)\[(-?\d+)(?::(-?\d+))?\]", name)
    assert match, f"{name} is neither a declared name nor a part of one"
    first, last = int(match[2]), int(match[3] or match[2])
    vector = design.signals[match[1]]
    # The declared bounds may run either way; the simulator's bits are counted from the right.
    places = [i - vector.lsb if vector.msb >= vector.lsb else vector.lsb - i for i in (first, last)]
    assert max(places) - min(places) + 1 == width
    return simulator.Register(match[1], width, min(places))


def power_up_states(system: System) -> list[State]:
    """Every settled state, at both levels of the clock."""
    settled = e.compile_step([system.settled], system.names)
    return [s for s in product(*(range(1 << w) for _, w in system.variables)) if settled(*s) == (1,)]


def differences(
    system: System, bench: Bench, states: Sequence[State], half_cycles: int
) -> tuple[list[str], Map, dict[State, int]]:
    """Where System and the simulator part ways, a line for each start that does, with the simulator's own map of the
    start states: each to the next, and to the output. Registers and output are compared at the end of the half-cycle
    of the start and of each of the `half_cycles` after it."""
    starts = [Start(state[:-1], state[-1]) for state in states]
    runs = simulator.run(bench, starts, half_cycles)
    known: dict[State, tuple[State, int]] = {}
    told: list[str] = []
    step: Map = {}
    output: dict[State, int] = {}
    for state, samples in zip(states, runs, strict=True):
        step[state] = (*samples[1].values, 1 - state[-1])
        output[state] = samples[0].output
        line = _difference(system, known, state, samples)
        if line:
            told.append(line)
    return told, step, output


def _difference(
    system: System, known: dict[State, tuple[State, int]], start: State, samples: Sequence[Sample]
) -> str:
    at = start
    for half_cycle, sample in enumerate(samples):
        if at not in known:
            known[at] = (system.next(at), system.out(at))
        after, out = known[at]
        if sample.values != at[:-1] or sample.output != out:
            return (
                f"from {system.describe(start)}, half-cycle {half_cycle}: System has {system.describe(at)} and "
                f"output {out}, the simulator {sample.values} and {sample.output}"
            )
        at = after
    return ""
