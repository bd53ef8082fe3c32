"""Claims for all values at once: right ones hold at every value, altered ones are rejected, enumeration agrees."""

from __future__ import annotations

import random
from collections.abc import Callable, Iterator
from dataclasses import fields, is_dataclass, replace
from fractions import Fraction
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from agreement import brute
from programmable import Plan, State, drawn

from prover import certificate, each, family, formula, generalise
from prover import expr as e
from prover.api import check, read
from prover.certificate import discharge
from prover.domain import Domain
from prover.effort import Effort
from prover.family import Claim, Proof
from prover.findings import Report
from prover.forms import Poly
from prover.sample import Machines
from prover.spec import Spec
from prover.together import Together, prove

DOWN = """\
module down #(parameter W = 6) (input clk, input rst, input [W-1:0] div, output reg tick);
  reg [W-1:0] left;
  always @(posedge clk)
    if (rst) begin left <= {W{1'b0}}; tick <= 1'b0; end
    else if (left == {W{1'b0}}) begin left <= div; tick <= ~tick; end
    else left <= left - 1'b1;
endmodule
"""

# High for half of the count, rounded down: even and odd values differ.
HALF = """\
module half #(parameter W = 6) (input clk, input rst, input [W-1:0] div, output tick);
  reg [W-1:0] count;
  always @(posedge clk)
    if (rst || count >= div) count <= {W{1'b0}};
    else count <= count + 1'b1;
  assign tick = count < (div >> 1);
endmodule
"""

# A prescaler by 3 before it, and two inputs.
TWO = """\
module two (input clk, input rst, input [4:0] low, input [4:0] high, output out);
  reg [4:0] left;
  reg up;
  always @(posedge clk)
    if (rst) begin left <= 5'd0; up <= 1'b0; end
    else if (left == 5'd0) begin left <= up ? low : high; up <= ~up; end
    else left <= left - 5'd1;
  assign out = up;
endmodule
"""

# Name: source, options. All of them divide as they are claimed to.
SUBJECTS: dict[str, tuple[str, dict[str, Any]]] = {
    "down": (DOWN, {"ratio": "2*(div+1)", "each": {"div": None}}),
    "half": (HALF, {"ratio": "div+1", "high": "2*(div//2)", "each": {"div": ((2, 60),)}}),
    "two": (TWO, {"ratio": "low+high+2", "high": "2*(high+1)", "each": {"low": None, "high": None}}),
}


def spec_of(options: dict[str, Any]) -> Spec:
    high = options.get("high")
    return Spec(
        ratio_formula=formula.read(options["ratio"], "--ratio"),
        high_formula=formula.read(high, "--high") if high else None,
        each=options["each"],
        where=tuple(formula.read(text, "--where") for text in options.get("where", ())),
    )


_proved: dict[str, tuple[Together, Machines, Claim]] = {}


@pytest.fixture
def subject(tmp_path: Path) -> Callable[[str], tuple[Together, Machines, Claim]]:
    """A subject's proof, its machines, and its claim; made once."""

    def made(name: str) -> tuple[Together, Machines, Claim]:
        if name not in _proved:
            text, options = SUBJECTS[name]
            path = tmp_path / f"{name}.v"
            path.write_text(text, encoding="utf-8")
            spec = spec_of(options)
            design = read([path], spec)
            domain = Domain.of(design, spec)
            together = prove(design, spec, domain, Effort(120))
            assert isinstance(together, Together)
            # A comparison with the running count may pulse on the way; all else is known of every subject.
            assert not any(why for name, why in together.at_once.why.items() if name != "glitch-free"), (
                together.at_once.why
            )
            claim = Claim(spec.ratio_formula or Fraction(1), spec.high_formula, domain.fixed)
            _proved[name] = together, together.machines, claim
        return _proved[name]

    return made


def faults(machines: Machines, claim: Claim, proof: Proof) -> list[str]:
    owed = family.proof_obligations(
        machines.origin(), machines.admitted(), dict(machines.inputs), claim, proof
    )
    return family.faults(owed, lambda each: discharge(each, Effort(60)))


@pytest.mark.parametrize("name", SUBJECTS)
def test_what_is_found_covers_most_values_and_holds_at_each(
    name: str, subject: Callable[[str], tuple[Together, Machines, Claim]]
) -> None:
    together, machines, claim = subject(name)
    proof = together.proof
    assert faults(machines, claim, proof) == []
    assert proof.starts
    assert proof.everywhere
    assert len(proof.singly) < machines.domain.size / 3
    rng = random.Random(1)
    widths = [width for _, width in machines.system.variables]
    seen = 0
    for _ in range(30):
        values = machines.domain.value(rng.randrange(machines.domain.size))
        system, _, starts, _ = machines.at(values)
        for piece, from_start in proof.starts:
            if e.evaluate([piece.holds()], values) == [1]:
                runs = [family.at(course, values, widths) for course in from_start.courses]
                assert [run.start for run in runs] == list(starts)
                assert all(certificate.orbit_faults(system, run, Effort(30)) == [] for run in runs)
                seen += 1
    assert seen > 10


def altered(value: Any, rng: random.Random) -> Iterator[Any]:
    """The same claim with one number another, everywhere in it in turn. What is a fact about the machine's own names
    and widths stays."""
    if isinstance(value, Poly):
        for index, (monomial, coefficient) in enumerate(value.terms):
            other = list(value.terms)
            other[index] = (monomial, coefficient + rng.choice((-1, 1)))
            yield Poly.of(dict(other))
        if not value.terms or value.terms[0][0]:
            yield value + Poly.const(rng.choice((-1, 1)))
    elif isinstance(value, bool):
        yield not value
    elif isinstance(value, int):
        yield value + rng.choice((-1, 1))
    elif isinstance(value, tuple):
        for index, part in enumerate(value):
            for other in altered(part, rng):
                yield (*value[:index], other, *value[index + 1 :])
    elif is_dataclass(value) and not isinstance(value, type):
        for each_field in fields(value):
            if each_field.name not in ("rests", "gaps", "high", "release", "singly"):
                for other in altered(getattr(value, each_field.name), rng):
                    yield replace(value, **{each_field.name: other})


def harmless(right: Proof, wrong: Proof) -> bool:
    """Whether the altered claim says less than the right one, and nothing false: of fewer values, where the others are
    judged by themselves; a greater bound; a later place from which a course is good."""
    for pieces, others in ((right.starts, wrong.starts), (right.everywhere, wrong.everywhere)):
        changed = [(a, b) for a, b in zip(pieces or (), others or (), strict=True) if a != b]
        if changed and all(a[1] == b[1] for a, b in changed):
            return True
    for (_, a), (_, b) in zip(right.everywhere or (), wrong.everywhere or (), strict=True):
        for old, new in zip(a.layers, b.layers, strict=True):
            if old != new:
                return replace(new, unrolled=old.unrolled, merge=old.merge, recoveries=old.recoveries) == old
    for (p, c), (q, d) in zip(right.starts or (), wrong.starts or (), strict=True):
        if c != d and c.held is not None and d.held is not None:
            # Holding reset longer, or just as long as it needs, leaves the same states.
            return replace(d, held=replace(d.held, half_cycles=c.held.half_cycles)) == c and p == q
    return False


@pytest.mark.parametrize("name", ["down", "half"])
def test_each_number_put_wrong_is_rejected(
    name: str, subject: Callable[[str], tuple[Together, Machines, Claim]]
) -> None:
    together, machines, claim = subject(name)
    rng = random.Random(7)
    wrongs = list(altered(together.proof, rng))
    assert len(wrongs) > 100
    passed = 0
    for wrong in rng.sample(wrongs, 30):
        if faults(machines, claim, wrong):
            continue
        assert harmless(together.proof, wrong), wrong
        passed += 1
    assert passed < 8


@pytest.mark.parametrize("name", ["down", "half"])
def test_another_claim_or_fewer_values_are_rejected(
    name: str, subject: Callable[[str], tuple[Together, Machines, Claim]]
) -> None:
    together, machines, claim = subject(name)
    proof = together.proof
    assert isinstance(claim.ratio, formula.Formula)
    text = claim.ratio.text
    for other in (f"{text} + 1", f"2*({text})", f"{text} if div != 20 else 21"):
        assert faults(machines, replace(claim, ratio=formula.read(other, "--ratio")), proof)
    assert faults(machines, replace(claim, high=3), proof)
    assert proof.starts
    assert proof.everywhere
    assert faults(machines, claim, replace(proof, starts=proof.starts[1:]))
    assert faults(machines, claim, replace(proof, everywhere=proof.everywhere[1:]))
    for missing in range(len(proof.singly)):
        singly = (*proof.singly[:missing], *proof.singly[missing + 1 :])
        alone = [
            e.evaluate([p.holds()], proof.singly[missing]) == [1]
            for p, _ in (*proof.starts, *proof.everywhere)
        ]
        if not any(alone):
            assert faults(machines, claim, replace(proof, singly=singly))


# -- against enumeration -----------------------------------------------------------------------------------


@pytest.fixture
def at_once(monkeypatch: pytest.MonkeyPatch) -> None:
    """Small domains are proved at once, too, as far as that goes."""
    monkeypatch.setattr(each, "ENUMERATED", 0)
    monkeypatch.setattr(each, "MOST_ENUMERATED", 0)
    monkeypatch.setattr(generalise, "LEFT", 3)


def gaps_from_reset(plan: Plan, div: int) -> set[int]:
    """The gaps between rises, in half-cycles, from both start states on; 0 where the output stops."""
    found = set()
    for clock in (0, 1):
        shown, state = [], (0, 0, clock)
        for _ in range(6 * len(plan.states())):
            shown.append(plan.output(state, div))
            state = plan.step(state, div)
        rises = [i for i in range(1, len(shown)) if shown[i] and not shown[i - 1]]
        found |= {b - a for a, b in pairwise(rises)} if len(set(shown[len(shown) // 2 :])) == 2 else {0}
    return found


def agrees(plan: Plan, report: Report, period: Callable[[int], int], high: Callable[[int], int]) -> int:
    """Whether what is proved or refuted for all values is so; the number of properties that are left open."""
    worst: dict[int, int | None] = {}
    stuck = set()
    for div in range(1 << plan.width):
        after = {state: plan.step(state, div) for state in plan.states()}
        levels = {state: plan.output(state, div) for state in after}
        found: brute.BruteResult[State] = brute.analyse(after, levels, period(div), high(div))
        worst[div] = found.worst_half_cycles
        if found.stuck:
            stuck.add(div)
    left = 0
    for finding in report.findings:
        failing = {"recovery": {d for d, w in worst.items() if w is None}, "no-stuck": stuck}.get(
            finding.name
        )
        left += finding.verdict == "open"
        if failing is None or finding.verdict == "open":
            continue
        assert finding.verdict == ("refuted" if failing else "proved"), finding
        if failing:
            at = finding.facts["at"]
            assert isinstance(at, dict)
            assert at["div"] in failing
            if "not known" not in finding.says:
                assert at["div"] == min(failing)
        elif finding.name == "recovery":
            most = max(w for w in worst.values() if w is not None)
            assert isinstance(finding.facts["worst_half_cycles"], int)
            assert finding.facts["worst_half_cycles"] >= most
            if finding.facts["exact"]:
                assert finding.facts["worst_half_cycles"] == most
    return left


SOUND = [
    # A counter loaded at its wrap, and one compared with the input; the output toggles.
    Plan(6, False, "==", "{W{1'b0}}", "div", True, "div", True),
    Plan(6, True, ">=", "div", "{W{1'b0}}", True, "div", True),
    Plan(6, True, "==", "div", "{W{1'b0}}", True, "div", True),
    Plan(6, True, "==", "{W{1'b1}}", "~div", True, "div", True),
]


@pytest.mark.usefixtures("at_once")
@pytest.mark.parametrize("plan", SOUND, ids=lambda plan: f"{plan.compare} {plan.limit}, load {plan.load}")
def test_a_sound_programmable_divider_is_proved_at_once(plan: Plan, tmp_path: Path) -> None:
    path = tmp_path / "divider.v"
    path.write_text(plan.verilog(), encoding="utf-8")
    spec = Spec(ratio_formula=formula.read("2*(div+1)", "--ratio"), each={"div": None}, reset="rst=1")
    report = check([path], spec)
    assert agrees(plan, report, lambda div: 4 * (div + 1), lambda div: 2 * (div + 1)) == 0
    assert report.verdict == "proved"
    assert report.each is not None
    assert report.each.shapes >= 2
    assert report.each.tried < 32


@pytest.mark.usefixtures("at_once")
@pytest.mark.parametrize("seed", range(10))
def test_nothing_false_is_said_of_random_programmable_dividers(seed: int, tmp_path: Path) -> None:
    says_nothing_false(seed, tmp_path, 4)


def says_nothing_false(seed: int, folder: Path, width: int) -> None:
    """A random divider with a divisor of so many bits, claimed to do what some straight line says, or the one through
    what it does at two values."""
    rng = random.Random(5000 + seed)
    plan = drawn(rng, width)
    path = folder / "divider.v"
    path.write_text(plan.verilog(), encoding="utf-8")
    reset: dict[str, Any] = {"reset": "rst=1"} if plan.reset else {"holds": {"rst": 0}}
    slope, offset = rng.choice(((1, 1), (2, 2), (1, 0), (0, 4), (-1, 16), (-2, 32)))
    one, two = (max(gaps_from_reset(plan, div), default=0) for div in (5, 9))
    if rng.random() < 0.7 and not (two - one) % 8:
        slope = (two - one) // 8
        offset = one // 2 - 5 * slope
    ratio = formula.read(f"max(2, {slope}*div + {offset})", "--ratio")
    half = plan.toggles
    high = None if half else formula.read("2", "--high")
    spec = Spec(ratio_formula=ratio, high_formula=high, each={"div": None}, **reset)
    report = check([path], spec)

    def period(div: int) -> int:
        return int(2 * ratio.value({"div": div}))

    agrees(plan, report, period, lambda div: period(div) // 2 if half else 2)
