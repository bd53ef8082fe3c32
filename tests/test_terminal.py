"""The report for people: what is drawn is what the machine does, and what is left out is stated."""

from __future__ import annotations

import itertools
import random
import re
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from machines import random_design
from small import twisted_ring
from texts import BY_3, RING, SECOND, SPINS, STICKS_AT_7, checked, measured

from prover import orbit
from prover.effort import Effort
from prover.report.look import Look
from prover.report.terminal import render
from prover.report.wave import ASCII, UNICODE, Drawing, Piece, Row, Timeline, draw, fold_text, plan
from prover.rhythm import Orbit
from prover.settling import settle
from prover.system import Inputs, System


def lines_of(report: str, name: str) -> list[str]:
    """The drawn rows of that name, without it."""
    return [m[1] for m in re.finditer(rf"(?m)^  {re.escape(name)} +([‾_|].*)$", report)]


def traced(design_seed: int) -> tuple[System, Orbit]:
    """A random machine that settles, and the orbit of its first state."""
    rng = random.Random(design_seed)
    while True:
        design = random_design(rng, 6)
        system, settling = settle(design, "clk", Inputs.of({}), design.signals["out"].value, Effort(60))
        if settling.depth is not None:
            return system, orbit.trace(system, (0,) * len(system.variables), Effort(60))


# -- timelines ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(12))
def test_a_timeline_is_what_stepping_gives(seed: int) -> None:
    system, followed = traced(seed)
    timeline = Timeline(followed)
    states = [followed.start]
    while len(states) < timeline.once + 2 * (timeline.loop or 0) + 2:
        states.append(system.next(states[-1]))
    outputs = [system.out(state) for state in states]
    count = len(states)
    assert [timeline.state(t) for t in range(count)] == states
    assert [timeline.level(t) for t in range(count)] == outputs
    edges = [t for t in range(1, count) if outputs[t] != outputs[t - 1]]
    assert list(timeline.edges(0, count)) == edges
    half = count // 2
    assert list(timeline.edges(half, count)) == [t for t in edges if t >= half]
    rows = [*zip(*states, strict=True), outputs]
    for begins, ends in ((0, 2), (1, 4), (0, count), (half, half + 1)):
        expected = [row[begins] if len(set(row[begins:ends])) == 1 else None for row in rows]
        assert list(timeline.steady(begins, ends)) == expected


# How fast a machine draws them says nothing of what is drawn.
@settings(deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    st.integers(0, 50),
    st.integers(1, 5000),
    st.lists(st.integers(0, 5000), max_size=12),
    st.integers(1, 20),
    st.integers(1, 100),
    st.integers(1, 30),
)
def test_a_plan_covers_its_range_and_keeps_to_its_limit(
    begins: int, length: int, points: list[int], margin: int, most: int, least: int
) -> None:
    pieces = plan(begins, begins + length, points, margin, most, least)
    assert pieces[0].begins == begins
    assert pieces[-1].ends == begins + length
    assert all(a.ends == b.begins for a, b in itertools.pairwise(pieces))
    assert all(piece.length >= least for piece in pieces if piece.folded)
    shown = sum(piece.length for piece in pieces if not piece.folded)
    # Up to one unfoldable rest before each window and after the last stands beside what the points ask for.
    assert shown <= most + least * (len(points) + 1)


def test_rows_line_up_and_folds_state_their_length() -> None:
    levels = {0: 0, 1: 1, 2: 1, 3: 0}
    rows = (
        Row("clk", 1, lambda t: t % 2, lambda a, b: None, counts=True),
        Row("q", 1, lambda t: levels.get(t, 0), lambda a, b: 0, marked=(1, 3)),
        Row("n", 8, lambda t: t // 2, lambda a, b: None),
    )
    pieces = (Piece(0, 6), Piece(6, 1_000_006, folded=True), Piece(1_000_006, 1_000_008))
    drawn = draw(Drawing("t", 0, 0, rows, pieces), UNICODE, 100)
    fold = " … 1 000 000 half-cycles … "
    assert fold == fold_text(1_000_000, UNICODE)
    assert drawn == [
        "t    0       4" + " " * (len(fold) + 3) + "1000006",
        "clk  __|‾|_|‾|_|‾" + fold + "|_|‾",
        "q    __|‾‾‾|_____" + "_" * len(fold) + "____",
        "       ^^^^",
        "n    0   1   2   " + "…".center(len(fold)) + "500003",
    ]


# -- reports -----------------------------------------------------------------------------------------------


def test_a_third_is_drawn_three_high_three_low(tmp_path: Path) -> None:
    text = render(checked(tmp_path, BY_3, "3", fin=Fraction(1_000_000)))
    assert "PROVED    ratio" in text
    assert "verdict  PROVED" in text
    (tick,) = lines_of(text, "tick")
    assert tick == "|‾‾‾‾‾|_____" * 2 + "|‾‾‾"
    (clock,) = lines_of(text, "clk")
    assert len(clock) == len(tick)
    assert set(clock.split("|")) <= {"", "‾", "_"}
    assert "divides by 3: period 6 half-cycles, high 3" in text
    assert "counterexample" not in text


def test_the_wave_is_drawn_without_a_start_state_too(tmp_path: Path) -> None:
    report = checked(tmp_path, BY_3, "3", start="any")
    assert report.facts["source_edges"] == [1, 4, 7]
    assert lines_of(render(report), "tick") == ["|‾‾‾‾‾|_____" * 2 + "|‾‾‾"]


def test_loops_that_differ_have_no_common_figures(tmp_path: Path) -> None:
    assert measured(tmp_path, RING).facts == {"clock_depth": {"q": 0}}


def test_the_offending_stretch_is_marked(tmp_path: Path) -> None:
    report = checked(tmp_path, BY_3, "3", high=2)
    text = render(report)
    broken = next(f.counterexample for f in report.findings if f.name == "high-time")
    assert broken is not None
    below = text[text.index("counterexample to high-time") :].splitlines()
    row = next(i for i, line in enumerate(below) if re.match(r"  tick +[‾_|]", line))
    marked = [i for i, c in enumerate(below[row + 1]) if c == "^"]
    left = below[row].index(re.search(r"[‾_|]", below[row])[0])  # type: ignore[index]
    assert marked == list(range(left + 2 * broken.begins, left + 2 * broken.ends))
    under = {below[row][i] for i in marked}
    assert under == {"|", "‾"}


def test_a_long_wave_is_folded_and_all_of_it_accounted_for(tmp_path: Path) -> None:
    text = render(checked(tmp_path, SECOND, "50000000"))
    measured_part = text[text.index("measured  ") : text.index("rise, fall")]
    rows = lines_of(measured_part, "clk")
    folded = [int(f.replace(" ", "")) for row in rows for f in re.findall(r"… ([\d ]+) half-cycles …", row)]
    shown = sum(len(re.sub(r" … [\d ]+ half-cycles … ?", "", row)) // 2 for row in rows)
    # One period and the first input cycle of the next.
    assert sum(folded) + shown == 100_000_000 + 2
    assert max(map(len, text.splitlines())) <= 110


def test_a_stuck_state_is_named(tmp_path: Path) -> None:
    text = render(checked(tmp_path, STICKS_AT_7, "5", high=4))
    assert "counterexample to no-stuck: the output stays 0" in text
    assert "stage0.count=7" in text
    assert "REFUTED   no-stuck" in text


def test_all_loops_of_a_ring_are_listed(tmp_path: Path) -> None:
    text = render(measured(tmp_path, RING))
    assert "6 loops of all power-up states" in text
    assert len(re.findall(r"(?m)^ .*  q=\d+  clk=0$", text)) == 6
    assert text.count("stuck") == 2
    assert "verdict" not in text


def test_a_round_that_never_settles_is_listed(tmp_path: Path) -> None:
    text = render(checked(tmp_path, SPINS, "2"))
    assert "REFUTED   settling" in text
    spins = re.findall(r"micro-step \d+: .*spin=(\d)", text)
    assert set(spins) == {"0", "1"}


def test_waivers_assumptions_and_limits_are_told(tmp_path: Path) -> None:
    text = render(checked(tmp_path, STICKS_AT_7, "5", high=4, waivers={"recovery": "reset at\x1b power-up"}))
    assert r"WAIVED: reset at\x1b power-up" in text
    assert "assumed: clk toggles without end" in text
    assert "A proof covers the Verilog under the stated model" in text
    assert "\x1b" not in text


def test_a_plain_terminal_gets_ascii(tmp_path: Path) -> None:
    report = checked(tmp_path, SECOND, "50000000", fin=Fraction(50_000_000))
    text = render(report, Look(unicode=False))
    assert text.isascii()
    assert ASCII.high * 8 in text


def test_colour_only_adds_to_the_words(tmp_path: Path) -> None:
    report = checked(tmp_path, BY_3, "3", high=2)
    plain, coloured = render(report), render(report, Look(colour=True))
    assert re.sub(r"\x1b\[[\d;]*m", "", coloured) == plain
    assert "\x1b[1;31mREFUTED" in coloured


def test_drawing_does_not_walk_a_long_orbit(tmp_path: Path) -> None:
    """2 147 483 647 input cycles: were it walked, this test would not end."""
    slow = SECOND.replace("49999999", "2147483646").replace("24999999", "1073741823")
    text = render(checked(tmp_path, slow, "2147483647"))
    assert "divides by 2147483647" in text
    assert "4 294 967" in text.replace("…", "") or "2 147 483" in text


def test_twisted_ring_rows_are_levels() -> None:
    design = twisted_ring(3)
    system, _ = settle(design, "clk", Inputs.of({}), design.signals["out"].value, Effort(60))
    timeline = Timeline(orbit.trace(system, (0, 0, 0, 0), Effort(60)))
    row = Row("q0", 1, lambda t: timeline.state(t)[0], lambda a, b: None)
    drawn = draw(Drawing("t", 0, 0, (row,), (Piece(0, 14),)), UNICODE, 100)
    # Three input cycles high, three low, the first rise on the first rising edge.
    assert drawn[1] == "q0  " + "__" + "|" + "‾" * 11 + "|" + "_" * 11 + "|‾"
