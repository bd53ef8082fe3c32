"""Expressions by the width and sign rules of IEEE 1364-2005 clause 5.

An expression is read in two passes, as clause 5.4 and 5.5 have it: `type_of` finds from the operands up how
wide and of which sign it is on its own, `build` carries the type of the context down to the operands that
take it and makes the word. Both are generators for `deep.run`. What the standard calls x is a choice: a
fresh variable that may have any value.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any, NamedTuple, NoReturn, Protocol

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.expr import Expr
from prover.verilog import reals, tree
from prover.verilog.deep import Task, run
from prover.verilog.names import MAX_WIDTH, Constant, Net, Real, Report, Routine, Type
from prover.verilog.parts import Place, constant_word, literal, read_part
from prover.verilog.source import printable
from prover.verilog.words import cut, joined

_ROUND = "round it first: localparam integer N = …, or $rtoi"
_CAST_TYPES = {
    "int": Type(32, True),
    "integer": Type(32, True),
    "byte": Type(8, True),
    "shortint": Type(16, True),
    "longint": Type(64, True),
    "bit": Type(1, False),
    "logic": Type(1, False),
}


class Env(Protocol):
    """What an expression is read against."""

    @property
    def report(self) -> Report:
        """Where refusals and notes go."""

    def find(self, node: Any, routine: bool = False) -> Any:
        """The Net, Constant, Real or Routine that an identifier stands for; UserError if nothing. Inside a function
        its name is the result's, unless a `routine` is asked for."""

    def named_type(self, name: str) -> Type | None:
        """The type that a typedef gave the name, if any."""

    def read(self, net: Net, node: Any) -> Expr:
        """The present word of a net; UserError where only constants may stand."""

    def call(self, routine: Routine, arguments: tuple[Any, ...], node: Any) -> Task[Expr]:
        """The result of a function call."""


class Value(NamedTuple):
    """A word and its sign."""

    word: Expr
    signed: bool


# -- the two passes ----------------------------------------------------------------------------------------


class Sizer:
    """Reads one expression; types that were found are kept for the second pass."""

    def __init__(self, env: Env) -> None:
        self.env = env
        self.report = env.report
        self.types: dict[int, Type] = {}
        self.places: dict[int, Place] = {}
        self.outside: dict[int, tuple[str, Any]] = {}
        self.reals: dict[int, bool] = {}

    def type_of(self, node: Any) -> Task[Type]:
        """The type of the node on its own (clauses 5.4.1 and 5.5.1)."""
        known = self.types.get(id(node))
        if known is None:
            rule = _TYPE_RULES.get(type(node))
            if rule is None:
                self._refuse(node)
            found: Type = yield rule(self, node)
            if found.width > MAX_WIDTH:
                self.report.fail(
                    f"an expression of {found.width} bits", node, f"at most {MAX_WIDTH} are read"
                )
            self.types[id(node)] = known = found
        return known

    def build(self, node: Any, to: Type) -> Task[Expr]:
        """The node's word in a context of the given type, which is at least as wide as its own."""
        rule = _BUILD_RULES[type(node)]
        word: Expr = yield rule(self, node, to)
        return word

    def alone(self, node: Any) -> Task[Value]:
        """The node where nothing around it counts (self-determined)."""
        own: Type = yield self.type_of(node)
        word: Expr = yield self.build(node, own)
        return Value(word, own.signed)

    def condition(self, node: Any) -> Task[Expr]:
        """One bit: the node is not zero."""
        real: bool = yield self.is_real(node)
        if real:
            number: float = yield self.real(node)
            return e.TRUE if number else e.FALSE
        value: Value = yield self.alone(node)
        return e.nonzero(value.word)

    def assigned(self, node: Any, width: int) -> Task[Expr]:
        """The node as the right side of an assignment to `width` bits (clause 5.4.1, last paragraph)."""
        real: bool = yield self.is_real(node)
        if real:
            number: float = yield self.real(node)
            return e.const(self.rounded(number, Type(width, False), node), width)
        own: Type = yield self.type_of(node)
        word: Expr = yield self.build(node, Type(max(width, own.width), own.signed))
        if word.is_const and width < word.width:
            negative = own.signed and bool(word.value >> (word.width - 1))
            whole = word.value - (1 << word.width) if negative else word.value
            if not -(1 << (width - 1)) <= whole < 1 << width:
                left = word.value & ((1 << width) - 1)
                self.report.note(f"constant {whole} is cut to {width} bits and becomes {left}", node)
        return cut(word, width - 1, 0) if width < word.width else e.resize(word, width, own.signed)

    def constant(self, node: Any, what: str) -> Task[Constant | Real]:
        """The node as a constant; UserError names `what` needs it."""
        real: bool = yield self.is_real(node)
        if real:
            number: float = yield self.real(node)
            return Real(number)
        bare = self.pattern(node)
        if bare is not None:
            return bare
        value: Value = yield self.alone(node)
        if not value.word.is_const:
            self.report.fail(f"{what} must be a known constant", node, "use literals and parameters")
        return Constant(value.word.value, 0, 0, Type(value.word.width, value.signed))

    def number(self, node: Any, what: str) -> Task[int]:
        """The node as a whole number."""
        found: Constant | Real = yield self.constant(node, what)
        if isinstance(found, Real):
            self.report.fail(f"{what} is the real number {found.value}", node, _ROUND)
        if found.x | found.z:
            self.report.fail(f"{what} can't be x or z", node, "use digits")
        return found.number

    def pattern(self, node: Any) -> Constant | None:
        """The constant that a literal or a parameter's name stands for, with its x and z digits."""
        if isinstance(node, vast.IntConst):
            return self._literal(node)
        if isinstance(node, vast.StringConst):
            return self._string(node)
        if isinstance(node, vast.Identifier):
            found = self.env.find(node)
            return found if isinstance(found, Constant) else None
        return None

    def _literal(self, node: Any) -> Constant:
        try:
            found = literal(node.value)
        except ValueError as error:
            self.report.fail(
                f"{printable(node.value[:40])}: {error}", node, "write SIZE'BASE DIGITS, as in 4'd9"
            )
        size, tick, _ = node.value.partition("'")
        if tick and size.strip() and not found.x | found.z:
            full = literal("'" + node.value.partition("'")[2]).bits
            if full != found.bits:
                self.report.note(
                    f"constant {printable(node.value[:40])} doesn't fit its size and becomes {found.bits}",
                    node,
                )
        return found

    def _string(self, node: Any) -> Constant:
        """A string is a number of eight bits a character, the first uppermost (clause 3.6)."""
        try:
            characters = _characters(node.value)
        except ValueError as error:
            self.report.fail(f"this string: {error}", node, "write plain characters")
        bits = int.from_bytes(characters, "big")
        return Constant(bits, 0, 0, Type(8 * max(1, len(characters)), False))

    def _refuse(self, node: Any) -> NoReturn:
        if isinstance(node, vast.FloatConst):
            self.report.fail("a real number can't stand here", node, _ROUND)
        self.report.fail(
            f"{type(node).__name__} isn't supported in an expression", node, "the README lists what is read"
        )

    # -- real constants ------------------------------------------------------------------------------------

    def is_real(self, node: Any) -> Task[bool]:
        """Is the node's own type real? What takes no real then refuses it, for it has no width."""
        known = self.reals.get(id(node))
        if known is None:
            known = isinstance(node, vast.FloatConst)
            if isinstance(node, vast.Identifier):
                known = isinstance(self.env.find(node), Real)
            elif isinstance(node, vast.SystemCall):
                known = node.syscall in reals.REAL_FUNCTIONS
            for part in reals.operands(node):
                inner: bool = yield self.is_real(part)
                known = known or inner
            self.reals[id(node)] = known
        return known

    def real(self, node: Any) -> Task[float]:
        """The value of a constant as a real; an integer is worked out on its own first (clause 5.5.2)."""
        is_real: bool = yield self.is_real(node)
        if isinstance(node, vast.Identifier) and is_real:
            named: float = self.env.find(node).value
            return named
        inner: tuple[Any, ...] = reals.operands(node)
        if not is_real:
            integer: float = yield self._converted(node)
            return integer
        if isinstance(node, vast.Cond):
            test: Expr = yield self.condition(node.cond)
            if not test.is_const:
                self.report.fail("a real number must be a known constant", node, _ROUND)
            inner = (node.true_value if test.value else node.false_value,)
        elif isinstance(node, vast.SystemCall):
            inner = (self._argument(node),)
        values = []
        for part in inner:
            value: float = yield self.real(part)
            values.append(value)
        try:
            if isinstance(node, vast.FloatConst):
                return reals.literal(node.value)
            if isinstance(node, vast.SystemCall):
                if node.syscall == "itor" and (self.reals[id(inner[0])] or abs(values[0]) >= 1 << 31):
                    self.report.fail("$itor takes an integer of 32 bits", node, "write 1.0 * value")
                return reals.REAL_FUNCTIONS[node.syscall](values[0])
            if len(values) == 1:
                return -values[0] if isinstance(node, vast.Uminus) else values[0]
            return reals.combined(type(node), values[0], values[1])
        except ValueError as error:
            self.report.fail(str(error), node, "correct the numbers")

    def _converted(self, node: Any) -> Task[float]:
        number: int = yield self.number(node, "a number beside a real one")
        own: Type = yield self.type_of(node)
        word: Expr = yield self.build(node, Type(own.width + 64, own.signed))
        if not word.is_const or self._number(Value(word, own.signed)) != number:
            # Clause 5.5.2 cuts it to its own width, and not every simulator does.
            self.report.fail(
                f"this overflows its {own.width} bits before it becomes real", node, "write 1.0 *"
            )
        return self.as_real(number, node)

    def as_real(self, number: int, at: Any) -> float:
        """The integer as a real; UserError where it is no exact one."""
        if abs(number) >> reals.EXACT_BITS:
            self.report.fail(f"{number} is no exact real number", at, "write it as a real, as in 1e18")
        return float(number)

    def rounded(self, value: float, to: Type, at: Any) -> int:
        """The real as an integer of that type; simulators differ on what doesn't fit."""
        number = reals.rounded(value)
        if not -(1 << (to.width - 1)) <= number < 1 << (to.width - to.signed):
            self.report.fail(f"the real number {value} doesn't fit {to.width} bits", at, "give it more bits")
        return number

    def _argument(self, node: Any) -> Any:
        if len(node.args) != 1 or node.args[0] is None:
            name = printable(node.syscall)
            self.report.fail(f"${name} takes one argument", node, f"write ${name}(value)")
        return node.args[0]

    def _real_comparison(self, node: Any) -> Task[Expr]:
        """A comparison with a real: of two constants, or of a word with the integer next to the real."""
        if type(node) not in reals.COMPARISONS:
            self.report.fail("=== and !== of a real number are no Verilog", node, "write == or !=")
        sides: list[float | Value] = []
        for side in (node.left, node.right):
            real: bool = yield self.is_real(side)
            value = None if real else (yield self.alone(side))
            if value is None or value.word.is_const:
                number: float = yield self.real(side)
                sides.append(number)
            else:
                sides.append(value)
        left, right = sides
        if isinstance(left, Value):
            (word, signed), limit, mirrored = left, right, False
        elif isinstance(right, Value):
            (word, signed), limit, mirrored = right, left, True
        else:
            return e.TRUE if reals.COMPARISONS[type(node)](left, right) else e.FALSE
        assert isinstance(limit, float)
        if word.width > reals.EXACT_BITS:
            what = f"a comparison of {word.width} bits with a real number"
            self.report.fail(what, node, _ROUND)
        if type(node) in (vast.Eq, vast.NotEq) and not limit.is_integer():
            holds = "always" if isinstance(node, vast.NotEq) else "never"
            self.report.note(f"this comparison {holds} holds: {limit} is no whole number", node)
            return e.const(isinstance(node, vast.NotEq), 1)
        bound = reals.whole_bound(type(node), limit, mirrored)
        width = max(word.width, bound.bit_length()) + 1
        both = [e.resize(word, width, signed), e.const(bound, width)][:: -1 if mirrored else 1]
        signed = signed or bound < 0
        bit = _comparison(type(node), both[0], both[1], signed)
        self._remark(node, both[0], both[1], bit, signed)
        return bit

    # -- names and their parts -----------------------------------------------------------------------------

    def place(self, node: Any) -> Task[Place]:
        """What a name with selects stands for (clause 5.2); a constant one has to lie inside the declaration."""
        found: Place = yield self._place(node)
        if id(node) in self.outside:
            message, at = self.outside[id(node)]
            self.report.fail(message, at, "stay inside the declared range")
        return found

    def _place(self, node: Any) -> Task[Place]:
        """The same; what lies outside is left in `outside`, for the side of a ?: that is not taken has a type too."""
        known = self.places.get(id(node))
        if known is not None:
            return known
        chain, base = [], node
        while not isinstance(base, vast.Identifier):
            chain.append(base)
            base = base.var
        chain.reverse()
        found = self.env.find(base)
        if isinstance(found, Routine):
            self.report.fail(
                f"{printable(found.name)} is a routine, not a value", base, "call it with arguments"
            )
        name = printable(base.name)
        if isinstance(found, Real):
            self.report.fail(f"{name} is a real number, which can't stand here", base, _ROUND)
        word: int | Expr | None = None
        if isinstance(found, Net) and found.words:
            if not chain or not isinstance(chain[0], vast.Pointer):
                self.report.fail(f"memory {name} can only be used word by word", node, f"write {name}[index]")
            first, last = found.words
            word = yield self._position(
                chain.pop(0).ptr, max(first, last), min(first, last), found.count, name, node
            )
        msb, lsb = _bounds(found)
        type_ = found.type
        low: int | Expr = 0
        width, signed = type_.width, type_.signed
        if chain:
            if len(chain) > 1:
                self.report.fail(f"{name} has no further part to select", chain[1], "select once")
            low, width = yield self._select(chain[0], msb, lsb, type_.width, name, node)
            signed = False
        made = Place(found, word, low, width, signed)
        self.places[id(node)] = made
        return made

    def _position(self, node: Any, msb: int, lsb: int, count: int, name: str, whole: Any) -> Task[int | Expr]:
        """Where an index points, counted from the bottom; `whole` is the name with all its selects."""
        value: Value = yield self.alone(node)
        low: int | Expr = self._moved(value, msb, lsb)
        if isinstance(low, int) and not 0 <= low < count:
            self.outside[id(whole)] = (
                f"index {self._number(value)} lies outside {name}[{msb}:{lsb}]",
                node,
            )
            return 0
        return low

    @staticmethod
    def _number(value: Value) -> int:
        return Constant(value.word.value, 0, 0, Type(value.word.width, value.signed)).number

    def _moved(self, value: Value, msb: int, lsb: int, more: int = 0) -> int | Expr:
        """The bit position of a declared index plus `more` positions."""
        if value.word.is_const:
            number = self._number(value)
            return (number - lsb if msb >= lsb else lsb - number) + more
        if msb >= lsb and lsb == 0 and not value.signed and not more:
            return e.zero_extend(value.word, 1)
        size = max(value.word.width, abs(lsb).bit_length(), abs(more).bit_length()) + 3
        index, start = e.resize(value.word, size, value.signed), e.const(lsb, size)
        moved = e.bvsub(index, start) if msb >= lsb else e.bvsub(start, index)
        return e.bvadd(moved, e.const(more, size))

    def _select(
        self, node: Any, msb: int, lsb: int, count: int, name: str, whole: Any
    ) -> Task[tuple[int | Expr, int]]:
        if isinstance(node, vast.Pointer):
            low: int | Expr = yield self._position(node.ptr, msb, lsb, count, name, whole)
            return low, 1
        if isinstance(node, tree.IndexedSelect):
            width: int = yield self.number(node.width, "the width of a part select")
            if not 1 <= width <= count:
                self.report.fail(
                    f"a part of {width} bits of {name}, which has {count}", node, "select no more than it has"
                )
            value: Value = yield self.alone(node.base)
            # The base names the part's lowest bit where the part grows the way the declaration does.
            low = self._moved(value, msb, lsb, 0 if node.up == (msb >= lsb) else 1 - width)
        else:
            left: int = yield self.number(node.msb, "the bound of a part select")
            right: int = yield self.number(node.lsb, "the bound of a part select")
            if (left < right) == (msb > lsb) and left != right:
                self.report.fail(
                    f"{name}[{left}:{right}] runs against its declaration [{msb}:{lsb}]",
                    node,
                    "turn the bounds round",
                )
            low = right - lsb if msb >= lsb else lsb - right
            width = abs(left - right) + 1
        if isinstance(low, int) and not 0 <= low <= count - width:
            self.outside[id(whole)] = (f"this part lies outside {name}[{msb}:{lsb}]", node)
        return low, width

    def _type_place(self, node: Any) -> Task[Type]:
        place: Place = yield self._place(node)
        return Type(place.width, place.signed)

    def _build_place(self, node: Any, to: Type) -> Task[Expr]:
        place: Place = yield self.place(node)
        if isinstance(place.net, Constant):
            if isinstance(node, vast.Identifier):
                return constant_word(self.report, place.net, to)
            whole = constant_word(self.report, place.net, place.net.type)
        else:
            whole = self.env.read(place.net, node)
        return e.resize(read_part(self.report, place, whole), to.width, to.signed)

    # -- types ---------------------------------------------------------------------------------------------

    def _type_literal(self, node: Any) -> Task[Type]:
        return self._literal(node).type
        yield

    def _type_string(self, node: Any) -> Task[Type]:
        return self._string(node).type
        yield

    def _type_fill(self, node: Any) -> Task[Type]:
        return Type(1, False)
        yield

    def _type_wide(self, node: Any) -> Task[Type]:
        left: Type = yield self.type_of(node.left)
        right: Type = yield self.type_of(node.right)
        return Type(max(left.width, right.width), left.signed and right.signed)

    def _type_left(self, node: Any) -> Task[Type]:
        left: Type = yield self.type_of(node.left)
        return left

    def _type_unary(self, node: Any) -> Task[Type]:
        right: Type = yield self.type_of(node.right)
        return right

    def _type_bit(self, node: Any) -> Task[Type]:
        return Type(1, False)
        yield

    def _type_cond(self, node: Any) -> Task[Type]:
        true: Type = yield self.type_of(node.true_value)
        false: Type = yield self.type_of(node.false_value)
        return Type(max(true.width, false.width), true.signed and false.signed)

    def _type_concat(self, node: Any) -> Task[Type]:
        total = 0
        for part in node.list:
            if isinstance(part, tree.Fill) or (
                isinstance(part, vast.IntConst) and not self._literal(part).sized
            ):
                self.report.fail(
                    "a number without a size in a concatenation", part, "give its width, as in 4'd3"
                )
            own: Type = yield self.type_of(part)
            total += own.width
        return Type(total, False)

    def _type_repeat(self, node: Any) -> Task[Type]:
        times: int = yield self.number(node.times, "a replication count")
        own: Type = yield self.type_of(node.value)
        if not 1 <= times <= MAX_WIDTH:
            self.report.fail(f"a replication of {times} times", node, "give a count from 1 on")
        return Type(times * own.width, False)

    def _type_call(self, node: Any) -> Task[Type]:
        routine = self._function(node)
        assert routine.result is not None
        return routine.result.type
        yield

    def _function(self, node: Any) -> Routine:
        found = self.env.find(node.name, routine=True)
        if not isinstance(found, Routine) or found.result is None:
            self.report.fail(
                f"{printable(node.name.name)} is no function",
                node,
                "declare the function, or correct the name",
            )
        return found

    def _type_system(self, node: Any) -> Task[Type]:
        name = node.syscall
        if name in ("clog2", "bits", "rtoi"):
            return Type(32, True)
        if name in reals.REAL_FUNCTIONS:
            self.report.fail(f"${name} gives a real number, which can't stand here", node, _ROUND)
        if name not in ("signed", "unsigned") or len(node.args) != 1 or node.args[0] is None:
            self.report.fail(
                f"${printable(name)} isn't supported in an expression", node, "the README lists what is read"
            )
        own: Type = yield self.type_of(node.args[0])
        return Type(own.width, name == "signed")

    def _type_cast(self, node: Any) -> Task[Type]:
        real: bool = yield self.is_real(node.value)
        if not (real and isinstance(node.type, str)) or node.type in ("signed", "unsigned"):
            own: Type = yield self.type_of(node.value)
        if node.type in ("signed", "unsigned"):
            return Type(own.width, node.type == "signed")
        if isinstance(node.type, str):
            named = _CAST_TYPES.get(node.type) or self.env.named_type(node.type)
            if named is None:
                self.report.fail(
                    f"type {printable(node.type)} isn't declared", node, "declare it with typedef"
                )
            return named
        width: int = yield self.number(node.type, "the width of a cast")
        if not 1 <= width <= MAX_WIDTH:
            self.report.fail(f"a cast to {width} bits", node, "give a width from 1 on")
        return Type(width, own.signed)

    # -- words ---------------------------------------------------------------------------------------------

    def _build_literal(self, node: Any, to: Type) -> Task[Expr]:
        found = self._literal(node)
        if found.z:
            self.report.note("z counts as any value", node)
        return constant_word(self.report, found, to)
        yield

    def _build_string(self, node: Any, to: Type) -> Task[Expr]:
        return constant_word(self.report, self._string(node), to)
        yield

    def _build_fill(self, node: Any, to: Type) -> Task[Expr]:
        if node.digit in "xXzZ":
            return self.report.choice(to.width)
        return e.const(-int(node.digit), to.width)
        yield

    def _build_wide(self, node: Any, to: Type) -> Task[Expr]:
        left: Expr = yield self.build(node.left, to)
        right: Expr = yield self.build(node.right, to)
        return _WIDE[type(node)](left, right)

    def _build_division(self, node: Any, to: Type) -> Task[Expr]:
        left: Expr = yield self.build(node.left, to)
        right: Expr = yield self.build(node.right, to)
        kind = "div" if isinstance(node, vast.Divide) else "rem"
        result = e.binary(f"bv{'s' if to.signed else 'u'}{kind}", left, right)
        if right.is_const and right.value:
            return result
        # Division by zero is x (clause 5.1.5).
        return e.ite(e.eq(right, e.const(0, to.width)), self.report.choice(to.width), result)

    def _build_shift(self, node: Any, to: Type) -> Task[Expr]:
        left: Expr = yield self.build(node.left, to)
        amount: Value = yield self.alone(node.right)
        op = "bvshl" if isinstance(node, (vast.Sll, vast.Sla)) else "bvlshr"
        if isinstance(node, vast.Sra) and to.signed:
            op = "bvashr"
        # The amount counts as unsigned, whatever its type (clause 5.1.12).
        size = max(to.width, amount.word.width)
        by = e.resize(amount.word, size, False)
        return e.resize(e.binary(op, e.resize(left, size, op == "bvashr"), by), to.width, False)

    def _build_power(self, node: Any, to: Type) -> Task[Expr]:
        left: Expr = yield self.build(node.left, to)
        exponent: Value = yield self.alone(node.right)
        if left.is_const and exponent.word.is_const:
            base = Constant(left.value, 0, 0, to).number
            power = Constant(exponent.word.value, 0, 0, Type(exponent.word.width, exponent.signed)).number
            return self._power(base, power, to)
        if left.is_const and left.value == 2 and not exponent.signed:
            size = max(to.width, exponent.word.width)
            one, by = e.const(1, size), e.resize(exponent.word, size, False)
            return e.resize(e.binary("bvshl", one, by), to.width, False)
        self.report.fail(
            "** of values that aren't constant", node, "only 2 ** unsigned is read; write << or *"
        )

    def _power(self, base: int, power: int, to: Type) -> Expr:
        """Clause 5.1.5, table 5-6: a negative power is 1/base^n rounded to zero."""
        if power >= 0:
            return e.const(pow(base, power, 1 << to.width), to.width)
        if base == 0:
            return self.report.choice(to.width)
        return e.const({1: 1, -1: -1 if power % 2 else 1}.get(base, 0), to.width)

    def _build_unary(self, node: Any, to: Type) -> Task[Expr]:
        right: Expr = yield self.build(node.right, to)
        return e.bvneg(right) if isinstance(node, vast.Uminus) else e.bvnot(right)

    def _build_reduction(self, node: Any, to: Type) -> Task[Expr]:
        value: Value = yield self.alone(node.right)
        return e.resize(_REDUCTIONS[type(node)](value.word), to.width, False)

    def _build_not(self, node: Any, to: Type) -> Task[Expr]:
        test: Expr = yield self.condition(node.right)
        return e.resize(e.bvnot(test), to.width, False)

    def _build_logical(self, node: Any, to: Type) -> Task[Expr]:
        left: Expr = yield self.condition(node.left)
        if left is (e.FALSE if isinstance(node, vast.Land) else e.TRUE):
            # The right side decides nothing, and may select what isn't there: `i > 0 && q[i - 1]`.
            real: bool = yield self.is_real(node.right)
            if not real:
                yield self.type_of(node.right)
            return e.resize(left, to.width, False)
        right: Expr = yield self.condition(node.right)
        bit = e.bvand(left, right) if isinstance(node, vast.Land) else e.bvor(left, right)
        return e.resize(bit, to.width, False)

    def _build_comparison(self, node: Any, to: Type) -> Task[Expr]:
        for side in (node.left, node.right):
            real: bool = yield self.is_real(side)
            if real:
                found: Expr = yield self._real_comparison(node)
                return e.resize(found, to.width, False)
        common: Type = yield self._type_wide(node)
        exact = isinstance(node, (vast.Eql, vast.NotEql))
        if exact and any(p and (p.x | p.z) for p in map(self.pattern, (node.left, node.right))):
            self.report.note("=== with x or z never holds for values of 0 and 1", node)
            return e.resize(e.FALSE if isinstance(node, vast.Eql) else e.TRUE, to.width, False)
        left: Expr = yield self.build(node.left, common)
        right: Expr = yield self.build(node.right, common)
        bit = _comparison(type(node), left, right, common.signed)
        self._remark(node, left, right, bit, common.signed)
        return e.resize(bit, to.width, False)

    def _remark(self, node: Any, left: Expr, right: Expr, bit: Expr, signed: bool) -> None:
        """Note a comparison that its operands' ranges decide."""
        if left.is_const == right.is_const:
            return
        (low, high), (low2, high2) = _range(left, signed), _range(right, signed)
        below, above = high < low2, high2 < low
        # For each comparison: when it never holds, and when it always does.
        never, always = {
            vast.Eq: (below or above, False),
            vast.Eql: (below or above, False),
            vast.NotEq: (False, below or above),
            vast.NotEql: (False, below or above),
            vast.LessThan: (low >= high2, below),
            vast.GreaterThan: (high <= low2, above),
            vast.LessEq: (above, high <= low2),
            vast.GreaterEq: (below, low >= high2),
        }[type(node)]
        if never or always:
            number = (low2, low)[left.is_const]
            self.report.note(
                f"this comparison {'never' if never else 'always'} holds: "
                f"{number} is at or beyond the end of the other side's range",
                node,
            )

    def _build_cond(self, node: Any, to: Type) -> Task[Expr]:
        test: Expr = yield self.condition(node.cond)
        if test.is_const:
            taken: Expr = yield self.build(node.true_value if test.value else node.false_value, to)
            return taken
        true: Expr = yield self.build(node.true_value, to)
        false: Expr = yield self.build(node.false_value, to)
        return e.ite(test, true, false)

    def _build_concat(self, node: Any, to: Type) -> Task[Expr]:
        parts = []
        for part in node.list:
            value: Value = yield self.alone(part)
            parts.append(value.word)
        return e.resize(joined(parts), to.width, False)

    def _build_repeat(self, node: Any, to: Type) -> Task[Expr]:
        total: Type = yield self.type_of(node)
        value: Value = yield self.alone(node.value)
        word = value.word
        while word.width < total.width:
            word = e.concat(word, cut(word, min(word.width, total.width - word.width) - 1, 0))
        return e.resize(word, to.width, False)

    def _build_call(self, node: Any, to: Type) -> Task[Expr]:
        routine = self._function(node)
        assert routine.result is not None
        word: Expr = yield self.env.call(routine, node.args, node)
        return e.resize(word, to.width, to.signed)

    def _build_system(self, node: Any, to: Type) -> Task[Expr]:
        if node.syscall == "bits":
            own: Type = yield self.type_of(node.args[0])
            return e.const(own.width, to.width)
        if node.syscall == "clog2":
            if len(node.args) != 1 or node.args[0] is None:
                self.report.fail("$clog2 takes one argument", node, "write $clog2(value)")
            number: int = yield self.number(node.args[0], "the argument of $clog2")
            # Clause 17.11.1: the argument counts as unsigned.
            found: Type = yield self.type_of(node.args[0])
            number &= (1 << found.width) - 1
            return e.const(max(0, number - 1).bit_length() if number else 0, to.width)
        if node.syscall == "rtoi":
            # Clause 17.8: the fraction is dropped.
            real: float = yield self.real(self._argument(node))
            return e.const(self.rounded(float(int(real)), Type(32, True), node), to.width)
        value: Value = yield self.alone(node.args[0])
        return e.resize(value.word, to.width, to.signed)

    def _build_cast(self, node: Any, to: Type) -> Task[Expr]:
        own: Type = yield self.type_of(node)
        real: bool = yield self.is_real(node.value)
        if real:
            # A cast converts as an assignment does (IEEE 1800-2017 clause 6.24.1).
            word: Expr = yield self.assigned(node.value, own.width)
            return e.resize(word, to.width, to.signed)
        value: Value = yield self.alone(node.value)
        return e.resize(e.resize(value.word, own.width, value.signed), to.width, to.signed)


_ESCAPES = {"n": 10, "t": 9, "\\": 92, '"': 34}


def _characters(text: str) -> bytes:
    """The characters of a string as written between its quotes. Raises ValueError for one of no byte."""
    out = bytearray()
    for found in re.finditer(r"\\([0-7]{1,3}|.)|.", text, re.DOTALL):
        escape = found[1]
        if escape is None:
            code = ord(found[0])
        else:
            code = int(escape, 8) if escape[0] in "01234567" else _ESCAPES.get(escape, ord(escape))
        if code > 255:
            raise ValueError(f"a character of code {code}")
        out.append(code)
    if len(out) * 8 > MAX_WIDTH:
        raise ValueError(f"more than {MAX_WIDTH // 8} characters")
    return bytes(out)


def _bounds(found: Net | Constant) -> tuple[int, int]:
    if isinstance(found, Net):
        return found.msb, found.lsb
    return (found.type.width - 1 if found.msb is None else found.msb), found.lsb


def _range(word: Expr, signed: bool) -> tuple[int, int]:
    """Bounds of the word's value that its shape shows."""
    if word.is_const:
        number = Constant(word.value, 0, 0, Type(word.width, signed)).number
        return number, number
    if word.op == "zero_extend":
        return 0, (1 << word.args[0].width) - 1
    if not signed:
        return 0, (1 << word.width) - 1
    width = word.args[0].width if word.op == "sign_extend" else word.width
    return -(1 << (width - 1)), (1 << (width - 1)) - 1


def _comparison(kind: Any, left: Expr, right: Expr, signed: bool) -> Expr:
    left, right = _narrowed(left, right, signed)
    less, less_equal = (e.bvslt, e.bvsle) if signed else (e.bvult, e.bvule)
    if kind in (vast.Eq, vast.Eql):
        return e.eq(left, right)
    if kind in (vast.NotEq, vast.NotEql):
        return e.bvnot(e.eq(left, right))
    if kind is vast.LessThan:
        return less(left, right)
    if kind is vast.GreaterThan:
        return less(right, left)
    return less_equal(left, right) if kind is vast.LessEq else less_equal(right, left)


def _narrowed(left: Expr, right: Expr, signed: bool) -> tuple[Expr, Expr]:
    """The operands of a comparison without the extension that both share; a constant may lose it too."""
    extension = "sign_extend" if signed else "zero_extend"
    widths = []
    for word in (left, right):
        if word.op == extension:
            widths.append(word.args[0].width)
        elif word.is_const:
            number = _range(word, signed)[0]
            widths.append((number if number >= 0 else ~number).bit_length() + signed)
        else:
            return left, right
    width = max(1, *widths)
    return (
        (left, right)
        if left.is_const and right.is_const
        else (cut(left, width - 1, 0), cut(right, width - 1, 0))
    )


_WIDE: dict[Any, Callable[[Expr, Expr], Expr]] = {
    vast.Plus: e.bvadd, vast.Minus: e.bvsub, vast.Times: e.bvmul, vast.And: e.bvand, vast.Or: e.bvor,
    vast.Xor: e.bvxor, vast.Xnor: lambda a, b: e.bvnot(e.bvxor(a, b)),
}  # fmt: skip
_REDUCTIONS: dict[Any, Callable[[Expr], Expr]] = {
    vast.Uor: e.nonzero, vast.Unor: lambda a: e.bvnot(e.nonzero(a)),
    vast.Uand: lambda a: e.eq(a, e.const(-1, a.width)),
    vast.Unand: lambda a: e.bvnot(e.eq(a, e.const(-1, a.width))),
    vast.Uxor: e.parity, vast.Uxnor: lambda a: e.bvnot(e.parity(a)),
}  # fmt: skip
_COMPARISONS = (vast.Eq, vast.NotEq, vast.Eql, vast.NotEql, vast.LessThan, vast.GreaterThan, vast.LessEq,
                vast.GreaterEq)  # fmt: skip

_S = Sizer
_RULES: list[tuple[tuple[Any, ...], Any, Any]] = [
    ((vast.Identifier, vast.Pointer, vast.Partselect, tree.IndexedSelect), _S._type_place, _S._build_place),
    ((vast.IntConst,), _S._type_literal, _S._build_literal),
    ((vast.StringConst,), _S._type_string, _S._build_string),
    ((tree.Fill,), _S._type_fill, _S._build_fill),
    (tuple(_WIDE), _S._type_wide, _S._build_wide),
    ((vast.Divide, vast.Mod), _S._type_wide, _S._build_division),
    ((vast.Sll, vast.Srl, vast.Sla, vast.Sra), _S._type_left, _S._build_shift),
    ((vast.Power,), _S._type_left, _S._build_power),
    ((vast.Uminus, vast.Unot), _S._type_unary, _S._build_unary),
    ((vast.Ulnot,), _S._type_bit, _S._build_not),
    (tuple(_REDUCTIONS), _S._type_bit, _S._build_reduction),
    ((vast.Land, vast.Lor), _S._type_bit, _S._build_logical),
    (_COMPARISONS, _S._type_bit, _S._build_comparison),
    ((vast.Cond,), _S._type_cond, _S._build_cond),
    ((vast.Concat,), _S._type_concat, _S._build_concat),
    ((vast.Repeat,), _S._type_repeat, _S._build_repeat),
    ((vast.FunctionCall,), _S._type_call, _S._build_call),
    ((vast.SystemCall,), _S._type_system, _S._build_system),
    ((tree.Cast,), _S._type_cast, _S._build_cast),
]
_TYPE_RULES: dict[Any, Any] = {kind: types for kinds, types, _ in _RULES for kind in kinds}
_BUILD_RULES: dict[Any, Any] = {kind: words for kinds, _, words in _RULES for kind in kinds}


def constant(env: Env, node: Any, what: str) -> int:
    """The value of a constant expression; UserError says that `what` needs one."""
    return run(Sizer(env).number(node, what))
