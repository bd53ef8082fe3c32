"""The comment block at the head of a case: what to ask of it, and what has to come out.

Prose first; then lines of the form `// key: value`. A `check` line opens a group: the options of one run of the
command, and under it what that run has to say; so does a `compare` line, after those. Times are half-cycles. A line that is none of the known kinds is an
error, so that nothing that a case states goes unread.
"""

from __future__ import annotations

import re
import shlex
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

CASES = Path(__file__).parents[1] / "cases"
FOLDERS = ("gauge", "faulty", "published", "refused")
PROPERTIES = ("ratio", "high-time", "no-stuck", "recovery", "settling", "glitch-free", "reset")
WHILE_MOVING = ("ratio-change", "enable")
VERDICTS = {"proved", "refuted", "open"}


class FormatError(Exception):
    """A comment block that says something this reader doesn't know."""


@dataclass(frozen=True)
class Stated:
    """What a group states of one property."""

    verdicts: frozenset[str]
    worst: int | None = None
    exact: bool = False
    obligation: bool = False
    held: int | None = None


@dataclass(frozen=True)
class StatedWave:
    """A wave: half-cycles per period and of high time; a period of None never toggles, a high of None is not stated
    (several high runs)."""

    period: int | None
    high: int | None = None


@dataclass(frozen=True)
class StatedMoves:
    """What a group states of a property of inputs that move: `back` are the half-cycles after the last move until the
    ratio holds, `parked` the levels at which the output comes to stay, `run` the half-cycles of the shortest run that
    refutes."""

    verdicts: frozenset[str]
    back: int | None = None
    exact: bool = False
    parked: tuple[int, ...] = ()
    run: int | None = None


@dataclass
class Group:
    """One run of `check` on a case, and what it has to say. `error` are words of the message of a refusal, `line` the
    line that it points at; `at` is the value of the inputs of --each that is reported; `notes` are lines of the file with words of the remark that accompanies the verdict."""

    options: list[str]
    verdicts: frozenset[str] = frozenset()
    properties: dict[str, Stated] = field(default_factory=dict)
    moves: dict[str, StatedMoves] = field(default_factory=dict)
    loops: int | None = None
    false_loops: int | None = None
    stuck: bool = False
    from_reset: StatedWave | None = None
    from_initial: StatedWave | None = None
    at: str = ""
    error: list[str] = field(default_factory=list)
    line: int | None = None
    notes: list[tuple[int, str]] = field(default_factory=list)


@dataclass
class PairGroup:
    """One run of `compare`: the file is OLD, `other` is NEW, a path below `cases`. `differs` is the half-cycle of the
    old output, `settled` the half-cycles after which dividers that powered up apart agree."""

    other: str
    options: list[str]
    verdict: str = ""
    lag: int | None = None
    differs: int | None = None
    settled: int | None = None
    obligation: bool = False


@dataclass(frozen=True)
class Case:
    """A file with its groups. `delayed` are the gates and nets that the event simulator gives one unit of delay."""

    path: Path
    prose: str
    delayed: tuple[str, ...]
    groups: tuple[Group, ...]
    pairs: tuple[PairGroup, ...] = ()

    @property
    def name(self) -> str:
        """Folder and file, such as gauge/chopper_by_2.v."""
        return f"{self.path.parent.name}/{self.path.name}"


def read_case(path: Path) -> Case:
    """The case in a file. Raises FormatError for a block that can't be read."""
    prose: list[str] = []
    delayed: list[str] = []
    groups: list[Group] = []
    pairs: list[PairGroup] = []
    for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), 1):
        if not line.startswith("//"):
            break
        text = line[2:].strip()
        key, colon, value = text.partition(": ")
        try:
            if key == "unit delay" and colon:
                delayed += value.split()
            elif key == "check":
                groups.append(Group(shlex.split(value)))
            elif key == "compare":
                other, *options = shlex.split(value)
                pairs.append(PairGroup(other, options))
            elif pairs:
                _state_of_pair(pairs[-1], key, value if colon else "")
            elif groups:
                _state(groups[-1], key, value if colon else "")
            else:
                prose.append(text)
        except (ValueError, KeyError) as fault:
            raise FormatError(f"{path}:{number}: {line!r} is not understood") from fault
    if not groups and not pairs:
        raise FormatError(f"{path}: neither a check line nor a compare line")
    for pair in pairs:
        if pair.verdict not in VERDICTS or not (CASES / pair.other).is_file():
            raise FormatError(f"{path}: compare {pair.other}: no verdict, or no such file")
    for group in groups:
        if len(group.properties) > 1:
            # Most outputs are registers; a line of its own has to be given only where it is otherwise.
            group.properties.setdefault("glitch-free", Stated(frozenset({"proved"})))
            group.properties = {
                name: group.properties[name] for name in PROPERTIES if name in group.properties
            }
        if bool(group.error) == bool(group.verdicts):
            raise FormatError(
                f"{path}: check {shlex.join(group.options)}: a verdict or an error, one of the two"
            )
    return Case(path, " ".join(prose), tuple(delayed), tuple(groups), tuple(pairs))


def _state_of_pair(pair: PairGroup, key: str, value: str) -> None:
    """The same for a pair."""
    if key == "verdict":
        pair.verdict = value
    elif key == "obligation":
        pair.obligation = {"yes": True}[value]
    elif key in ("lag", "differs", "settled"):
        setattr(pair, key, int(value))
    else:
        raise KeyError(key)


def _state(group: Group, key: str, value: str) -> None:
    """Take one line into its group. Raises ValueError or KeyError for what is not known."""
    if key in PROPERTIES:
        group.properties[key] = _property(value)
    elif key in WHILE_MOVING:
        group.moves[key] = _moves(value)
    elif key == "verdict":
        group.verdicts = _verdicts(value)
    elif key == "loops":
        group.loops = int(value)
    elif key == "false loops":
        group.false_loops = int(value)
    elif key == "stuck":
        group.stuck = {"yes": True}[value]
    elif key == "from reset":
        group.from_reset = _wave(value)
    elif key == "from initial":
        group.from_initial = _wave(value)
    elif key == "at" and value:
        group.at = value
    elif key == "error" and value:
        group.error = value.split()
    elif key == "line":
        group.line = int(value)
    elif key == "note":
        line, _, words = value.partition(": ")
        group.notes.append((int(line), words))
    else:
        raise KeyError(key)


def _moves(value: str) -> StatedMoves:
    """Such as `proved, back 30, exact`, `proved, back 6, exact, parked 0` or `refuted, run 9`."""
    verdict, *parts = value.split(", ")
    exact = "exact" in parts
    numbers: dict[str, list[int]] = {}
    for part in parts:
        if part != "exact":
            word, number = part.split(" ")
            numbers.setdefault(word, []).append(int(number))
    if not set(numbers) <= {"back", "parked", "run"}:
        raise ValueError(value)
    (back,), (run,) = numbers.get("back", [None]), numbers.get("run", [None])
    return StatedMoves(_verdicts(verdict), back, exact, tuple(numbers.get("parked", ())), run)


def _verdicts(value: str) -> frozenset[str]:
    found = frozenset(value.split(" or "))
    if not found <= VERDICTS:
        raise ValueError(value)
    return found


def _property(value: str) -> Stated:
    """Such as `proved, worst 3, exact`; the words after the verdict in any order."""
    verdict, *parts = value.split(", ")
    numbers: dict[str, int] = {}
    for part in parts:
        match = re.fullmatch(r"(worst|held) (\d+)", part)
        if match:
            numbers[match[1]] = int(match[2])
        elif part not in ("exact", "obligation"):
            raise ValueError(part)
    worst, held = numbers.get("worst"), numbers.get("held")
    return Stated(_verdicts(verdict), worst, "exact" in parts, "obligation" in parts, held)


def _wave(value: str) -> StatedWave:
    if value == "never toggles":
        return StatedWave(None)
    match = re.fullmatch(r"period (\d+)(?:, high (\d+))?", value)
    if not match:
        raise ValueError(value)
    return StatedWave(int(match[1]), int(match[2]) if match[2] else None)


def cases(*folders: str) -> Iterator[Case]:
    """Every case of the folders, in order; of all FOLDERS if none is named."""
    for folder in folders or FOLDERS:
        for path in sorted((CASES / folder).glob("*.v")):
            yield read_case(path)
