"""User-defined primitives: their tables as wires, latches and flip-flops (IEEE 1364-2005 clause 8).

A level row holds while its inputs match and so forces the output; an edge row moves it when its input
changes. What no row covers makes the output x, here a choice: for an edge as much as for a level.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.design import Edge, Force
from prover.expr import Expr
from prover.verilog import tree
from prover.verilog.deep import run
from prover.verilog.names import Net, Report
from prover.verilog.parts import Place
from prover.verilog.processes import Driver, satisfiable
from prover.verilog.sizing import Sizer
from prover.verilog.words import replace

if TYPE_CHECKING:
    from prover.verilog.elaborate import Elaboration
    from prover.verilog.hierarchy import Primitive

MAX_INPUTS = 10
# For each edge symbol the levels before and after; a level symbol is a set of levels (clause 8.1.6).
_LEVELS = {"0": "0", "1": "1", "x": "", "?": "01", "b": "01"}
_EDGES = {"r": ("0", "1"), "f": ("1", "0"), "p": ("0", "1"), "n": ("1", "0"), "*": ("01", "01")}


@dataclass(slots=True, frozen=True)
class Row:
    """A table row: levels per input, or at `edge` a pair of them; the state it needs, and the next one."""

    inputs: list[Any]
    edge: int | None
    state: str
    result: str


def rows(report: Report, primitive: tree.Primitive, sequential: bool) -> list[Row]:
    """The rows of a table; what only x can match is left out, because values are 0 and 1."""
    out: list[Row] = []
    offset = primitive.table_offset
    for line in primitive.table.split(";"):
        at = offset + len(line) - len(line.lstrip())
        offset += len(line) + 1
        if not line.strip():
            continue
        fields = [part.strip().lower() for part in line.split(":")]
        if len(fields) != (3 if sequential else 2):
            report.fail("a table row with the wrong number of fields", at, "separate the fields with colons")
        symbols = _symbols(report, fields[0], at)
        if len(symbols) != len(primitive.ports) - 1:
            report.fail(
                f"a table row for {len(symbols)} inputs, not {len(primitive.ports) - 1}",
                at,
                "give one symbol for each input",
            )
        edges = [i for i, s in enumerate(symbols) if isinstance(s, tuple)]
        result = fields[-1]
        state = _LEVELS.get(fields[1], "?") if sequential else "01"
        if len(edges) > (1 if sequential else 0) or state == "?" or result not in ("0", "1", "x", "-"):
            report.fail("this table row makes no sense", at, "give levels, at most one edge, and a result")
        possible = all(s not in ("", ("", "1"), ("", "0")) for s in symbols) and state
        if possible:
            out.append(Row(symbols, edges[0] if edges else None, state, result))
    return out


def _symbols(report: Report, text: str, at: int) -> list[Any]:
    out: list[Any] = []
    rest = "".join(text.split())
    while rest:
        if rest[0] == "(" and rest[3:4] == ")":
            before, after = (_LEVELS.get(c) for c in rest[1:3])
            if before is None or after is None:
                report.fail(f"{rest[:4]!r} is no edge", at, "write (01), (10) or a letter")
            out.append((before, after) if before and after else "")
            rest = rest[4:]
        elif rest[0] in _EDGES or rest[0] in _LEVELS:
            out.append(_EDGES[rest[0]] if rest[0] in _EDGES else _LEVELS[rest[0]])
            rest = rest[1:]
        else:
            report.fail(f"{rest[0]!r} has no place in a table", at, "use 0 1 x ? b r f p n * and -")
    return out


def _is(word: Expr, levels: str) -> Expr:
    if len(levels) == 2:
        return e.TRUE
    return word if levels == "1" else e.bvnot(word) if levels == "0" else e.FALSE


def _matches(row: Row, inputs: list[Expr], state: Expr | None, skip: int | None = None) -> Expr:
    terms = [_is(word, s) for i, (word, s) in enumerate(zip(inputs, row.inputs, strict=True)) if i != skip]
    if state is not None:
        terms.append(_is(state, row.state))
    return e.conj(terms)


def _value(report: Report, row: Row, state: Expr | None) -> Expr:
    if row.result == "-" and state is not None:
        return state
    return e.const(int(row.result), 1) if row.result in "01" else report.choice(1)


def _decided(report: Report, rows: list[tuple[Expr, Expr]]) -> Expr:
    """The value of the first row that matches; any value where none does, if that can be at all."""
    if rows and not satisfiable(e.bvnot(e.disj(match for match, _ in rows))):
        rows, value = rows[:-1], rows[-1][1]
    else:
        value = report.choice(1)
    for match, result in reversed(rows):
        value = e.ite(match, result, value)
    return value


def udp_driver(elaboration: Elaboration, primitive: Primitive) -> None:
    """Add the driver of one instance of a user-defined primitive."""
    report: Report = elaboration.report
    table = primitive.table
    assert table is not None
    if len(primitive.terminals) != len(table.ports) or None in primitive.terminals:
        report.fail(f"{table.name} has {len(table.ports)} terminals", primitive.at, "connect all of them")
    if len(table.ports) > MAX_INPUTS + 1:
        report.fail(f"a primitive of more than {MAX_INPUTS} inputs", table.lineno, "use a module")
    output = table.ports[0].name.name
    words = [
        word
        for item in [*table.ports, *table.items]
        for named in ([item.name] if isinstance(item, tree.PortItem) else getattr(item, "names", []))
        if named.name == output and getattr(item, "type", None) is not None
        for word in item.type.words
    ]
    sequential = "reg" in words
    places, inputs = elaboration.terminals(primitive, 1)
    read = rows(report, table, sequential)
    if not sequential:
        value = _decided(report, [(_matches(r, inputs, None), _value(report, r, None)) for r in read])
        elaboration.drive(places[0], value, primitive.at)
        return
    _sequential(elaboration, primitive, table, places[0], inputs, read)


def _sequential(
    elaboration: Elaboration,
    primitive: Primitive,
    table: tree.Primitive,
    places: list[Place],
    inputs: list[Expr],
    read: list[Row],
) -> None:
    """The output is a register of its own, named after the instance's terminal."""
    report: Report = elaboration.report
    place = places[0]
    net = place.net
    assert isinstance(net, Net)
    assert isinstance(place.low, int)
    if net.kind == "variable" or place.word is not None:
        report.fail(
            f"{net.name} is a reg and can't be driven from outside a process",
            primitive.at,
            "declare it as wire",
        )
    low = place.low
    state = e.extract(net.value, low, low)

    def placed(bit: Expr) -> Expr:
        word = e.concat(bit, e.const(0, low)) if low else bit
        return e.resize(word, net.width, False)

    where = report.where(primitive.at)
    levels = [row for row in read if row.edge is None]
    forces = tuple(
        Force(_matches(row, inputs, state), placed(_value(report, row, state)), where) for row in levels
    )
    edges = []
    for i, word in enumerate(inputs):
        for after in "01":
            moved = [
                row
                for row in read
                if row.edge == i and after in row.inputs[i][1] and "10"[int(after)] in row.inputs[i][0]
            ]
            data = _decided(
                report, [(_matches(row, inputs, state, i), _value(report, row, state)) for row in moved]
            )
            # While a level row matches it decides, whatever edge came (clause 8.6): its force wins.
            for row in levels:
                data = e.ite(_matches(row, inputs, state), state, data)
            data = replace([data], {} if word.is_const else {word: e.const(int(after), 1)})[0]
            if data is not state:
                edges.append(Edge(word if after == "1" else e.bvnot(word), placed(data)))
    elaboration.drivers.add(Driver(net, 1 << low, primitive.at, None, tuple(edges), forces))
    for item in table.items:
        if isinstance(item, vast.Initial) and isinstance(item.statement, tree.Assignment):
            scope = primitive.scope
            value = run(
                Sizer(elaboration.declarer.env(scope)).number(item.statement.right, "an initial value")
            )
            elaboration.drivers.initial[net] = (1 << low, (value & 1) << low)
