"""Glitches: verdicts against all orders of arrival, and what the findings say."""

from __future__ import annotations

import random
from collections.abc import Mapping, Sequence
from dataclasses import replace
from fractions import Fraction
from itertools import product
from pathlib import Path
from typing import Any

import pytest
import small
from agreement import brute as enumeration
from cases_format import CASES
from machines import random_design
from orders import moments, most_changes, most_changes_in_any_order
from test_hazard import HERE, Delays, random_network
from vcdvcd import VCDVCD

from properties import glitch_free
from prover import analyse, check, glitch
from prover import expr as e
from prover.arrival import Glitch
from prover.design import Design, Edge, Force, Register, Signal
from prover.effort import Effort
from prover.expr import Expr
from prover.findings import Finding, Report
from prover.good import EVERYWHERE, Scope
from prover.hazard import Network
from prover.ports import recognise
from prover.report import terminal, vcd
from prover.report.json import as_object
from prover.rhythm import Rhythm
from prover.settling import settle
from prover.solve import find
from prover.spec import Spec
from prover.system import State


def analysed(design: Design, spec: Spec) -> Rhythm:
    return analyse.rhythm_of(recognise(design, spec), spec, Effort(60))


def worst_changes(design: Design, rhythm: Rhythm, period: int, high: int) -> tuple[int, int] | None:
    """The most changes of the output in one half-cycle that starts in a good state: in any order within a micro-step,
    and in any order at all. None if no state is good."""
    system = rhythm.system
    output = design.signals["out"].value
    paths = {}
    levels = {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        values = dict(zip(system.names, state, strict=True))
        (rest,) = e.evaluate([system.settled], values)
        if rest:
            paths[state] = moments(design, "clk", values)
            (levels[state],) = e.evaluate([output], values)
    after = {state: tuple(steps[-1][name] for name in system.names) for state, steps in paths.items()}
    good = enumeration.good_phases(after, levels, period, high)
    seen = e.compile_step([output], system.names)

    def level(values: Mapping[str, int]) -> int:
        return seen(*(values[name] for name in system.names))[0]

    counts = [(most_changes(level, paths[s]), most_changes_in_any_order(level, paths[s])) for s in good]
    return (max(a for a, _ in counts), max(b for _, b in counts)) if counts else None


@pytest.mark.parametrize("seed", range(60))
def test_random_machines_pulse_where_some_order_of_arrival_shows_it(seed: int) -> None:
    rng = random.Random(seed)
    agrees(random_design(rng, rng.randint(2, 6)))


def agrees(design: Design) -> bool:
    """Whether the design was compared: a divider with one high run a period, its verdict held against all orders."""
    rhythm = analysed(design, Spec(start="any"))
    if rhythm.settling.depth is None:
        return False
    waves = [loop.wave for loop in rhythm.loops if len(loop.wave.runs) == 2]
    if not waves:
        return False
    period, high = waves[0].period or 2, waves[0].high or 1
    claim = Spec(ratio=Fraction(period, 2), high=high, start="any")
    found = glitch_free.judge(analysed(design, claim), claim)
    expected = worst_changes(design, rhythm, period, high)
    assert expected is not None
    in_order, anyhow = expected
    assert found.verdict == ("refuted" if in_order > 1 else "proved"), design
    if in_order == 1 < anyhow:
        assert found.obligations
    if found.glitch is not None:
        assert replayed(design, found.glitch) > 1
    return True


def replayed(design: Design, glitch: Glitch) -> int:
    """The changes of the output as the finding's arrivals come in, computed from their words."""
    output = design.signals["out"].value
    level = glitch.level
    changes = 0
    for arrival in glitch.arrivals:
        (seen,) = e.evaluate([output], dict(arrival.seen))
        assert seen == arrival.level
        changes += seen != level
        level = seen
    return changes


# -- machines that go round random codes -------------------------------------------------------------------


def coded(rng: random.Random) -> tuple[list[Register], list[Expr], list[int]]:
    """Flip-flops that go round some random codes, to which any other code leads; their bits, and the codes in order."""
    bits = rng.choice([2, 3, 3, 4])
    codes = rng.sample(range(1 << bits), rng.randint(2, min(6, 1 << bits)))
    following = {code: codes[(i + 1) % len(codes)] for i, code in enumerate(codes)}
    names = [e.var(f"i{k}", 1) for k in range(bits)]
    word = e.concat_all(names[::-1])
    after = [following.get(code, rng.choice(codes)) for code in range(1 << bits)]
    registers = []
    for k in range(bits):
        data = e.FALSE
        for code, target in enumerate(after):
            data = e.ite(e.eq(word, e.const(code, bits)), e.const(target >> k & 1, 1), data)
        registers.append(Register(f"i{k}", 1, "flip-flop", (Edge(e.var("clk", 1), data),), (), None, HERE))
    return registers, names, codes


def divider(registers: Sequence[Register], output: Signal, network: Network | None = None) -> Design:
    gates = dict(network.gates) if network else {}
    made = Design(
        "coded", {"clk": 1}, ("out",), tuple(registers), {"out": output}, {}, ("c.v",), "0", gates=gates
    )
    made.sanity_check()
    return made


def one_run(codes: Sequence[int], high: int, bits: int, rng: random.Random) -> Expr:
    """One bit over the code word: 1 at the first codes, 0 at the later ones, anything elsewhere."""
    word = e.concat_all([e.var(f"i{k}", 1) for k in reversed(range(bits))])
    levels = {code: int(i < high) for i, code in enumerate(codes)}
    terms = [c for c in range(1 << bits) if levels.get(c, rng.getrandbits(1))]
    return e.disj(e.eq(word, e.const(code, bits)) for code in terms)


@pytest.mark.parametrize("batch", range(20))
def test_decodes_of_random_codes_pulse_where_some_order_of_arrival_shows_it(batch: int) -> None:
    compared = 0
    for seed in range(12 * batch, 12 * batch + 12):
        rng = random.Random(seed)
        registers, bits, codes = coded(rng)
        output = one_run(codes, rng.randint(1, len(codes) - 1), len(bits), rng)
        clock = e.var("clk", 1)
        kind = rng.randrange(4)
        if kind:
            # Resampled by one edge or the other, and merged with the decode, or with the clock.
            net = rng.choice([clock, e.bvnot(clock)])
            registers.append(Register("late", 1, "flip-flop", (Edge(net, output),), (), None, HERE))
            late = e.var("late", 1)
            output = [e.bvor(output, late), e.bvand(clock, late), e.bvand(e.bvnot(clock), late)][kind - 1]
        compared += agrees(divider(registers, Signal("out", output, 0, 0, False, HERE)))
    assert compared >= 6


@pytest.mark.parametrize("batch", range(12))
def test_written_gates_pulse_with_the_delays_that_enumeration_finds(batch: int) -> None:
    compared = 0
    for seed in range(40 * batch, 40 * batch + 40):
        rng = random.Random(seed)
        registers, bits, codes = coded(rng)
        network = random_network(rng, len(bits), rng.randint(2, 5))
        compared += gates_agree(registers, network, codes)
    assert compared >= 8


def gates_agree(registers: Sequence[Register], network: Network, codes: Sequence[int]) -> bool:
    """Whether the gates make a divider with one high run a period; then its verdict is held against all delays."""
    value = flat(network)
    design = divider(registers, Signal("out", value, 0, 0, False, HERE, written=network.root), network)
    names = [register.name for register in registers]
    seen = e.compile_step([value], names)

    def bits_of(code: int) -> list[int]:
        return [code >> k & 1 for k in range(len(names))]

    levels = [seen(*bits_of(code))[0] for code in codes]
    if sum(a != b for a, b in zip(levels, [*levels[1:], levels[0]], strict=True)) != 2:
        return False
    period, high = 2 * len(codes), 2 * sum(levels)
    claim = Spec(ratio=Fraction(period, 2), high=high, start="any")
    rhythm = analysed(design, claim)
    found = glitch_free.judge(rhythm, claim)
    system = rhythm.system
    good = enumeration.good_phases(*tables(rhythm), period, high)
    rising = [state for state in good if state[-1] == 0]
    worst = max(
        Delays(
            network, dict(zip(names, s, strict=False)), dict(zip(names, system.next(s), strict=False))
        ).most_changes()
        for s in rising
    )
    assert found.verdict == ("refuted" if worst > 1 else "proved"), design
    assert not found.obligations
    if found.glitch is not None:
        assert found.glitch.changes > 1
    return True


def flat(network: Network) -> Expr:
    """The network's output over its inputs, simplified as expressions are."""
    values: dict[str, Expr] = {}
    for net in network.order:
        made = network.gates[net]
        pins = e.substitute(made.pins, values)
        fold = {"a": e.bvand, "o": e.bvor, "x": e.bvxor}.get(made.kind.lstrip("n")[0])
        word = pins[0]
        for pin in pins[1:]:
            word = fold(word, pin) if fold else word
        values[net] = e.bvnot(word) if made.kind in ("nand", "nor", "xnor", "not") else word
    return e.substitute([network.root], values)[0]


def tables(rhythm: Rhythm) -> tuple[dict[State, State], dict[State, int]]:
    """Every state's successor and output, through the integer evaluation of the step."""
    system = rhythm.system
    after, out = {}, {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        *step, level = e.evaluate([*system.step, system.output], dict(zip(system.names, state, strict=True)))
        after[state], out[state] = tuple(step), level
    return after, out


# -- what a finding says -----------------------------------------------------------------------------------


def judged(case: str, ratio: str, high: int, **options: Any) -> tuple[Report, Finding]:
    report = check([CASES / f"{case}.v"], Spec(ratio=Fraction(ratio), high=high, **options))
    (finding,) = [f for f in report.findings if f.name == "glitch-free"]
    return report, finding


def found_in(case: str, ratio: str, high: int) -> Glitch:
    _, finding = judged(case, ratio, high)
    assert finding.verdict == "refuted"
    assert finding.glitch is not None
    return finding.glitch


def line(case: str, words: str) -> int:
    lines = (CASES / f"{case}.v").read_text(encoding="utf-8").splitlines()
    (number,) = [i for i, text in enumerate(lines, 1) if words in text]
    return number


def test_a_compare_names_the_step_the_bits_and_the_value_in_between() -> None:
    case = "faulty/pump_by_10_compare"
    _, finding = judged(case, "10", 8)
    glitch = found_in(case, "10", 8)
    # By hand: of all steps of the count only that from 0111 to 1000 can pass below 4 on its way, where bit 2 is first.
    assert (glitch.kind, glitch.state, glitch.rising) == ("function", {"count": 7, "clk": 0}, True)
    assert glitch.where.line == line(case, "count < 4")
    assert [(a.name, a.old, a.new, a.level) for a in glitch.arrivals[:1]] == [("count[2]", 1, 0, 1)]
    assert {a.name for a in glitch.arrivals} == {"count[3]", "count[2]", "count[1]", "count[0]"}
    assert (glitch.first, dict(glitch.between), glitch.changes) == (0, {"count": 3}, 2)
    assert "pulses to 1 at the rising edge from count=7" in finding.says
    assert "count[2] 1→0 has arrived before the rest, count=3" in finding.says


def test_a_decoded_ripple_counter_pulses_in_the_order_of_its_stages() -> None:
    glitch = found_in("faulty/sonde_by_8_decoded", "8", 4)
    # 011, 010, 000, 100: stage 1 falls a reaction after stage 0, stage 2 rises one after that.
    assert [(a.micro_step, a.name, a.level) for a in glitch.arrivals] == [(2, "q[1]", 1), (3, "q[2]", 0)]


def test_an_enable_from_the_same_edge_lets_a_sliver_through() -> None:
    glitch = found_in("faulty/pulses_same_edge", "2", 1)
    assert glitch.state == {"enable": 1, "clk": 0}
    assert [(a.micro_step, a.name, a.new, a.level) for a in glitch.arrivals] == [
        (0, "clk", 1, 1),
        (1, "enable", 0, 0),
    ]


@pytest.mark.parametrize(
    ("case", "ratio", "output", "order"),
    [
        ("gauge/heater_by_4_gated", "2", "pulses", "clk before open at the falling edge"),
        ("gauge/pump_by_4_gated", "4", None, "clk before open at the falling edge"),
    ],
)
def test_an_enable_from_the_other_edge_or_a_latch_owes_its_order(
    case: str, ratio: str, output: str | None, order: str
) -> None:
    _, finding = judged(case, ratio, 1, output=output)
    (due,) = finding.obligations
    assert finding.verdict == "proved"
    assert order in due.text
    assert due.where.line == line(case, "clk & open" if output else "and gate")


def test_gates_are_told_by_their_terminals_and_a_bridge_mends_them() -> None:
    case = "faulty/stage_by_8_unbridged"
    glitch = found_in(case, "8", 4)
    # From 110 to 111: the AND of 110 lets go before that of 111 takes over.
    assert (glitch.kind, glitch.state) == ("gates", {"gray": 6, "clk": 0})
    assert glitch.where.line == line(case, "or merge")
    assert glitch.arrivals[0].name == "gray[0] at not gray_n[0]"
    assert (glitch.between["at_6"], glitch.between["at_7"], glitch.changes) == (0, 0, 2)
    assert judged("gauge/stage_by_8_bridged", "8", 4)[1].verdict == "proved"


def test_a_register_that_clears_itself_on_the_way_is_no_clean_output() -> None:
    # By hand: at the count of 3 stage 0 rises and is cleared at once, so as an output it has a sliver a round.
    bits = [e.var(f"q{i}", 1) for i in range(2)]
    design = small.self_clearing(2)
    signals = {"out": Signal("out", bits[0], 0, 0, False, HERE)}
    claim = Spec(ratio=Fraction(3), high=2, start="any")
    found = glitch_free.judge(analysed(replace(design, signals=signals), claim), claim)
    assert found.verdict == "refuted"
    assert found.glitch is not None
    assert [(a.name, a.new) for a in found.glitch.arrivals] == [("q0", 1), ("q0", 0)]


def test_a_pulse_is_dumped_listed_and_drawn(tmp_path: Path) -> None:
    report, finding = judged("faulty/pump_by_10_compare", "10", 8)
    assert finding.glitch is not None
    text = vcd.render(report, finding)
    assert text is not None
    path = tmp_path / "pulse.vcd"
    path.write_text(text)
    dump = VCDVCD(str(path))
    assert [(at, int(v, 2)) for at, v in dump["pump_by_10_compare.pump"].tv] == [(0, 0), (1, 1), (4, 0)]
    assert [int(v, 2) for _, v in dump["pump_by_10_compare.count"].tv] == [7, 3, 2, 0, 8]
    (told,) = [p for p in as_object(report)["properties"] if p["name"] == "glitch-free"]
    assert [a["output"] for a in told["glitch"]["arrivals"]] == [1, 1, 1, 0]
    assert told["glitch"]["line"] == finding.glitch.where.line
    drawn = terminal.render(report)
    assert "glitch of pump at the rising edge of clk" in drawn
    rows = [row.split() for row in drawn.splitlines() if "→" in row and row.startswith("  1 ")]
    assert [row[-1] for row in rows] == ["3", "2", "0", "8"]


def test_what_a_latch_lets_through_is_not_taken_for_clean() -> None:
    # Open while the clock is high, so that it shows all that the decode of 1 to 2 (01, 00 or 11, 10) does on its way.
    count, held = e.var("count", 2), e.var("held", 1)
    decode = e.eq(count, e.const(3, 2))
    latch = Register("held", 1, "latch", (), (Force(small.CLOCK, decode, HERE),), None, HERE)
    registers = [small.flop("count", 2, small.CLOCK, e.bvadd(count, e.const(1, 2))), latch]
    claim = Spec(ratio=Fraction(4), high=2, start="any")
    found = glitch_free.judge(analysed(small.design(registers, held), claim), claim)
    assert found.verdict == "open"
    assert "what held takes on may pulse while it is open" in found.says
    shut = Register("held", 1, "latch", (), (Force(small.FALLING, decode, HERE),), None, HERE)
    closed = glitch_free.judge(analysed(small.design([registers[0], shut], held), claim), claim)
    assert (closed.verdict, closed.obligations) == ("proved", ())


def test_an_output_that_hangs_on_x_is_not_taken_for_clean() -> None:
    # A tri-state driver that lets go while q is 0: what is seen then may be anything.
    q = e.var("q", 1)
    registers = [small.flop("q", 1, small.CLOCK, e.bvnot(q))]
    design = small.design(registers, e.ite(q, e.TRUE, e.var("?floating", 1)))
    ports = recognise(design, Spec(ratio=Fraction(2), start="any"))
    system, _ = settle(design, "clk", ports.running, ports.output_value, Effort(10))
    scope = Scope((EVERYWHERE,), "everywhere")
    found = glitch.find(ports, system, scope, lambda state: None, lambda goal: find(goal, Effort(10)))
    assert found.open == "it hangs on a value that x stands for"


# -- wide machines -----------------------------------------------------------------------------------------


def test_a_wide_compare_is_refuted_on_its_own_run_and_an_or_of_its_halves_is_proved() -> None:
    # From 2^24 - 1 to 2^24 all lower bits fall and one rises: the count may pass by anything below.
    last = 50_000_000
    count = e.var("count", 26)
    following = e.ite(e.bvule(e.const(last - 1, 26), count), e.const(0, 26), e.bvadd(count, e.const(1, 26)))
    registers = [small.flop("count", 26, small.CLOCK, following)]
    design = small.design(registers, e.bvult(count, e.const(last // 2, 26)))
    claim = Spec(ratio=Fraction(last), start="any")
    found = glitch_free.judge(analysed(design, claim), claim)
    assert found.verdict == "refuted"
    assert found.glitch is not None
    before = found.glitch.state["count"]
    assert before < last
    assert replayed(design, found.glitch) > 1
    wide = judged("gauge/second_by_50000001", "50000001", 50000001)[1]
    assert (wide.verdict, wide.obligations) == ("proved", ())
