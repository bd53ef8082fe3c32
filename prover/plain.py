"""Reports as plain data and back: what goes from one process to another, and into the ledger.

A value is a list of nodes, each a list that starts with the node's kind and refers to earlier nodes by their number;
the last one is the value. Shared parts stay shared. Only this program's frozen dataclasses are made from it, by their
fields; nothing in the data is ever run. Expressions are taken as they are, with nothing simplified. Places in the
sources, also those that a text names as FILE:LINE, are given as anchors where there is one, and come back as the
places in the sources of that time.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from fractions import Fraction
from functools import cache
from importlib import import_module
from typing import Any

from prover import expr as e
from prover import formula
from prover.content import Content
from prover.design import Design
from prover.errors import InternalError, UserError, Where
from prover.expr import Expr
from prover.formula import Formula

Data = list[list[Any]]

SHORT = 1 << 62
"""Numbers from here on are written in hexadecimal, which takes no longer the longer they are."""


class Unreadable(Exception):
    """Data that stands for nothing."""


def freeze(value: object, content: Content | None = None) -> tuple[Data, bool]:
    """The value as plain data, and whether every place in it is an anchor in the content. Raises TypeError for a
    value that has no such form."""
    nodes: Data = []
    numbers: dict[object, int] = {}
    anchored = True
    # What is in here is alive until the end, so no identity is used twice.
    stack: list[tuple[object, tuple[object, ...] | None]] = [(value, None)]
    while stack:
        thing, parts = stack.pop()
        key = _key(thing)
        if key in numbers:
            continue
        if parts is None:
            parts = _parts(thing)
            if parts:
                stack.append((thing, parts))
                stack += [(part, None) for part in reversed(parts)]
                continue
        if isinstance(thing, Where):
            anchor = content.anchor(thing) if content is not None else None
            anchored &= anchor is not None
            node = ["where", thing.file, thing.line, thing.column, thing.text]
            node = node if anchor is None else ["anchor", anchor]
        elif isinstance(thing, str) and content is not None and (said := content.split(thing)):
            anchored &= None not in said
            node = ["is", thing] if None in said else ["said", *said]
        else:
            node = _node(thing, [numbers[_key(part)] for part in parts])
        numbers[key] = len(nodes)
        nodes.append(node)
    return nodes, anchored


def _key(thing: object) -> object:
    """By what a thing is known again: small things by value, others by identity."""
    if thing is None or isinstance(thing, (bool, int, str, float)):
        return type(thing), thing
    if type(thing) is tuple and _are_short(thing):
        return "ints", thing
    return id(thing)


def _are_short(things: tuple[object, ...]) -> bool:
    return all(type(thing) is int and -SHORT < thing < SHORT for thing in things)


def _parts(thing: object) -> tuple[object, ...]:
    """What a thing consists of."""
    if isinstance(thing, Expr):
        return (*thing.params, *thing.args)
    if isinstance(thing, (tuple, list)):
        return () if _are_short(tuple(thing)) else tuple(thing)
    if isinstance(thing, Mapping):
        return tuple(part for pair in thing.items() for part in pair)
    if isinstance(thing, (set, frozenset)):
        return tuple(sorted(thing))
    if dataclasses.is_dataclass(thing) and not isinstance(thing, (type, Where, Formula)):
        return tuple(getattr(thing, name) for name in _fields(type(thing)))
    return ()


def _node(thing: object, parts: list[int]) -> list[Any]:
    if isinstance(thing, int) and not isinstance(thing, bool) and not -SHORT < thing < SHORT:
        return ["hex", hex(thing)]
    if thing is None or isinstance(thing, (bool, int, str, float)):
        return ["is", thing]
    if isinstance(thing, Fraction):
        return ["fraction", hex(thing.numerator), hex(thing.denominator)]
    if isinstance(thing, Formula):
        return ["formula", thing.text]
    if isinstance(thing, Expr):
        return ["expr", thing.op, thing.width, len(thing.params), *parts]
    for kind, of in (("tuple", tuple), ("list", list), ("dict", Mapping), ("set", (set, frozenset))):
        if isinstance(thing, of):
            short = isinstance(thing, (tuple, list)) and not parts
            return [f"{kind} of ints", *thing] if short else [kind, *parts]
    if dataclasses.is_dataclass(thing) and not isinstance(thing, type):
        name = f"{type(thing).__module__}.{type(thing).__qualname__}"
        if _class(name) is type(thing):
            return ["of", name, *parts]
    raise TypeError(f"{type(thing).__name__} has no plain form")


@cache
def _fields(of: Any) -> tuple[str, ...]:
    """The fields that a dataclass is made from, in order."""
    return tuple(field.name for field in dataclasses.fields(of) if field.init)


@cache
def _class(name: str) -> Any:
    """This program's frozen dataclass of that name. Raises Unreadable for anything else."""
    module, _, inner = name.rpartition(".")
    try:
        if not module.startswith("prover."):
            raise ImportError
        found = vars(import_module(module)).get(inner)
    except ImportError:
        found = None
    if not isinstance(found, type) or not dataclasses.is_dataclass(found) or found.__module__ != module:
        raise Unreadable(f"{name} is no class of this program's data")
    if not vars(found)["__dataclass_params__"].frozen:
        raise Unreadable(f"{name} is no class of this program's data")
    return found


def thaw(data: object, content: Content | None = None) -> Any:
    """The value that the data stands for, its places and files those of the content. Raises Unreadable for data that
    stands for nothing."""
    try:
        if not isinstance(data, list) or not data:
            raise Unreadable("no nodes")
        made: list[Any] = []
        for node in data:
            made.append(_thawed(node, made, content))
        return made[-1]
    except (
        TypeError,
        ValueError,
        LookupError,
        AttributeError,
        ArithmeticError,
        InternalError,
        UserError,
    ) as fault:
        raise Unreadable(f"{type(fault).__name__}: {fault}") from None


def _thawed(node: list[Any], made: list[Any], content: Content | None) -> Any:
    kind, *rest = node
    if kind == "is":
        (value,) = rest
        if value is None or isinstance(value, (bool, int, str, float)):
            return value
        raise Unreadable("a value of no kind")
    if kind == "said":
        if content is None:
            raise Unreadable("an anchor without sources")
        return "".join(part if isinstance(part, str) else str(content.place(part)) for part in rest)
    if kind == "hex":
        return int(rest[0], 16)
    if kind == "fraction":
        return Fraction(int(rest[0], 16), int(rest[1], 16))
    if kind == "where":
        return Where(*rest)
    if kind == "anchor":
        if content is None:
            raise Unreadable("an anchor without sources")
        return content.place(rest[0])
    if kind == "formula":
        return formula.read(rest[0], "a formula")
    if kind == "tuple of ints":
        return tuple(rest)
    if kind == "list of ints":
        return rest
    if kind == "expr":
        op, width, count, *numbers = rest
        parts = [_part(made, number) for number in numbers]
        return e.node(op, width, tuple(parts[count:]), tuple(parts[:count]))
    if kind == "of":
        name, *numbers = rest
        of = _class(name)
        values = [_part(made, number) for number in numbers]
        thing = of(**dict(zip(_fields(of), values, strict=True)))
        if isinstance(thing, Design) and content is not None:
            thing = dataclasses.replace(thing, files=content.files, sha256=content.sha256)
        return thing
    parts = [_part(made, number) for number in rest]
    if kind == "dict":
        return dict(zip(parts[::2], parts[1::2], strict=True))
    return {"tuple": tuple, "list": list, "set": frozenset}[kind](parts)


def _part(made: list[Any], number: int) -> Any:
    """An earlier node. Raises IndexError where there is none."""
    if number < 0:
        raise IndexError(number)
    return made[number]
