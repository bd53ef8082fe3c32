"""Evidence of a claim on each value of some inputs: that of the values judged singly, and the proof of all others.

As with `evidence`, nothing in it is believed, and reading is strict. Polynomials are lists of a coefficient and the
inputs that it is multiplied with, each with its shift to the right.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from prover import evidence
from prover.evidence import (
    DEEPEST,
    LONGEST,
    Evidence,
    Malformed,
    Object,
    answer_of,
    each_of,
    fields_of,
    list_of,
    number_of,
    text_of,
)
from prover.family import Course, Everywhere, Held, Layer, Pass, Piece, Point, Proof, Starts, Track
from prover.forms import Atom, Poly
from prover.solve import Model

Widths = Mapping[str, int]

MOST_ATOMS = 8
"""Inputs that are multiplied with one another."""


@dataclass(frozen=True, slots=True)
class AllAtOnce:
    """The proof of all values that are not judged singly.

    settling, reset, glitches  the answers that bound the micro-steps, those with reset held as well (None where
                reset plays no part), and those to the questions about glitches
    proof       the pieces with their courses; the values that are judged singly are not in it
    bound       half-cycles within which every state recovers, None where nothing is claimed of power-up states
    """

    settling: tuple[Model | None, ...]
    reset: tuple[Model | None, ...] | None
    glitches: tuple[Model | None, ...]
    proof: Proof
    bound: int | None


@dataclass(frozen=True, slots=True)
class ValuesEvidence:
    """What the verdicts on all values rest on: the evidence of each that is judged singly, in order, and the proof of
    the others."""

    singly: tuple[tuple[dict[str, int], Evidence], ...]
    together: AllAtOnce | None


# -- writing -----------------------------------------------------------------------------------------------


def as_object(found: ValuesEvidence) -> Object:
    """The evidence as dictionaries and lists."""
    return {
        "singly": [{"at": dict(values), **evidence.as_object(each)} for values, each in found.singly],
        "together": None if found.together is None else _together(found.together),
    }


def _together(of: AllAtOnce) -> Object:
    proof = of.proof
    return {
        "settling": list(of.settling),
        "reset": None if of.reset is None else list(of.reset),
        "glitches": list(of.glitches),
        "bound": of.bound,
        "gaps": proof.gaps,
        "high": proof.high,
        "release": proof.release,
        "starts": None
        if proof.starts is None
        else [{**_piece(piece), **_starts(starts)} for piece, starts in proof.starts],
        "everywhere": None
        if proof.everywhere is None
        else [
            {**_piece(piece), "layers": [_layer(layer) for layer in everywhere.layers]}
            for piece, everywhere in proof.everywhere
        ],
    }


def _piece(piece: Piece) -> Object:
    return {
        "rests": [[name, shift, rest] for name, _, shift, rest in piece.rests],
        "guards": [_poly(guard) for guard in piece.guards],
        "cases": list(piece.cases),
    }


def _poly(poly: Poly) -> list[Any]:
    return [[int(c), *([name, shift] for name, _, shift in monomial)] for monomial, c in poly.terms]


def _starts(starts: Starts) -> Object:
    held = starts.held
    return {
        "half_cycles": None if held is None else held.half_cycles,
        "held": [] if held is None else [[_poly(value) for value in state] for state in held.states],
        "courses": [_course(course) for course in starts.courses],
    }


def _course(course: Course) -> Object:
    return {"lead": _track(course.lead), "loop": _track(course.loop)}


def _track(track: Track) -> list[Object]:
    return [
        {"state": [_poly(value) for value in part.state], "level": part.level}
        if isinstance(part, Point)
        else {"times": _poly(part.times), "stride": list(part.stride), "body": _track(part.body)}
        for part in track
    ]


def _layer(layer: Layer) -> Object:
    courses = [
        {**_course(course), "behind": behind, "recovery": _poly(recovery)}
        for course, (behind, recovery) in zip(layer.courses, layer.recoveries, strict=True)
    ]
    return {
        "registers": list(layer.names),
        "unrolled": layer.unrolled,
        "merge": layer.merge,
        "courses": courses,
    }


# -- reading -----------------------------------------------------------------------------------------------


def read(value: Any, widths: Widths) -> ValuesEvidence:
    """The evidence in an object; `widths` are those of the inputs. Raises Malformed."""
    of = fields_of(value, "evidence", "singly together")
    singly = []
    for number, each in enumerate(list_of(of["singly"], "singly")):
        if not isinstance(each, dict) or "at" not in each:
            raise Malformed(f"singly/{number}: no values")
        at = fields_of(each["at"], f"singly/{number}/at", " ".join(widths))
        values = {name: number_of(at[name], f"singly/{number}/at/{name}", 0) for name in widths}
        singly.append((values, evidence.read({k: v for k, v in each.items() if k != "at"})))
    together = None if of["together"] is None else _Reader(widths).together(of["together"])
    return ValuesEvidence(tuple(singly), together)


class _Reader:
    def __init__(self, widths: Widths) -> None:
        self.widths = widths

    def together(self, value: Any) -> AllAtOnce:
        names = "settling reset glitches bound gaps high release starts everywhere"
        of = fields_of(value, "together", names)
        for name in ("gaps", "high", "release"):
            if not isinstance(of[name], bool):
                raise Malformed(f"together/{name}: neither true nor false")
        answers = {
            name: None if of[name] is None else each_of(of[name], f"together/{name}", answer_of)
            for name in ("settling", "reset", "glitches")
        }
        bound = of["bound"]
        proof = Proof(
            starts=None if of["starts"] is None else each_of(of["starts"], "starts", self.starts),
            everywhere=None
            if of["everywhere"] is None
            else each_of(of["everywhere"], "everywhere", self.everywhere),
            gaps=of["gaps"],
            high=of["high"],
            release=of["release"],
            singly=(),
        )
        if answers["settling"] is None or answers["glitches"] is None:
            raise Malformed("together: answers missing")
        return AllAtOnce(
            settling=answers["settling"],
            reset=answers["reset"],
            glitches=answers["glitches"],
            proof=proof,
            bound=None if bound is None else number_of(bound, "together/bound", 0),
        )

    def starts(self, value: Any, where: str) -> tuple[Piece, Starts]:
        of = fields_of(value, where, "rests guards cases half_cycles held courses")
        held = None
        if of["half_cycles"] is not None:
            count = number_of(of["half_cycles"], f"{where}/half_cycles", 0, LONGEST)
            held = Held(count, each_of(of["held"], f"{where}/held", self.state))
        elif of["held"] != []:
            raise Malformed(f"{where}/held: states that nothing leaves")
        return self.piece(of, where), Starts(held, self.courses(of["courses"], f"{where}/courses"))

    def everywhere(self, value: Any, where: str) -> tuple[Piece, Everywhere]:
        of = fields_of(value, where, "rests guards cases layers")
        return self.piece(of, where), Everywhere(each_of(of["layers"], f"{where}/layers", self.layer))

    def layer(self, value: Any, where: str) -> Layer:
        of = fields_of(value, where, "registers unrolled merge courses")
        courses, recoveries = [], []
        for number, each in enumerate(list_of(of["courses"], f"{where}/courses")):
            here = f"{where}/courses/{number}"
            inner = fields_of(each, here, "lead loop behind recovery")
            courses.append(self.course({name: inner[name] for name in ("lead", "loop")}, here))
            behind = number_of(inner["behind"], f"{here}/behind", 0)
            recoveries.append((behind, self.poly(inner["recovery"], f"{here}/recovery")))
        unrolled = of["unrolled"]
        return Layer(
            names=each_of(of["registers"], f"{where}/registers", text_of),
            courses=tuple(courses),
            recoveries=tuple(recoveries),
            unrolled=None if unrolled is None else number_of(unrolled, f"{where}/unrolled", 0, LONGEST),
            merge=number_of(of["merge"], f"{where}/merge", 0, LONGEST),
        )

    def piece(self, of: Mapping[str, Any], where: str) -> Piece:
        rests = []
        listed = list_of(of["rests"], f"{where}/rests")
        for number, (name, each) in enumerate(zip(self.widths, listed, strict=False)):
            here = f"{where}/rests/{number}"
            parts = list_of(each, here)
            if len(parts) != 3 or parts[0] != name:
                raise Malformed(f"{here}: not {name}, a shift and a rest")
            shift = number_of(parts[1], here, 0, self.widths[name])
            rests.append((name, self.widths[name], shift, number_of(parts[2], here, 0, (1 << shift) - 1)))
        if len(listed) != len(self.widths):
            raise Malformed(f"{where}/rests: not one for each input")
        cases = list_of(of["cases"], f"{where}/cases")
        if any(not isinstance(case, bool) for case in cases):
            raise Malformed(f"{where}/cases: neither true nor false")
        return Piece(tuple(rests), each_of(of["guards"], f"{where}/guards", self.poly), tuple(cases))

    def courses(self, value: Any, where: str) -> tuple[Course, ...]:
        return each_of(value, where, self.course)

    def course(self, value: Any, where: str) -> Course:
        of = fields_of(value, where, "lead loop")
        return Course(self.track(of["lead"], f"{where}/lead", 0), self.track(of["loop"], f"{where}/loop", 0))

    def track(self, value: Any, where: str, depth: int) -> Track:
        if depth > DEEPEST:
            raise Malformed(f"{where}: more than {DEEPEST} repeats within one another")
        parts: list[Point | Pass] = []
        for number, each in enumerate(list_of(value, where)):
            here = f"{where}/{number}"
            if isinstance(each, dict) and "times" in each:
                of = fields_of(each, here, "times stride body")
                stride = each_of(of["stride"], f"{here}/stride", lambda x, at: number_of(x, at, 0))
                body = self.track(of["body"], f"{here}/body", depth + 1)
                parts.append(Pass(self.poly(of["times"], f"{here}/times"), stride, body))
            else:
                of = fields_of(each, here, "state level")
                level = number_of(of["level"], f"{here}/level", 0, 1)
                parts.append(Point(self.state(of["state"], f"{here}/state"), level))
        return tuple(parts)

    def state(self, value: Any, where: str) -> tuple[Poly, ...]:
        return each_of(value, where, self.poly)

    def poly(self, value: Any, where: str) -> Poly:
        terms: dict[tuple[Atom, ...], Fraction] = {}
        for number, each in enumerate(list_of(value, where)):
            coefficient, *atoms = list_of(each, f"{where}/{number}") or [None]
            if not isinstance(coefficient, int) or isinstance(coefficient, bool) or not coefficient:
                raise Malformed(f"{where}/{number}: no whole number that is not 0")
            monomial = tuple(self.atom(atom, f"{where}/{number}") for atom in atoms)
            if len(monomial) > MOST_ATOMS or list(monomial) != sorted(monomial) or monomial in terms:
                raise Malformed(f"{where}/{number}: a product that is not written as it should be")
            terms[monomial] = Fraction(coefficient)
        made = Poly.of(terms)
        if [m for m, _ in made.terms] != list(terms):
            raise Malformed(f"{where}: products out of order")
        return made

    def atom(self, value: Any, where: str) -> Atom:
        parts: Sequence[Any] = list_of(value, where)
        if len(parts) != 2 or not isinstance(parts[0], str) or parts[0] not in self.widths:
            raise Malformed(f"{where}: not an input and a shift")
        return parts[0], self.widths[parts[0]], number_of(parts[1], where, 0, self.widths[parts[0]])
