"""Word-level expressions: one immutable node, one table of operators, four evaluations.

Operators are named and mean what they do in SMT-LIB 2.6 QF_BV, with one difference: a comparison yields a
word of one bit rather than a Boolean, so every value is a bit vector. The four evaluations are on integers
(`evaluate`, `compile_step`), on numpy arrays (`arrays`), as z3 terms (`z3_terms`) and as SMT-LIB text
(`smtlib`). Nodes are hash-consed: equal expressions are the same object, and every walk keeps a memo and an
explicit stack, because elaborated designs are deep.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any
from weakref import WeakValueDictionary

from prover.errors import InternalError

if TYPE_CHECKING:
    import numpy as np
    import z3

Param = int | str


class Expr:
    """An expression of `width` bits: operator, operands, and constant parameters (`OPERATORS` lists them)."""

    __slots__ = ("__weakref__", "args", "op", "params", "width")

    op: str
    args: tuple[Expr, ...]
    params: tuple[Param, ...]
    width: int

    def __repr__(self) -> str:
        return text(self)

    @property
    def name(self) -> str:
        """The name of a variable."""
        return str(self.params[0])

    @property
    def value(self) -> int:
        """The value of a constant."""
        return int(self.params[0])

    @property
    def is_const(self) -> bool:
        return self.op == "const"


@dataclass(frozen=True, slots=True)
class Operator:
    """How an operator computes on integers, and what it is called in SMT-LIB.

    `ints` takes the node's width, the operands' widths, the parameters and the operand values, all masked.
    `python` is the same as a Python expression over {0}, {1}, {2} (operands), {m} (result mask), {w} (result
    width), {p}, {q} (parameters), {a}, {b} (operand widths); it is what `compile_step` strings together.
    """

    arity: int
    smt: str
    python: str


# The same table serves integers and text; `arrays` and `z3_terms` have tables of their own below, so that
# a slip in one evaluation shows as a disagreement.
OPERATORS: dict[str, Operator] = {
    "const": Operator(0, "", "{p}"),
    "var": Operator(0, "", ""),
    "bvnot": Operator(1, "bvnot", "({0} ^ {m})"),
    "bvneg": Operator(1, "bvneg", "(-{0} & {m})"),
    "bvand": Operator(2, "bvand", "({0} & {1})"),
    "bvor": Operator(2, "bvor", "({0} | {1})"),
    "bvxor": Operator(2, "bvxor", "({0} ^ {1})"),
    "bvadd": Operator(2, "bvadd", "(({0} + {1}) & {m})"),
    "bvsub": Operator(2, "bvsub", "(({0} - {1}) & {m})"),
    "bvmul": Operator(2, "bvmul", "(({0} * {1}) & {m})"),
    "bvudiv": Operator(2, "bvudiv", "({0} // {1} if {1} else {m})"),
    "bvurem": Operator(2, "bvurem", "({0} % {1} if {1} else {0})"),
    "bvsdiv": Operator(2, "bvsdiv", "_sdiv({0}, {1}, {w})"),
    "bvsrem": Operator(2, "bvsrem", "_srem({0}, {1}, {w})"),
    "bvshl": Operator(2, "bvshl", "(({0} << {1}) & {m} if {1} < {w} else 0)"),
    "bvlshr": Operator(2, "bvlshr", "({0} >> {1} if {1} < {w} else 0)"),
    "bvashr": Operator(2, "bvashr", "((_signed({0}, {w}) >> min({1}, {w})) & {m})"),
    "concat": Operator(2, "concat", "({0} << {b} | {1})"),
    "extract": Operator(1, "extract", "({0} >> {q} & {m})"),
    "zero_extend": Operator(1, "zero_extend", "{0}"),
    "sign_extend": Operator(1, "sign_extend", "(_signed({0}, {a}) & {m})"),
    "ite": Operator(3, "ite", "({1} if {0} else {2})"),
    "eq": Operator(2, "=", "(1 if {0} == {1} else 0)"),
    "bvult": Operator(2, "bvult", "(1 if {0} < {1} else 0)"),
    "bvslt": Operator(2, "bvslt", "(1 if _signed({0}, {a}) < _signed({1}, {a}) else 0)"),
}

# A cache only: it decides which object stands for an expression, never what an expression means.
_interned: WeakValueDictionary[tuple[object, ...], Expr] = WeakValueDictionary()


def _node(op: str, width: int, args: tuple[Expr, ...] = (), params: tuple[Param, ...] = ()) -> Expr:
    key = (op, width, params, *map(id, args))
    found = _interned.get(key)
    if found is not None:
        return found
    made = Expr.__new__(Expr)
    made.op, made.args, made.params, made.width = op, args, params, width
    _interned[key] = made
    return made


def node(op: str, width: int, args: tuple[Expr, ...], params: tuple[Param, ...]) -> Expr:
    """An expression as it was built once, with nothing simplified. Raises InternalError for what is none."""
    if op not in OPERATORS or OPERATORS[op].arity != len(args) or width < 1:
        raise InternalError(f"no expression: {op} of {len(args)}")
    return _node(op, width, args, params)


def _mask(width: int) -> int:
    return (1 << width) - 1


def _signed(value: int, width: int) -> int:
    return value - (1 << width) if value >> (width - 1) else value


def _sdiv(a: int, b: int, width: int) -> int:
    x, y = _signed(a, width), _signed(b, width)
    if y == 0:
        return 1 if x < 0 else _mask(width)
    quotient = abs(x) // abs(y)
    return (quotient if (x < 0) == (y < 0) else -quotient) & _mask(width)


def _srem(a: int, b: int, width: int) -> int:
    x, y = _signed(a, width), _signed(b, width)
    if y == 0:
        return a
    remainder = abs(x) % abs(y)
    return (-remainder if x < 0 else remainder) & _mask(width)


_HELPERS = {"_signed": _signed, "_sdiv": _sdiv, "_srem": _srem, "min": min}


# -- construction ------------------------------------------------------------------------------------------
# Each constructor checks widths and applies the identities that keep half-cycle unrolling small.


def const(value: int, width: int) -> Expr:
    """The constant value mod 2^width."""
    if width < 1:
        raise InternalError(f"a word of {width} bits")
    return _node("const", width, (), (value & _mask(width),))


def var(name: str, width: int) -> Expr:
    """A variable. Names that begin with '?' are choices: any value, afresh at every micro-step."""
    if width < 1:
        raise InternalError(f"a variable of {width} bits: {name}")
    return _node("var", width, (), (name,))


TRUE = const(1, 1)
FALSE = const(0, 1)


def _same_width(*args: Expr) -> int:
    if len({a.width for a in args}) != 1:
        raise InternalError(f"operands of {[a.width for a in args]} bits")
    return args[0].width


def _fold(op: str, width: int, args: tuple[Expr, ...], params: tuple[Param, ...] = ()) -> Expr:
    node = _node(op, width, args, params)
    if all(a.is_const for a in args):
        return const(_evaluate_node(node, [a.value for a in args], {}), width)
    return node


def bvnot(a: Expr) -> Expr:
    if a.op == "bvnot":
        return a.args[0]
    return _fold("bvnot", a.width, (a,))


def bvneg(a: Expr) -> Expr:
    return _fold("bvneg", a.width, (a,))


def _ordered(a: Expr, b: Expr) -> tuple[Expr, Expr]:
    """A constant goes second; otherwise the order as given is kept, for stable text."""
    return (b, a) if a.is_const and not b.is_const else (a, b)


def _complements(a: Expr, b: Expr) -> bool:
    return (a.op == "bvnot" and a.args[0] is b) or (b.op == "bvnot" and b.args[0] is a)


def bvand(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if a is b or (b.is_const and b.value == _mask(width)):
        return a
    if (b.is_const and b.value == 0) or _complements(a, b):
        return const(0, width)
    for x, y in ((a, b), (b, a)):
        if x.op == "bvand" and (x.args[0] is y or x.args[1] is y):
            return x
        if x.op == "bvand" and (_complements(x.args[0], y) or _complements(x.args[1], y)):
            return const(0, width)
    return _fold("bvand", width, (a, b))


def bvor(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if a is b or (b.is_const and b.value == 0):
        return a
    if (b.is_const and b.value == _mask(width)) or _complements(a, b):
        return const(-1, width)
    return _fold("bvor", width, (a, b))


def bvxor(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if a is b:
        return const(0, width)
    if _complements(a, b):
        return const(-1, width)
    if b.is_const and b.value == 0:
        return a
    if b.is_const and b.value == _mask(width):
        return bvnot(a)
    return _fold("bvxor", width, (a, b))


def bvadd(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if b.is_const and b.value == 0:
        return a
    if b.is_const and a.op == "bvadd" and a.args[1].is_const:
        return bvadd(a.args[0], const(a.args[1].value + b.value, width))
    return _fold("bvadd", width, (a, b))


def bvsub(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    if a is b:
        return const(0, width)
    if b.is_const:
        return bvadd(a, const(-b.value, width))
    return _fold("bvsub", width, (a, b))


def bvmul(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if b.is_const and b.value in (0, 1):
        return a if b.value == 1 and width >= 1 else const(0, width)
    return _fold("bvmul", width, (a, b))


def binary(op: str, a: Expr, b: Expr) -> Expr:
    """Any operator of two words of equal width and a result as wide: divisions and shifts come this way."""
    width = _same_width(a, b)
    if b.is_const and not a.is_const and op in ("bvshl", "bvlshr", "bvashr"):
        return _shifted(op, a, min(b.value, width))
    return _fold(op, width, (a, b))


def _shifted(op: str, a: Expr, by: int) -> Expr:
    """A shift by a known amount, as the part of the word that it keeps."""
    if by == 0:
        return a
    if op == "bvshl":
        kept = extract(a, a.width - 1 - by, 0) if by < a.width else None
        return const(0, a.width) if kept is None else concat(kept, const(0, by))
    if op == "bvashr":
        by = min(by, a.width - 1)
        return sign_extend(extract(a, a.width - 1, by), by)
    return zero_extend(extract(a, a.width - 1, by), by) if by < a.width else const(0, a.width)


def concat(a: Expr, b: Expr) -> Expr:
    """a above b."""
    if a.is_const and a.value == 0 and not b.is_const:
        return zero_extend(b, a.width)
    if (
        a.op == "extract"
        and b.op == "extract"
        and a.args[0] is b.args[0]
        and a.params[1] == int(b.params[0]) + 1
    ):
        return extract(a.args[0], int(a.params[0]), int(b.params[1]))
    return _fold("concat", a.width + b.width, (a, b))


def concat_all(parts: Sequence[Expr]) -> Expr:
    """The parts joined, the first one uppermost."""
    out = parts[-1]
    for part in reversed(parts[:-1]):
        out = concat(part, out)
    return out


def extract(a: Expr, high: int, low: int) -> Expr:
    """Bits high..low of a, both counted from 0."""
    if not 0 <= low <= high < a.width:
        raise InternalError(f"bits {high}:{low} of {a.width}")
    while True:
        if low == 0 and high == a.width - 1:
            return a
        if a.op == "extract":
            offset = int(a.params[1])
            a, high, low = a.args[0], high + offset, low + offset
        elif a.op == "concat" and low >= a.args[1].width:
            below = a.args[1].width
            a, high, low = a.args[0], high - below, low - below
        elif a.op == "concat" and high < a.args[1].width:
            a = a.args[1]
        elif a.op in ("zero_extend", "sign_extend") and high < a.args[0].width:
            a = a.args[0]
        elif a.op == "concat":
            below = a.args[1].width
            return concat(extract(a.args[0], high - below, 0), extract(a.args[1], below - 1, low))
        elif a.op == "zero_extend" and low >= a.args[0].width:
            return const(0, high - low + 1)
        else:
            return _fold("extract", high - low + 1, (a,), (high, low))


def zero_extend(a: Expr, more: int) -> Expr:
    return _fold("zero_extend", a.width + more, (a,), (more,)) if more else a


def sign_extend(a: Expr, more: int) -> Expr:
    return _fold("sign_extend", a.width + more, (a,), (more,)) if more else a


def ite(condition: Expr, then: Expr, other: Expr) -> Expr:
    width = _same_width(then, other)
    if condition.width != 1:
        raise InternalError("a condition of more than one bit")
    if condition.is_const:
        return then if condition.value else other
    if then is other:
        return then
    if condition.op == "bvnot":
        return ite(condition.args[0], other, then)
    if width == 1 and then.is_const and other.is_const:
        return condition if then.value else bvnot(condition)
    if then.op == "ite" and then.args[0] is condition:
        then = then.args[1]
    if other.op == "ite" and other.args[0] is condition:
        other = other.args[2]
    if then is other:
        return then
    return _node("ite", width, (condition, then, other))


def eq(a: Expr, b: Expr) -> Expr:
    width = _same_width(a, b)
    a, b = _ordered(a, b)
    if a is b:
        return TRUE
    if width == 1:
        return bvnot(bvxor(a, b))
    if b.is_const and a.op == "zero_extend":
        inner = a.args[0]
        return eq(inner, const(b.value, inner.width)) if b.value <= _mask(inner.width) else FALSE
    return _fold("eq", 1, (a, b))


def bvult(a: Expr, b: Expr) -> Expr:
    _same_width(a, b)
    if a is b or (b.is_const and b.value == 0):
        return FALSE
    return _fold("bvult", 1, (a, b))


def bvslt(a: Expr, b: Expr) -> Expr:
    _same_width(a, b)
    return FALSE if a is b else _fold("bvslt", 1, (a, b))


def bvule(a: Expr, b: Expr) -> Expr:
    return bvnot(bvult(b, a))


def bvsle(a: Expr, b: Expr) -> Expr:
    return bvnot(bvslt(b, a))


def conj(parts: Iterable[Expr]) -> Expr:
    """The conjunction of one-bit words; of none, true."""
    out = TRUE
    for part in parts:
        out = bvand(out, part)
    return out


def disj(parts: Iterable[Expr]) -> Expr:
    """The disjunction of one-bit words; of none, false."""
    out = FALSE
    for part in parts:
        out = bvor(out, part)
    return out


def implies(a: Expr, b: Expr) -> Expr:
    return bvor(bvnot(a), b)


def nonzero(a: Expr) -> Expr:
    """One bit: a is not zero."""
    return a if a.width == 1 else bvnot(eq(a, const(0, a.width)))


def parity(a: Expr) -> Expr:
    """One bit: the exclusive or of a's bits."""
    out = extract(a, 0, 0)
    for i in range(1, a.width):
        out = bvxor(out, extract(a, i, i))
    return out


def resize(a: Expr, width: int, signed: bool) -> Expr:
    """a cut or extended to the width, by its sign if signed."""
    if width < a.width:
        return extract(a, width - 1, 0)
    return (sign_extend if signed else zero_extend)(a, width - a.width)


_BUILDERS: dict[str, Callable[..., Expr]] = {
    "bvnot": bvnot, "bvneg": bvneg, "bvand": bvand, "bvor": bvor, "bvxor": bvxor, "bvadd": bvadd,
    "bvsub": bvsub, "bvmul": bvmul, "concat": concat, "ite": ite, "eq": eq, "bvult": bvult, "bvslt": bvslt,
    "extract": extract, "zero_extend": zero_extend, "sign_extend": sign_extend,
}  # fmt: skip


def rebuild(node: Expr, args: Sequence[Expr]) -> Expr:
    """The node's operator applied to other operands, simplified anew."""
    if not args:
        return node
    builder = _BUILDERS.get(node.op)
    if builder is None:
        return binary(node.op, args[0], args[1])
    return builder(*args, *(int(p) for p in node.params))


def made(op: str, args: Sequence[Expr], params: Sequence[int]) -> Expr:
    """The operator applied to operands, simplified. Raises KeyError, TypeError or InternalError where that is no
    expression."""
    if op in _BUILDERS:
        return _BUILDERS[op](*args, *params)
    if OPERATORS[op].arity != 2 or params:
        raise TypeError(op)
    return binary(op, *args)


# -- walks -------------------------------------------------------------------------------------------------


def topological(roots: Iterable[Expr]) -> list[Expr]:
    """Every node below the roots, operands before their users, in a stable order."""
    done: set[Expr] = set()
    order: list[Expr] = []
    for root in roots:
        stack: list[tuple[Expr, bool]] = [(root, False)]
        while stack:
            node, expanded = stack.pop()
            if node in done:
                continue
            if expanded or not node.args:
                done.add(node)
                order.append(node)
            else:
                stack.append((node, True))
                stack.extend((a, False) for a in reversed(node.args) if a not in done)
    return order


def variables(roots: Iterable[Expr]) -> list[Expr]:
    """The variables below the roots, in order of first use."""
    return [node for node in topological(roots) if node.op == "var"]


def substitute(roots: Sequence[Expr], by_name: Mapping[str, Expr]) -> list[Expr]:
    """The roots with variables replaced, all at once."""
    memo: dict[Expr, Expr] = {}
    for node in topological(roots):
        if node.op == "var":
            memo[node] = by_name.get(node.name, node)
            if memo[node].width != node.width:
                raise InternalError(f"{node.name}: {node.width} bits replaced by {memo[node].width}")
        elif node.args:
            memo[node] = rebuild(node, [memo[a] for a in node.args])
        else:
            memo[node] = node
    return [memo[root] for root in roots]


def evaluate(roots: Sequence[Expr], values: Mapping[str, int]) -> list[int]:
    """The roots' values as unsigned integers; a variable without a value is an InternalError."""
    memo: dict[Expr, int] = {}
    for node in topological(roots):
        memo[node] = _evaluate_node(node, [memo[a] for a in node.args], values)
    return [memo[root] for root in roots]


def _evaluate_node(node: Expr, args: Sequence[int], values: Mapping[str, int]) -> int:
    op, mask = node.op, _mask(node.width)
    match op:
        case "const":
            return node.value
        case "var":
            if node.name not in values:
                raise InternalError(f"no value for {node.name}")
            return values[node.name] & mask
        case "bvnot":
            return args[0] ^ mask
        case "bvneg":
            return -args[0] & mask
        case "bvand":
            return args[0] & args[1]
        case "bvor":
            return args[0] | args[1]
        case "bvxor":
            return args[0] ^ args[1]
        case "bvadd":
            return args[0] + args[1] & mask
        case "bvsub":
            return args[0] - args[1] & mask
        case "bvmul":
            return args[0] * args[1] & mask
        case "bvudiv":
            return args[0] // args[1] if args[1] else mask
        case "bvurem":
            return args[0] % args[1] if args[1] else args[0]
        case "bvsdiv":
            return _sdiv(args[0], args[1], node.width)
        case "bvsrem":
            return _srem(args[0], args[1], node.width)
        case "bvshl":
            return args[0] << args[1] & mask if args[1] < node.width else 0
        case "bvlshr":
            return args[0] >> args[1] if args[1] < node.width else 0
        case "bvashr":
            return _signed(args[0], node.width) >> min(args[1], node.width) & mask
        case "concat":
            return args[0] << node.args[1].width | args[1]
        case "extract":
            return args[0] >> int(node.params[1]) & mask
        case "zero_extend":
            return args[0]
        case "sign_extend":
            return _signed(args[0], node.args[0].width) & mask
        case "ite":
            return args[1] if args[0] else args[2]
        case "eq":
            return int(args[0] == args[1])
        case "bvult":
            return int(args[0] < args[1])
        case "bvslt":
            width = node.args[0].width
            return int(_signed(args[0], width) < _signed(args[1], width))
    raise InternalError(f"unknown operator {op}")


def compile_step(roots: Sequence[Expr], inputs: Sequence[str]) -> Callable[..., tuple[int, ...]]:
    """A Python function from the inputs' values, in that order, to the tuple of the roots' values."""
    names: dict[Expr, str] = {}
    known = {name: f"v{i}" for i, name in enumerate(inputs)}
    lines: list[str] = []
    for node in topological(roots):
        if node.op == "var":
            if node.name not in known:
                raise InternalError(f"no value for {node.name}")
            names[node] = known[node.name]
        elif node.op == "const":
            names[node] = str(node.value)
        else:
            source = OPERATORS[node.op].python.format(
                *(names[a] for a in node.args),
                m=_mask(node.width),
                w=node.width,
                a=node.args[0].width,
                b=node.args[-1].width,
                p=node.params[0] if node.params else 0,
                q=node.params[1] if len(node.params) > 1 else 0,
            )
            names[node] = f"t{len(lines)}"
            lines.append(f"    {names[node]} = {source}\n")
    result = "".join(f"{names[root]}, " for root in roots)
    source = f"def step({', '.join(known.values())}):\n{''.join(lines)}    return ({result})\n"
    scope: dict[str, Any] = dict(_HELPERS)
    exec(source, scope)
    function: Callable[..., tuple[int, ...]] = scope["step"]
    return function


# -- arrays ------------------------------------------------------------------------------------------------


def arrays(roots: Sequence[Expr], values: Mapping[str, np.ndarray]) -> list[np.ndarray]:
    """The roots' values for many assignments at once.

    `values` maps each variable to an array of unsigned integers, all of one length. The results have that
    length. Words of up to 64 bits are uint64; if any is wider, all are arrays of Python integers.
    """
    import numpy as np

    order = topological(roots)
    wide = any(node.width > 64 for node in order)
    kind: Any = object if wide else np.uint64
    length = len(next(iter(values.values()))) if values else 1
    memo: dict[Expr, np.ndarray] = {}
    uses: dict[Expr, int] = {}
    for node in order:
        for arg in node.args:
            uses[arg] = uses.get(arg, 0) + 1
    for root in roots:
        uses[root] = uses.get(root, 0) + 1
    with np.errstate(over="ignore", divide="ignore"):
        for node in order:
            if node.op == "const":
                memo[node] = np.full(length, node.value, dtype=kind)
            elif node.op == "var":
                if node.name not in values:
                    raise InternalError(f"no values for {node.name}")
                memo[node] = values[node.name].astype(kind)
            else:
                memo[node] = _array_node(node, [memo[a] for a in node.args], kind)
                for arg in node.args:
                    uses[arg] -= 1
                    if not uses[arg]:
                        del memo[arg]
    return [memo[root] for root in roots]


def _array_node(node: Expr, args: Sequence[np.ndarray], kind: Any) -> np.ndarray:
    import numpy as np

    width = node.width
    # Of a word that is too wide for numpy's the elements are Python integers.
    number: Any = int if kind is object else kind
    one, mask = number(1), number(_mask(width))

    def flip(a: np.ndarray, bits: int) -> np.ndarray:
        # Adding the sign bit maps signed order onto unsigned order.
        return np.asarray(a ^ number(1 << (bits - 1)))

    match node.op:
        case "bvnot":
            out = args[0] ^ mask
        case "bvneg":
            out = ((args[0] ^ mask) + one) & mask
        case "bvand":
            out = args[0] & args[1]
        case "bvor":
            out = args[0] | args[1]
        case "bvxor":
            out = args[0] ^ args[1]
        case "bvadd":
            out = (args[0] + args[1]) & mask
        case "bvsub":
            out = (args[0] + (args[1] ^ mask) + one) & mask
        case "bvmul":
            out = (args[0] * args[1]) & mask
        case "bvudiv" | "bvurem":
            safe = np.where(args[1] == 0, one, args[1])
            if node.op == "bvudiv":
                out = np.where(args[1] == 0, mask, args[0] // safe)
            else:
                out = np.where(args[1] == 0, args[0], args[0] % safe)
        case "bvsdiv" | "bvsrem":
            helper = _sdiv if node.op == "bvsdiv" else _srem
            out = np.array([helper(int(a), int(b), width) for a, b in zip(*args, strict=True)], dtype=kind)
        case "bvshl" | "bvlshr" | "bvashr":
            out = _array_shift(node.op, args[0], args[1], width, kind)
        case "concat":
            out = (args[0] << number(node.args[1].width)) | args[1]
        case "extract":
            out = (args[0] >> number(int(node.params[1]))) & mask
        case "zero_extend":
            out = args[0]
        case "sign_extend":
            below = node.args[0].width
            negative = (args[0] >> number(below - 1)) == one
            out = np.where(negative, args[0] | number(_mask(width) ^ _mask(below)), args[0])
        case "ite":
            out = np.where(args[0] == one, args[1], args[2])
        case "eq":
            out = args[0] == args[1]
        case "bvult":
            out = args[0] < args[1]
        case "bvslt":
            bits = node.args[0].width
            out = flip(args[0], bits) < flip(args[1], bits)
        case _:
            raise InternalError(f"unknown operator {node.op}")
    # Comparisons are numbers, too, so that they can be joined to a word.
    return (
        np.asarray(out).astype(np.uint8).astype(kind) if out.dtype == bool else np.asarray(out).astype(kind)
    )


def _array_shift(op: str, a: np.ndarray, by: np.ndarray, width: int, kind: Any) -> np.ndarray:
    import numpy as np

    if kind is object:
        table = {"bvshl": lambda x, n: x << n & _mask(width), "bvlshr": lambda x, n: x >> n}
        table["bvashr"] = lambda x, n: _signed(x, width) >> n & _mask(width)
        pairs = zip(a, by, strict=True)
        return np.array([table[op](int(x), min(int(n), width)) for x, n in pairs], dtype=object)
    small = np.minimum(by, kind(width - 1))
    beyond = by >= kind(width)
    if op == "bvshl":
        return np.asarray(np.where(beyond, kind(0), (a << small) & kind(_mask(width))))
    shifted = a >> small
    if op == "bvlshr":
        return np.asarray(np.where(beyond, kind(0), shifted))
    negative = (a >> kind(width - 1)) == kind(1)
    # Ones move in from above: what a logical shift leaves zero is filled for negative words.
    filled = shifted | (kind(_mask(width)) ^ (kind(_mask(width)) >> small))
    high = np.where(beyond, kind(_mask(width)), filled)
    return np.asarray(np.where(negative, high, np.where(beyond, kind(0), shifted)))


# -- z3 ----------------------------------------------------------------------------------------------------


def z3_terms(
    roots: Sequence[Expr], memo: dict[Expr, z3.ExprRef] | None = None, context: z3.Context | None = None
) -> list[z3.ExprRef]:
    """The roots as z3 bit-vector terms of a context, z3's own unless given; variables keep their names. A memo may be
    shared between calls that are of one context."""
    import z3

    memo = {} if memo is None else memo
    bit = (z3.BitVecVal(1, 1, context), z3.BitVecVal(0, 1, context))
    binary_terms: dict[str, Callable[[Any, Any], Any]] = {
        "bvand": lambda a, b: a & b, "bvor": lambda a, b: a | b, "bvxor": lambda a, b: a ^ b,
        "bvadd": lambda a, b: a + b, "bvsub": lambda a, b: a - b, "bvmul": lambda a, b: a * b,
        "bvudiv": z3.UDiv, "bvurem": z3.URem, "bvsdiv": lambda a, b: a / b, "bvsrem": z3.SRem,
        "bvshl": lambda a, b: a << b, "bvlshr": z3.LShR, "bvashr": lambda a, b: a >> b, "concat": z3.Concat,
        "eq": lambda a, b: z3.If(a == b, *bit), "bvult": lambda a, b: z3.If(z3.ULT(a, b), *bit),
        "bvslt": lambda a, b: z3.If(a < b, *bit),
    }  # fmt: skip
    for node in topological(roots):
        if node in memo:
            continue
        args: list[Any] = [memo[a] for a in node.args]
        match node.op:
            case "const":
                memo[node] = z3.BitVecVal(node.value, node.width, context)
            case "var":
                memo[node] = z3.BitVec(node.name, node.width, context)
            case "bvnot":
                memo[node] = ~args[0]
            case "bvneg":
                memo[node] = -args[0]
            case "extract":
                memo[node] = z3.Extract(int(node.params[0]), int(node.params[1]), args[0])
            case "zero_extend":
                memo[node] = z3.ZeroExt(int(node.params[0]), args[0])
            case "sign_extend":
                memo[node] = z3.SignExt(int(node.params[0]), args[0])
            case "ite":
                memo[node] = z3.If(args[0] == bit[0], args[1], args[2])
            case _:
                memo[node] = binary_terms[node.op](args[0], args[1])
    return [memo[root] for root in roots]


# -- text --------------------------------------------------------------------------------------------------


def symbol(name: str) -> str:
    """A name as a quoted SMT-LIB symbol; the two characters that can't stand in one are written as their codes."""
    return "|" + name.replace("%", "%25").replace("\\", "%5c").replace("|", "%7c") + "|"


def smtlib(goal: Expr, title: str = "") -> str:
    """An SMT-LIB 2.6 QF_BV script that is satisfiable iff some assignment makes the one-bit goal 1."""
    lines = [f"; {title}"] if title else []
    defined, names = _defined([goal])
    lines += ["(set-logic QF_BV)", *defined, f"(assert (= {names[goal]} #b1))", "(check-sat)"]
    return "\n".join(lines) + "\n"


def smtlib_definitions(named: Mapping[str, Expr]) -> str:
    """SMT-LIB 2.6 text that declares the variables and defines each of the named expressions over them."""
    lines, names = _defined(list(named.values()), taken=named)
    for name, root in named.items():
        lines.append(f"(define-fun {symbol(name)} () (_ BitVec {root.width}) {names[root]})")
    return "\n".join(lines) + "\n"


def _defined(roots: Sequence[Expr], taken: Iterable[str] = ()) -> tuple[list[str], dict[Expr, str]]:
    """Declarations of the variables and definitions of the nodes below the roots, and what each is called."""
    order = topological(roots)
    names = {node: symbol(node.name) for node in order if node.op == "var"}
    used = [*names.values(), *map(symbol, taken)]
    if len(set(used)) != len(used):
        raise InternalError("two names that are one SMT-LIB symbol")
    # A quoted symbol and the same one without quotes are one symbol, so a register may be called t0.
    prefix = "t"
    while any(name.startswith(f"|{prefix}") and name[len(prefix) + 1 : -1].isdigit() for name in used):
        prefix += "_"
    lines = [f"(declare-const {name} (_ BitVec {node.width}))" for node, name in names.items()]
    count = 0
    for node in order:
        if node.op == "var":
            continue
        if node.op == "const":
            names[node] = f"(_ bv{node.value} {node.width})"
            continue
        names[node] = f"{prefix}{count}"
        count += 1
        lines.append(f"(define-fun {names[node]} () (_ BitVec {node.width}) {_smt_node(node, names)})")
    return lines, names


def _smt_node(node: Expr, names: Mapping[Expr, str]) -> str:
    args = [names[a] for a in node.args]
    name = OPERATORS[node.op].smt
    match node.op:
        case "extract":
            return f"((_ extract {node.params[0]} {node.params[1]}) {args[0]})"
        case "zero_extend" | "sign_extend":
            return f"((_ {name} {node.params[0]}) {args[0]})"
        case "ite":
            return f"(ite (= {args[0]} #b1) {args[1]} {args[2]})"
        case "eq" | "bvult" | "bvslt":
            return f"(ite ({name} {args[0]} {args[1]}) #b1 #b0)"
    return f"({name} {' '.join(args)})"


def text(root: Expr) -> str:
    """Stable text for people and tests: shared nodes are written out again, deep ones are cut short."""
    rendered: dict[Expr, str] = {}
    for node in topological([root]):
        if node.op == "const":
            rendered[node] = f"{node.width}'d{node.value}"
        elif node.op == "var":
            rendered[node] = node.name
        else:
            inner = " ".join([*(rendered[a] for a in node.args), *map(str, node.params)])
            full = f"({node.op} {inner})"
            rendered[node] = full if len(full) <= 2000 else f"({node.op} …)"
    return rendered[root]
