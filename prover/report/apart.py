"""Two runs whose outputs differ, each of a divider on its own: drawn under one ruler, and dumped into one file."""

from __future__ import annotations

from prover.compared import Apart, Comparison, Difference
from prover.pair import SIDES
from prover.report.figures import MOST_REGISTERS, Extent
from prover.report.vcd import File, Variable, elided
from prover.report.wave import Drawing, Piece, Row, Timeline, plan

SHORTEST = 16
"""Half-cycles shown at least."""

AFTER = 8
"""Half-cycles shown after the difference."""


DUMPED = 8192
"""Half-cycles that a dump shows at most; around the difference, at the start and at the end if there are more."""

LEAST_FOLD = 64
"""Half-cycles that are worth leaving out of a dump."""


class Both:
    """What two orbits are at each half-cycle after their starts, which are at one time."""

    def __init__(self, shown: Apart) -> None:
        self.timelines = [Timeline(orbit) for orbit in shown.orbits]

    def end(self, wanted: int) -> int:
        """`wanted`, or where one of the orbits ends that has not closed."""
        return min(timeline.end(wanted) for timeline in self.timelines)


def _ends(found: Difference, both: Both) -> int:
    return both.end(max(SHORTEST, found.half_cycle + AFTER))


def drawing(comparison: Comparison, found: Difference, shown: Apart, extent: Extent) -> tuple[Drawing, int]:
    """The clock, both outputs with the difference underlined, and the registers that matter; and how many registers
    are left out."""
    both = Both(shown)
    ends = _ends(found, both)
    places = (found.old_half_cycle, found.new_half_cycle)
    points = [*places, *(place + 1 for place in places), 0, ends]
    pieces = tuple(plan(0, ends, points, extent.margin, extent.most, extent.least_fold))
    clock = len(both.timelines[0].orbit.widths) - 1
    rows = [_row(comparison.pair.old.clock, 1, both.timelines[0], clock, counts=True)]
    registers: list[list[Row]] = []
    for side, ports, timeline, system, at in zip(
        SIDES,
        (comparison.pair.old, comparison.pair.new),
        both.timelines,
        shown.systems,
        places,
        strict=True,
    ):
        last = len(system.variables)
        rows.append(_row(f"{side}.{ports.output}", 1, timeline, last, marked=(at, at + 1)))
        own = [
            _row(f"{side}.{name}", width, timeline, place)
            for place, (name, width) in enumerate(system.variables[:-1])
            if name != ports.output
        ]
        registers.append(_moving_first(own, pieces))
    most = MOST_REGISTERS // 2
    # What one divider leaves unused the other may have.
    room = [max(most, MOST_REGISTERS - len(other)) for other in reversed(registers)]
    chosen = [own[:count] for own, count in zip(registers, room, strict=True)]
    left = sum(map(len, registers)) - sum(map(len, chosen))
    return Drawing("half-cycle", 0, 0, (*rows, *chosen[0], *chosen[1]), pieces), left


def _row(
    name: str,
    width: int,
    timeline: Timeline,
    place: int,
    counts: bool = False,
    marked: tuple[int, int] | None = None,
) -> Row:
    """A component of a state, or the output, which comes after the last of them."""

    def value(half_cycle: int) -> int:
        there = timeline.place(half_cycle)
        return (*there.state, there.level)[place]

    def steady(begins: int, ends: int) -> int | None:
        return timeline.steady(begins, ends)[place] if ends > begins else None

    return Row(name, width, value, steady, counts, marked)


def _moving_first(rows: list[Row], pieces: tuple[Piece, ...]) -> list[Row]:
    """The rows that move where they are drawn before those that do not."""
    shown = [at for piece in pieces if not piece.folded for at in range(piece.begins, piece.ends)]
    moving = [row for row in rows if len({row.value(at) for at in shown}) > 1]
    return [*moving, *(row for row in rows if row not in moving)]


def dump(comparison: Comparison, found: Difference, shown: Apart) -> str:
    """Both runs as a value change dump, one time unit a half-cycle, with the registers of each in a scope of its
    own."""
    both = Both(shown)
    ends = _ends(found, both)
    pieces = plan(
        0, ends, (found.old_half_cycle, found.new_half_cycle, 0, ends), DUMPED // 8, DUMPED, LEAST_FOLD
    )
    pair = comparison.pair
    comment = [
        found.text,
        f"start: {found.cause}; one time unit is one half-cycle of {pair.old.clock}",
        *(f"{name} is held at {value}" for name, value in shown.inputs.items()),
        *elided([piece for piece in pieces if piece.folded]),
    ]
    variables = [Variable(pair.old.clock, 1, "wire")]
    # Whether the output is no register under its own name, which would be declared twice.
    apart: list[bool] = []
    for side, ports, system in zip(SIDES, (pair.old, pair.new), shown.systems, strict=True):
        variables += [Variable(f"{side}.{name}", width, "reg") for name, width in system.variables[:-1]]
        apart.append(ports.output not in system.names)
        variables += [Variable(f"{side}.{ports.output}", 1, "wire")] * apart[-1]
    differs = (found.old_half_cycle, found.old_half_cycle + 1)
    file = File(f"{pair.old.design.top}_and_{pair.new.design.top}", variables, comment, broken=differs)
    for piece in pieces:
        times = [piece.begins] if piece.folded else range(piece.begins, piece.ends)
        for time in times:
            old, new = (
                _values(timeline, time, piece.ends if piece.folded else None) for timeline in both.timelines
            )
            # The clock's level is the last component of each state; it is shown once.
            outputs = [values[-1:] * alone for values, alone in zip((old, new), apart, strict=True)]
            file.put(time, [old[-2], *old[:-2], *outputs[0], *new[:-2], *outputs[1]])
    return file.close(ends)


def _values(timeline: Timeline, time: int, until: int | None) -> tuple[int | None, ...]:
    """State and output at a time; up to another, what keeps its value, and None for the rest."""
    if until is not None:
        return timeline.steady(time, until)
    there = timeline.place(time)
    return (*there.state, there.level)
