"""A second road to a proof: obligations made into clauses here, refuted by a SAT solver whose proof is checked.

Words are taken apart into bits by this file's own circuits (ripple-carry adders, shift-and-add multipliers,
comparators, barrel shifters, multiplexers), every gate becomes clauses (Tseitin 1968), CaDiCaL refutes them and
writes down each clause that it learns (a DRUP proof: Goldberg and Novikov 2003, Heule, Hunt and Wetzler 2013), and
the package `drup`, extracted from verified code, checks that each of these follows and the last is empty.

Limits: no division, and CaDiCaL is not interrupted.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from importlib.util import find_spec

from prover import expr as e
from prover.errors import InternalError, UserError
from prover.expr import Expr
from prover.rup import needed_steps

SOLVER = "cadical195"

TRUSTED = (
    "the reading of the sources and the machine made from it (prover/verilog, ports, system, settling)",
    "the derivation of the obligations and of the verdicts (rebuild, certificate, tables, reset, properties)",
    "the making of clauses (clausal) and the simplification of expressions (expr)",
    "the package drup: its verified checker as compiled, and its binding to Python",
    "z3 as far as ports were recognised with its help: the certificate states which they are",
    "Python",
)
"""What remains trusted when the clausal road accepts; no solver's word that something is refuted is among it."""

Literal = int
"""A variable's number, negative for its complement. Variable 1 is true."""

TRUE: Literal = 1
Bits = list[Literal]
"""A word, lowest bit first."""


class Unsupported(Exception):
    """An operator that has no circuit here."""


@dataclass(frozen=True, slots=True)
class Clauses:
    """Clauses that can be satisfied together iff the goal can be 1.

    variables  how many there are; inputs  the literals of each word of the goal, lowest bit first"""

    variables: int
    clauses: list[list[Literal]]
    inputs: dict[str, Bits]

    def dimacs(self) -> str:
        """The clauses in DIMACS format."""
        lines = [f"p cnf {self.variables} {len(self.clauses)}"]
        lines += [" ".join(map(str, clause)) + " 0" for clause in self.clauses]
        return "\n".join(lines) + "\n"


@dataclass(frozen=True, slots=True)
class Proof:
    """A refutation that was checked: how many variables and clauses there were, and the steps that it took."""

    variables: int
    clauses: int
    steps: int


def needs() -> None:
    """Raise UserError where a package for this road is not installed."""
    for module, package in (("pysat", "python-sat"), ("drup", "drup")):
        if find_spec(module) is None:
            raise UserError(
                f"--clausal needs the package {package}",
                hint="install it with pip install 'subharmonic[proof]'",
            )


def refute(goal: Expr) -> Proof | None:
    """The checked refutation of a goal, or None if something fulfils it. Raises Unsupported, and InternalError where
    the solver's proof does not pass."""
    from pysat.solvers import Solver

    made = clauses_of(goal)
    with Solver(name=SOLVER, bootstrap_with=made.clauses, with_proof=True) as solver:
        if solver.solve():
            return None
        # Deletions only spare a checker work; without them every lemma still follows.
        lines = [line.split() for line in solver.get_proof() if not line.startswith("d")]
    lemmas = [tuple(map(int, line[:-1])) for line in lines if line and line[-1] == "0"]
    # What propagation alone refutes needs no lemma, and the solver may not write the empty one.
    steps = check([tuple(clause) for clause in made.clauses], [*lemmas, ()])
    if steps is None:
        raise InternalError("CaDiCaL's proof does not pass its check")
    return Proof(made.variables, len(made.clauses), steps)


def check(clauses: Sequence[tuple[int, ...]], lemmas: Sequence[tuple[int, ...]]) -> int | None:
    """The number of steps of a refutation that the verified checker accepts one by one; None if it is none.

    It is asked of each lemma whether its premises and its negation lead to the empty clause by propagation. That
    the premises of each are clauses given, or lemmas accepted before, is seen to here."""
    import drup

    steps = needed_steps(clauses, lemmas)
    if not steps or steps[-1].lemma:
        return None
    known = set(clauses)
    for step in steps:
        if not known.issuperset(step.premises):
            return None
        negated = [[-literal] for literal in step.lemma]
        outcome = drup.check_proof([*map(list, step.premises), *negated], [[]]).outcome
        if outcome is not drup.Outcome.VALID:
            return None
        known.add(step.lemma)
    return len(steps)


def clauses_of(goal: Expr) -> Clauses:
    """The goal, a word of one bit, as clauses. Raises Unsupported."""
    circuit = _Circuit()
    (out,) = circuit.bits(goal)
    circuit.clauses.append([out])
    return Clauses(circuit.count, circuit.clauses, circuit.inputs)


class _Circuit:
    """Gates made so far, each with its clauses; equal gates are one, and constants go no further."""

    def __init__(self) -> None:
        self.count = 1
        self.clauses: list[list[Literal]] = [[TRUE]]
        self.inputs: dict[str, Bits] = {}
        self.made: dict[tuple[str, Literal, Literal, Literal], Literal] = {}

    # -- gates ---------------------------------------------------------------------------------------------

    def fresh(self) -> Literal:
        self.count += 1
        return self.count

    def conj(self, a: Literal, b: Literal) -> Literal:
        if a == b or b == TRUE:
            return a
        if a == TRUE:
            return b
        if -TRUE in (a, b) or a == -b:
            return -TRUE
        key = ("and", min(a, b), max(a, b), 0)
        if key not in self.made:
            out = self.made[key] = self.fresh()
            self.clauses += [[-out, a], [-out, b], [out, -a, -b]]
        return self.made[key]

    def disj(self, a: Literal, b: Literal) -> Literal:
        return -self.conj(-a, -b)

    def xor(self, a: Literal, b: Literal) -> Literal:
        # Both are made positive, and the sign is put back.
        sign = 1
        if a < 0:
            a, sign = -a, -sign
        if b < 0:
            b, sign = -b, -sign
        if a == b:
            return -sign * TRUE
        if TRUE in (a, b):
            return -sign * (b if a == TRUE else a)
        key = ("xor", min(a, b), max(a, b), 0)
        if key not in self.made:
            out = self.made[key] = self.fresh()
            self.clauses += [[-out, a, b], [-out, -a, -b], [out, -a, b], [out, a, -b]]
        return sign * self.made[key]

    def choose(self, when: Literal, then: Literal, other: Literal) -> Literal:
        if when == TRUE or then == other:
            return then
        if when == -TRUE:
            return other
        if when < 0:
            when, then, other = -when, other, then
        if then == -other:
            return self.xor(when, other)
        if abs(then) == TRUE or then in (when, -when):
            # A then of 1, or of the condition itself, is 1; of 0, or of its complement, is 0.
            high = then in (TRUE, when)
            return self.disj(when, other) if high else self.conj(-when, other)
        if abs(other) == TRUE or other in (when, -when):
            high = other in (TRUE, -when)
            return self.disj(-when, then) if high else self.conj(when, then)
        key = ("choose", when, then, other)
        if key not in self.made:
            out = self.made[key] = self.fresh()
            self.clauses += [
                [-when, -then, out],
                [-when, then, -out],
                [when, -other, out],
                [when, other, -out],
            ]
            # Not needed, but the solver finds more by itself with them.
            self.clauses += [[-then, -other, out], [then, other, -out]]
        return self.made[key]

    # -- words ---------------------------------------------------------------------------------------------

    def bits(self, root: Expr) -> Bits:
        """The root's bits, those of everything below it made first."""
        made: dict[Expr, Bits] = {}
        for node in e.topological([root]):
            made[node] = self._word(node, [made[a] for a in node.args])
            if len(made[node]) != node.width:
                raise InternalError(f"{node.op}: {len(made[node])} bits for {node.width}")
        return made[root]

    def _word(self, node: Expr, args: Sequence[Bits]) -> Bits:
        match node.op:
            case "const":
                return [TRUE if node.value >> i & 1 else -TRUE for i in range(node.width)]
            case "var":
                if node.name not in self.inputs:
                    self.inputs[node.name] = [self.fresh() for _ in range(node.width)]
                return self.inputs[node.name]
            case "bvnot":
                return [-a for a in args[0]]
            case "bvneg":
                return self._sum([-a for a in args[0]], [-TRUE] * node.width, TRUE)
            case "bvand":
                return [self.conj(a, b) for a, b in zip(*args, strict=True)]
            case "bvor":
                return [self.disj(a, b) for a, b in zip(*args, strict=True)]
            case "bvxor":
                return [self.xor(a, b) for a, b in zip(*args, strict=True)]
            case "bvadd":
                return self._sum(args[0], args[1], -TRUE)
            case "bvsub":
                return self._sum(args[0], [-b for b in args[1]], TRUE)
            case "bvmul":
                return self._product(args[0], args[1])
            case "bvshl":
                return self._shifted(args[0], args[1], -TRUE, up=True)
            case "bvlshr":
                return self._shifted(args[0], args[1], -TRUE, up=False)
            case "bvashr":
                return self._shifted(args[0], args[1], args[0][-1], up=False)
            case "concat":
                return [*args[1], *args[0]]
            case "extract":
                return args[0][int(node.params[1]) : int(node.params[0]) + 1]
            case "zero_extend":
                return [*args[0], *[-TRUE] * int(node.params[0])]
            case "sign_extend":
                return [*args[0], *[args[0][-1]] * int(node.params[0])]
            case "ite":
                return [self.choose(args[0][0], a, b) for a, b in zip(args[1], args[2], strict=True)]
            case "eq":
                return [self._equal(args[0], args[1])]
            case "bvult":
                return [self._below(args[0], args[1])]
            case "bvslt":
                # With the signs turned over, the order is that without signs.
                return [self._below([*args[0][:-1], -args[0][-1]], [*args[1][:-1], -args[1][-1]])]
        raise Unsupported(f"there is no circuit for {node.op}")

    def _sum(self, a: Bits, b: Bits, carry: Literal) -> Bits:
        out = []
        for x, y in zip(a, b, strict=True):
            half = self.xor(x, y)
            out.append(self.xor(half, carry))
            carry = self.disj(self.conj(x, y), self.conj(half, carry))
        return out

    def _product(self, a: Bits, b: Bits) -> Bits:
        """Shift and add, or for a constant add and subtract: by its digits 1, 0 and −1, no two of them neighbours
        (the non-adjacent form: Reitwiesner 1960), which makes -1 one subtraction."""
        if all(abs(bit) == TRUE for bit in a):
            a, b = b, a
        if all(abs(bit) == TRUE for bit in b):
            return self._scaled(a, sum((bit == TRUE) << i for i, bit in enumerate(b)))
        total: Bits = [-TRUE] * len(a)
        for place, bit in enumerate(b):
            if bit != -TRUE:
                row = [-TRUE] * place + [self.conj(bit, x) for x in a[: len(a) - place]]
                total = self._sum(total, row, -TRUE)
        return total

    def _scaled(self, a: Bits, factor: int) -> Bits:
        width = len(a)
        total: Bits = [-TRUE] * width
        left = factor - (1 << width) if factor >> (width - 1) else factor
        for place in range(width):
            digit = 2 - left % 4 if left % 2 else 0
            left = (left - digit) // 2
            row = [-TRUE] * place + a[: width - place]
            if digit == 1:
                total = self._sum(total, row, -TRUE)
            elif digit == -1:
                total = self._sum(total, [-bit for bit in row], TRUE)
        return total

    def _shifted(self, a: Bits, by: Bits, filling: Literal, up: bool) -> Bits:
        width = len(a)
        for place, bit in enumerate(by):
            step = min(1 << place, width)
            moved = [filling] * step + a[: width - step] if up else a[step:] + [filling] * step
            a = [self.choose(bit, x, y) for x, y in zip(moved, a, strict=True)]
        return a

    def _equal(self, a: Bits, b: Bits) -> Literal:
        out: Literal = TRUE
        for x, y in zip(a, b, strict=True):
            out = self.conj(out, -self.xor(x, y))
        return out

    def _below(self, a: Bits, b: Bits) -> Literal:
        out: Literal = -TRUE
        for x, y in zip(a, b, strict=True):
            out = self.choose(self.xor(x, y), y, out)
        return out
