"""Random dividers in Verilog, from a seed: what people write by hand, put together at random.

A divider is a chain of units, each of which reads the registers of the ones before it: counters with synchronous and
asynchronous resets of either polarity, ripple stages, ripple counters that clear themselves, flip-flops on gated
clocks, resampling flip-flops, latches, decodes made of gates. The reset is a port that the tests hold inactive. Gates
that need one unit of delay in an event simulator (the clear of a counter that clears itself) are listed.
"""

from __future__ import annotations

import random
from dataclasses import dataclass, field

MOST_BITS = 7


@dataclass(frozen=True)
class Divider:
    """A generated module named `divider`, its reset's inactive level (None without reset), and the delayed gates."""

    text: str
    idle: int | None
    delayed: tuple[str, ...]


@dataclass
class _Net:
    """A register that later units may read. `edge` is the edge of `clk` that it moves on, None if it ripples."""

    name: str
    width: int
    signed: bool
    edge: str | None
    blocking: bool = False

    def bit(self, r: random.Random) -> str:
        return self.name if self.width == 1 else f"{self.name}[{r.randrange(self.width)}]"


@dataclass
class _Writer:
    r: random.Random
    reset: tuple[str, int] | None  # the port, and its active level
    asynchronous: bool
    nets: list[_Net] = field(default_factory=list)
    lines: list[str] = field(default_factory=list)
    modules: list[str] = field(default_factory=list)
    delayed: list[str] = field(default_factory=list)
    bits: int = 0
    count: int = 0

    def name(self, stem: str) -> str:
        self.count += 1
        return f"{stem}{self.count}"

    def say(self, line: str) -> None:
        self.lines.append("  " + line)

    def register(
        self, stem: str, width: int, edge: str | None, signed: bool = False, blocking: bool = False
    ) -> str:
        name = self.name(stem)
        range_ = "" if width == 1 and self.r.random() < 0.9 else f"[{width - 1}:0] "
        if range_ == "" and signed:
            signed = False
        self.say(f"reg {'signed ' if signed else ''}{range_}{name};")
        self.nets.append(_Net(name, width, signed, edge, blocking))
        if width == 1 and range_:
            # A vector of one bit is selected as one.
            self.nets[-1].width = 1
        self.bits += width
        return name

    def room(self) -> int:
        return MOST_BITS - self.bits


def divider(seed: int) -> Divider:
    """The divider of a seed, always the same."""
    r = random.Random(seed)
    reset = (r.choice(["rst", "rst_n", "clear"]), r.randrange(2)) if r.random() < 0.6 else None
    w = _Writer(r, reset, r.random() < 0.5)
    first = r.choice([_counter, _counter, _counter, _ripple, _clears_itself, _clears_itself, _shift])
    first(w)
    others = [
        _counter,
        _ripple,
        _resample,
        _resample,
        _gated,
        _shift,
        _latch,
        _logic,
        _clears_itself,
        _cleared,
        _turned,
        _capture,
    ]
    for _ in range(r.randrange(1, 4)):
        if w.room() > 0:
            r.choice(others)(w)
    output = _output(w)
    ports = ["input clk", *([f"input {reset[0]}"] if reset else []), "output tick"]
    body = "\n".join(
        [f"module divider ({', '.join(ports)});", *w.lines, f"  assign tick = {output};", "endmodule", ""]
    )
    return Divider("\n".join([*w.modules, body]), 1 - reset[1] if reset else None, tuple(w.delayed))


# -- units -------------------------------------------------------------------------------------------------


def _clocked(
    w: _Writer, clock: str, edge: str, cleared: list[tuple[str, int]], body: list[str], op: str = "<="
) -> None:
    """A clocked block; `cleared` are registers with their reset values, if there is a reset and it takes part."""
    r = w.r
    reset = w.reset if r.random() < 0.8 else None
    events = f"{edge} {clock}"
    if reset and w.asynchronous:
        events += f"{r.choice([' or', ','])} {'posedge' if reset[1] else 'negedge'} {reset[0]}"
    w.say(f"always @({events})")
    if reset:
        test = r.choice([reset[0], f"{reset[0]} == 1'b1"] if reset[1] else [f"!{reset[0]}", f"~{reset[0]}"])
        w.say(f"  if ({test}) begin")
        for name, value in cleared:
            w.say(f"    {name} {op} {value};")
        w.say("  end else begin")
    else:
        w.say("  begin")
    for line in body:
        w.say(f"    {line}")
    w.say("  end")


def _other(edge: str) -> str:
    return "negedge" if edge == "posedge" else "posedge"


def _readable(w: _Writer, edge: str | None) -> list[_Net]:
    """Registers that a block on that edge of clk may read: none that a blocking assignment writes on the same edge,
    because simulators take such blocks in an order of their own."""
    return [n for n in w.nets if not (n.blocking and (edge is None or n.edge in (None, edge)))]


def _constant(r: random.Random, width: int, value: int) -> str:
    return r.choice([str(value), f"{width}'d{value}", f"{width}'b{value:b}", f"'h{value:x}"])


def _condition(w: _Writer, edge: str | None) -> str:
    """A one-bit expression over what a block on that edge may read."""
    r = w.r
    nets = _readable(w, edge)
    if not nets:
        return "1'b1"
    n = r.choice(nets)
    kinds = [n.bit(r), f"~{n.bit(r)}", f"!{n.name}", f"|{n.name}", f"^{n.name}", f"&{n.name}"]
    value = r.randrange(1 << n.width)
    kinds += [f"{n.name} {op} {_constant(r, n.width, value)}" for op in ("==", "!=", "<=", ">=")]
    if n.signed:
        kinds += [f"{n.name} < 0", f"{n.name} >= -1", f"{n.name} > {n.width}'sd1"]
    one = r.choice(kinds)
    others = [m for m in nets if m is not n]
    if others and r.random() < 0.35:
        m = r.choice(others)
        return f"({one}) {r.choice(['&&', '||', '^', '&', '|'])} ({m.bit(r)})"
    return one


def _counter(w: _Writer) -> None:
    """A count with a limit, and perhaps a toggle at it, in one of many hands."""
    r = w.r
    width = min(w.room(), r.choice([1, 2, 2, 3, 3, 4]))
    edge = r.choice(["posedge", "posedge", "negedge"])
    toggles = w.room() > width and r.random() < 0.4
    blocking = r.random() < 0.25
    signed = r.random() < 0.25 and width > 1
    enable = _condition(w, edge) if w.nets and r.random() < 0.4 else None
    c = w.register("count", width, edge, signed, blocking)
    out = w.register("level", 1, edge, False, blocking) if toggles else None
    op = "=" if blocking else "<="
    last = r.randrange(1, 1 << width)
    if signed:
        last = r.randrange(1, 1 << (width - 1))
    step, first = ("+", 0) if r.random() < 0.75 else ("-", last)
    limit = last if step == "+" else 0
    compare = f"{c} {r.choice(['==', '>='] if step == '+' else ['==', '=='])} {_constant(r, width, limit)}"
    if signed and r.random() < 0.5:
        compare = f"{c} {r.choice(['==', '>='])} {limit}"
    one = r.choice(["1", f"{width}'d1", "1'b1"])
    toggle = f"{out} {op} ~{out};" if out else ""
    form = r.randrange(5)
    if form == 0:
        body = [f"if ({compare}) begin {c} {op} {first}; {toggle} end", f"else {c} {op} {c} {step} {one};"]
    elif form == 1 and not blocking:
        body = [f"{c} <= {c} {step} {one};", f"if ({compare}) begin {c} <= {first}; {toggle} end"]
    elif form == 2:
        body = [f"{c} {op} ({compare}) ? {first} : {c} {step} {one};"]
        if toggle:
            at = [f"if ({compare}) {toggle}"]
            body = at + body
    elif form == 3 and blocking:
        # The level is decided from the value that the count has just been given.
        body = [f"{c} = {c} {step} {one};", f"if ({c} > {limit}) {c} = {first};"]
        if out:
            body.append(f"{out} = {c} < {max(1, (last + 1) // 2)};")
    elif form == 4 and width <= 3:
        body = [f"case ({c})"]
        for value in range(1 << width):
            if value < last or r.random() < 0.3:
                following = value + 1 if value < last else r.randrange(1 << width)
                label = f"{width}'b{value:b}" if signed else _constant(r, width, value)
                body.append(f"  {label}: {c} {op} {following};")
        body += [f"  default: begin {c} {op} 0; {toggle} end", "endcase"]
    else:
        limit_text = f"{width}'b{limit:0{width}b}"
        dots = limit_text if width == 1 else limit_text[:-1] + r.choice(["?", limit_text[-1]])
        body = [
            f"casez ({{{c}}})",
            f"  {dots}: begin {c} {op} {first}; {toggle} end",
            f"  default: {c} {op} {c} {step} {one};",
            "endcase",
        ]
    if enable:
        body = [f"if ({enable}) begin", *body, "end"]
    cleared = [(c, r.randrange(1 << width)), *([(out, r.randrange(2))] if out else [])]
    _clocked(w, "clk", edge, cleared, body, op)


def _ripple(w: _Writer) -> None:
    """Toggle stages, each clocked by the one before; blocks, or instances of a stage."""
    r = w.r
    stages = min(w.room(), r.randrange(1, 4))
    source = "clk"
    edge = r.choice(["negedge", "negedge", "posedge"])
    plain = [n for n in w.nets if not n.blocking]
    if plain and r.random() < 0.6:
        source = r.choice(plain).bit(r)
    instances = r.random() < 0.4
    if instances and not any("toggle_stage" in m for m in w.modules):
        w.modules.append(
            "module toggle_stage #(parameter FALLS = 1) (input ck, output reg q);\n"
            "  wire strobe;\n  xor turn (strobe, ck, FALLS != 0);\n"
            "  always @(posedge strobe) q <= ~q;\nendmodule\n"
        )
    for _ in range(stages):
        if instances:
            net = w.name("stage")
            w.say(f"wire {net};")
            w.say(f"toggle_stage #({int(edge == 'negedge')}) unit_{net} (.ck({source}), .q({net}));")
            w.nets.append(_Net(net, 1, False, None))
            w.bits += 1
        else:
            net = w.register("stage", 1, None)
            _clocked(w, _named_clock(w, source), edge, [(net, 0)], [f"{net} <= {r.choice(['~', '!'])}{net};"])
        source = net


def _named_clock(w: _Writer, source: str) -> str:
    """A name for the clock net where the source is part of a vector or somebody likes a wire."""
    if source == "clk" or ("[" not in source and w.r.random() < 0.7):
        return source
    name = w.name("ck")
    w.say(f"wire {name};" if w.r.random() < 0.5 else f"wire {name} = {source};")
    if not w.lines[-1].endswith(f"= {source};"):
        w.say(f"assign {name} = {source};")
    return name


def _clears_itself(w: _Writer) -> None:
    """A ripple counter that is cleared by the decode of its own count."""
    r = w.r
    stages = min(w.room(), r.choice([2, 2, 3, 3]))
    if stages < 2:
        return _resample(w)
    edge = r.choice(["posedge", "negedge"])
    names = [w.register("q", 1, None) for _ in range(stages)]
    low = r.random() < 0.6
    clear = w.name("decode")
    w.say(f"wire {clear};")
    # The partial decode of the ones: what people wire.
    ones = r.randrange(2 if stages > 2 else 3, 1 << stages)
    terms = [name for i, name in enumerate(names) if ones >> i & 1]
    if r.random() < 0.3:
        # Or the count in full.
        terms = [name if ones >> i & 1 else f"~{name}" for i, name in enumerate(names)]
    if len(terms) == 1:
        terms = names[-2:]
    if r.random() < 0.6:
        w.say(f"{'nand' if low else 'and'} {clear}_gate ({clear}, {', '.join(terms)});")
        w.delayed.append(f"{clear}_gate")
    else:
        inner = " & ".join(terms)
        w.say(f"assign {clear} = {f'~({inner})' if low else inner};")
        w.delayed.append(clear)
    source, way = "clk", edge
    for name in names:
        w.say(f"always @({way} {source} or {'negedge' if low else 'posedge'} {clear})")
        w.say(f"  if ({'!' if low else ''}{clear}) {name} <= 1'b0;")
        w.say(f"  else {name} <= ~{name};")
        source, way = name, "negedge"
    return None


def _cleared(w: _Writer) -> None:
    """A count that a bit of an earlier register, or a decode of one, sets or clears asynchronously."""
    r = w.r
    nets = [n for n in w.nets if not n.blocking]
    if not nets:
        return _resample(w)
    n = r.choice(nets)
    clear = w.name("clear")
    if r.random() < 0.5 and n.width > 1:
        w.say(
            f"wire {clear} = {n.name} {r.choice(['==', '!='])} {_constant(r, n.width, r.randrange(1 << n.width))};"
        )
    else:
        w.say(f"wire {clear} = {r.choice(['', '~'])}{n.bit(r)};")
    edge = r.choice(["posedge", "negedge"])
    width = min(w.room(), r.choice([1, 2, 2]))
    name = w.register("count", width, None)
    high = r.random() < 0.5
    w.say(f"always @({edge} clk or {'posedge' if high else 'negedge'} {clear})")
    w.say(f"  if ({'' if high else '!'}{clear}) {name} <= {r.randrange(1 << width)};")
    w.say(f"  else {name} <= {name} + 1'b1;")
    return None


def _capture(w: _Writer) -> None:
    """A flip-flop on a derived clock that takes a bit of some register; perhaps set and cleared besides."""
    r = w.r
    nets = [n for n in w.nets if not n.blocking]
    if not nets:
        return _resample(w)
    clock = r.choice(nets)
    others = [n for n in nets if n is not clock]
    if not others:
        return _resample(w)
    data = r.choice(others).bit(r)
    extra = r.choice(others).bit(r) if r.random() < 0.3 else None
    name = w.register("taken", 1, None)
    edge = r.choice(["posedge", "negedge"])
    ck = _named_clock(w, clock.bit(r))
    if extra is None:
        _clocked(w, ck, edge, [(name, 0)], [f"{name} <= {data};"])
        return None
    off = w.name("off")
    on = w.name("on")
    w.say(f"wire {off} = {extra} & clk;")
    w.say(f"wire {on} = {extra} & ~clk;")
    w.say(f"always @({edge} {ck} or posedge {off} or posedge {on})")
    w.say(f"  if ({off}) {name} <= 1'b0;")
    w.say(f"  else if ({on}) {name} <= 1'b1;")
    w.say(f"  else {name} <= {data};")
    return None


def _turned(w: _Writer) -> None:
    """A toggle on the clock turned over by a register: by the toggle itself, so that it takes every edge, or by
    another that moves with the clock."""
    r = w.r
    clock = w.name("turned")
    nets = [n for n in w.nets if not n.blocking and n.edge in ("posedge", "negedge")]
    itself = not nets or r.random() < 0.5
    name = w.register("turn", 1, None)
    by = name if itself else r.choice(nets).bit(r)
    if r.random() < 0.5:
        w.say(f"wire {clock};")
        w.say(f"{r.choice(['xor', 'xnor'])} gate_{clock} ({clock}, clk, {by});")
    else:
        w.say(f"wire {clock} = clk {r.choice(['^', '~^'])} {by};")
    _clocked(w, clock, r.choice(["posedge", "negedge"]), [(name, 0)], [f"{name} <= ~{name};"])


def _resample(w: _Writer) -> None:
    """A flip-flop that takes a bit on either edge of the clock."""
    r = w.r
    if not w.nets:
        return _shift(w)
    edge = r.choice(["posedge", "negedge"])
    data = _condition(w, edge)
    name = w.register("late", 1, edge)
    _clocked(w, "clk", edge, [(name, 0)], [f"{name} <= {data};"])
    return None


def _gated(w: _Writer) -> None:
    """A toggle or a small count on a gated clock; its enable moves on the edge that leaves the gate closed."""
    r = w.r
    gate_or = r.random() < 0.4
    idle_edge = "posedge" if gate_or != (r.random() < 0.15) else "negedge"
    enables = [n for n in w.nets if n.edge == idle_edge and not n.blocking]
    if not enables:
        condition = _condition(w, idle_edge)
        name = w.register("enable", 1, idle_edge)
        _clocked(w, "clk", idle_edge, [(name, 1)], [f"{name} <= {condition};"])
        enables = [w.nets[-1]]
    if w.room() == 0:
        return
    enable = r.choice(enables).bit(r)
    clock = w.name("gclk")
    form = r.randrange(3)
    if form == 0:
        w.say(f"wire {clock} = clk {'|' if gate_or else '&'} {enable};")
    else:
        w.say(f"wire {clock};")
        w.say(
            f"{'or' if gate_or else 'and'} gate_{clock} ({clock}, clk, {enable});"
            if form == 1
            else f"assign {clock} = {enable} {'|' if gate_or else '&'} clk;"
        )
    width = min(w.room(), r.choice([1, 1, 2]))
    name = w.register("gated", width, None)
    edge = r.choice(["posedge", "negedge"])
    _clocked(
        w, clock, edge, [(name, 0)], [f"{name} <= {name} + 1'b1;" if width > 1 else f"{name} <= ~{name};"]
    )


def _shift(w: _Writer) -> None:
    """A ring, twisted or with taps."""
    r = w.r
    width = min(w.room(), r.choice([1, 2, 3, 4, 4]))
    edge = r.choice(["posedge", "negedge"])
    more = _condition(w, edge) if w.nets and r.random() < 0.3 else None
    name = w.register("ring", width, edge)
    if width == 1:
        feed = f"~{name}"
        body = [f"{name} <= {feed};"]
    else:
        feed = r.choice(
            [f"~{name}[{width - 1}]", f"{name}[{width - 1}] ^ {name}[0]", f"~|{name}[{width - 2}:0]"]
        )
        if more:
            feed = f"({feed}) ^ ({more})"
        form = r.randrange(3)
        if form == 0:
            body = [f"{name} <= {{{name}[{width - 2}:0], {feed}}};"]
        elif form == 1:
            body = [f"{name} <= {name} << 1;", f"{name}[0] <= {feed};"]
        else:
            body = [f"{name} <= {{{feed}, {name}[{width - 1}:1]}};"]
    _clocked(w, "clk", edge, [(name, r.randrange(1 << width))], body)


def _latch(w: _Writer) -> None:
    """A latch that is open while the clock is at one level, its data moving on the edge that closes it; or one that a
    bit of some register opens."""
    r = w.r
    high = r.random() < 0.5
    closing = "negedge" if high else "posedge"
    derived = r.random() < 0.4
    sources = [n for n in w.nets if not n.blocking] if derived else [n for n in w.nets if n.edge == closing]
    if not sources:
        return _resample(w)
    data = r.choice(sources)
    openers = [n for n in sources if n is not data]
    if derived and not openers:
        return _resample(w)
    bit = data.bit(r)
    enable = r.choice(openers).bit(r) if derived else "clk"
    name = w.register("held", 1, "latch")
    sensitive = r.choice(["*", f"{enable} or {bit}"])
    w.say(f"always @({sensitive}) if ({'' if high else '!'}{enable}) {name} {r.choice(['=', '<='])} {bit};")
    w.nets[-1].blocking = True
    w.nets[-1].edge = None
    return None


def _logic(w: _Writer) -> None:
    """Registers with whatever next values, by way of a combinational block or an expression."""
    r = w.r
    width = min(w.room(), r.choice([1, 2, 3]))
    edge = r.choice(["posedge", "negedge"])
    conditions = [_condition(w, edge) for _ in range(3)]
    nets = _readable(w, edge)
    name = w.register("word", width, edge, r.random() < 0.3 and width > 1)
    other = r.choice(nets).name if nets else name
    terms = [
        name,
        f"~{name}",
        f"{name} + {other}",
        f"{name} ^ {other}",
        f"{other} - {name}",
        f"{other} << 1",
        f"{{{name}, {other}}} >> 1",
    ]
    terms += [
        f"{name} * 3",
        f"-{name}",
        f"{name} >>> 1",
        f"({name} + {other}) >> 1",
        f"$signed({other}) + 1",
        str(r.randrange(1 << width)),
    ]
    a, b, c = r.choice(terms), r.choice(terms), r.choice(terms)
    if r.random() < 0.5:
        wire = w.name("next")
        w.say(f"reg [{width - 1}:0] {wire};")
        w.say("always @* begin")
        w.say(f"  {wire} = {a};")
        w.say(f"  if ({conditions[0]}) {wire} = {b};")
        w.say(f"  else if ({conditions[1]}) {wire} = {c};")
        w.say("end")
        body = [f"{name} <= {wire};"]
    else:
        body = [f"if ({conditions[0]}) {name} <= {a};", f"else if ({conditions[1]}) begin {name} <= {b}; end"]
        if r.random() < 0.5:
            body.append(f"else {name} <= ({conditions[2]}) ? {c} : {a};")
    _clocked(w, "clk", edge, [(name, 0)], body)


def _output(w: _Writer) -> str:
    r = w.r
    a, b = w.nets[-1], r.choice(w.nets)
    kind = r.randrange(6)
    if kind < 2:
        return a.bit(r)
    if kind == 2:
        return f"{a.bit(r)} {r.choice('|&^')} {b.bit(r)}"
    if kind == 3 and a is not b:
        # Not of one bit with itself: Icarus 11 leaves such a gate at x when that bit is forced.
        net = w.name("mix")
        w.say(f"wire {net};")
        w.say(f"{r.choice(['nand', 'nor', 'xor', 'or', 'xnor'])} last_gate ({net}, {a.bit(r)}, {b.bit(r)});")
        return net
    if kind == 4:
        return f"{b.name} < {r.randrange(1, 1 << b.width) if b.width > 1 else 1}"
    return f"clk ? {a.bit(r)} : {b.bit(r)}"
