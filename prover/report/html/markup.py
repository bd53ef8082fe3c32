"""Elements of HTML and SVG as text. Whatever is put into one is escaped, unless an element made it.

Names and messages come from sources that anyone may have written. There is no other way into the page than through
here: a plain string is a text, and only what `element` made is markup.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from html import escape

from prover.output import harmless

VOID = frozenset({"br", "col", "hr", "meta"})
CLOSED = frozenset({"circle", "line", "path", "rect"})
"""Elements of SVG that have no content here."""


class Markup(str):
    """Text that is markup already."""

    __slots__ = ()


Content = str | Iterable[str] | None
Attribute = str | int | float | bool | None


def text(content: str) -> Markup:
    """A text as markup: control characters as escapes, and nothing in it that means anything to a browser."""
    return content if isinstance(content, Markup) else Markup(escape(harmless(content), quote=True))


_LONG = re.compile(r"(?<![\w=.'$-])\d{5,}(?![\w.])|(?<=\d) (?=%)")


def prose(content: str) -> Markup:
    """A text with the digits of long numbers set in threes, as a reader sees it; copied, the numbers are as before.
    A per cent sign stays with its number. Numbers in names, after an equals sign and with a point stay as they
    are."""
    if isinstance(content, Markup):
        return content
    parts: list[Markup] = []
    at = 0
    for found in _LONG.finditer(content):
        parts.append(text(content[at : found.start()]))
        parts.append(_in_threes(found[0]) if found[0] != " " else Markup("&nbsp;"))
        at = found.end()
    return Markup("".join([*parts, text(content[at:])]))


def _in_threes(digits: str) -> Markup:
    first = len(digits) % 3 or 3
    rest = (element("span", digits[at : at + 3]) for at in range(first, len(digits), 3))
    return element("span", digits[:first], rest, class_="digits")


def number(value: float) -> str:
    """A length in pixels with one decimal at most, so that it reads the same on every machine."""
    rounded = round(value, 1)
    return str(int(rounded)) if rounded == int(rounded) else str(rounded)


def element(name: str, /, *content: Content, **attributes: Attribute) -> Markup:
    """The element with its content in order. An attribute's trailing underscore is dropped and others become
    hyphens (`class_`, `aria_label`); one that is None or False is left out, one that is True has no value."""
    head = name + "".join(_attribute(key, value) for key, value in attributes.items())
    inside = joined(content)
    if name in VOID:
        return Markup(f"<{head}>")
    if name in CLOSED and not inside:
        return Markup(f"<{head}/>")
    return Markup(f"<{head}>{inside}</{name}>")


def _attribute(key: str, value: Attribute) -> str:
    if value is None or value is False:
        return ""
    name = key.rstrip("_").replace("_", "-")
    if value is True:
        return f" {name}"
    told = number(value) if isinstance(value, int | float) else value
    return f' {name}="{text(told)}"'


def joined(content: Iterable[Content]) -> Markup:
    """Contents one after another."""
    parts: list[str] = []
    for item in content:
        if isinstance(item, str):
            parts.append(text(item))
        elif item is not None:
            parts += (text(part) for part in item)
    return Markup("".join(parts))
