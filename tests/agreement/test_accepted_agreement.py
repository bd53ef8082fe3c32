"""Random programs over all that is accepted, in the event simulator (Icarus Verilog), from every power-up state.

Registers and output have to be System's at the end of each half-cycle. A failure is shrunk to the smallest program
that shows it. 100 programs, or as many as SUBHARMONIC_PROGRAMS says. Where the settling property says that the outcome
hangs on the order of simultaneous events a simulator may take another one, and the program counts as excused.
"""

from __future__ import annotations

import os
import re
import tempfile
from collections import Counter
from pathlib import Path

from agreement.programs import UNITS, Plan, Program, program
from agreement.simulator import Bench, Register
from agreement.stepping import differences, machine, power_up_states, simulated_registers
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from prover.api import read
from prover.design import Design
from prover.ports import recognise
from prover.spec import Spec

PROGRAMS = int(os.environ.get("SUBHARMONIC_PROGRAMS", "100"))
HALF_CYCLES = 40
WORDS = ("function", "signed", "for", "while", "repeat", "task")


PLANS = st.builds(
    Plan,
    units=st.lists(
        st.tuples(st.sampled_from(list(UNITS)), st.integers(0, 2**32 - 1)), min_size=1, max_size=5
    ).map(tuple),
    depth=st.integers(0, 3),
    reset=st.none() | st.tuples(st.sampled_from(["rst", "rst_n"]), st.integers(0, 1)),
    asynchronous=st.booleans(),
    output=st.integers(0, 2**32 - 1),
)


def test_random_programs_step_as_in_the_simulator() -> None:
    units: Counter[str] = Counter()
    texts: set[str] = set()
    excused = 0

    @settings(
        max_examples=PROGRAMS,
        derandomize=True,
        database=None,
        deadline=None,
        suppress_health_check=list(HealthCheck),
    )
    @given(PLANS)
    def run(plan: Plan) -> None:
        nonlocal excused
        made = program(plan)
        texts.add(made.text)
        if agrees(made):
            units.update({*made.units, *(word for word in WORDS if f"{word} " in made.text)})
        else:
            excused += 1

    for name in UNITS:
        # Whatever is drawn, each unit occurs by itself and after a counter.
        run = example(Plan(((name, 1),)))(example(Plan((("counter", 1), (name, 2))))(run))
    run()
    assert len(texts) > 0.6 * PROGRAMS
    assert excused < PROGRAMS // 3
    assert set(units) >= {*UNITS, *WORDS}
    assert min(units.values()) >= PROGRAMS // 100, units


def agrees(made: Program) -> bool:
    """Whether the program was compared without an excuse. Fails with its source where it differs without one."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "divider.v"
        path.write_text(made.text, encoding="utf-8")
        design = read([path])
        holds = {} if made.idle is None else {name: made.idle for name in design.inputs if name != "clk"}
        ports = recognise(design, Spec(clock="clk", output="tick", holds=holds))
        system, settling = machine(ports)
        if settling.depth is None:
            assert settling.unsettled is not None, made.text
            return False
        assert not settling.open, made.text
        assert not system.choices, made.text
        # What nothing hangs on is no register here, and must not be x there.
        known = path.with_name("known.v")
        known.write_text(re.sub(r"(?m)^(  reg [^;=]*\w);", r"\1 = 0;", made.simulated), encoding="utf-8")
        bench = Bench(
            sources=[known],
            top="divider",
            clock="clk",
            output="tick",
            registers=[placed(r, design) for r in simulated_registers(design)],
            holds=holds,
            delayed=made.delayed,
        )
        states = power_up_states(system)
        assert states, made.text
        told, _, _ = differences(system, bench, states, HALF_CYCLES)
    excused = any(race.kind != "release" for race in settling.races)
    if told and not excused:
        raise AssertionError("\n".join([*told[:3], f"{len(told)} of {len(states)} states differ", made.text]))
    return not excused


def placed(register: Register, design: Design) -> Register:
    """A word of a memory, which a simulator can't force, as the bit of the vector that takes its place there."""
    match = re.fullmatch(r"(\w+)\[(\d+)\]", register.path)
    if match and match[1] not in design.signals:
        return Register(match[1], register.width, int(match[2]) * register.width)
    return register
