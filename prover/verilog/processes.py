"""Processes to drivers: which registers, latches and wires an always block makes.

An edge-triggered block is read by what its result depends on, not by the shape of its ifs. The edges in its
list are the clock and the asynchronous controls; a control is a signal that the result depends on. With a
control at its active level the block must come to a value that doesn't hang on the register: that is the
set, clear or load, level-sensitive as IEEE 1364.1 has it; with all of them inactive it comes to what the
clock edge samples. So nested ifs, cases and conditional operators in any order are all the same. What a
simulator and gates would do differently is refused.
"""

from __future__ import annotations

from dataclasses import dataclass
from dataclasses import replace as replaced
from itertools import product
from typing import Any, NamedTuple, NoReturn

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.design import Edge, Force, GateKind
from prover.errors import UserError
from prover.expr import Expr
from prover.verilog import tree
from prover.verilog.deep import run
from prover.verilog.execute import SILENT, Environment, Executor, State
from prover.verilog.names import Net, Report, Scope
from prover.verilog.sizing import Sizer, Value
from prover.verilog.source import printable
from prover.verilog.words import assume, cut, masked, reads, replace, runs

MAX_CONTROLS = 6
MAX_LATCH = 4_096
# Wider words that are written in part count as hanging on themselves.
MAX_JUDGED = 256


@dataclass(slots=True, frozen=True)
class Driver:
    """What drives some bits of a net. Words are as wide as the net; only the bits of the mask count.

    A wire has `word`, a register has edges and forces; `latch` tells the latter's kind. `procedural` marks
    what an always block assigns with =: no register where nothing else reads it, and only if something does
    is `error` raised. `block` numbers the always blocks. `gate` has a gate's kind and its input bits.
    """

    net: Net
    mask: int
    at: int
    word: Expr | None = None
    edges: tuple[Edge, ...] = ()
    forces: tuple[Force, ...] = ()
    latch: bool = False
    procedural: bool = False
    keeps_itself: bool = False
    error: UserError | None = None
    block: int = 0
    gate: tuple[GateKind, tuple[Expr, ...]] | None = None


class _Result(NamedTuple):
    """A variable's word after the block, and under which condition each bit was written."""

    word: Expr
    written: Expr


class _Event(NamedTuple):
    """An edge: the signal it is of, bare of negations, the level it goes to, and where it stands."""

    base: Expr
    level: int
    at: int


# -- always blocks -----------------------------------------------------------------------------------------


@dataclass(slots=True)
class Processes:
    """Reads always and initial blocks."""

    report: Report
    executor: Executor
    blocks: int = 0

    def always(self, scope: Scope, node: tree.Always) -> list[Driver]:
        """The drivers that an always block makes."""
        statement = node.statement
        events: list[tuple[str, Any, int]] | None = None
        statement = _event_first(statement)
        if isinstance(statement, tree.EventControl):
            if node.kind in ("always_comb", "always_latch"):
                self.report.fail(f"{node.kind} takes no sensitivity list", node.lineno, "leave the list out")
            events, statement = statement.events, statement.statement
        elif node.kind in ("always", "always_ff"):
            what = "a delay" if isinstance(statement, tree.DelayControl) else "no event"
            message = f"an {node.kind} block with {what} at its head describes no hardware"
            self.report.fail(message, node.lineno, "write always @(posedge clk) or always @*")
        edges = {kind for kind, _, _ in events or ()}
        if node.kind == "always_ff" and (not edges or "level" in edges):
            self.report.fail("always_ff needs edges only", node.lineno, "write always_ff @(posedge clk)")
        state = self.executor.run(statement, scope)
        if len(edges) > 1 and "level" in edges:
            level = next(at for kind, _, at in events or () if kind == "level")
            self.report.fail(
                "edges and levels in one list: a simulator would sample data at a level too, gates wouldn't",
                level,
                "write posedge or negedge before it",
            )
        self.blocks += 1
        if edges and "level" not in edges:
            made = self._clocked(scope, events or [], state)
        else:
            made = self._combinational(scope, node, events, state)
        return [replaced(driver, block=self.blocks) for driver in made]

    def _results(self, state: State) -> dict[Net, _Result]:
        """What the block makes of each variable; bits that it never assigns are 0 in both words."""
        memo: dict[tuple[Expr, int, int], Expr] = {}
        return {
            net: _Result(masked(state.result(net), mask, memo), masked(state.written[net], mask, memo))
            for net, mask in state.touched.items()
            if mask and not net.local
        }

    # -- edge-triggered ------------------------------------------------------------------------------------

    def _events(self, scope: Scope, events: list[tuple[str, Any, int]]) -> list[_Event]:
        found: list[_Event] = []
        for kind, node, at in events:
            value: Value = run(Sizer(Environment(self.executor, scope, State())).alone(node))
            signal, level = value.word, int(kind == "posedge")
            if signal.width != 1:
                self.report.fail(f"an edge of {signal.width} bits", at, "name one bit")
            if signal.is_const:
                self.report.fail("this edge never comes: its signal is constant", at, "name a net that moves")
            if signal.op == "bvnot":
                signal, level = signal.args[0], 1 - level
            if _Event(signal, level, at)[:2] not in [f[:2] for f in found]:
                found.append(_Event(signal, level, at))
        return found

    def _clocked(self, scope: Scope, events: list[tuple[str, Any, int]], state: State) -> list[Driver]:
        found = self._events(scope, events)
        results = self._results(state)
        if not results:
            return []
        words = [word for result in results.values() for word in result]
        inside = set(e.topological(words))
        levels: dict[Expr, list[_Event]] = {}
        for event in found:
            levels.setdefault(event.base, []).append(event)
        clock = self._clock(levels, inside, {net.value for net in state.reads})
        controls = [group[0] for base, group in levels.items() if base is not clock]
        if len(controls) > MAX_CONTROLS:
            self.report.fail(
                f"more than {MAX_CONTROLS} asynchronous controls", controls[0].at, "use fewer sets and clears"
            )
        both = len(levels[clock]) == 2
        if both:
            self.report.note("both edges of one clock: this needs dual-edge flip-flops", levels[clock][1].at)
        out: list[Driver] = []
        for net, result in results.items():
            try:
                out += self._register(net, result, levels[clock], controls, state)
            except UserError as error:
                if not state.blocking[net]:
                    raise
                keeps = depends_on_itself(net, *result)
                out.append(
                    Driver(net, state.touched[net], state.at[net], None, (), (), False, True, keeps, error)
                )
        return out

    def _clock(self, levels: dict[Expr, list[_Event]], inside: set[Expr], read: set[Expr]) -> Expr:
        """The signal whose edge samples: the one that the block doesn't look at."""
        dual = [base for base, group in levels.items() if len(group) == 2]
        if len(dual) > 1:
            self.report.fail(
                "both edges of two signals: no flip-flop has two clocks",
                levels[dual[1]][1].at,
                "keep one clock",
            )
        if dual:
            for base, group in levels.items():
                if base is not dual[0] and base not in inside:
                    self._two_clocks(group[0], levels[dual[0]][0])
            return dual[0]
        unused = [base for base in levels if base not in inside]
        if len(unused) > 1:
            # A test whose branches come to the same has left no trace in the result.
            unused = [base for base in unused if base not in read] or unused
        if len(unused) == 1:
            return unused[0]
        if len(unused) > 1:
            self._two_clocks(levels[unused[1]][0], levels[unused[0]][0])
        last = next(iter(levels.values()))[0]
        if len(levels) == 1:
            self.report.fail(
                "this signal is sampled by the edge it makes: a simulator reads its new value, gates race",
                last.at,
                "sample something else, or use the other edge",
            )
        names = ", ".join(printable(str(base)) for base in levels)
        return self.report.fail(
            f"which of {names} is the clock isn't plain: the block looks at all of them",
            last.at,
            "test every edge but the clock's, and the clock's not",
        )

    def _two_clocks(self, event: _Event, other: _Event) -> NoReturn:
        one, two = (printable(str(x.base)) for x in (other, event))
        self.report.fail(
            f"edges of both {one} and {two} clock this block: no flip-flop has two clocks",
            event.at,
            f"if {two} is a set or clear, test it before anything else; if not, leave it out of the list",
        )

    def _register(
        self, net: Net, result: _Result, clock: list[_Event], controls: list[_Event], state: State
    ) -> list[Driver]:
        """A register's edges and forces, by setting the controls to each combination of levels."""
        table: dict[tuple[int, ...], _Result] = {}
        for active in product((0, 1), repeat=len(controls)):
            levels = {
                c.base: e.const(c.level if on else 1 - c.level, 1)
                for c, on in zip(controls, active, strict=True)
            }
            table[active] = _Result(*replace(list(result), levels))
        idle = table[(0,) * len(controls)]
        for active, forced in table.items():
            if any(active):
                self._check_forced(net, forced, idle, controls, active)
        at = state.at[net]
        blocking = state.blocking[net]
        keeps = depends_on_itself(net, *result)
        out = []
        for mask in self._groups(state.touched[net], table):
            forces = self._forces(net, mask, table, controls)
            word = idle.word
            if controls and not forces:
                busy = e.disj(_active(c) for c in controls)
                word = e.ite(busy, net.value, word)
            edges = []
            for event in clock:
                after = {event.base: e.const(event.level, 1)} if len(clock) == 2 else {}
                sampled = replace([word], after)[0]
                edges.append(Edge(_active(event), sampled))
            out.append(Driver(net, mask, at, None, tuple(edges), forces, False, blocking, keeps))
        return out

    def _check_forced(
        self, net: Net, forced: _Result, idle: _Result, controls: list[_Event], active: tuple[int, ...]
    ) -> None:
        """With a control active the register must hold, or take a value that isn't sampled data."""
        if forced.written.is_const and not forced.written.value:
            return
        first = controls[active.index(1)]
        name, control = printable(net.name), printable(str(first.base))
        edge = "posedge" if first.level else "negedge"
        other = "negedge" if first.level else "posedge"
        touched = forced.written.value if forced.written.is_const else (1 << net.width) - 1
        settled = _constant_on(forced.word, touched)
        if forced == idle and not settled:
            self.report.fail(
                f"{name} takes its data at the {edge} of {control} as well as at the clock's",
                first.at,
                f"give {name} a value where {control} is active, or a block of its own",
            )
        if not settled and (_constant_on(idle.word, touched) or idle.written is e.const(0, net.width)):
            self.report.fail(
                f"the {edge} of {control} is in the list, but the block resets when {control} is "
                f"{1 - first.level}: a simulator would sample data at that edge, gates reset at the other",
                first.at,
                f"write {other} {control}, or test {control} for {first.level}",
            )
        if depends_on_itself(net, *forced):
            self.report.fail(
                f"{name} moves on at the {edge} of {control} as well as at the clock's: no flip-flop does",
                first.at,
                f"leave {control} out of the list, or give {name} a fixed value where it is active",
            )
        if not forced.written.is_const:
            self.report.fail(
                f"{name} is set or cleared only under a further condition while {control} is active: "
                f"a simulator looks at it at edges, gates all the time",
                first.at,
                f"assign {name} unconditionally where {control} is active",
            )
        if not settled:
            self.report.note(
                f"{name} is loaded while {control} is active: gates follow it, a simulator looks at edges",
                first.at,
            )

    def _groups(self, touched: int, table: dict[tuple[int, ...], _Result]) -> list[int]:
        """The touched bits, parted by which combinations of controls write them."""
        groups = [touched]
        for active, result in table.items():
            if any(active):
                mask = result.written.value
                groups = [part for g in groups for part in (g & mask, g & ~mask) if part]
        return groups

    def _forces(
        self, net: Net, mask: int, table: dict[tuple[int, ...], _Result], controls: list[_Event]
    ) -> tuple[Force, ...]:
        """The set, clear and load values in order of precedence."""

        def value(active: tuple[int, ...]) -> Expr:
            result = table[active]
            return result.word if result.written.value & mask else net.value

        def shown(active: tuple[int, ...]) -> Expr:
            return e.bvand(value(active), e.const(mask, net.width))

        if not any(table[a].written.value & mask for a in table if any(a)):
            return ()
        where = self.report.where
        forces: list[Force] = []
        left = list(range(len(controls)))
        cases = [a for a in table if any(a)]
        while cases:
            for i in left:
                mine = [a for a in cases if a[i]]
                if len({shown(a) for a in mine}) == 1:
                    forces.append(Force(_active(controls[i]), value(mine[0]), where(controls[i].at)))
                    left.remove(i)
                    cases = [a for a in cases if not a[i]]
                    break
            else:
                # No control comes first: each combination is a force of its own.
                for a in cases:
                    terms = (
                        _active(c) if on else e.bvnot(_active(c)) for c, on in zip(controls, a, strict=True)
                    )
                    at = controls[a.index(1)].at
                    forces.append(Force(e.conj(terms), value(a), where(at)))
                break
        return tuple(forces)

    # -- combinational and latches -------------------------------------------------------------------------

    def _combinational(
        self, scope: Scope, node: tree.Always, events: list[tuple[str, Any, int]] | None, state: State
    ) -> list[Driver]:
        results = self._results(state)
        if events is not None:
            self._complete_list(scope, events, results, node)
        out: list[Driver] = []
        for net, result in results.items():
            out += self._wires(net, result, state, node)
        return out

    def _complete_list(
        self, scope: Scope, events: list[tuple[str, Any, int]], results: dict[Net, _Result], node: tree.Always
    ) -> None:
        listed: dict[str, int] = {}
        for _, signal, _ in events:
            value: Value = run(Sizer(Environment(self.executor, scope, State())).alone(signal))
            for name, mask in reads([value.word]).items():
                listed[name] = listed.get(name, 0) | mask
        for net, result in results.items():
            held = not depends_on_itself(net, *result)
            for name, mask in reads(result).items():
                if name == net.name and held:
                    continue
                if mask & ~listed.get(name, 0):
                    self.report.fail(
                        f"the sensitivity list lacks {printable(name)}: a simulator would keep the old value "
                        f"of {printable(net.name)}, gates wouldn't",
                        node.lineno,
                        "write always @*, or always @(posedge …) for a register",
                    )

    def _wires(self, net: Net, result: _Result, state: State, node: tree.Always) -> list[Driver]:
        touched, at = state.touched[net], state.at[net]
        word, written = result
        keeps = depends_on_itself(net, *result)
        if written.is_const:
            return [Driver(net, touched & written.value, at, word, procedural=True, keeps_itself=keeps)]
        if net.width > MAX_LATCH:
            self.report.fail(f"a latch of {net.width} bits", at, "use a flip-flop")
        memo: dict[tuple[Expr, int, int], Expr] = {}
        groups: dict[Expr, int] = {}
        for high, low in runs(touched):
            for bit in range(low, high + 1):
                condition = cut(written, bit, bit, memo)
                groups[condition] = groups.get(condition, 0) | 1 << bit
        out = []
        for condition, mask in groups.items():
            if condition is e.FALSE:
                continue
            if condition is e.TRUE:
                out.append(Driver(net, mask, at, word, procedural=True, keeps_itself=keeps))
                continue
            error = None
            if node.kind == "always_comb":
                message = f"{printable(net.name)} isn't assigned on every path of an always_comb"
                hint = "assign it in every branch, or first of all"
                error = UserError(message, self.report.where(at), hint)
            force = Force(condition, assume(word, condition), self.report.where(at))
            out.append(Driver(net, mask, at, None, (), (force,), True, True, keeps, error))
        return out

    # -- initial blocks ------------------------------------------------------------------------------------

    def initial(self, scope: Scope, statement: tree.Node) -> dict[Net, tuple[int, int]]:
        """The known bits that an initial block gives: for each variable a mask and a value."""
        if not _assigns(statement):
            self.report.note("initial block passed over: it only serves simulation", statement)
            return {}
        state = self.executor.run(statement, scope)
        out: dict[Net, tuple[int, int]] = {}
        for net, (word, written) in self._results(state).items():
            out[net] = self.known_bits(word, written, state.touched[net], state.at[net])
        return out

    def known_bits(self, word: Expr, written: Expr, touched: int, at: int) -> tuple[int, int]:
        """Mask and value of the bits that are constant; x bits are left out, anything else is refused."""
        if word.is_const:
            return touched, word.value & touched
        mask = value = 0
        memo: dict[tuple[Expr, int, int], Expr] = {}
        for high, low in runs(touched):
            for i in range(low, high + 1):
                bit = cut(word, i, i, memo)
                if bit.is_const and cut(written, i, i, memo) is e.TRUE:
                    mask |= 1 << i
                    value |= bit.value << i
                elif reads([bit]):
                    self.report.fail(
                        "an initial value must be constant", at, "assign a literal or a parameter"
                    )
        return mask, value


def _event_first(statement: tree.Node) -> tree.Node:
    """`begin @(edge); body end` waits first and then runs, which is `@(edge) begin body end`."""
    if isinstance(statement, vast.Block) and statement.statements:
        first = statement.statements[0]
        if isinstance(first, tree.EventControl):
            rest = (first.statement, *statement.statements[1:])
            body = vast.Block(rest, statement.scope, lineno=statement.lineno)
            return tree.EventControl(first.events, body, first.lineno)
    return statement


def _assigns(statement: tree.Node) -> bool:
    """May the statement assign anything? A call or a statement that is refused counts as if it did."""
    stack = [statement]
    while stack:
        node = stack.pop()
        if isinstance(node, (tree.DelayControl, tree.EventControl)):
            stack.append(node.statement)
        elif isinstance(node, vast.Block):
            stack += node.statements
        elif isinstance(node, vast.IfStatement):
            stack += [node.true_statement, node.false_statement]
        elif isinstance(node, (tree.Repeat, tree.For)):
            stack.append(node.body)
        elif isinstance(node, vast.SystemCall):
            if node.syscall not in SILENT:
                return True
        elif node is not None and not isinstance(node, tree.Null):
            return True
    return False


def _active(event: _Event) -> Expr:
    return event.base if event.level else e.bvnot(event.base)


def _constant_on(word: Expr, mask: int) -> bool:
    return all(cut(word, high, low).is_const for high, low in runs(mask))


def depends_on_itself(net: Net, word: Expr, written: Expr) -> bool:
    """Does a bit that is written hang on the variable's own old value?"""
    if net.value not in e.topological([word]):
        return False
    zeros, ones = ({net.value: e.const(value, net.width)} for value in (0, -1))
    low, written_low = replace([word, written], zeros)
    high, written_high = replace([word, written], ones)
    if written_low is not written_high:
        return True
    # Where a bit isn't written its word is the old value, which doesn't count.
    if written_low.is_const:
        kept = e.const(written_low.value, net.width)
        return e.bvand(low, kept) is not e.bvand(high, kept)
    if net.width > MAX_JUDGED:
        return True
    bits: dict[Expr, int] = {}
    for i in range(net.width):
        condition = cut(written_low, i, i)
        bits[condition] = bits.get(condition, 0) | 1 << i
    doubtful = []
    for condition, mask in bits.items():
        if condition is e.FALSE:
            continue
        kept = e.const(mask, net.width)
        one, other = (e.bvand(assume(word, condition), kept) for word in (low, high))
        if one is not other:
            doubtful.append(e.bvand(condition, e.bvnot(e.eq(one, other))))
    return bool(doubtful) and satisfiable(e.disj(doubtful))


def satisfiable(goal: Expr) -> bool:
    """Can the bit be 1? Where the solver gives up it counts as if it could."""
    from prover.effort import Effort, OutOfEffort
    from prover.solve import find

    try:
        return find(goal, Effort(2)) is not None
    except OutOfEffort:
        return True
