"""A clausal proof taken apart into single steps, each with the few clauses that it follows from.

A checker that is given all clauses searches through all of them at every step. Here each lemma that the refutation
needs is propagated once, from the last to the first (core extraction: Goldberg and Novikov 2003), and the clauses
that took part are written down. Whether they suffice is for the checker to say: nothing here is believed.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

Clause = tuple[int, ...]

PORTION = 40
"""Propagations that a step has at most: a checker may take the square of their number."""


@dataclass(frozen=True, slots=True)
class Step:
    """A lemma and clauses that it follows from by unit propagation."""

    lemma: Clause
    premises: tuple[Clause, ...]


def needed_steps(clauses: Sequence[Clause], lemmas: Sequence[Clause]) -> list[Step] | None:
    """The steps that lead to the empty clause, in order; None if some lemma does not follow by propagation."""
    every = [*clauses, *lemmas]
    database = _Database(every)
    wanted = [False] * (len(clauses) + len(lemmas))
    empty = next((i for i, lemma in enumerate(lemmas) if not lemma), None)
    if empty is None:
        return None
    wanted[len(clauses) + empty] = True
    steps: list[Step] = []
    for number in range(len(clauses) + empty, len(clauses) - 1, -1):
        if not wanted[number]:
            continue
        lemma = lemmas[number - len(clauses)]
        premises = database.conflict(lemma, number)
        if premises is None:
            return None
        for premise in premises:
            wanted[premise] = True
        steps.append(Step(lemma, tuple(every[premise] for premise in premises)))
    return [portion for step in reversed(steps) for portion in _portions(step)]


def _portions(step: Step) -> list[Step]:
    """A step in portions: where many propagations lead to the contradiction, a literal that later ones need becomes a
    lemma of its own, in the place of all that led to it."""
    if len(step.premises) <= PORTION:
        return [step]
    free = {-literal for literal in step.lemma}
    reasons: dict[int, Clause] = {}
    portion_of: dict[int, int] = {}
    last: Clause = ()
    for at, clause in enumerate(step.premises):
        open_literals = [x for x in clause if -x not in free and -x not in reasons]
        if not open_literals:
            last = clause
            break
        reasons[open_literals[0]] = clause
        portion_of[open_literals[0]] = at // PORTION
    lemma_of: dict[int, Clause] = {}
    made: list[Step] = []

    def premises_of(clause: Clause, implied: int | None, portion: int) -> tuple[Clause, ...]:
        """The clause, what its literals rest on within the portion, and lemmas for what they rest on before it."""
        out: dict[Clause, None] = {clause: None}
        todo = [-x for x in clause if x != implied]
        seen = set(todo)
        while todo:
            literal = todo.pop()
            if literal in free:
                continue
            if portion_of[literal] != portion:
                out[lemma_of[literal]] = None
                continue
            out[reasons[literal]] = None
            more = {-x for x in reasons[literal] if x != literal} - seen
            seen |= more
            todo += more
        return tuple(out)

    end = len(reasons) // PORTION
    exported = _exported(reasons, portion_of, last, end)
    for literal, clause in reasons.items():
        if literal in exported:
            lemma_of[literal] = (*step.lemma, literal)
            made.append(Step(lemma_of[literal], premises_of(clause, literal, portion_of[literal])))
    return [*made, Step(step.lemma, premises_of(last, None, end))]


def _exported(reasons: dict[int, Clause], portion_of: dict[int, int], last: Clause, end: int) -> set[int]:
    """The literals that some later portion needs."""
    out = {-x for x in last if portion_of.get(-x, end) != end}
    for literal, clause in reasons.items():
        out |= {-x for x in clause if x != literal and portion_of.get(-x, end + 1) < portion_of[literal]}
    return out


class _Database:
    """All clauses, each watched by two of its literals."""

    def __init__(self, clauses: Sequence[Clause]) -> None:
        self.clauses = [list(clause) for clause in clauses]
        self.watched: dict[int, list[int]] = {}
        self.units: list[int] = []
        for number, clause in enumerate(self.clauses):
            if len(clause) == 1:
                self.units.append(number)
            for literal in clause[:2] if len(clause) > 1 else ():
                self.watched.setdefault(literal, []).append(number)

    def conflict(self, lemma: Clause, before: int) -> list[int] | None:
        """Clauses before that number from which the lemma follows by unit propagation; None if it doesn't."""
        reasons: dict[int, int | None] = {}
        queue: list[int] = []
        for literal in lemma:
            if -literal not in reasons:
                reasons[-literal] = None
                queue.append(-literal)
        for number in self.units:
            if number >= before:
                break
            (literal,) = self.clauses[number]
            if -literal in reasons:
                return self._blamed(number, reasons)
            if literal not in reasons:
                reasons[literal] = number
                queue.append(literal)
        for literal in queue:
            found = self._propagate(-literal, before, reasons, queue)
            if found is not None:
                return self._blamed(found, reasons)
        return None

    def _propagate(
        self, false: int, before: int, reasons: dict[int, int | None], queue: list[int]
    ) -> int | None:
        """Visit clauses that watch a literal which has become false; the number of one that is false altogether."""
        watchers = self.watched.get(false, [])
        kept: list[int] = []
        for at, number in enumerate(watchers):
            clause = self.clauses[number]
            if number >= before:
                kept.append(number)
                continue
            if clause[0] == false:
                clause[0], clause[1] = clause[1], clause[0]
            if clause[0] in reasons:
                kept.append(number)
                continue
            for i in range(2, len(clause)):
                if -clause[i] not in reasons:
                    clause[1], clause[i] = clause[i], clause[1]
                    self.watched.setdefault(clause[1], []).append(number)
                    break
            else:
                kept.append(number)
                if -clause[0] in reasons:
                    self.watched[false] = kept + watchers[at + 1 :]
                    return number
                reasons[clause[0]] = number
                queue.append(clause[0])
        self.watched[false] = kept
        return None

    def _blamed(self, number: int, reasons: dict[int, int | None]) -> list[int]:
        """The clauses that led to the false one, in the order of propagation, and then that one."""
        used = {number}
        todo = [-literal for literal in self.clauses[number]]
        seen = set(todo)
        while todo:
            literal = todo.pop()
            reason = reasons[literal]
            if reason is None or reason in used:
                continue
            used.add(reason)
            more = {-other for other in self.clauses[reason] if other != literal} - seen
            seen |= more
            todo += more
        # Literals stand in the order in which they were propagated, each with a reason of its own.
        ordered = [reason for reason in reasons.values() if reason in used and reason != number]
        return [reason for reason in ordered if reason is not None] + [number]
