"""Surgery on expressions: nodes replaced, bits cut out, what is read found.

All that `prover.expr` builds is simplified as it is built, operand by operand; these walks look deeper.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence

from prover import expr as e
from prover.expr import Expr
from prover.verilog.deep import Task, run


class Replacer:
    """Replaces nodes and simplifies what stands above them; what was done once is kept for the next root."""

    def __init__(self, by_node: Mapping[Expr, Expr]) -> None:
        self.memo: dict[Expr, Expr] = dict(by_node)

    def __call__(self, root: Expr) -> Expr:
        memo = self.memo
        stack = [root]
        while stack:
            node = stack[-1]
            if node in memo:
                stack.pop()
                continue
            missing = [a for a in node.args if a not in memo]
            if missing:
                stack += missing
            else:
                stack.pop()
                memo[node] = e.rebuild(node, [memo[a] for a in node.args])
        return memo[root]


def replace(roots: Sequence[Expr], by_node: Mapping[Expr, Expr]) -> list[Expr]:
    """The roots with whole nodes replaced and everything above them simplified."""
    replacer = Replacer(by_node)
    return [replacer(root) for root in roots]


class Search:
    """Tells whether expressions read some bits of a variable; what was searched once isn't searched again."""

    def __init__(self, variable: Expr, mask: int) -> None:
        self.variable, self.mask = variable, mask
        self.without: set[Expr] = set()

    def reads(self, root: Expr) -> bool:
        """Does the root read any of the bits?"""
        if root is self.variable:
            return True
        stack = [root]
        while stack:
            node = stack.pop()
            if node in self.without:
                continue
            if self.variable in node.args:
                bits = (1 << self.variable.width) - 1
                if node.op == "extract":
                    bits = ((1 << (int(node.params[0]) + 1)) - 1) ^ ((1 << int(node.params[1])) - 1)
                if bits & self.mask:
                    return True
            self.without.add(node)
            stack += (a for a in node.args if a is not self.variable)
        return False


def joined(parts: Sequence[Expr]) -> Expr:
    """The parts as one word, the first uppermost, in a balanced tree: cutting it up again is quick."""
    level = list(parts)
    while len(level) > 1:
        pairs = [e.concat(level[i], level[i + 1]) for i in range(0, len(level) - 1, 2)]
        level = pairs + level[len(level) - 1 :] if len(level) % 2 else pairs
    return level[0]


def cut(word: Expr, high: int, low: int, memo: dict[tuple[Expr, int, int], Expr] | None = None) -> Expr:
    """Bits high..low of the word, with the selection carried down through all that works bit by bit."""
    return run(_cut(word, high, low, {} if memo is None else memo))


def _cut(word: Expr, high: int, low: int, memo: dict[tuple[Expr, int, int], Expr]) -> Task[Expr]:
    if low == 0 and high == word.width - 1:
        return word
    known = memo.get((word, high, low))
    if known is not None:
        return known
    op, args = word.op, word.args
    made: Expr
    if op in ("bvnot", "bvand", "bvor", "bvxor"):
        parts = []
        for a in args:
            part: Expr = yield _cut(a, high, low, memo)
            parts.append(part)
        made = e.rebuild(word, parts)
    elif low == 0 and op in ("bvadd", "bvsub", "bvmul", "bvneg"):
        # The lower bits of a sum hang on the operands' lower bits only.
        parts = []
        for a in args:
            lower: Expr = yield _cut(a, high, 0, memo)
            parts.append(lower)
        made = e.rebuild(word, parts)
    elif op == "bvadd" and (still := min(low, _zeros_below(args))):
        # Where a constant is zero nothing is carried.
        upper = []
        for a in args:
            higher: Expr = yield _cut(a, high, still, memo)
            upper.append(higher)
        made = e.extract(e.bvadd(*upper), high - still, low - still)
    elif op in ("bvadd", "bvsub", "bvmul", "bvneg") and high < word.width - 1:
        sum_: Expr = yield _cut(word, high, 0, memo)
        made = e.extract(sum_, high, low)
    elif op == "ite":
        then: Expr = yield _cut(args[1], high, low, memo)
        other: Expr = yield _cut(args[2], high, low, memo)
        made = e.ite(args[0], then, other)
    elif op == "concat" and low < args[1].width <= high:
        above: Expr = yield _cut(args[0], high - args[1].width, 0, memo)
        below: Expr = yield _cut(args[1], args[1].width - 1, low, memo)
        made = e.concat(above, below)
    elif op in ("concat", "extract", "zero_extend", "sign_extend"):
        made = e.extract(word, high, low)
        # The simplified selection may lie over something that works bit by bit again.
        if made.op == "extract" and made.args[0] is not word:
            made = yield _cut(made.args[0], int(made.params[0]), int(made.params[1]), memo)
    else:
        made = e.extract(word, high, low)
    memo[word, high, low] = made
    return made


def _zeros_below(args: Sequence[Expr]) -> int:
    """How many of the lowest bits are zero in one of the words for certain."""
    return max(((a.value & -a.value).bit_length() - 1 for a in args if a.is_const and a.value), default=0)


def reads(roots: Iterable[Expr]) -> dict[str, int]:
    """Which bits of which variables the roots read: a mask for each name."""
    found: dict[str, int] = {}

    def add(node: Expr, mask: int) -> None:
        if not node.name.startswith("?"):
            found[node.name] = found.get(node.name, 0) | mask

    roots = list(roots)
    for root in roots:
        if root.op == "var":
            add(root, (1 << root.width) - 1)
    for node in e.topological(roots):
        for a in node.args:
            if a.op == "var" and node.op == "extract":
                high, low = int(node.params[0]), int(node.params[1])
                add(a, ((1 << (high + 1)) - 1) ^ ((1 << low) - 1))
            elif a.op == "var":
                add(a, (1 << a.width) - 1)
    return found


def runs(mask: int) -> Iterator[tuple[int, int]]:
    """The stretches of ones in a mask, as (high, low), from the bottom."""
    low = 0
    while mask >> low:
        low += (mask >> low & -(mask >> low)).bit_length() - 1
        size = (~(mask >> low) & (mask >> low) + 1).bit_length() - 1
        yield low + size - 1, low
        low += size


def assume(word: Expr, condition: Expr) -> Expr:
    """The word, simplified where the condition holds; equal to it there, and anything elsewhere."""
    facts: dict[Expr, Expr] = {}
    stack = [(condition, e.TRUE)]
    while stack:
        node, value = stack.pop()
        facts[node] = value
        if node.op == "bvnot":
            stack.append((node.args[0], e.bvnot(value)))
        elif (node.op == "bvand" and value is e.TRUE) or (node.op == "bvor" and value is e.FALSE):
            stack += ((a, value) for a in node.args)
    return replace([word], facts)[0]


def masked(word: Expr, mask: int, memo: dict[tuple[Expr, int, int], Expr]) -> Expr:
    """The word with all bits outside the mask 0, and nothing left of what they were."""
    parts, above = [], 0
    for high, low in runs(mask):
        if low > above:
            parts.append(e.const(0, low - above))
        parts.append(cut(word, high, low, memo))
        above = high + 1
    if above < word.width:
        parts.append(e.const(0, word.width - above))
    return joined(parts[::-1])
