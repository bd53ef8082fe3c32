"""The two kinds of failure: the user's, which names a place and a remedy, and ours."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Where:
    """A position in a source file; line and column count from 1, text is the line as written."""

    file: str
    line: int
    column: int = 1
    text: str = ""

    def __str__(self) -> str:
        return f"{self.file}:{self.line}"


class UserError(Exception):
    """Input or usage that can't be accepted: what is wrong, where it stands, and what to do about it."""

    def __init__(self, message: str, where: Where | None = None, hint: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.where = where
        self.hint = hint

    def __str__(self) -> str:
        lines = [f"{self.where}: {self.message}" if self.where else self.message]
        if self.where and self.where.text.strip():
            text = self.where.text.replace("\t", " ")
            lines.append(f"    {text}")
            lines.append("    " + " " * (self.where.column - 1) + "^")
        if self.hint:
            lines.append(f"hint: {self.hint}")
        return "\n".join(lines)


class InternalError(Exception):
    """A fault of this program: a broken invariant, or a certificate that its own search can't uphold."""
