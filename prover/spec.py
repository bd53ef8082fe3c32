"""What the user claims and chooses: one frozen dataclass carries every option; texts are read here."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from math import ceil
from typing import Literal

from prover.errors import UserError
from prover.formula import Formula

StartScope = Literal["reset", "initial", "any"]

Ranges = tuple[tuple[int, int], ...]
"""Values of an input: ranges with both ends in them, none of them overlapping, the lowest first."""

PLAIN_RATIO = re.compile(r"\s*[-+]?[0-9_.]{1,100}(/[0-9_]{1,100})?\s*")
PLAIN_NUMBER = re.compile(r"\s*[-+]?[0-9][\w']*\s*")
"""Numbers as such; any other ratio or high time is a formula."""

EACH_HINT = "such as --each div, --each div=1..15 or --each sel=0,2,8..15"

UNITS = {"": 1, "k": 10**3, "M": 10**6, "G": 10**9}


@dataclass(frozen=True)
class Spec:
    """A claim about one divider.

    ratio         N, in input cycles per output period; None to measure instead of claiming
    mean          whether the ratio is that of the mean gap, every gap being one of the two whole numbers next to it
    high          H, half-cycles per period in which the output is 1; None means N, and with `mean` no claim
    ratio_formula, high_formula  the same as formulas, which take the place of the numbers until these are computed
    each          inputs for each of whose values the claim is made; None: all values of the port
    where         conditions on these values: the claim is made where none of them is 0
    moving        inputs that may move between any two edges, and the values that they take; None: all of the port
    module        top module; None if the sources leave one choice
    clock, reset, output  ports by name; reset may end in `=0` or `=1`, its active level. None: by use
    parameters, holds, defines  name to value or text
    include       folders for `include
    start         where the ratio is claimed from; None: reset if there is one, else initial values, else any
    within        limit on the recovery, in half-cycles
    reset_cycles  input cycles for which reset is held; None: as long as it needs
    waivers       property name to reason
    fin           frequency of the input clock, in Hz
    source_duty   range of the input clock's high fraction, in per cent
    effort        seconds
    """

    ratio: Fraction | None = None
    mean: bool = False
    high: int | None = None
    ratio_formula: Formula | None = None
    high_formula: Formula | None = None
    each: Mapping[str, Ranges | None] = field(default_factory=dict)
    where: tuple[Formula, ...] = ()
    moving: Mapping[str, Ranges | None] = field(default_factory=dict)
    module: str | None = None
    clock: str | None = None
    reset: str | None = None
    output: str | None = None
    parameters: Mapping[str, int] = field(default_factory=dict)
    holds: Mapping[str, int] = field(default_factory=dict)
    defines: Mapping[str, str] = field(default_factory=dict)
    include: tuple[str, ...] = ()
    start: StartScope | None = None
    within: int | None = None
    reset_cycles: int | None = None
    waivers: Mapping[str, str] = field(default_factory=dict)
    fin: Fraction | None = None
    source_duty: tuple[Fraction, Fraction] | None = None
    effort: float = 60.0

    def __post_init__(self) -> None:
        if self.reset_cycles is not None and self.reset_cycles < 1:
            raise UserError(
                f"--reset-cycles {self.reset_cycles}: no time for which reset is held",
                hint="give a number of input cycles, 1 or more",
            )
        if self.ratio is None:
            if not self.claims and (self.high is not None or self.high_formula is not None):
                raise UserError("a high time without a ratio", hint="give --ratio as well")
            return
        if self.ratio <= 0 or (not self.mean and (2 * self.ratio).denominator != 1):
            other = ", or claim it as a mean with --mean" if self.ratio > 0 else ""
            raise UserError(
                f"ratio {self.ratio_text}: an output period has to be a whole number of half-cycles",
                hint=f"give a positive multiple of 0.5, such as 3 or 2.5{other}",
            )
        if self.ratio < 1:
            raise UserError(
                f"ratio {self.ratio_text}: the shortest period that a divider can make is one input cycle",
                hint="give a ratio of at least 1",
            )
        if self.mean:
            most = ceil(2 * self.ratio) - 1
            if self.high is not None and not 0 < self.high <= most:
                raise UserError(
                    f"high time {self.high}: not within a gap of {most} half-cycles or less",
                    hint=f"give --high between 1 and {most}, or leave it out",
                )
            return
        if self.high is None and self.ratio.denominator != 1:
            raise UserError(
                f"ratio {self.ratio_text}: half of {self.period} half-cycles is no whole number of half-cycles",
                hint=f"give the high time with --high, 1 to {self.period - 1} half-cycles",
            )
        if not 0 < self.high_half_cycles < self.period:
            raise UserError(
                f"high time {self.high_half_cycles}: not within a period of {self.period} half-cycles",
                hint=f"give --high between 1 and {self.period - 1}",
            )

    @property
    def claims(self) -> bool:
        """Whether a ratio is claimed, as a number or as a formula that is still to be computed."""
        return self.ratio is not None or self.ratio_formula is not None

    @property
    def period(self) -> int:
        """2N: half-cycles per output period. A ValueError for a mean, which has no one period."""
        if self.ratio is None or self.mean:
            raise ValueError("no period")
        return int(2 * self.ratio)

    @property
    def high_half_cycles(self) -> int:
        """H: half-cycles per period in which the output is 1."""
        if self.high is not None:
            return self.high
        return self.period // 2

    @property
    def ratio_text(self) -> str:
        """The ratio as people write it: 3, 2.5."""
        if self.ratio is None:
            return ""
        if self.ratio.denominator == 1:
            return str(self.ratio.numerator)
        if self.ratio.denominator == 2 and self.ratio > 0:
            return f"{self.ratio.numerator // 2}.5"
        return str(self.ratio)


def read_ratio(text: str) -> Fraction:
    """A ratio as written on the command line: 3, 2.5, 5/2, 50_000_001."""
    try:
        # No exponents: 1e999999999 would fill the memory before it is found to be nonsense.
        if not PLAIN_RATIO.fullmatch(text):
            raise ValueError
        return Fraction(text.replace("_", "").strip())
    except (ValueError, ZeroDivisionError):
        raise UserError(f"ratio '{text}' is not a number", hint="such as 3, 2.5 or 5/2") from None


def read_each(text: str, option: str = "--each") -> tuple[str, Ranges | None]:
    """An input and the values that it takes: div, div=1..15, sel=0,2,8..15."""
    hint = EACH_HINT.replace("--each", option)
    name, equals, values = text.partition("=")
    if not name.strip() or (equals and not values.strip()):
        raise UserError(f"{option} '{text}' names no input and no values", hint=hint)
    if not equals:
        return name.strip(), None
    ranges: list[tuple[int, int]] = []
    for part in values.split(","):
        low, dots, high = part.partition("..")
        ends = (
            read_number(low, f"{option} {text}:"),
            read_number(high if dots else low, f"{option} {text}:"),
        )
        if not 0 <= ends[0] <= ends[1]:
            raise UserError(f"{option} {text}: '{part}' holds no values", hint=hint)
        ranges.append(ends)
    joined: list[tuple[int, int]] = []
    for low_end, high_end in sorted(ranges):
        if joined and low_end <= joined[-1][1] + 1:
            joined[-1] = (joined[-1][0], max(joined[-1][1], high_end))
        else:
            joined.append((low_end, high_end))
    return name.strip(), tuple(joined)


def read_number(text: str, option: str) -> int:
    """A value as users write it: 12, 1_000, 0x1f, or a Verilog literal such as 8'h1f."""
    plain = text.replace("_", "").strip()
    literal = re.fullmatch(r"\d*'s?([bodh])([0-9a-f]+)", plain.lower())
    try:
        if len(plain) > 1000:
            raise ValueError
        if literal:
            return int(literal[2], {"b": 2, "o": 8, "d": 10, "h": 16}[literal[1]])
        return int(plain, 0)
    except ValueError:
        raise UserError(
            f"{option} '{text}' is not a whole number", hint="such as 12, 0x1f or 8'h1f"
        ) from None


def read_frequency(text: str) -> Fraction:
    """A frequency in Hz: 50MHz, 32.768kHz, 1e6."""
    match = re.fullmatch(r"\s*([0-9._]+(?:e[0-9]{1,2})?)\s*([kMG]?)(?:Hz)?\s*", text)
    try:
        if not match:
            raise ValueError
        value = Fraction(match[1].replace("_", "")) * UNITS[match[2]]
    except ValueError:
        raise UserError(f"--fin '{text}' is not understood", hint="such as 50MHz or 32.768kHz") from None
    if value <= 0:
        raise UserError(f"--fin '{text}' is not positive", hint="such as 50MHz")
    return value


def read_duty_range(text: str) -> tuple[Fraction, Fraction]:
    """A range of the source's duty in per cent: 45..55, or 50."""
    low, dots, high = text.partition("..")
    try:
        if not re.fullmatch(r"[0-9. ]{1,100}", text):
            raise ValueError
        ends = Fraction(low.strip()), Fraction((high if dots else low).strip())
    except (ValueError, ZeroDivisionError):
        raise UserError(
            f"--source-duty '{text}' is not understood", hint="such as 45..55, in per cent"
        ) from None
    if not 0 < ends[0] <= ends[1] < 100:
        raise UserError(f"--source-duty '{text}' is not a range within 0 to 100", hint="such as 45..55")
    return ends


def read_pair(text: str, option: str) -> tuple[str, str]:
    """NAME=TEXT."""
    name, equals, value = text.partition("=")
    if not equals or not name.strip():
        raise UserError(f"{option} '{text}' is not of the form NAME=VALUE", hint=f"such as {option} N=5")
    return name.strip(), value.strip()
