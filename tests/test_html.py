"""The report as a page: well-formed, safe whatever the sources say, and true to what was found."""

from __future__ import annotations

import itertools
import os
import random
import re
import subprocess
import sys
from collections import Counter
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from agreement import brute
from click.testing import CliRunner, Result
from machines import random_design
from pages import Node, page
from test_trace import released_at
from test_trace_reports import report_of
from texts import BY_3, RING, SECOND, SPINS, STICKS_AT_7, checked, measured, written

import prover
from prover import cli
from prover.analyse import rhythm_of
from prover.effort import Effort
from prover.expr import evaluate
from prover.facts import LIMITS
from prover.findings import Report
from prover.ports import recognise
from prover.report.html import page as html_page
from prover.report.html import recovery, render, render_several, states
from prover.report.html.markup import element, prose
from prover.report.html.waves import Scene, figure
from prover.report.wave import Drawing, Piece, Row
from prover.several import Outcome
from prover.spec import Spec

CASES = Path(__file__).parents[1] / "cases"
EVIL = "<script>alert(1)</script>"


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def section(root: Node, name: str) -> Node:
    """A section's body, without its heading."""
    return root.get(name).of("body")[0]


def case(name: str, ratio: str, **options: object) -> Report:
    return prover.check([CASES / name], Spec(ratio=Fraction(ratio), **options))  # type: ignore[arg-type]


# -- waves read back ---------------------------------------------------------------------------------------


def columns(picture: Node) -> list[float]:
    """Where each half-cycle that is drawn begins, in pixels, by its tick."""
    (ticks,) = picture.of("tick")
    return [float(x) for x in re.findall(r"M([\d.-]+) 20v6", ticks.attributes["d"] or "")]


def levels(line: Node, places: list[float]) -> list[int]:
    """The levels of a line in the half-cycles that begin there: 1 where it is in its upper half."""
    points: list[tuple[float, float]] = []
    for letter, numbers in re.findall(r"([MHV])([\d .-]+)", line.attributes["d"] or ""):
        values = [float(value) for value in numbers.split()]
        x, y = points[-1] if points else (0.0, 0.0)
        points.append(
            (values[0], values[1]) if letter == "M" else (values[0], y) if letter == "H" else (x, values[0])
        )
    ys = sorted({y for _, y in points})
    out = []
    for place in places:
        (y,) = {a[1] for a, b in itertools.pairwise(points) if a[1] == b[1] and a[0] <= place + 3 < b[0]}
        out.append(int(y == ys[0]) if len(ys) == 2 else -1)
    return out


def numbers(picture: Node, kind: str) -> list[int]:
    return [int(node.text.replace(" ", "")) for node in picture.of(kind) if node.name == "text"]


def test_the_wave_is_drawn_as_it_is(tmp_path: Path) -> None:
    root = page(render(checked(tmp_path, BY_3, "3")))
    (picture,) = section(root, "wave").of("wave")
    places = columns(picture)
    clock, tick = picture.of("line")
    # A third of the clock at 50 %, from a rise on, twice round and one input cycle more: 3 high, 3 low.
    assert levels(clock, places) == [1, 0] * 7
    assert levels(tick, places) == [1, 1, 1, 0, 0, 0] * 2 + [1, 1]
    # Edges 1, 4, 7, 10 and 13 launch it; the odd ones rise.
    assert numbers(picture, "launch") == [1, 4, 7, 10, 13]
    assert len(picture.of("arrow")) == len(picture.of("thread")) == 5
    assert [node.text for node in picture.of("measure")] == ["high 3", "period 6"]
    assert "in half-cycles: high 3, low 3, high 3, low 3, high 2." in picture.all("desc")[0].text


def test_a_counterexample_is_drawn_with_what_is_broken_measured() -> None:
    root = page(render(case("faulty/by_7_clears_at_6.v", "7")))
    body = section(root, "counterexamples")
    assert [node.text for node in body.all("h3")] == ["ratio", "high-time", "recovery"]
    pictures = body.of("wave")
    # Published with the circuit: a modulo-6 ripple counter, its top stage stretched by half a cycle: high 5 of 12.
    assert [[node.text for node in picture.of("measure")] for picture in pictures[:2]] == [
        ["12 half-cycles"],
        ["5 half-cycles"],
    ]
    lines = pictures[0].of("line")
    names = [node.text for node in body.of("names")[0].all("text")]
    assert names == ["half-cycle", "clk", "ping", "stage0.q", "stage1.q", "stage2.q", "delay.q"]
    drawn = dict(zip(names[1:], (levels(line, columns(pictures[0])) for line in lines), strict=True))
    assert drawn["ping"] == [0] * 7 + [1] * 5 + [0] * 7 + [1] * 2
    # The output is the top stage or itself half a cycle late.
    pairs = zip(drawn["stage2.q"], drawn["delay.q"], strict=True)
    assert [a | b for a, b in pairs] == drawn["ping"]


def test_long_stretches_are_folded_and_their_length_told(tmp_path: Path) -> None:
    root = page(render(checked(tmp_path, SECOND, "50000000", high=49_999_998)))
    pictures = section(root, "wave").of("wave")
    folds = [int(n.text.replace(" ", "").removesuffix("half-cycles")) for p in pictures for n in p.of("fold")]
    shown = sum(len(columns(picture)) for picture in pictures)
    # One period and the first input cycle of the next.
    assert sum(folds) + shown == 100_000_000 + 2
    edges = [edge for picture in pictures for edge in numbers(picture, "launch")]
    # High for 24 999 999 input cycles from edge 1 on, and all is launched by rising edges.
    assert edges == [1, 1 + 49_999_998, 1 + 100_000_000]
    told = section(root, "facts").text
    assert "on source edges 1, 49999999, 100000001 (edge 1 rises)" in told
    (ports,) = root.of("about")
    assert [node.text for node in ports.all("dd")][1:4] == ["clk", "rst, active 1, synchronous", "tick"]


def test_the_page_of_the_slowest_divider_is_small() -> None:
    text = render(case("gauge/season_by_2147483647.v", "2147483647"))
    assert len(text.encode()) < 300_000
    root = page(text)
    assert "2 147 483 647" in section(root, "wave").text
    assert root.of("overall")[0].text.startswith("proved")


def test_moving_inputs_are_drawn_in_the_middle_of_a_half_cycle(tmp_path: Path) -> None:
    # The run is worked out by hand in test_trace: the release is in the second half of half-cycle 2.
    trace = replace(released_at(2, 10), begins=5, ends=9, text="a high run", cause="held")
    report, _ = report_of(tmp_path, trace)
    root = page(render(report))
    (picture,) = section(root, "counterexamples").of("wave")
    assert [node.text for node in picture.of("measure")] == ["4 half-cycles"]
    clock, reset, tick, count = picture.of("line")
    places = columns(picture)
    halves = sorted([*places, *(place + (places[1] - places[0]) / 2 for place in places)])
    assert levels(reset, halves) == [1] * 5 + [0] * (len(halves) - 5)
    assert levels(clock, places) == [0, 1] * (len(places) // 2)
    assert levels(tick, places) == [1, 0, 0, 0, 0, 1, 1, 1, 1, 0]
    assert levels(count, places) == [1, 0, 0, 1, 1, 0, 0, 1, 1, 0]
    assert numbers(picture, "launch") == [1, 5, 9]


def test_a_pulse_that_begins_between_two_edges_is_measured_from_there() -> None:
    # The output is the decoded count, gated by the reset: released in the middle of half-cycle 2, it falls at 7.
    root = page(render(case("faulty/gated_by_reset.v", "6")))
    (picture,) = section(root, "counterexamples").of("wave")
    assert [node.text for node in picture.of("measure")] == ["4.5 half-cycles"]


def test_a_stuck_output_is_a_wave_of_its_own(tmp_path: Path) -> None:
    root = page(render(checked(tmp_path, STICKS_AT_7, "5", high=4)))
    (wave,) = [
        node
        for node in section(root, "counterexamples").of("wave")
        if "no-stuck" in node.all("title")[0].text
    ]
    tick = wave.of("line")[1]
    assert set(levels(tick, columns(wave))) == {-1}
    # There is no length to tell of what never ends.
    assert [node.text for node in wave.of("measure")] == ["here"]
    assert "low" in wave.all("desc")[0].text


# -- what is told ------------------------------------------------------------------------------------------


def test_every_finding_and_all_that_it_rests_on_is_told() -> None:
    report = case("gauge/ping_by_7_ripple.v", "7", output="ping", fin=Fraction(1_000_000))
    root = page(render(report))
    verdicts = root.of("verdicts")[0]
    for item, finding in zip(
        [n for n in verdicts.inside if isinstance(n, Node)], report.findings, strict=True
    ):
        for told in (
            finding.name,
            finding.verdict,
            finding.claim,
            finding.says,
            finding.method,
            finding.bound,
        ):
            assert told in item.text
    due = section(root, "obligations").text
    (settling,) = [finding for finding in report.findings if finding.name == "settling"]
    assert len(settling.obligations) == 2
    for obligation in settling.obligations:
        assert obligation.text in due
        assert f"cases/gauge/ping_by_7_ripple.v:{obligation.where.line}" in due
        assert obligation.where.text.strip() in due
    for assumption in report.assumptions:
        assert assumption in section(root, "assumptions").text
    assert section(root, "limits").text == LIMITS
    facts = section(root, "facts").text
    # Two half-cycles of a clock of 1 MHz are a microsecond.
    assert "on source edges 1, 8, 15 (edge 1 rises)" in facts
    assert "2 half-cycles, 1 input cycle, 1 µs" in facts
    links = [node.attributes["href"] for node in root.all("nav")[0].all("a")]
    assert links == [f"#{node.attributes['id']}" for node in root.of("part")]


def test_waivers_are_told_with_their_reasons(tmp_path: Path) -> None:
    waivers = {
        "no-stuck": "the supply monitor holds reset",
        "recovery": "the watchdog resets it",
        "glitch-free": "an enable",
    }
    root = page(render(checked(tmp_path, STICKS_AT_7, "5", high=4, waivers=waivers)))
    rows = [[cell.text for cell in row.all("th", "td")] for row in section(root, "waivers").all("tr")[1:]]
    assert rows == [[name, "refuted", reason] for name, reason in waivers.items()]
    assert root.of("overall")[0].text.startswith("proved")
    assert "3 waived" in root.of("overall")[0].text


def test_a_round_that_never_settles_is_a_table(tmp_path: Path) -> None:
    root = page(render(checked(tmp_path, SPINS, "2")))
    (table,) = section(root, "micro-steps").all("table")
    spins = [row.all("th", "td") for row in table.all("tr")]
    place = [cell.text for cell in spins[0]].index("spin")
    # An inverter fed by itself changes at every step.
    values = [row[place].text for row in spins[1:]]
    assert set(values) == {"0", "1"}
    assert all(a != b for a, b in itertools.pairwise(values))


def test_a_glitch_is_drawn_and_listed_by_arrivals() -> None:
    # The output is a decode of a counter at 1, 4 and 5, all bits of which may change at once.
    root = page(render(case("faulty/two_pulses.v", "9", high=6)))
    body = section(root, "glitches")
    (table,) = body.all("table")
    head, *rows = [[cell.text for cell in row.all("th", "td")] for row in table.all("tr")]
    assert head == ["arrival", "micro-step", "arrives", "ping", "count"]
    counts, pings = [int(row[4]) for row in rows], [int(row[3]) for row in rows]
    assert pings == [int(count in (1, 4, 5)) for count in counts]
    # One bit after another, and the output more than once.
    assert all((a ^ b).bit_count() == 1 for a, b in itertools.pairwise(counts))
    assert sum(a != b for a, b in itertools.pairwise(pings)) > 1
    (picture,) = body.of("wave")
    assert levels(picture.of("line")[0], columns(picture)) == pings
    assert [node.text for node in picture.of("measure")] == ["pulse"]
    assert numbers(picture, "number") == list(range(len(rows)))


def test_a_measurement_claims_nothing(tmp_path: Path) -> None:
    root = page(render(measured(tmp_path, RING)))
    assert "nothing is claimed" in root.all("header")[0].text
    assert not root.of("verdicts")
    assert root.all("title")[0].text == "ring: measured"


def test_values_of_an_input_are_a_table() -> None:
    file = str(CASES / "gauge/sample_by_div.v")
    # The case says that it divides by 2 (div + 1): at any other claim all values but one fail.
    result = run("check", file, "--each", "div=1..15", "--ratio", "4", "--html", "-")
    root = page(result.stdout)
    rows = [[cell.text for cell in row.all("th", "td")] for row in section(root, "values").all("tr")[1:]]
    assert [row[:3] for row in rows] == [["div=2..15", "refuted", "4"], ["div=1", "proved", "4"]]
    assert "All that follows is about div=" in section(root, "values").text


# -- state graphs ------------------------------------------------------------------------------------------


def enumerated(report: Report) -> dict[tuple[int, ...], tuple[tuple[int, ...], int]]:
    """Every power-up state of the report's machine, and those that they lead to, by plain stepping: the next state,
    and the output."""
    system = report.rhythm.system
    ranges = [range(1 << width) for _, width in system.variables]
    found = {}
    todo = [
        state
        for state in itertools.product(*ranges)
        if evaluate([system.settled], dict(zip(system.names, state, strict=True)))[0]
    ]
    while todo:
        state = todo.pop()
        if state not in found:
            found[state] = (system.next(state), system.out(state))
            todo.append(found[state][0])
    return found


def random_report(seed: int) -> Report:
    """A measurement of a random machine of up to five register bits, all of whose states are drawn."""
    rng = random.Random(seed)
    while True:
        design = random_design(rng, rng.randint(2, 5))
        spec = Spec(clock="clk", output="out", start="any")
        ports = recognise(design, spec)
        rhythm = rhythm_of(ports, spec, Effort(60))
        report = Report(ports, spec, rhythm, (), {}, (), (), 0.0)
        if rhythm.settling.depth is not None and states.machine(report) is not None:
            return report


@pytest.mark.parametrize("seed", range(25))
def test_every_state_is_in_one_box_and_leads_where_it_does(seed: int) -> None:
    report = random_report(seed)
    found = states.machine(report)
    assert found is not None
    truth = enumerated(report)
    numbers = {tuple(values): number for number, values in found.values.items()}
    assert set(numbers) == set(truth)
    for state, (after, output) in truth.items():
        assert found.after[numbers[state]] == numbers[after]
        assert found.output[numbers[state]] == output
    boxes: list[states.Node] = []
    for index in range(len(found.members)):
        ring = states.ring(found, index)
        on_ring = [state for box in ring for state in box.states]
        # One after another round the loop.
        assert all(found.after[a] == b for a, b in itertools.pairwise([*on_ring, on_ring[0]]))
        todo: list[tuple[states.Node, states.Node | None]] = [(box, None) for box in ring]
        while todo:
            box, onto = todo.pop()
            boxes.append(box)
            if onto is not None:
                # Several in one box lead to one another, and each tree of them by one way out.
                out = [state for state in box.states if found.after[state] not in box.states]
                assert [found.after[state] for state in out] == [onto.states[-1]] * box.trees
                if box.inward:
                    assert all(found.after[b] == a for a, b in itertools.pairwise(box.states))
            todo += [(inner, box) for inner in box.inward]
    assert Counter(state for box in boxes for state in box.states) == Counter(numbers.values())


@pytest.mark.parametrize("seed", range(40))
def test_no_two_boxes_overlap(seed: int) -> None:
    report = random_report(seed)
    found = states.machine(report)
    assert found is not None
    for index in range(len(found.members)):
        made = states.plan(found, index)
        for a, b in itertools.combinations([*made.ring, *made.trees], 2):
            apart = abs(a.at[0] - b.at[0]) >= a.half + b.half or abs(a.at[1] - b.at[1]) >= states.HEIGHT
            assert apart, (a, b)


def test_the_table_of_states_says_what_stepping_gives() -> None:
    report = case("faulty/twisted_ring_4.v", "8")
    root = page(render(report))
    (table,) = [node for node in root.all("table") if "until good" in node.text]
    head, *rows = [[cell.text for cell in row.all("th", "td")] for row in table.all("tr")]
    assert head == ["state", "ring", "clk", "output", "next", "until on a loop", "until good"]
    assert len(rows) == 32
    for row in rows:
        ring, clk = int(row[1]), int(row[2])
        # A twisted ring of four stages that shifts at the rising edge; the output is the last stage.
        after = ring if clk else (ring << 1 | (ring >> 3 ^ 1)) & 15
        assert row[0] == f"{ring}·{clk}"
        assert row[3] == str(ring >> 3)
        assert row[4] == f"{after}·{1 - clk}"
        # Of its two loops of sixteen states each, one is a Johnson counter's: 0, 1, 3, 7, 15, 14, 12, 8.
        assert row[5:] == ["0", "0" if ring in (0, 1, 3, 7, 15, 14, 12, 8) else "never"]
    captions = [node.text for node in root.all("figcaption") if "loop" in node.text]
    assert captions[0].startswith("The good loop of 16 states: divides by 8")
    assert captions[1].startswith("A false loop of 16 states")


def test_a_machine_of_more_states_has_its_loops_counted_and_no_graph() -> None:
    report = case("gauge/ping_by_7_rtl.v", "7", output="ping")
    assert report.rhythm.census is not None
    assert sum(report.rhythm.census.leading) == 2 ** (report.rhythm.system.bits)
    wide = case("gauge/season_by_2147483647.v", "2147483647")
    assert wide.rhythm.census is None
    root = page(render(wide))
    assert not root.of("states")
    assert "good after exactly 3 half-cycles" in section(root, "states").text


# -- recovery ----------------------------------------------------------------------------------------------


def test_the_census_is_what_enumeration_gives() -> None:
    report = case("gauge/ping_by_7_ripple.v", "7", output="ping")
    truth = enumerated(report)
    told = brute.analyse(
        {state: after for state, (after, _) in truth.items()}, {s: o for s, (_, o) in truth.items()}, 14, 7
    )
    counted = Counter(told.recovery_half_cycles.values())
    census = report.rhythm.census
    assert census is not None
    assert dict(census.recovery) == counted
    assert sum(census.leading) == len(truth)


@pytest.mark.parametrize("worst", [0, 1, 55, 56, 57, 1000, 123_456])
def test_each_state_is_in_one_bar(worst: int) -> None:
    rng = random.Random(worst)
    pairs = sorted({rng.randint(0, worst) for _ in range(200)} | {worst})
    counts = [(needed, rng.randint(1, 10_000)) for needed in pairs]
    shown = recovery.bars(counts)
    assert len(shown) <= recovery.MOST_BARS
    for first, last, count in shown:
        assert count == sum(n for needed, n in counts if first <= needed <= last)
    assert sum(count for _, _, count in shown) == sum(n for _, n in counts)


def test_the_recovery_in_words() -> None:
    # Ten states: five good at once, two after 1, two after 4, and one that never is.
    assert recovery.summary([(0, 5), (1, 2), (4, 2)], 10) == (
        "Of 10 power-up states, 5 are good from the start; the slowest need 4 half-cycles (2 states); "
        "1 never becomes good."
    )
    assert recovery.summary([(2, 2), (4, 2)], 4) == (
        "Of 4 power-up states, 0 are good from the start; half of those that become good need at most 2 half-cycles; "
        "the slowest need 4 half-cycles (2 states)."
    )


def test_long_numbers_are_set_in_threes_and_read_as_they_were() -> None:
    told = "period 4294967294 of 12345, at count=4294967295 in d_100000 and 3.14159 or 9999; 45 to 55 %"
    made = prose(told)
    assert re.sub("<[^>]*>", "", made).replace("&nbsp;", " ") == told
    assert re.findall(r'<span class="digits">(.*?)</span>(?!<)(?!\d)', made) == [
        "4<span>294</span><span>967</span><span>294</span>",
        "12<span>345</span>",
    ]
    assert prose("<b>12") == "&lt;b&gt;12"
    # What is markup already is not made text again.
    assert prose(prose("<b>12345")) == prose("<b>12345")


def test_no_number_of_the_ruler_is_crossed_by_a_tear(tmp_path: Path) -> None:
    # A second of 50 MHz: eight digits at every fold.
    root = page(render(checked(tmp_path, SECOND, "50000000", high=49_999_998)))
    for picture in section(root, "wave").of("wave"):
        tears = [float((node.attributes["d"] or "").split()[0][1:]) for node in picture.of("tear")]
        spans = [
            (float(node.attributes["x"] or ""), len(node.text) * 6.6)
            for node in picture.of("number")
            if node.name == "text"
        ]
        assert spans
        # An 11 px letter of the pages' face is 6.6 px wide, and a tear reaches 3 px to the right.
        assert not [
            (x, at) for at in tears for x, wide in spans if x - wide / 2 < at + 3 and at < x + wide / 2
        ]


def test_a_value_too_long_for_its_box_is_told_all_the_same() -> None:
    clock = Row("clk", 1, lambda at: at % 2, lambda begins, ends: None)
    ring = Row("ring", 90, lambda at: 10**20 + at, lambda begins, ends: 10**20)
    pieces = (Piece(0, 3), Piece(3, 40, folded=True), Piece(40, 42))
    scene = Scene(Drawing("half-cycle", 0, 0, (clock, ring), pieces), 0, (), "a ring", "ring")
    told = re.findall(r">(?:<title>ring=(\d+)</title>)?…<", figure(scene))
    assert [int(value) - 10**20 for value in told] == [0, 1, 2, 0, 40, 41]


# -- two compared ------------------------------------------------------------------------------------------


def test_two_dividers_that_differ_are_drawn_under_one_ruler() -> None:
    pair = [str(CASES / f"pairs/scan_by_8_{kind}.v") for kind in ("binary", "late")]
    result = run("compare", *pair, "--html", "-")
    assert result.exit_code == 1
    root = page(result.stdout)
    assert root.all("h1")[0].text == "scan_by_8_binary and scan_by_8_late"
    assert [side.text.count("scan_by_8_binary.v") for side in root.of("about")] == [1, 0]
    (picture,) = section(root, "difference").of("wave")
    clock, old, new = picture.of("line")[:3]
    places = columns(picture)
    # The new one is the old one sampled at the falling edge, half a cycle late.
    assert levels(old, places) == [0] * 7 + [1] * 8 + [0]
    assert levels(new, places) == [0] * 8 + [1] * 8
    assert levels(clock, places) == [0, 1] * 8
    assert [node.text for node in picture.of("measure")] == ["here", "here"]
    assert "half-cycle 7: the old output is 1, the new one 0" in section(root, "found").text


def test_two_dividers_that_are_equal_have_no_difference(tmp_path: Path) -> None:
    pair = [str(CASES / f"pairs/scan_by_8_{kind}.v") for kind in ("binary", "late")]
    result = run("compare", *pair, "--lag", "1", "--html", str(tmp_path / "pair.html"))
    assert result.exit_code == 0
    root = page((tmp_path / "pair.html").read_text(encoding="utf-8"))
    assert root.of("overall")[0].text == "proved"
    parts = [node.attributes["id"] for node in root.of("part")]
    assert parts == ["found", "assumptions", "limits"]


def test_inputs_that_move_are_drawn_with_both_outputs() -> None:
    pair = [str(CASES / f"pairs/sample_{kind}.v") for kind in ("up", "live")]
    root = page(run("compare", *pair, "--moving", "divisor", "--html", "-").stdout)
    names = [node.text for node in section(root, "difference").of("names")[0].all("text")]
    assert names[:5] == ["half-cycle", "clk", "divisor", "old.sample", "new.sample"]


# -- safe and the same -------------------------------------------------------------------------------------


def test_whatever_the_sources_say_is_text(tmp_path: Path) -> None:
    module, register = "\\top<img/src=x/onerror=alert(1)> ", "\\q&amp;\"'><b> "
    text = f"""\
module {module} (input clk, input \\a<i> , output reg \\t--> );
  reg [1:0] {register};
  always @(posedge clk) {register} <= {register} + 1 + \\a<i> ;
  always @* \\t--> = {register} == 2'd1;
endmodule
"""
    file = tmp_path / '"><svg onload=alert(2)>.v'
    file.write_text(text, encoding="utf-8")
    waiver = f"recovery=</style>{EVIL}\x1b[31m\u202e"
    result = run("check", str(file), "--ratio", "3", "--waive", waiver, "--html", "-", "--hold", r"\a<i>=0")
    assert result.exit_code == 1, result.stderr
    root = page(result.stdout)
    assert root.all("h1")[0].text == r"\top<img/src=x/onerror=alert(1)>"
    assert r"\top<img/src=x/onerror=alert(1)>" in root.all("title")[0].text
    assert str(file) in root.all("header")[0].text
    assert rf"</style>{EVIL}\x1b[31m\u202e" in section(root, "waivers").text
    assert "q&amp;\"'><b>" in section(root, "counterexamples").text
    assert (
        not root.all("img", "script", "b", "i") or {n.name for n in root.all("img", "script", "i")} == set()
    )


def test_an_element_escapes_its_texts_and_attributes() -> None:
    made = element("p", "a<b", element("i", "&"), [f"{EVIL}"], title="\"'<", hidden=False, open=True, x=1.25)
    assert made == (
        '<p title="&quot;&#x27;&lt;" open x="1.2">a&lt;b<i>&amp;</i>&lt;script&gt;alert(1)&lt;/script&gt;</p>'
    )


def test_the_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    root = str(Path(prover.__file__).parents[1])
    pages = []
    for seed in ("1", "2"):
        path = tmp_path / f"{seed}.html"
        command = [
            sys.executable,
            "-m",
            "prover",
            "check",
            str(CASES / "faulty/saturates_at_15.v"),
            "--ratio",
            "20",
        ]
        environment = {**os.environ, "PYTHONPATH": root, "PYTHONHASHSEED": seed}
        done = subprocess.run(
            [*command, "--html", str(path)], env=environment, capture_output=True, check=False
        )
        assert done.returncode == 1
        pages.append(path.read_bytes())
    assert pages[0] == pages[1]


# -- several dividers, and the command line ----------------------------------------------------------------


def test_several_dividers_are_one_file(tmp_path: Path) -> None:
    for name, text in {"third": BY_3, "sticks": STICKS_AT_7, "broken<b>": "module ("}.items():
        (tmp_path / f"{name}.v").write_text(text)
    result = run("check", str(tmp_path), "--ratio", "3", "--html", str(tmp_path / "all.html"))
    assert result.exit_code == 2
    root = page((tmp_path / "all.html").read_text(encoding="utf-8"))
    rows = [[cell.text.strip() for cell in row.all("th", "td")] for row in root.get("index").all("tr")[1:]]
    assert [row[:2] for row in rows] == [
        ["broken<b>.v", "error"],
        ["sticks_at_7", "refuted"],
        ["by_3", "proved"],
    ]
    parts = root.of("divider")
    # What is wrong is shown, what is not can be opened.
    assert ["open" in part.attributes for part in parts] == [True, True, False]
    assert [len(part.of("verdicts")) for part in parts] == [0, 1, 1]
    assert "line 1" in rows[0][2] or "1" in parts[0].text


def test_of_very_many_dividers_the_proved_ones_are_told_in_short(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(html_page, "MOST_WHOLE", 3)
    proved, refuted = checked(tmp_path, BY_3, "3"), checked(tmp_path, BY_3, "3", high=2)
    many = [Outcome(("one.v",), proved)] * 3 + [Outcome(("two.v",), refuted)]
    root, whole = page(render_several(many)), page(render_several(many[1:]))
    assert [bool(part.of("states")) for part in root.of("divider")] == [False] * 3 + [True]
    assert all(part.of("states") for part in whole.of("divider"))
    assert all(part.of("wave") for part in root.of("divider"))


def test_standard_output_holds_the_page_alone(tmp_path: Path) -> None:
    file = written(tmp_path, BY_3)
    result = run("measure", file, "--html", "-")
    assert result.exit_code == 0
    assert page(result.stdout).all("h1")[0].text == "by_3"
    other = run("check", file, "--ratio", "3", "--html", str(tmp_path / "out.html"), "--json", "-")
    assert other.stdout.startswith("{")
    assert page((tmp_path / "out.html").read_text(encoding="utf-8"))
    for wrong in (["--html", "-", "--json", "-"], ["--html", str(tmp_path)], ["--html", file]):
        refused = run("check", file, "--ratio", "3", *wrong)
        assert (refused.exit_code, refused.stdout) == (2, "")
