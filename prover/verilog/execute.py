"""Statements carried out on expressions instead of values.

A process is run once with every variable standing for itself. Branches whose condition isn't known run on
copies of the state that an ite joins again; loops are unrolled; functions and tasks run in place. What comes
out is, for each variable that is assigned, its new word over the old values, and under which condition each
of its bits is written at all.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any, NoReturn, Protocol

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.design import element
from prover.expr import Expr
from prover.verilog import tree
from prover.verilog.deep import Task, run
from prover.verilog.names import (
    MAX_CALL_DEPTH,
    Constant,
    Lazy,
    Net,
    Real,
    Report,
    Routine,
    Scope,
    Type,
    words,
)
from prover.verilog.parts import Place, write_part, written_mask
from prover.verilog.sizing import Sizer, constant
from prover.verilog.source import printable
from prover.verilog.words import assume, cut

MAX_STEPS = 12_000
MAX_ROUNDS = 4_096

SILENT = words(
    """display displayb displayh displayo write writeb writeh writeo monitor monitoron monitoroff
    strobe fdisplay fwrite fclose dumpfile dumpvars dumpon dumpoff dumpall dumpflush dumplimit
    timeformat printtimescale finish stop error warning info fatal"""
)
"""System tasks that only serve simulation; every other one is refused."""


@dataclass(slots=True, eq=False)
class State:
    """Words so far: `values` after blocking assignments, `pending` those of non-blocking ones.

    `written` has a word per variable whose bits say under which condition each bit was assigned, and
    `touched` the bits assigned on any path. `returned` is one bit: a return has ended the routine, and there
    `outcome` is its value. The rest is shared by all copies: where a variable was first
    assigned, and how, and what has been read at all.
    """

    values: dict[Net, Expr] = field(default_factory=dict)
    pending: dict[Net, Expr] = field(default_factory=dict)
    written: dict[Net, Expr] = field(default_factory=dict)
    touched: dict[Net, int] = field(default_factory=dict)
    blocking: dict[Net, bool] = field(default_factory=dict)
    at: dict[Net, int] = field(default_factory=dict)
    reads: set[Net] = field(default_factory=set)
    returned: Expr = e.FALSE
    outcome: Expr | None = None

    def copy(self) -> State:
        return State(
            dict(self.values),
            dict(self.pending),
            dict(self.written),
            dict(self.touched),
            self.blocking,
            self.at,
            self.reads,
            self.returned,
            self.outcome,
        )

    def result(self, net: Net) -> Expr:
        """The word at the end of the process."""
        found = self.pending.get(net)
        return found if found is not None else self.values[net]

    def merge(self, condition: Expr, then: State, other: State, report: Report) -> None:
        """Become `then` where the condition holds, and `other` elsewhere."""

        def absent(net: Net) -> Expr:
            # A local of a routine that only one branch has set is x after the other.
            return report.choice(net.width) if net.local else net.value

        def joined(a: dict[Net, Expr], b: dict[Net, Expr], missing: Any) -> dict[Net, Expr]:
            out = {}
            for net in {**b, **a}:
                x, y = a.get(net), b.get(net)
                if x is not y:
                    x = missing(net) if x is None else x
                    y = missing(net) if y is None else y
                    out[net] = e.ite(condition, x, y)
                elif x is not None:
                    out[net] = x
            return out

        self.values = joined(then.values, other.values, absent)
        self.pending = joined(then.pending, other.pending, absent)
        self.written = joined(then.written, other.written, lambda net: e.const(0, net.width))
        self.returned = e.ite(condition, then.returned, other.returned)
        self.outcome = other.outcome if then.outcome is None else then.outcome
        if then.outcome is not None and other.outcome is not None:
            self.outcome = e.ite(condition, then.outcome, other.outcome)
        self.touched = {
            net: then.touched.get(net, 0) | other.touched.get(net, 0)
            for net in {**other.touched, **then.touched}
        }


class Declares(Protocol):
    """The part of elaboration that declares what stands inside blocks."""

    def block(self, scope: Scope, block: Any, items: list[Any]) -> Scope:
        """The scope of a block with declarations; the same one each time."""


@dataclass(slots=True, eq=False)
class Environment:
    """Names of a scope, and values of a state; without a state only constants can be read."""

    executor: Executor
    scope: Scope
    state: State | None = None

    @property
    def report(self) -> Report:
        return self.executor.report

    def find(self, node: Any, routine: bool = False) -> Any:
        name = printable(node.name)
        entry: Any = self.scope.find(node.name, routine) if node.scope is None else self._descend(node)
        if isinstance(entry, Lazy):
            entry = entry.get(self.report, node.name)
        if entry is None:
            self.report.fail(f"{name} isn't declared", node, f"declare {name}, or correct the name")
        if not isinstance(entry, (Net, Constant, Real, Routine)):
            self.report.fail(
                f"{name} is the name of a block or instance, not a value", node, "name something inside it"
            )
        return entry

    def _descend(self, node: Any) -> Any:
        labels = list(node.scope.labellist)
        inner: Any = None
        for i, label in enumerate(labels):
            name = label.name
            if label.loop is not None:
                name = element(name, constant(self, label.loop, "an index in a path"))
            inner = self._upward(name) if i == 0 else inner.names.get(name)
            if not isinstance(inner, Scope):
                shown = printable(name)
                self.report.fail(f"{shown} is no block or instance here", node, "check the path")
        return inner.names.get(node.name)

    def _upward(self, name: str) -> Any:
        scope: Scope | None = self.scope
        while scope is not None:
            found = scope.names.get(name)
            if isinstance(found, Scope):
                return found
            if scope.kind == "module" and scope.module == name:
                return scope
            scope = scope.parent
        return None

    def named_type(self, name: str) -> Type | None:
        shape = self.scope.find(f"type {name}")
        return None if shape is None else Type(*shape.type)

    def read(self, net: Net, node: Any) -> Expr:
        if self.state is None:
            self.report.fail(f"{printable(net.name)} isn't constant", node, "use a parameter or a literal")
        self.state.reads.add(net)
        found = self.state.values.get(net)
        if found is None:
            found = self.report.choice(net.width) if net.local else net.value
        return found

    def call(self, routine: Routine, arguments: tuple[Any, ...], node: Any) -> Task[Expr]:
        state = State() if self.state is None else self.state
        if self.state is None:
            # Only constants may flow into a function where a constant is asked for.
            for argument in arguments:
                yield Sizer(self).constant(argument, "the argument of a function in a constant expression")
        found: Expr = yield self.executor.call(routine, arguments, self, state, node)
        return found


@dataclass(slots=True, eq=False)
class Executor:
    """Carries out statements. One serves a whole reading, so that all unrolling shares one bound."""

    report: Report
    declares: Declares | None = None
    unrolling: int = 0
    steps: int = 0
    running: list[Routine] = field(default_factory=list)

    def run(self, statement: Any, scope: Scope, state: State | None = None) -> State:
        """The state after the statement."""
        state = State() if state is None else state
        run(self.execute(statement, scope, state))
        return state

    def execute(self, node: Any, scope: Scope, state: State) -> Task[None]:
        if self.unrolling:
            # Straight code is as long as its source; only what is repeated can run away.
            self.steps += 1
            if self.steps > MAX_STEPS:
                self.report.fail(
                    f"unrolling takes more than {MAX_STEPS} steps", node, "are the loop bounds right?"
                )
        rule = _STATEMENTS.get(type(node))
        if rule is None:
            self.report.fail(
                f"{type(node).__name__} isn't supported as a statement", node, "the README lists what is read"
            )
        yield rule(self, node, scope, state)

    def _sequence(self, statements: Sequence[Any], scope: Scope, state: State) -> Task[None]:
        """Statements in a row, up to a return."""
        for i, statement in enumerate(statements):
            if state.returned is not e.FALSE:
                yield self._unless_returned(self._sequence, statements[i:], scope, state)
                return
            yield self.execute(statement, scope, state)

    def _unless_returned(
        self, rest: Callable[[Any, Scope, State], Task[None]], what: Any, scope: Scope, state: State
    ) -> Task[None]:
        """Go on where no return has ended the routine yet."""
        if state.returned is e.TRUE:
            return
        left, going = state.copy(), state.copy()
        ended = state.returned
        left.returned, going.returned = e.TRUE, e.FALSE
        # What one side has not set yet is any value there, and must not linger where it can't come through.
        for side, holds in ((left, ended), (going, e.bvnot(ended))):
            side.values |= {net: assume(word, holds) for net, word in side.values.items() if net.local}
        yield rest(what, scope, going)
        state.merge(ended, left, going, self.report)

    # -- assignments ---------------------------------------------------------------------------------------

    def _assignment(self, node: tree.Assignment, scope: Scope, state: State) -> Task[None]:
        if isinstance(node.delay, vast.DelayStatement):
            self.report.note("delay passed over: gates have their own", node.delay)
        elif node.delay is not None:
            self.report.fail(
                "an event inside an assignment isn't supported", node, "use a process of its own"
            )
        env = Environment(self, scope, state)
        places: list[Place] = yield self.targets(node.left, env)
        value: Expr = yield Sizer(env).assigned(node.right, sum(p.width for p in places))
        self.store(places, value, state, node.blocking, node.lineno)

    def targets(self, node: Any, env: Environment) -> Task[list[Place]]:
        """The places that the left side of an assignment names, the uppermost first."""
        if isinstance(node, vast.Concat):
            found: list[Place] = []
            for part in node.list:
                inner: list[Place] = yield self.targets(part, env)
                found += inner
            return found
        if not isinstance(node, (vast.Identifier, vast.Pointer, vast.Partselect, tree.IndexedSelect)):
            self.report.fail("this can't be assigned", node, "assign a variable, a part of one, or {a, b}")
        place: Place = yield Sizer(env).place(node)
        if isinstance(place.net, Constant):
            self.report.fail("a parameter can't be assigned", node, "use a reg")
        return [place]

    def store(self, places: list[Place], value: Expr, state: State, blocking: bool, at: int) -> None:
        """Assign the value to the places, the uppermost bits to the first."""
        high = value.width
        for place in places:
            net = place.net
            assert isinstance(net, Net)
            if net.kind == "net":
                self.report.fail(f"{printable(net.name)} is a wire and can't be assigned in a process", at,
                                 f"declare {printable(net.name)} as reg")  # fmt: skip
            if net.direction == "input":
                self.report.fail(
                    f"{printable(net.name)} is an input and can't be assigned",
                    at,
                    "make it an output, or assign another variable",
                )
            if state.blocking.setdefault(net, blocking) != blocking and not net.local:
                self.report.fail(
                    f"{printable(net.name)} is assigned with both = and <=", at,
                    "use <= for registers and = for values inside a block",
                )  # fmt: skip
            if not blocking and net.local:
                self.report.fail(f"{printable(net.name)} is local and can't take <=", at, "use =")
            state.at.setdefault(net, at)
            part = cut(value, high - 1, high - place.width)
            high -= place.width
            words = state.values if blocking else state.pending
            before = words.get(net)
            if before is None:
                before = self.report.choice(net.width) if net.local else net.value
            words[net] = write_part(place, before, part)
            state.written[net] = write_part(
                place, state.written.get(net, e.const(0, net.width)), e.const(-1, place.width)
            )
            state.touched[net] = state.touched.get(net, 0) | written_mask(place)

    # -- branches ------------------------------------------------------------------------------------------

    def _if(self, node: Any, scope: Scope, state: State) -> Task[None]:
        test: Expr = yield Sizer(Environment(self, scope, state)).condition(node.cond)
        branches = (node.true_statement, node.false_statement)
        if test.is_const:
            taken = branches[0] if test.value else branches[1]
            if taken is not None:
                yield self.execute(taken, scope, state)
            return
        then, other = state.copy(), state.copy()
        yield self.execute(branches[0], scope, then)
        if branches[1] is not None:
            yield self.execute(branches[1], scope, other)
        state.merge(test, then, other, self.report)

    def _case(self, node: Any, scope: Scope, state: State) -> Task[None]:
        sizer = Sizer(Environment(self, scope, state))
        arms: list[tuple[Expr, Any]] = []
        default: Any = None
        common: Type = yield self._case_type(node, sizer)
        subject: Expr = yield sizer.build(node.comp, common)
        for arm in node.caselist:
            if arm.cond is None:
                if default is not None:
                    self.report.fail("a second default", arm, "keep one of them")
                default = arm.statement
                continue
            tests = []
            for label in arm.cond:
                test: Expr = yield self._label(type(node), label, subject, common, sizer)
                tests.append(test)
            arms.append((e.disj(tests), arm.statement))
        ran: list[tuple[Expr, State]] = []
        rest = e.TRUE
        for test, statement in arms:
            if rest is e.FALSE or test is e.FALSE:
                continue
            inner = state.copy()
            yield self.execute(statement, scope, inner)
            ran.append((test, inner))
            rest = e.FALSE if test is e.TRUE else rest
        last = state.copy()
        if default is not None and rest is not e.FALSE:
            yield self.execute(default, scope, last)
        for test, inner in reversed(ran):
            merged = State(blocking=state.blocking, at=state.at, reads=state.reads)
            merged.merge(test, inner, last, self.report)
            last = inner if test is e.TRUE else merged
        state.values, state.pending = last.values, last.pending
        state.written, state.touched = last.written, last.touched
        state.returned, state.outcome = last.returned, last.outcome

    def _case_type(self, node: Any, sizer: Sizer) -> Task[Type]:
        """All labels and the subject take the widest's width, and are signed if all are (clause 9.5)."""
        width, signed = 0, True
        for label in (node.comp, *(c for arm in node.caselist for c in arm.cond or ())):
            own: Type = yield sizer.type_of(label)
            width, signed = max(width, own.width), signed and own.signed
        return Type(width, signed)

    def _label(self, kind: Any, label: Any, subject: Expr, common: Type, sizer: Sizer) -> Task[Expr]:
        pattern = sizer.pattern(label)
        if pattern is None or not pattern.x | pattern.z:
            word: Expr = yield sizer.build(label, common)
            test = e.eq(subject, word)
            if word.is_const and test is e.FALSE and not subject.is_const:
                self.report.note(f"case label {word.value} is out of the subject's reach", label)
            return test
        bits, x, z = (_extended(plane, pattern, common) for plane in (pattern.bits, pattern.x, pattern.z))
        free = {vast.CasezStatement: z, vast.CasexStatement: x | z}.get(kind, 0)
        if (x | z) & ~free:
            self.report.note("a case label with x or z never matches values of 0 and 1", label)
            return e.FALSE
        mask = e.const(~free, common.width)
        return e.eq(e.bvand(subject, mask), e.const(bits & ~free, common.width))

    # -- loops ---------------------------------------------------------------------------------------------

    def _for(self, node: tree.For, scope: Scope, state: State) -> Task[None]:
        if node.type is not None:
            assert self.declares is not None
            assert node.start is not None
            name = tree.Named(node.start.left.name, [], None, node.lineno)
            scope = self.declares.block(scope, node, [tree.Declaration(node.type, [name], None, node.lineno)])
        if node.start is not None:
            yield self.execute(node.start, scope, state)
        if node.condition is None:
            self.report.fail("a for loop without a condition never ends", node, "give it a condition")
        yield self._loop(node, node.condition, node.body, node.step, scope, state)

    def _while(self, node: Any, scope: Scope, state: State) -> Task[None]:
        yield self._loop(node, node.cond, node.statement, None, scope, state)

    def _loop(
        self, node: Any, condition: Any, body: Any, step: Any, scope: Scope, state: State
    ) -> Task[None]:
        self.unrolling += 1
        for _ in range(MAX_ROUNDS):
            test: Expr = yield Sizer(Environment(self, scope, state)).condition(condition)
            if not test.is_const:
                self.report.fail(
                    "how often this loop runs isn't known beforehand", node, "give it constant bounds"
                )
            if not test.value:
                self.unrolling -= 1
                return
            before = dict(state.values)
            yield self.execute(body, scope, state)
            if state.returned is not e.FALSE:

                def further(_: Any, scope: Scope, state: State) -> Task[None]:
                    if step is not None:
                        yield self.execute(step, scope, state)
                    yield self._loop(node, condition, body, step, scope, state)

                yield self._unless_returned(further, None, scope, state)
                self.unrolling -= 1
                return
            if step is not None:
                yield self.execute(step, scope, state)
            if state.values == before:
                self.report.fail("this loop never ends", node, "its step must move towards its end")
        self.report.fail(f"this loop runs more than {MAX_ROUNDS} times", node, "give it fewer rounds")

    def _repeat(self, node: tree.Repeat, scope: Scope, state: State) -> Task[None]:
        times: int = yield Sizer(Environment(self, scope, state)).number(node.times, "the count of a repeat")
        if times > MAX_ROUNDS:
            self.report.fail(f"this loop runs more than {MAX_ROUNDS} times", node, "give it fewer rounds")
        self.unrolling += 1
        yield self._sequence([node.body] * times, scope, state)
        self.unrolling -= 1

    # -- blocks and calls ----------------------------------------------------------------------------------

    def _block(self, node: Any, scope: Scope, state: State) -> Task[None]:
        items = [s for s in node.statements if isinstance(s, (tree.Declaration, tree.Parameters))]
        if items or node.scope is not None:
            assert self.declares is not None
            scope = self.declares.block(scope, node, items)
        statements = [s for s in node.statements if not isinstance(s, (tree.Declaration, tree.Parameters))]
        yield self._sequence(statements, scope, state)

    def _task(self, node: Any, scope: Scope, state: State) -> Task[None]:
        name, arguments = (node.name, node.args) if isinstance(node, vast.FunctionCall) else (node.name, ())
        env = Environment(self, scope, state)
        routine = env.find(name, routine=True)
        if not isinstance(routine, Routine) or routine.result is not None:
            self.report.fail(
                f"{printable(name.name)} is no task", node, "declare the task, or correct the name"
            )
        yield self.call(routine, tuple(arguments), env, state, node)

    def call(
        self, routine: Routine, arguments: tuple[Any, ...], env: Environment, state: State, node: Any
    ) -> Task[Expr]:
        """Run a routine on the state: arguments in, body, outputs back; its result, or nothing of note."""
        if len(arguments) != len(routine.arguments):
            shown = printable(routine.name)
            self.report.fail(f"{shown} takes {len(routine.arguments)} arguments", node, "give it as many")
        if routine.active and not routine.automatic:
            self.report.fail(f"{printable(routine.name)} calls itself", node, "declare it automatic")
        if routine.active > MAX_CALL_DEPTH:
            self.report.fail(
                f"{printable(routine.name)} calls itself without end",
                node,
                "give its recursion an end that constants reach",
            )
        given: list[Expr | None] = []
        for formal, actual in zip(routine.arguments, arguments, strict=True):
            word: Expr | None = None
            if formal.direction != "output":
                word = yield Sizer(env).assigned(actual, formal.width)
            given.append(word)
        own = (*routine.arguments, *((routine.result,) if routine.result else ()))
        saved = {net: state.values.get(net) for net in state.values if net.local} if routine.active else {}
        for net in [n for n in state.values if n.local and n.name.startswith(routine.scope.prefix)]:
            del state.values[net]
        for formal, word in zip(routine.arguments, given, strict=True):
            if word is not None:
                state.values[formal] = word
        routine.active += 1
        self.unrolling += 1
        self.running.append(routine)
        before, state.outcome = state.outcome, None
        yield self._sequence(routine.body, routine.scope, state)
        if routine.result and state.outcome is not None:
            unreturned = state.values.get(routine.result)
            otherwise = self.report.choice(routine.result.width) if unreturned is None else unreturned
            state.values[routine.result] = e.ite(state.returned, state.outcome, otherwise)
        state.returned, state.outcome = e.FALSE, before
        self.running.pop()
        self.unrolling -= 1
        routine.active -= 1
        outcome = {net: state.values.get(net) or self.report.choice(net.width) for net in own}
        for table in (state.values, state.written, state.touched):
            for net in [n for n in table if n.local and n.name.startswith(routine.scope.prefix)]:
                del table[net]
        state.values.update({net: word for net, word in saved.items() if word is not None})
        for formal, actual in zip(routine.arguments, arguments, strict=True):
            if formal.direction in ("output", "inout"):
                places: list[Place] = yield self.targets(actual, env)
                value = e.resize(outcome[formal], sum(p.width for p in places), formal.type.signed)
                self.store(places, value, state, True, tree_position(node))
        return outcome[routine.result] if routine.result else e.FALSE

    def _system(self, node: Any, scope: Scope, state: State) -> Task[None]:
        if node.syscall not in SILENT:
            self.report.fail(f"${printable(node.syscall)} isn't supported", node, "assign constants instead")
        self.report.note(f"${node.syscall} passed over: it only serves simulation", node)
        return
        yield

    def _null(self, node: Any, scope: Scope, state: State) -> Task[None]:
        return
        yield

    def _delay(self, node: tree.DelayControl, scope: Scope, state: State) -> NoReturn:
        self.report.fail("a delay before a statement has no hardware", node, "leave it to the test bench")

    def _event(self, node: tree.EventControl, scope: Scope, state: State) -> NoReturn:
        self.report.fail(
            "an event inside a process isn't supported", node, "use one always block for each edge"
        )

    def _return(self, node: tree.Return, scope: Scope, state: State) -> Task[None]:
        result = self.running[-1].result if self.running else None
        if not self.running or (node.value is None) != (result is None):
            what = "a return that doesn't fit: a function gives a value, a task none"
            self.report.fail(what, node, "write return VALUE inside a function")
        if result is not None:
            value: Expr = yield Sizer(Environment(self, scope, state)).assigned(node.value, result.width)
            state.outcome = value
        state.returned = e.TRUE

    def _refused(self, node: tree.Refused, scope: Scope, state: State) -> NoReturn:
        self.report.fail(f"{node.what} isn't supported", node, "describe registers with always @(posedge …)")


def tree_position(node: Any) -> int:
    return int(node.lineno)


def _extended(plane: int, pattern: Constant, common: Type) -> int:
    """A plane of a literal's bits at the common width; the uppermost is repeated where the rules say so."""
    width = pattern.type.width
    top = plane >> (width - 1) & 1
    repeats = common.signed or (not pattern.sized and (pattern.x | pattern.z) >> (width - 1) & 1)
    if top and repeats:
        return plane | ((1 << common.width) - 1) ^ ((1 << width) - 1)
    return plane


_E = Executor
_STATEMENTS: dict[Any, Any] = {
    tree.Assignment: _E._assignment,
    vast.IfStatement: _E._if,
    vast.CaseStatement: _E._case,
    vast.CasezStatement: _E._case,
    vast.CasexStatement: _E._case,
    tree.For: _E._for,
    vast.WhileStatement: _E._while,
    tree.Repeat: _E._repeat,
    vast.Block: _E._block,
    vast.TaskCall: _E._task,
    vast.FunctionCall: _E._task,
    vast.SystemCall: _E._system,
    tree.Null: _E._null,
    tree.DelayControl: _E._delay,
    tree.EventControl: _E._event,
    tree.Return: _E._return,
    tree.Refused: _E._refused,
}
