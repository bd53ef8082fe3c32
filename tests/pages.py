"""HTML files read back, for tests: every element closed in its place, and what a page says of itself holds."""

from __future__ import annotations

import hashlib
import re
from base64 import b64encode
from dataclasses import dataclass, field
from html.parser import HTMLParser

VOID = {"br", "col", "hr", "meta"}
"""Elements without an end (WHATWG HTML, section 13.1.2), of those that the pages use."""


@dataclass
class Node:
    """An element, with its attributes and what is in it."""

    name: str
    attributes: dict[str, str | None]
    inside: list[Node | str] = field(default_factory=list)

    def all(self, *names: str) -> list[Node]:
        """The elements of these names below this one, in order."""
        found: list[Node] = []
        for part in self.inside:
            if isinstance(part, Node):
                found += [part] if part.name in names or not names else []
                found += part.all(*names)
        return found

    def of(self, kind: str) -> list[Node]:
        """The elements of that class below this one."""
        return [node for node in self.all() if kind in (node.attributes.get("class") or "").split()]

    def get(self, identifier: str) -> Node:
        """The element with that identifier."""
        (found,) = [node for node in self.all() if node.attributes.get("id") == identifier]
        return found

    @property
    def text(self) -> str:
        return "".join(part if isinstance(part, str) else part.text for part in self.inside)


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.stack = [Node("", {})]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(set(names)) == len(names), (tag, attrs)
        node = Node(tag, dict(attrs))
        self.stack[-1].inside.append(node)
        if tag not in VOID:
            self.stack.append(node)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        # Only elements of SVG may be written so.
        assert any(node.name == "svg" for node in self.stack), tag
        self.stack[-1].inside.append(Node(tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert tag not in VOID
        assert self.stack.pop().name == tag

    def handle_data(self, data: str) -> None:
        self.stack[-1].inside.append(data)

    def handle_comment(self, data: str) -> None:
        raise AssertionError(data)


def page(text: str) -> Node:
    """The page's elements. Raises AssertionError where it is not well-formed, or breaks what all pages promise: no
    script, no network, no style but its own, identifiers that are unique and exist where they are meant, pictures that
    are told in words, headings in order, tables with headings."""
    assert text.startswith("<!DOCTYPE html>\n")
    assert not re.search(r"[\x00-\x09\x0b-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069]", text)
    reader = _Reader()
    reader.feed(text)
    reader.close()
    (root,) = reader.stack
    _harmless(root)
    _linked(root)
    _readable(root)
    return root


def _harmless(root: Node) -> None:
    for node in root.all():
        assert node.name not in (
            "script",
            "link",
            "img",
            "iframe",
            "object",
            "embed",
            "base",
            "form",
            "use",
            "a:href",
        )
        for name, value in node.attributes.items():
            assert not name.startswith("on"), node
            assert name not in ("style", "src", "srcset", "xlink:href", "action", "background")
            assert name != "href" or (value or "").startswith("#"), value
            assert "url(" not in (value or "").replace(" ", "") or name == "content"
    (style,) = root.all("style")
    assert "url(" not in style.text
    assert "@import" not in style.text
    digest = b64encode(hashlib.sha256(style.text.encode()).digest()).decode()
    policies = [n for n in root.all("meta") if n.attributes.get("http-equiv") == "Content-Security-Policy"]
    (policy,) = [node.attributes["content"] for node in policies]
    assert policy == f"default-src 'none'; style-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    # It has to come before anything that it is to forbid.
    head = root.all("head")[0]
    assert [node.attributes for node in head.all()][1].get("http-equiv") == "Content-Security-Policy"


def _linked(root: Node) -> None:
    identifiers = [node.attributes["id"] for node in root.all() if "id" in node.attributes]
    assert len(set(identifiers)) == len(identifiers)
    for node in root.all():
        for name in ("aria-labelledby", "aria-describedby"):
            if name in node.attributes:
                assert node.attributes[name] in identifiers
        if node.name == "a":
            assert (node.attributes["href"] or "")[1:] in identifiers


def _readable(root: Node) -> None:
    for name in ("html", "head", "body", "main", "header", "footer", "h1"):
        assert len(root.all(name)) == 1, name
    assert len(root.all("head")[0].all("title")) == 1
    assert root.all("html")[0].attributes["lang"] == "en"
    level = 0
    for heading in root.all("h1", "h2", "h3", "h4", "h5", "h6"):
        assert int(heading.name[1]) <= level + 1, heading.text
        level = int(heading.name[1])
        assert heading.text.strip()
    for picture in root.all("svg"):
        if picture.attributes.get("aria-hidden") != "true":
            assert picture.attributes["role"] == "img"
            assert [node.name for node in picture.inside if isinstance(node, Node)][:2] == ["title", "desc"]
            assert all(node.text.strip() for node in picture.all("title", "desc"))
    for table in root.all("table"):
        width = len(table.all("thead")[0].all("th"))
        assert all(node.attributes.get("scope") == "col" for node in table.all("thead")[0].all("th"))
        for row in table.all("tbody")[0].all("tr"):
            assert len(row.all("th", "td")) == width
            assert row.all("th")[0].attributes["scope"] == "row"
