"""Sources with something wrong in them: bytes flipped, lines dropped, tokens swapped, from seeds."""

from __future__ import annotations

import random
import re
from pathlib import Path

CASES = Path(__file__).parents[1] / "cases"
_TOKEN = re.compile(rb"\s+|[A-Za-z_`$][\w$]*|\d[\w']*|<=|>=|==|&&|\|\||.", re.DOTALL)


def sources() -> list[Path]:
    """Every Verilog file of the cases, in order, but those that are wrong already."""
    return sorted(path for path in CASES.rglob("*.v") if path.parent.name != "refused")


def fuzzed(seed: int, texts: list[bytes]) -> bytes:
    """One of the texts with one to four things done to it, always the same for a seed."""
    r = random.Random(seed)
    text = r.choice(texts)
    for _ in range(r.randrange(1, 5)):
        text = r.choice([_flip, _drop, _double, _swap, _swap, _borrow, _cut])(r, text, texts)
    return text


def _flip(r: random.Random, text: bytes, texts: list[bytes]) -> bytes:
    out = bytearray(text)
    for _count in range(r.randrange(1, 4)):
        if out:
            out[r.randrange(len(out))] = (
                r.randrange(256) if r.random() < 0.3 else r.choice(b"01;()[]{}<=~&|'`\\\" \n#@?:")
            )
    return bytes(out)


def _drop(r: random.Random, text: bytes, _: list[bytes]) -> bytes:
    lines = text.split(b"\n")
    del lines[r.randrange(len(lines))]
    return b"\n".join(lines)


def _double(r: random.Random, text: bytes, _: list[bytes]) -> bytes:
    lines = text.split(b"\n")
    at = r.randrange(len(lines))
    return b"\n".join([*lines[:at], lines[at], *lines[at:]])


def _swap(r: random.Random, text: bytes, _: list[bytes]) -> bytes:
    tokens = _TOKEN.findall(text)
    solid = [i for i, token in enumerate(tokens) if token.strip()]
    if len(solid) < 2:
        return text
    a, b = r.sample(solid, 2)
    tokens[a], tokens[b] = tokens[b], tokens[a]
    return b"".join(tokens)


def _borrow(r: random.Random, text: bytes, texts: list[bytes]) -> bytes:
    """A token of another file in the place of one of this."""
    tokens, others = _TOKEN.findall(text), _TOKEN.findall(r.choice(texts))
    if tokens and others:
        tokens[r.randrange(len(tokens))] = r.choice(others)
    return b"".join(tokens)


def _cut(r: random.Random, text: bytes, _: list[bytes]) -> bytes:
    return text[: r.randrange(len(text) // 2, len(text) + 1)]
