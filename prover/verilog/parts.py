"""Literals, and parts of words read and written: selects of bits, parts and memory words.

IEEE 1364-2005 clauses 3.5.1 (numbers) and 5.2.1 (selects). What lies outside a word is any value when read,
and dropped when written.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

from prover import expr as e
from prover.expr import Expr
from prover.verilog.names import MAX_WIDTH, Constant, Net, Report, Type
from prover.verilog.words import cut, joined

# More than the widest word takes, and fewer than Python refuses to read.
MAX_DIGITS = 4_000
_RADIX = {"b": 1, "o": 3, "h": 4}


@dataclass(frozen=True, slots=True)
class Place:
    """A net or a part of it: `word` picks a memory's word, `low` the lowest bit, both counted from 0 at the
    bottom. A number is a constant; an expression is signed and wide enough not to wrap."""

    net: Net | Constant
    word: int | Expr | None
    low: int | Expr
    width: int
    signed: bool


# -- literals ----------------------------------------------------------------------------------------------


@lru_cache(maxsize=4096)
def literal(text: str) -> Constant:
    """The constant that a number stands for (clause 3.5.1). Raises ValueError with the reason if none."""
    text = re.sub(r"\s|_", "", text).lower()
    size, tick, rest = text.partition("'")
    if len(size) > MAX_DIGITS:
        raise ValueError(f"a number of more than {MAX_DIGITS} digits")
    if not tick:
        number = int(size)
        # Without a size a number has at least 32 bits; a larger one has as many as it needs.
        return Constant(number, 0, 0, Type(max(32, number.bit_length() + 1), True), sized=False)
    signed = rest.startswith("s")
    base, digits = rest[signed], rest[signed + 1 :]
    bits, x, z = _decimal(digits) if base == "d" else _digits(digits, base)
    natural = max(1, len(digits) * _RADIX[base] if base != "d" else bits.bit_length())
    width = int(size) if size else max(32, natural if natural > 32 or base != "d" else 32)
    if not 1 <= width <= MAX_WIDTH:
        raise ValueError(f"a width of {width} bits")
    if digits[0] in "xz?" and width > natural:
        fill = ((1 << width) - 1) ^ ((1 << natural) - 1)
        x, z = (x | fill, z) if digits[0] == "x" else (x, z | fill)
    mask = (1 << width) - 1
    return Constant(bits & mask, x & mask, z & mask, Type(width, signed), bool(size))


def _decimal(digits: str) -> tuple[int, int, int]:
    if digits in ("x", "z", "?"):
        return 0, *((1, 0) if digits == "x" else (0, 1))
    if not digits.isdecimal():
        raise ValueError(f"{digits!r} is no decimal number")
    if len(digits) > MAX_DIGITS:
        raise ValueError(f"a number of more than {MAX_DIGITS} digits")
    return int(digits), 0, 0


def _digits(digits: str, base: str) -> tuple[int, int, int]:
    shift = _RADIX[base]
    if len(digits) > MAX_WIDTH:
        raise ValueError(f"a number of more than {MAX_WIDTH} digits")
    planes = []
    for mapping in ("0", "x", "z"):
        ones = format((1 << shift) - 1, "x")
        hexed = []
        for digit in digits:
            known = digit not in "xz?"
            if known and int(digit, 36) >= 1 << shift:
                raise ValueError(f"digit {digit!r} in a number of base {1 << shift}")
            if mapping == "0":
                hexed.append(digit if known else "0")
            else:
                hexed.append(ones if (digit == "x") == (mapping == "x") and not known else "0")
        planes.append(int("".join(hexed), 1 << shift))
    return planes[0], planes[1], planes[2]


def constant_word(report: Report, constant: Constant, to: Type) -> Expr:
    """The word of a constant in a context; each run of x or z bits is a fresh choice."""
    width, unknown = constant.type.width, constant.x | constant.z
    if not unknown:
        return e.resize(e.const(constant.bits, width), to.width, to.signed)
    if not constant.sized and unknown >> (width - 1) & 1 and to.width > width:
        # A leading x or z without a size goes on to the left (clause 3.5.1).
        unknown |= ((1 << to.width) - 1) ^ ((1 << width) - 1)
        width = to.width
    parts, low = [], 0
    while low < width:
        high = low
        while high + 1 < width and (unknown >> (high + 1) & 1) == (unknown >> low & 1):
            high += 1
        size = high - low + 1
        parts.append(report.choice(size) if unknown >> low & 1 else e.const(constant.bits >> low, size))
        low = high + 1
    return e.resize(e.concat_all(parts[::-1]), to.width, to.signed)


# -- parts of words ----------------------------------------------------------------------------------------


def read_part(report: Report, place: Place, whole: Expr) -> Expr:
    """The bits that the place picks; what lies outside is a choice."""
    word = whole
    if isinstance(place.net, Net) and place.net.words:
        size = place.net.type.width
        if isinstance(place.word, int):
            word = cut(whole, place.word * size + size - 1, place.word * size)
        else:
            assert place.word is not None
            count = place.net.count
            word = report.choice(size)
            if _fits(place.word, count):
                count -= 1
                word = cut(whole, count * size + size - 1, count * size)
            for k in reversed(range(count)):
                here = cut(whole, k * size + size - 1, k * size)
                word = e.ite(e.eq(place.word, e.const(k, place.word.width)), here, word)
    if isinstance(place.low, int):
        return cut(word, place.low + place.width - 1, place.low)
    if _fits(place.low, word.width - place.width + 1):
        return _shifted(word, place.low, place.width)
    # The word with choices on both sides, so that a part that sticks out reads its inner bits exactly.
    more = place.width
    padded = e.concat_all([report.choice(more), word, report.choice(more)])
    low, inside = _offset(place.low, more, word.width)
    return e.ite(inside, _shifted(padded, low, place.width), report.choice(place.width))


def write_part(place: Place, whole: Expr, value: Expr) -> Expr:
    """The whole word with the bits that the place picks replaced; what lies outside is dropped."""
    net = place.net
    assert isinstance(net, Net)
    if not net.words:
        return _put(whole, place.low, place.width, value)
    size = net.type.width
    if isinstance(place.word, int):
        low = place.word * size
        if isinstance(place.low, int):
            return _put(whole, low + place.low, place.width, value)
        word = cut(whole, low + size - 1, low)
        return _put(whole, low, size, _put(word, place.low, place.width, value))
    words = [cut(whole, k * size + size - 1, k * size) for k in range(net.count)]
    for k, word in enumerate(words):
        assert place.word is not None
        here = e.eq(place.word, e.const(k, place.word.width))
        words[k] = e.ite(here, _put(word, place.low, place.width, value), word)
    return joined(words[::-1])


def written_mask(place: Place) -> int:
    """The bits of the whole word that a write to the place may reach."""
    net = place.net
    assert isinstance(net, Net)
    size = net.type.width
    inner = (1 << size) - 1
    if isinstance(place.low, int):
        inner = ((1 << place.width) - 1) << place.low
    if isinstance(place.word, int):
        return inner << place.word * size
    return sum(inner << k * size for k in range(net.count)) if net.words else inner


def _fits(low: Expr, width: int) -> bool:
    """A position that was only widened from an unsigned index can't be negative nor reach the width."""
    return low.op == "zero_extend" and 1 << low.args[0].width <= width


def _offset(low: Expr, more: int, width: int) -> tuple[Expr, Expr]:
    """The position counted from `more` bits below, and whether any picked bit lies inside the word."""
    size = max(low.width, (width + 2 * more).bit_length()) + 2
    moved = e.bvadd(e.resize(low, size, signed=True), e.const(more, size))
    inside = e.bvand(e.bvslt(e.const(0, size), moved), e.bvslt(moved, e.const(width + more, size)))
    return moved, inside


def _shifted(word: Expr, low: Expr, width: int) -> Expr:
    size = max(word.width, low.width)
    moved = e.binary("bvlshr", e.resize(word, size, False), e.resize(low, size, False))
    return cut(moved, width - 1, 0)


def _put(word: Expr, low: int | Expr, width: int, value: Expr) -> Expr:
    if isinstance(low, int):
        parts = [value]
        if low + width < word.width:
            parts.insert(0, cut(word, word.width - 1, low + width))
        if low:
            parts.append(cut(word, low - 1, 0))
        return e.concat_all(parts)
    if width == 1 and word.width <= 64:
        bits = [
            e.ite(e.eq(low, e.const(i, low.width)), value, cut(word, i, i))
            if i >> (low.width - 1) == 0
            else cut(word, i, i)
            for i in range(word.width)
        ]
        return joined(bits[::-1])
    moved, inside = _offset(low, width, word.width)
    size = max(word.width + 2 * width, moved.width)
    amount = e.resize(moved, size, False)
    padded = e.zero_extend(e.concat(word, e.const(0, width)), size - word.width - width)
    hole = e.bvnot(e.binary("bvshl", e.const((1 << width) - 1, size), amount))
    filled = e.binary("bvshl", e.resize(value, size, False), amount)
    changed = e.bvor(e.bvand(padded, hole), filled)
    return e.ite(inside, cut(changed, width + word.width - 1, width), word)
