"""What a terminal can show, and texts made fit for it."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass

from prover.output import harmless

GREEN, RED, YELLOW = "32", "31", "33"
COLOURS = {
    "PROVED": GREEN,
    "MEASURED": GREEN,
    "ACCEPTED": GREEN,
    "REFUTED": RED,
    "REJECTED": RED,
    "ERROR": RED,
    "FAULT": RED,
    "EXPIRED": RED,
    "OPEN": YELLOW,
    "GIVEN UP": YELLOW,
}
"""Of the words that lines begin with."""

ASCII_TEXT = str.maketrans({"‾": "~", "…": "...", "µ": "u", "·": "*", "−": "-", "÷": "/", "→": "->"})


@dataclass(frozen=True, slots=True)
class Look:
    """What the terminal can show: characters beyond ASCII, and colour."""

    unicode: bool = True
    colour: bool = False


PLAIN = Look()


def finished(lines: Iterable[str], look: Look) -> str:
    """The lines as text for a terminal that looks so."""
    text = harmless("\n".join(lines))
    if not look.unicode:
        text = text.translate(ASCII_TEXT)
    return _coloured(text) if look.colour else text


def _coloured(text: str) -> str:
    words = "|".join(COLOURS)
    return re.sub(
        rf"(?m)^(verdict  )?({words})\b", lambda m: f"{m[1] or ''}\x1b[1;{COLOURS[m[2]]}m{m[2]}\x1b[0m", text
    )
