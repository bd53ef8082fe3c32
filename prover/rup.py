"""A clausal proof taken apart into single steps, each with the few clauses that it follows from.

A checker that is given all clauses searches through all of them at every step. Here each lemma that the refutation
needs is propagated once, from the last to the first (core extraction: Goldberg and Novikov 2003), and the clauses
that took part are written down. Whether they suffice is for the checker to say: nothing here is believed.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

Clause = tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Step:
    """A lemma and the numbers of the clauses it follows from: those given come first, then lemmas in order."""

    number: int
    lemma: Clause
    premises: tuple[int, ...]


def needed_steps(clauses: Sequence[Clause], lemmas: Sequence[Clause]) -> list[Step] | None:
    """The steps that lead to the empty clause, in order; None if some lemma does not follow by propagation."""
    database = _Database([*clauses, *lemmas])
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
        steps.append(Step(number, lemma, tuple(premises)))
    return steps[::-1]


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
        """The clauses that led to the false one, itself included, in order."""
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
        return sorted(used)
