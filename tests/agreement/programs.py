"""Random programs over all that the reader accepts: the hand-written units of `dividers`, and the language's reach.

A program is made of a plan: units with a seed each, and how deep expressions may be. A plan shrinks unit by unit, and
so does the program.
"""

from __future__ import annotations

import random
from collections.abc import Callable
from dataclasses import dataclass

from agreement import dividers
from agreement.dividers import _Net, _Writer

MOST_BITS = 6


@dataclass(frozen=True)
class Program:
    """A module named `divider`; `idle` and `delayed` as in Divider. `units` are what it is made of, and
    `replacements` the texts that the simulator gets instead: memories as vectors, which can be set from outside."""

    text: str
    idle: int | None
    delayed: tuple[str, ...]
    units: tuple[str, ...]
    replacements: tuple[tuple[str, str], ...]

    @property
    def simulated(self) -> str:
        """The text for the simulator."""
        text = self.text
        for old, new in self.replacements:
            text = text.replace(old, new)
        return text


@dataclass(frozen=True)
class Plan:
    """What a program is made of: units with seeds, the depth of expressions, the reset and when it acts."""

    units: tuple[tuple[str, int], ...]
    depth: int = 3
    reset: tuple[str, int] | None = None
    asynchronous: bool = False
    output: int = 0


@dataclass
class _Maker:
    """A writer with the functions and the memories that it has declared."""

    w: _Writer
    depth: int
    functions: list[str]
    replacements: list[tuple[str, str]]


def program(plan: Plan) -> Program:
    """The program of a plan, always the same. Units that would make the state too large are left out."""
    w = _Writer(random.Random(0), plan.reset, plan.asynchronous)
    w.bits = dividers.MOST_BITS - MOST_BITS
    maker = _Maker(w, plan.depth, [], [])
    units: list[str] = []
    for name, seed in plan.units:
        if w.room() > 0:
            w.r = random.Random(seed)
            units.append(name)
            UNITS[name](maker)
    w.r = random.Random(plan.output)
    output = dividers._output(w)
    reset = plan.reset
    ports = ["input clk", *([f"input {reset[0]}"] if reset else []), "output tick"]
    body = [f"module divider ({', '.join(ports)});", *w.lines, f"  assign tick = {output};", "endmodule", ""]
    return Program(
        "\n".join([*w.modules, *body]),
        1 - reset[1] if reset else None,
        tuple(w.delayed),
        tuple(units),
        tuple(maker.replacements),
    )


# -- expressions -------------------------------------------------------------------------------------------


def _leaf(m: _Maker, edge: str | None) -> str:
    r = m.w.r
    nets = dividers._readable(m.w, edge)
    if not nets or r.random() < 0.25:
        return r.choice(["1", "0", "3", "2'b10", "4'd9", "3'sd2", "-1", "'d5", "1'b1", "-2'sd1", "5'h1_3"])
    n = r.choice(nets)
    picks = [n.name, n.name, n.bit(r)]
    if n.width > 1:
        picks += [f"{n.name}[{n.width - 1}:1]", f"{n.name}[0 +: 2]", f"{n.name}[{n.width - 1} -: 2]"]
    if n.width in (2, 4):
        # Indices that can't leave the vector.
        bits = n.width.bit_length() - 1
        others = [o for o in nets if o.width >= bits]
        picks += [f"{n.name}[{o.name}{'' if o.width == bits else f'[{bits - 1}:0]'}]" for o in others[:2]]
    return r.choice(picks)


def _value(m: _Maker, edge: str | None, depth: int) -> str:
    """An expression of mixed widths and signs over what a block on that edge may read."""
    r = m.w.r
    if depth == 0 or r.random() < 0.2:
        return _leaf(m, edge)

    def inner() -> str:
        return _value(m, edge, depth - 1)

    pick = r.randrange(13)
    if pick < 4:
        return f"({inner()} {r.choice(['+', '-', '*', '&', '|', '^', '~^'])} {inner()})"
    if pick == 4:
        return f"({inner()} {r.choice(['<<', '>>', '>>>', '<<<'])} {r.choice(['1', '2', inner()])})"
    if pick == 5:
        return f"({inner()} {r.choice(['<', '>', '<=', '>=', '==', '!='])} {inner()})"
    if pick == 6:
        return f"({inner()} ? {inner()} : {inner()})"
    if pick == 7:
        return f"{r.choice(['~', '-', '!', '&', '|', '^', '~|', '~&'])}({inner()})"
    if pick == 8:
        return f"{r.choice(['$signed', '$unsigned'])}({inner()})"
    if pick == 9:
        return f"{{{_sized(m, edge)}, {{2{{{_sized(m, edge)}}}}}}}"
    if pick == 10:
        return f"({inner()} {r.choice(['/', '%'])} {r.choice(['3', '2', chr(39) + 'd5'])})"
    if pick == 11:
        return f"({inner()} {r.choice(['&&', '||'])} {inner()})"
    if not m.functions:
        _declare_function(m)
    return f"{r.choice(m.functions)}({inner()}, {inner()})"


def _sized(m: _Maker, edge: str | None) -> str:
    leaf = _leaf(m, edge)
    return "1'b1" if leaf[0] in "-'" or leaf.isdigit() else leaf


def _declare_function(m: _Maker) -> None:
    r = m.w.r
    name = m.w.name("f")
    sign = r.choice(["", "signed "])
    start = r.choice(["a + b", "a - b", "{a, b}", "a ^ (b >>> 1)"])
    step = r.choice([f"{name} = {name} + i", f"if (a[i]) {name} = {name} ^ (b << i)", f"{name} = -{name}"])
    loop = r.choice(
        [
            f"for (i = 0; i < 3; i = i + 1) {step};",
            f"begin i = 2; while (i > 0) begin i = i - 1; {step}; end end",
        ]
    )
    m.w.say(f"function {sign}[{r.choice([1, 3, 5])}:0] {name};")
    m.w.say(f"  input {r.choice(['', 'signed '])}[3:0] a; input {sign}[2:0] b; integer i;")
    m.w.say(f"  begin {name} = {start}; {loop} end")
    m.w.say("endfunction")
    m.functions.append(name)


# -- units -------------------------------------------------------------------------------------------------


def _of(unit: Callable[[_Writer], None]) -> Callable[[_Maker], None]:
    return lambda m: unit(m.w)


def _expression(m: _Maker) -> None:
    """A register whose next value is any expression, by way of a net or not."""
    w, r = m.w, m.w.r
    edge = r.choice(["posedge", "negedge"])
    width = min(w.room(), r.choice([1, 2, 3]))
    signed = r.random() < 0.4
    name = w.register("word", width, edge, signed)
    value = _value(m, edge, m.depth)
    if r.random() < 0.4:
        net = w.name("next")
        kind = r.choice(["signed ", ""])
        w.say(f"wire {kind}[{r.choice([0, 2, 4])}:0] {net} = {value};")
        value = f"{net} {r.choice(['+', '^', '-'])} {name}"
    dividers._clocked(w, "clk", edge, [(name, r.randrange(1 << width))], [f"{name} <= {value};"])


def _loop(m: _Maker) -> None:
    """A vector worked out by a loop over a value in between."""
    w, r = m.w, m.w.r
    if w.room() < 2:
        return _expression(m)
    edge = r.choice(["posedge", "negedge"])
    width = min(w.room(), r.choice([2, 3, 4]))
    value = _value(m, edge, min(m.depth, 2))
    name = w.register("loop", width, edge)
    mid, i = w.name("mid"), w.name("i")
    w.say(f"reg [{width - 1}:0] {mid}; integer {i};")
    step = r.choice(
        [
            f"{mid}[{i}] = {mid}[{i}] ^ {name}[{width - 1} - {i}];",
            f"if ({name}[{i}]) {mid} = {mid} + {i};",
            f"{mid} = {{{mid}, {mid}[{width - 1}]}};",
            f"case ({i}) 0: {mid} = ~{mid}; 1: {mid}[0] = {name}[0]; default {mid} = {mid} + 1; endcase",
        ]
    )
    loop = r.choice(
        [
            f"for ({i} = 0; {i} < {width}; {i} = {i} + 1) {step}",
            f"for ({i} = {width - 1}; {i} >= 0; {i} = {i} - 1) begin {step} end",
            f"begin {i} = 0; repeat ({width}) begin {step} {i} = {i} + 1; end end",
            f"begin {i} = 0; while ({i} < {width}) begin {step} {i} = {i} + 1; end end",
        ]
    )
    body = [f"{mid} = {name} + {value};", loop, f"{name} <= {mid};"]
    dividers._clocked(w, "clk", edge, [(name, 0)], body)
    return None


def _task(m: _Maker) -> None:
    """A count that a task steps."""
    w, r = m.w, m.w.r
    edge = r.choice(["posedge", "negedge"])
    width = min(w.room(), r.choice([1, 2, 3]))
    name, task = w.register("count", width, edge, blocking=True), w.name("step")
    last = r.randrange(1, 1 << width)
    w.say(f"task {task}; input [{width - 1}:0] a; output [{width - 1}:0] b; reg done;")
    w.say(f"  begin done = a >= {last}; if (done) b = 0; else b = a + 1; end")
    w.say("endtask")
    dividers._clocked(w, "clk", edge, [(name, 0)], [f"{task}({name}, {name});"], "=")


def _table(m: _Maker) -> None:
    """A successor from a memory of constants."""
    w, r = m.w, m.w.r
    edge = r.choice(["posedge", "negedge"])
    width = min(w.room(), r.choice([1, 2, 2, 3]))
    name, table = w.register("state", width, edge), w.name("table")
    w.say(f"reg [{width - 1}:0] {table} [0:{(1 << width) - 1}];")
    entries = " ".join(f"{table}[{k}] = {r.randrange(1 << width)};" for k in range(1 << width))
    w.say(f"initial begin {entries} end")
    dividers._clocked(w, "clk", edge, [(name, 0)], [f"{name} <= {table}[{name}];"])


def _memory(m: _Maker) -> None:
    """Bits in a memory, written and read at an index that can't leave it."""
    w, r = m.w, m.w.r
    nets = [n for n in w.nets if n.edge in ("posedge", "negedge") and not n.blocking]
    if not nets or w.room() < 2:
        return _expression(m)
    by = r.choice(nets)
    edge = by.edge or "posedge"
    name = w.name("memory")
    w.say(f"reg {name} [0:1];")
    m.replacements.append((f"reg {name} [0:1];", f"reg [1:0] {name};"))
    w.bits += 2
    index = by.bit(r)
    w.say(
        f"always @({edge} clk) {name}[{index}] <= {r.choice(['~', ''])}{name}[{r.choice(['0', '1', index])}];"
    )
    read = w.name("read")
    w.say(f"wire {read} = {name}[{by.bit(r)}];")
    w.nets.append(_Net(read, 1, False, None))
    return None


def _generated(m: _Maker) -> None:
    """Ripple stages in a generate loop."""
    w, r = m.w, m.w.r
    stages = min(w.room(), r.choice([1, 2, 3]))
    chain, i, block = w.name("chain"), w.name("g"), w.name("stages")
    edge = r.choice(["posedge", "negedge"])
    w.say(f"wire [{stages}:0] {chain}; assign {chain}[0] = clk; genvar {i};")
    w.say(f"generate for ({i} = 0; {i} < {stages}; {i} = {i} + 1) begin : {block}")
    w.say(f"  reg q; assign {chain}[{i} + 1] = q;")
    w.say(f"  if ({i} % 2) begin always @(posedge {chain}[{i}]) q <= !q; end")
    w.say(f"  else always @({edge} {chain}[{i}]) q <= ~q;")
    w.say("end endgenerate")
    w.bits += stages
    net = w.name("top")
    w.say(f"wire {net} = {chain}[{stages}];")
    w.nets.append(_Net(net, 1, False, None))


def _both_edges(m: _Maker) -> None:
    """A count of half-cycles."""
    w, r = m.w, m.w.r
    width = min(w.room(), r.choice([1, 2]))
    name = w.register("half", width, None)
    last = r.randrange(1, 1 << width)
    w.say(f"always @(posedge clk or negedge clk) {name} <= {name} >= {last} ? 0 : {name} + 1;")


def _instances(m: _Maker) -> None:
    """A counter module with parameters, and a primitive that picks from it."""
    w, r = m.w, m.w.r
    width = min(w.room(), r.choice([1, 2]))
    if not any("module tally" in text for text in w.modules):
        w.modules.append(
            "module tally #(parameter W = 1, LAST = 1) (input ck, output [W-1:0] n);\n"
            "  reg [W-1:0] q;\n  assign n = q;\n"
            "  always @(posedge ck) if (q >= LAST) q <= 0; else q <= q + 1'b1;\nendmodule\n"
            "primitive pick (o, s, a, b);\n  output o; input s, a, b;\n"
            "  table 0 1 ? : 1; 0 0 ? : 0; 1 ? 1 : 1; 1 ? 0 : 0; endtable\nendprimitive\n"
        )
    net = w.name("tallied")
    ports = r.choice(["clk, {}", ".ck(~clk), .n({})", ".n({}), .ck(clk)"]).format(net)
    last = r.randrange(1, 1 << width)
    form = r.randrange(3)
    w.say(f"wire [{width - 1}:0] {net};")
    given = [f"#({width}, {last}) ", f"#(.LAST({last}), .W({width})) ", f"#(.W({width})) "][form]
    w.say(f"tally {given}unit_{net} ({ports});")
    if form == 2:
        w.say(f"defparam unit_{net}.LAST = {last};")
    w.bits += width
    # The instance counts on an edge of clk, but by way of a port: what else moves there may not read it blocking.
    w.nets.append(_Net(net, width, False, "negedge" if "~" in ports else "posedge"))
    if r.random() < 0.5:
        picked = w.name("picked")
        w.say(
            f"wire {picked}; pick ({picked}, {net}[0], {r.choice(w.nets).bit(r)}, {r.choice(w.nets).bit(r)});"
        )
        w.nets.append(_Net(picked, 1, False, None))


UNITS: dict[str, Callable[[_Maker], None]] = {
    "counter": _of(dividers._counter),
    "expression": _expression,
    "loop": _loop,
    "task": _task,
    "table": _table,
    "memory": _memory,
    "generated ripple": _generated,
    "both edges": _both_edges,
    "instances": _instances,
    "ripple": _of(dividers._ripple),
    "gated clock": _of(dividers._gated),
    "latch": _of(dividers._latch),
    "shift": _of(dividers._shift),
    "logic": _of(dividers._logic),
    "clears itself": _of(dividers._clears_itself),
    "cleared": _of(dividers._cleared),
    "resample": _of(dividers._resample),
}
