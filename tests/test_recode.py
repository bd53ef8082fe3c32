"""Other coordinates: the same machine, state by state, and claims that do not hold of a wrong one."""

from __future__ import annotations

import random
from dataclasses import replace
from pathlib import Path

import pytest
from machines import random_design, random_expression

from prover import certificate, recode
from prover import expr as e
from prover.api import read
from prover.effort import Effort
from prover.ports import Ports, recognise
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System, cone, project
from prover.verilog.words import cut, reads

PREFIX = "number[W-1] = gray[W-1]; for (i = W-2; i >= 0; i = i-1) number[i] = number[i+1] ^ gray[i];"
SHIFTS = "number = gray; for (i = 1; i < W; i = i*2) number = number ^ (number >> i);"
SUMS = "for (i = 0; i < W; i = i+1) number[i] = ^(gray >> i);"
DECODERS = [PREFIX, SHIFTS, SUMS]
CODERS = ["next ^ (next >> 1)", "{next[W-1], next[W-1:1] ^ next[W-2:0]}", "(next >> 1) ^ next"]
STEPS = ["number + 1'b1", "number - 1'b1", "number == 41 ? 0 : number + 1'b1"]


def source(decoder: str, coder: str, step: str) -> str:
    return f"""module g #(parameter W = 7) (input clk, input rst, output q);
  reg [W-1:0] gray, number; integer i;
  always @* begin {decoder} end
  wire [W-1:0] next = {step};
  always @(posedge clk) if (rst) gray <= 0; else gray <= {coder};
  assign q = gray[W-1] ^ gray[0];
endmodule
"""


def system_of(ports: Ports) -> System:
    system, settling = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(20))
    assert settling.depth is not None
    return system


def from_text(tmp_path: Path, text: str) -> System:
    path = tmp_path / "g.v"
    path.write_text(text)
    return system_of(recognise(read([str(path)], Spec()), Spec()))


def random_state(rng: random.Random, system: System) -> State:
    return tuple(rng.randrange(1 << width) for _, width in system.variables)


def same_machine(system: System, other: System, rng: random.Random) -> None:
    """Steps, outputs and names of states agree in both coordinates, by running both on values."""
    for _ in range(200):
        state = random_state(rng, system)
        there = project(system, state, other)
        assert project(system, system.next(state), other) == other.next(there)
        assert system.out(state) == other.out(there)
        shown = system.describe(state)
        parts = {name: (register, low) for name, register, low in other.slices}
        for name, value in other.describe(there).items():
            register, low = parts.get(name, (name, 0))
            width = dict(other.variables).get(name, 64)
            assert shown[register] >> low & ((1 << width) - 1) == value


@pytest.mark.parametrize("step", STEPS)
@pytest.mark.parametrize("coder", CODERS)
@pytest.mark.parametrize("decoder", DECODERS)
def test_a_gray_counter_is_read_as_its_number(tmp_path: Path, decoder: str, coder: str, step: str) -> None:
    system = from_text(tmp_path, source(decoder, coder, step))
    numbered, known = recode.gray(system)
    assert numbered.grays == (("gray in binary", "gray"),)
    same_machine(system, numbered, random.Random(1))
    claims = list(certificate.gray_obligations(system, numbered, known))
    assert claims
    assert all(certificate.discharge(claim, Effort(20)) for claim in claims)
    # The number's step is off by one: some claim fails.
    off = (e.bvadd(numbered.step[0], e.const(1, 7)), *numbered.step[1:])
    wrong = certificate.gray_obligations(system, replace(numbered, step=off), known)
    assert not all(certificate.discharge(claim, Effort(20)) for claim in wrong)
    wrong = certificate.gray_obligations(system, numbered, {e.var("gray", 7): e.var("gray in binary", 7)})
    assert not all(certificate.discharge(claim, Effort(20)) for claim in wrong)


def test_what_is_no_gray_counter_stays_as_it_is(tmp_path: Path) -> None:
    for coder in ("next", "next ^ (next >> 2)"):
        system = from_text(tmp_path, source(PREFIX, coder, STEPS[0]))
        assert recode.gray(system)[0] is system


def test_parts_of_registers_are_the_same_machine() -> None:
    rng = random.Random(7)
    cut = 0
    for seed in range(150):
        ports = recognise(random_design(random.Random(seed), 4), Spec())
        system, settling = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(20))
        if settling.depth is None or system.choices:
            continue
        kept = recode.live(cone(system))
        cut += bool(kept.slices)
        same_machine(system, kept, rng)
    assert cut > 5


def test_the_copy_of_one_bit_needs_no_more(tmp_path: Path) -> None:
    text = """module g (input clk, input rst, output q);
  reg [7:0] count, copy;
  always @(posedge clk) if (rst) begin count <= 0; copy <= 0; end
    else begin count <= count + 1'b1; copy <= count ^ (count >> 1); end
  assign q = copy[7];
endmodule
"""
    kept = recode.live(from_text(tmp_path, text))
    assert kept.variables == (("count", 8), ("copy[7]", 1), ("clk", 1))


def test_selections_from_sums_are_what_plain_selections_are() -> None:
    rng = random.Random(5)
    leaves = [e.var("a", 9), e.var("b", 9)]
    for _ in range(600):
        even = e.const(rng.getrandbits(9) << rng.randrange(9) & 511, 9)
        other = rng.choice([even, random_expression(rng, leaves, 9, 2)])
        op = rng.choice(["bvadd", "bvadd", "bvsub", "bvmul"])
        word = e.binary(op, random_expression(rng, leaves, 9, 3), other)
        high = rng.randrange(9)
        low = rng.randrange(high + 1)
        values = {leaf.name: rng.getrandbits(9) for leaf in leaves}
        found, wanted = e.evaluate([cut(word, high, low), word], values)
        assert found == (wanted >> low) & ((1 << (high - low + 1)) - 1)


@pytest.mark.parametrize(
    ("step", "bit", "mask"), [(1, 25, (1 << 26) - 1), (1 << 28, 31, 15 << 28), (12, 6, 124)]
)
def test_a_bit_of_a_sum_hangs_on_those_from_which_it_gets_a_carry(step: int, bit: int, mask: int) -> None:
    # By the addition that is taught at school; below the constant's lowest one there is nothing to carry.
    count = e.var("count", 32)
    assert reads([cut(e.bvadd(count, e.const(step, 32)), bit, bit)]) == {"count": mask}
