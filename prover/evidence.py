"""Evidence: what the verdicts on a divider rest on, as plain data that goes into a certificate and comes out again.

Nothing in it is believed. `recheck` derives from it, and from the sources, obligations that any solver can refute,
and the verdicts. Reading is strict: whatever is not of the form that `as_object` writes is refused.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, TypeVar

from prover.accumulator import BEHIND, JOINED, Accumulator
from prover.path import Beat, Item, Path, Repeat
from prover.solve import Model
from prover.system import State
from prover.tables import Ranking, Rounds

DEEPEST = 40
"""Repeats within one another that are read."""

LONGEST = 4096
"""Half-cycles to unroll, or to hold reset, that are read."""

Object = dict[str, Any]
Read = TypeVar("Read")


class Malformed(ValueError):
    """Evidence that is not of the right form; the message says where and what."""


@dataclass(frozen=True, slots=True)
class Track:
    """A lead-in and the loop that it enters, as in an Orbit, without the widths; either may be empty."""

    lead: Path
    loop: Path


@dataclass(frozen=True, slots=True)
class Lasso:
    """A power-up state's run. `start` is the state of the whole divider, registers that were left out included."""

    track: Track
    start: State


@dataclass(frozen=True, slots=True)
class Hold:
    """Reset held.

    needs     half-cycles of reset, begun with the clock low and with it high, after which the machine is in one of
              the states, from wherever it began
    slowest   by that level a state at rest for which one half-cycle less does not do; None where none is known
    states    the states; all of them really occur
    settling  the answers from which the micro-steps under reset are bounded
    short     a state at rest after which reset as long as the user holds it does not do; None where it does
    runs      the runs after releases that begin in other states than those of `starts`, in order"""

    needs: tuple[int, int]
    slowest: tuple[State | None, State | None]
    states: tuple[State, ...]
    settling: tuple[Model | None, ...]
    short: State | None
    runs: tuple[Track, ...]


@dataclass(frozen=True, slots=True)
class Covered:
    """One orbit of a stage: its recovery in half-cycles, and the count and vector of its spread (see CoverClaim)."""

    track: Track
    recovery: int
    spread: tuple[int, State] | None


@dataclass(frozen=True, slots=True)
class Matrix:
    """The registers read as the powers of a matrix over GF(2): see `linear.Logs` and `linear.counter`."""

    columns: tuple[int, ...]
    fixed: int
    start: int
    moving: int
    level: int


@dataclass(frozen=True, slots=True)
class Layer:
    """A stage of a cover: its registers, and the numbers of `certificate.CoverClaim`."""

    registers: tuple[str, ...]
    orbits: tuple[Covered, ...]
    unrolled: int | None
    merge: int
    bound: int


@dataclass(frozen=True, slots=True)
class Evidence:
    """Everything that the verdicts rest on.

    settling    answers to the questions about micro-steps and races, in the order in which `settle` asks them: None
                where there is no such state, else values for which there is
    cone        whether registers that the output does not depend on are left out
    parts       whether of registers that the output depends on in part only that part is kept
    gray        registers in Gray code that are read as the number they stand for
    word        registers that are read as one word, lowest first; empty if there are none
    matrix      how all registers are read as one count of steps; None where they are not
    reset       the states that reset leaves, and its release; None where there is none, or where they are not certain
    starts      the runs of the start states, in order
    everywhere  about all power-up states: the stages of a cover, a ranking, a list of loops, or an accumulator
    lassos      power-up states that refute something, or that need the longest
    glitches    answers to the questions about what happens within a half-cycle, in the order in which `glitch.find`
                asks them
    pulse       the run from the state that shows a glitch
    """

    settling: tuple[Model | None, ...]
    cone: bool
    parts: bool
    gray: tuple[str, ...]
    word: tuple[str, ...]
    matrix: Matrix | None
    reset: Hold | None
    starts: tuple[Track, ...]
    everywhere: tuple[Layer, ...] | Ranking | Rounds | Accumulator | None
    lassos: tuple[Lasso, ...]
    glitches: tuple[Model | None, ...]
    pulse: Lasso | None


# -- writing -----------------------------------------------------------------------------------------------


def as_object(evidence: Evidence) -> Object:
    """The evidence as dictionaries and lists; a path that is used several times is written once, in `paths`."""
    numbers: dict[Path, int] = {}

    def track(of: Track) -> Object:
        return {"lead": number(of.lead), "loop": number(of.loop)}

    def number(path: Path) -> int | None:
        return numbers.setdefault(path, len(numbers)) if path else None

    def run(of: Lasso) -> Object:
        return {**track(of.track), "start": list(of.start)}

    out: Object = {
        "cone": evidence.cone,
        "parts": evidence.parts,
        "gray": list(evidence.gray),
        "word": list(evidence.word),
        "matrix": None if evidence.matrix is None else _matrix(evidence.matrix),
        "settling": list(evidence.settling),
        "reset": None,
        "starts": [track(of) for of in evidence.starts],
        "everywhere": _everywhere(evidence.everywhere, track),
        "lassos": [run(lasso) for lasso in evidence.lassos],
        "glitches": list(evidence.glitches),
        "pulse": None if evidence.pulse is None else run(evidence.pulse),
    }
    if evidence.reset is not None:
        out["reset"] = _hold(evidence.reset, track)
    out["paths"] = [[_item(item) for item in path] for path in numbers]
    return out


def _hold(of: Hold, track: Callable[[Track], Object]) -> Object:
    return {
        "needs": list(of.needs),
        "slowest": [None if state is None else list(state) for state in of.slowest],
        "states": [list(state) for state in of.states],
        "settling": list(of.settling),
        "short": None if of.short is None else list(of.short),
        "runs": [track(run) for run in of.runs],
    }


def _matrix(of: Matrix) -> Object:
    return {
        "columns": list(of.columns),
        "fixed": of.fixed,
        "start": of.start,
        "moving": of.moving,
        "level": of.level,
    }


def _everywhere(
    of: tuple[Layer, ...] | Ranking | Rounds | Accumulator | None, track: Callable[[Track], Object]
) -> Object | None:
    if of is None:
        return None
    if isinstance(of, Ranking):
        return {"kind": "ranking", "bound": of.bound, "phase": list(of.phase), "rank": list(of.rank)}
    if isinstance(of, Rounds):
        levels = ["".join(map(str, shown)) for shown in of.levels]
        members = [list(states) for states in of.members]
        return {"kind": "loops", "members": members, "levels": levels, "distance": list(of.distance)}
    if isinstance(of, Accumulator):
        return {"kind": "accumulator", **{name: getattr(of, name) for name in ACCUMULATOR.split()}}
    return {"kind": "cover", "stages": [_layer(layer, track) for layer in of]}


ACCUMULATOR = "register width base modulus stride level arc late behind joined worst slowest"


def _layer(layer: Layer, track: Callable[[Track], Object]) -> Object:
    orbits = [
        {
            **track(each.track),
            "recovery": each.recovery,
            "spread": None if each.spread is None else [each.spread[0], list(each.spread[1])],
        }
        for each in layer.orbits
    ]
    return {
        "registers": list(layer.registers),
        "unrolled": layer.unrolled,
        "merge": layer.merge,
        "bound": layer.bound,
        "orbits": orbits,
    }


def _item(item: Item) -> Object:
    if isinstance(item, Beat):
        return {"state": list(item.state), "level": item.level}
    return {"times": item.times, "stride": list(item.stride), "body": [_item(inner) for inner in item.body]}


# -- reading -----------------------------------------------------------------------------------------------


def read(value: Any) -> Evidence:
    """The evidence in an object. Raises Malformed."""
    of = fields_of(
        value,
        "evidence",
        "cone parts gray word matrix settling reset starts everywhere lassos glitches pulse paths",
    )
    paths = [_path(x, f"paths/{i}", 0) for i, x in enumerate(list_of(of["paths"], "paths"))]

    def track(x: Any, where: str) -> Track:
        return Track(path(x["lead"], f"{where}/lead"), path(x["loop"], f"{where}/loop"))

    def path(x: Any, where: str) -> Path:
        return () if x is None else paths[number_of(x, where, 0, len(paths) - 1)]

    def start(x: Any, where: str) -> Track:
        return track(fields_of(x, where, "lead loop"), where)

    def lasso(x: Any, where: str) -> Lasso:
        of = fields_of(x, where, "lead loop start")
        return Lasso(track(of, where), state_of(of["start"], f"{where}/start"))

    for name in ("cone", "parts"):
        if not isinstance(of[name], bool):
            raise Malformed(f"{name}: neither true nor false")
    return Evidence(
        settling=each_of(of["settling"], "settling", answer_of),
        cone=of["cone"],
        parts=of["parts"],
        gray=each_of(of["gray"], "gray", text_of),
        word=each_of(of["word"], "word", text_of),
        matrix=None if of["matrix"] is None else _read_matrix(of["matrix"]),
        reset=None if of["reset"] is None else _read_hold(of["reset"], start),
        starts=each_of(of["starts"], "starts", start),
        everywhere=_read_everywhere(of["everywhere"], track),
        lassos=each_of(of["lassos"], "lassos", lasso),
        glitches=each_of(of["glitches"], "glitches", answer_of),
        pulse=None if of["pulse"] is None else lasso(of["pulse"], "pulse"),
    )


def _read_hold(value: Any, run: Callable[[Any, str], Track]) -> Hold:
    of = fields_of(value, "reset", "needs slowest states settling short runs")
    needs = each_of(of["needs"], "reset/needs", lambda x, where: number_of(x, where, 0, LONGEST))
    slowest = each_of(of["slowest"], "reset/slowest", _state_or_none)
    if len(needs) != 2 or len(slowest) != 2:
        raise Malformed("reset: not for two levels of the clock")
    return Hold(
        (needs[0], needs[1]),
        (slowest[0], slowest[1]),
        each_of(of["states"], "reset/states", state_of),
        each_of(of["settling"], "reset/settling", answer_of),
        _state_or_none(of["short"], "reset/short"),
        each_of(of["runs"], "reset/runs", run),
    )


def _read_matrix(value: Any) -> Matrix:
    of = fields_of(value, "matrix", "columns fixed start moving level")
    return Matrix(
        each_of(of["columns"], "matrix/columns", lambda x, where: number_of(x, where, 0)),
        number_of(of["fixed"], "matrix/fixed", 0),
        number_of(of["start"], "matrix/start", 0),
        number_of(of["moving"], "matrix/moving", 0, 1),
        number_of(of["level"], "matrix/level", 0, 1),
    )


def _read_everywhere(
    value: Any, track: Callable[[Any, str], Track]
) -> tuple[Layer, ...] | Ranking | Rounds | Accumulator | None:
    if value is None:
        return None
    kind = value.get("kind") if isinstance(value, dict) else None
    if kind == "cover":
        of = fields_of(value, "everywhere", "kind stages")
        return each_of(of["stages"], "stages", lambda x, where: _read_layer(x, where, track))
    if kind == "ranking":
        of = fields_of(value, "everywhere", "kind bound phase rank")
        phase, rank = _numbers(of["phase"], "phase"), _numbers(of["rank"], "rank")
        return Ranking(phase, rank, number_of(of["bound"], "bound", 0))
    if kind == "loops":
        of = fields_of(value, "everywhere", "kind members levels distance")
        levels = each_of(of["levels"], "levels", _levels)
        members = each_of(of["members"], "members", _numbers)
        if len(members) != len(levels):
            raise Malformed("levels: not as many as loops")
        return Rounds(members, levels, _numbers(of["distance"], "distance"))
    if kind == "accumulator":
        return _read_accumulator(value)
    raise Malformed("everywhere: of no known kind")


def _read_accumulator(value: Any) -> Accumulator:
    of = fields_of(value, "everywhere", f"kind {ACCUMULATOR}")
    width = number_of(of["width"], "width", 1)
    modulus = number_of(of["modulus"], "modulus", 2, 1 << width)
    arc = each_of(of["arc"], "arc", lambda x, where: number_of(x, where, 0, modulus - 1))
    if len(arc) != 2 or not arc[1] or not isinstance(of["late"], bool):
        raise Malformed("everywhere: not an arc, or neither late nor not")
    joined = number_of(of["joined"], "joined", 0, JOINED)
    behind = number_of(of["behind"], "behind", 0, BEHIND)
    return Accumulator(
        register=text_of(of["register"], "register"),
        width=width,
        base=number_of(of["base"], "base", 0, (1 << width) - 1),
        modulus=modulus,
        stride=number_of(of["stride"], "stride", 1, modulus - 1),
        level=number_of(of["level"], "level", 0, 1),
        arc=(arc[0], arc[1]),
        late=of["late"],
        behind=behind,
        joined=joined,
        worst=number_of(of["worst"], "worst", joined, joined + behind),
        slowest=_state_or_none(of["slowest"], "slowest"),
    )


def _read_layer(value: Any, where: str, track: Callable[[Any, str], Track]) -> Layer:
    of = fields_of(value, where, "registers unrolled merge bound orbits")

    def covered(x: Any, where: str) -> Covered:
        of = fields_of(x, where, "lead loop recovery spread")
        spread = None
        if of["spread"] is not None:
            pair = list_of(of["spread"], f"{where}/spread")
            if len(pair) != 2:
                raise Malformed(f"{where}/spread: not a count and a vector")
            spread = (number_of(pair[0], f"{where}/spread", 1), state_of(pair[1], f"{where}/spread"))
        return Covered(track(of, where), number_of(of["recovery"], f"{where}/recovery", 0), spread)

    unrolled = of["unrolled"]
    return Layer(
        registers=each_of(of["registers"], f"{where}/registers", text_of),
        orbits=each_of(of["orbits"], f"{where}/orbits", covered),
        unrolled=None if unrolled is None else number_of(unrolled, f"{where}/unrolled", 0, LONGEST),
        merge=number_of(of["merge"], f"{where}/merge", 0, LONGEST),
        bound=number_of(of["bound"], f"{where}/bound", 0),
    )


def _path(value: Any, where: str, depth: int) -> Path:
    if depth > DEEPEST:
        raise Malformed(f"{where}: more than {DEEPEST} repeats within one another")
    items: list[Item] = []
    for i, x in enumerate(list_of(value, where)):
        here = f"{where}/{i}"
        if isinstance(x, dict) and "times" in x:
            of = fields_of(x, here, "times stride body")
            body = _path(of["body"], f"{here}/body", depth + 1)
            items.append(
                Repeat(
                    number_of(of["times"], f"{here}/times", 1), state_of(of["stride"], f"{here}/stride"), body
                )
            )
        else:
            of = fields_of(x, here, "state level")
            items.append(
                Beat(state_of(of["state"], f"{here}/state"), number_of(of["level"], f"{here}/level", 0, 1))
            )
    if not items:
        raise Malformed(f"{where}: nothing")
    return tuple(items)


def fields_of(value: Any, where: str, names: str) -> Mapping[str, Any]:
    if not isinstance(value, dict) or set(value) != set(names.split()):
        raise Malformed(f"{where}: not an object of {names.replace(' ', ', ')}")
    return value


def list_of(value: Any, where: str) -> list[Any]:
    if not isinstance(value, list):
        raise Malformed(f"{where}: not a list")
    return value


def each_of(value: Any, where: str, read: Callable[[Any, str], Read]) -> tuple[Read, ...]:
    return tuple(read(x, f"{where}/{i}") for i, x in enumerate(list_of(value, where)))


def number_of(value: Any, where: str, least: int, most: int | None = None) -> int:
    if not isinstance(value, int) or isinstance(value, bool):
        raise Malformed(f"{where}: not a whole number")
    if value < least or (most is not None and value > most):
        raise Malformed(f"{where}: {value} is out of range")
    return value


def _numbers(value: Any, where: str) -> tuple[int, ...]:
    return each_of(value, where, lambda x, here: number_of(x, here, -1))


def state_of(value: Any, where: str) -> State:
    return each_of(value, where, lambda x, here: number_of(x, here, 0))


def _state_or_none(value: Any, where: str) -> State | None:
    return None if value is None else state_of(value, where)


def text_of(value: Any, where: str) -> str:
    if not isinstance(value, str):
        raise Malformed(f"{where}: not a text")
    return value


def _levels(value: Any, where: str) -> tuple[int, ...]:
    text = text_of(value, where)
    if not set(text) <= {"0", "1"}:
        raise Malformed(f"{where}: not levels")
    return tuple(map(int, text))


def answer_of(value: Any, where: str) -> Model | None:
    if value is None:
        return None
    if not isinstance(value, dict):
        raise Malformed(f"{where}: neither null nor values")
    return {name: number_of(x, f"{where}/{name}", 0) for name, x in value.items()}


def layers_of(stages: Sequence[Any]) -> tuple[Layer, ...]:
    """The stages of a cover as evidence."""
    return tuple(
        Layer(
            registers=tuple(stage.system.names),
            orbits=tuple(
                Covered(Track(run.lead, run.loop), recovery, spread)
                for run, recovery, spread in zip(
                    stage.claim.orbits, stage.claim.recoveries, stage.claim.spreads, strict=True
                )
            ),
            unrolled=stage.claim.unrolled,
            merge=stage.claim.merge,
            bound=stage.claim.bound,
        )
        for stage in stages
    )
