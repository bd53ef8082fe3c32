"""What a shell is offered to complete an argument with: paths, and the modules in the files that are given already.

It runs at every press of a key, so nothing is parsed and nothing heavy imported: the sources are skimmed.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from pathlib import Path

import click
from click.shell_completion import BashComplete, CompletionItem, add_completion_class

MOST_READ = 1 << 20
"""Bytes of a file that are looked at for modules."""

MODULE = re.compile(r"^\s*module\s+(?:automatic\s+|static\s+)?(\\\S+|[A-Za-z_][\w$]*)", re.MULTILINE)

Items = list[CompletionItem]


class Bash(BashComplete):
    """As click has it, but that no blank comes after a sign that something has to follow."""

    source_template = BashComplete.source_template.replace(
        "COMPREPLY+=($value)\n", "COMPREPLY+=($value)\n            [[ $value == *= ]] && compopt -o nospace\n"
    )


add_completion_class(Bash)


def files(context: click.Context, parameter: click.Parameter, begun: str) -> Items:
    """Any file or folder: the shell knows best which."""
    return [CompletionItem(begun, type="file")]


def folders(context: click.Context, parameter: click.Parameter, begun: str) -> Items:
    """Folders only."""
    return [CompletionItem(begun, type="dir")]


def modules(context: click.Context, parameter: click.Parameter, begun: str) -> Items:
    """The modules that the files before it define."""
    # An option without its value ends the parsing of a command: what was found until then is left over.
    given = [*(context.params.get("files") or ()), *context.args]
    names = dict.fromkeys(name for path in given for name in _modules_in(path))
    return [CompletionItem(name) for name in names if name.startswith(begun)]


def _modules_in(path: str) -> Iterator[str]:
    try:
        if os.path.isfile(path):
            with Path(path).open(encoding="utf-8", errors="replace") as source:
                yield from MODULE.findall(source.read(MOST_READ))
    except OSError:
        # A file that can't be read is told of when the command runs.
        return


def properties(context: click.Context, parameter: click.Parameter, begun: str) -> Items:
    """The properties, with the sign that a reason follows."""
    from properties import ALL

    return [CompletionItem(f"{name}=") for name in ALL if name.startswith(begun)]
