"""A trace for the eye: looked up by column, and drawn with the inputs that move in it.

Columns    what a trace is at each column: one a half-cycle, or two where inputs move in the middle of some
drawing    the rows and pieces that show it
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from prover.design import Design
from prover.report.figures import MOST_REGISTERS, Extent
from prover.report.wave import Drawing, Piece, Row, plan
from prover.trace import Rest, Trace

Value = Callable[[Rest], int]


class Columns:
    """What a trace is at each column. `per` columns make a half-cycle: the first is after its edge; the second,
    where there is one, after the inputs moved."""

    def __init__(self, trace: Trace) -> None:
        self.per = 2 if any(rest.moved for rest in trace.rests[1:]) else 1
        self.rests: list[Rest] = []
        for rest in trace.rests:
            place = self.per * rest.half_cycle + (rest.moved and self.per - 1)
            self.rests += [self.rests[-1] if self.rests else rest] * (place - len(self.rests))
            self.rests.append(rest)
        # The last half-cycle is drawn whole.
        self.rests += [self.rests[-1]] * (-len(self.rests) % self.per)

    def row(self, name: str, width: int, value: Value) -> Row:
        """One signal of the trace."""

        def steady(begins: int, ends: int) -> int | None:
            seen = {value(rest) for rest in self.rests[begins:ends]}
            return seen.pop() if len(seen) == 1 else None

        return Row(name, width, lambda column: value(self.rests[column]), steady)

    def changes(self, value: Value) -> Iterator[int]:
        """The half-cycles in which it changes."""
        for column in range(1, len(self.rests)):
            if value(self.rests[column]) != value(self.rests[column - 1]):
                yield column // self.per


def drawing(design: Design, clock: str, trace: Trace, extent: Extent) -> tuple[Drawing, int]:
    """The trace under a ruler of half-cycles, and how many registers are left out of it.

    Rows: the clock, the inputs that move, the outputs (what is broken underlined), registers that move where it is
    drawn before those that do not."""
    columns = Columns(trace)
    first = trace.rests[0]
    inputs = [n for n in first.inputs if any(rest.inputs[n] != first.inputs[n] for rest in trace.rests)]
    points = [trace.begins, trace.ends, 0, trace.half_cycles]
    for name in inputs:
        points += columns.changes(_of_inputs(name))
    for name in first.outputs:
        points += columns.changes(_of_outputs(name))
    shown = plan(0, trace.half_cycles, points, extent.margin, extent.most // columns.per, extent.least_fold)
    pieces = [Piece(p.begins * columns.per, p.ends * columns.per, p.folded) for p in shown]
    marked = (trace.begins * columns.per, trace.ends * columns.per)
    widths = {register.name: register.width for register in design.registers}
    rows = [_replaced(columns.row(clock, 1, _of_registers(clock)), counts=True)]
    rows += [columns.row(n, design.inputs[n], _of_inputs(n)) for n in inputs]
    rows += [_replaced(columns.row(n, 1, _of_outputs(n)), marked=marked) for n in first.outputs]
    others = [name for name in widths if name not in first.outputs]
    chosen = _that_matter(columns, others, pieces)[:MOST_REGISTERS]
    rows += [columns.row(n, widths[n], _of_registers(n)) for n in others if n in chosen]
    made = Drawing("half-cycle", 0, 0, tuple(rows), tuple(pieces), columns.per)
    return made, len(others) - len(chosen)


def _that_matter(columns: Columns, names: Sequence[str], pieces: Sequence[Piece]) -> list[str]:
    """The names of the registers, those that move where the trace is drawn first."""
    drawn = [rest.registers for p in pieces if not p.folded for rest in columns.rests[p.begins : p.ends]]
    moving = [name for name in names if len({registers[name] for registers in drawn}) > 1]
    return [*moving, *(name for name in names if name not in moving)]


def _replaced(row: Row, counts: bool = False, marked: tuple[int, int] | None = None) -> Row:
    return Row(row.name, row.width, row.value, row.steady, counts, marked)


def _of_inputs(name: str) -> Value:
    return lambda rest: rest.inputs[name]


def _of_outputs(name: str) -> Value:
    return lambda rest: rest.outputs[name]


def _of_registers(name: str) -> Value:
    return lambda rest: rest.registers[name]
