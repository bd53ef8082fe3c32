"""Solvers that take an obligation's script as text: z3, and bitwuzla and cvc5 where they are installed."""

from __future__ import annotations

from collections.abc import Callable
from importlib.util import find_spec

from prover.errors import InternalError, UserError


def _z3(script: str, seconds: float) -> str:
    import z3

    solver = z3.SolverFor("QF_BV")
    solver.set("timeout", max(1, int(seconds * 1000)))
    solver.from_string(script)
    return str(solver.check())


def _bitwuzla(script: str, seconds: float) -> str:
    import bitwuzla

    options = bitwuzla.Options()
    options.set(bitwuzla.Option.TIME_LIMIT_PER, max(1, int(seconds * 1000)))
    parser = bitwuzla.Parser(bitwuzla.TermManager(), options, "smt2")
    # Read only: the question is asked afterwards, so that its answer comes back instead of being printed.
    parser.parse(script, True, False)
    return str(parser.bitwuzla().check_sat())


def _cvc5(script: str, seconds: float) -> str:
    import cvc5

    solver = cvc5.Solver(cvc5.TermManager())
    # With its defaults, deep trees of one-bit conditions take it a thousand times as long.
    for option, value in (("bitblast", "eager"), ("bool-to-bv", "all")):
        solver.setOption(option, value)
    solver.setOption("tlimit-per", str(max(1, int(seconds * 1000))))
    parser = cvc5.InputParser(solver)
    parser.setStringInput(cvc5.InputLanguage.SMT_LIB_2_6, script, "obligation")
    symbols, answer = parser.getSymbolManager(), ""
    while not (command := parser.nextCommand()).isNull():
        answer = str(command.invoke(solver, symbols)).strip() or answer
    return answer


SOLVERS: dict[str, Callable[[str, float], str]] = {"z3": _z3, "bitwuzla": _bitwuzla, "cvc5": _cvc5}
"""By name: what says of a script, within so many seconds, sat, unsat or anything else."""


def chosen(name: str) -> tuple[str, ...]:
    """The solvers that a name stands for, `all` for all that are installed. Raises UserError for one that isn't."""
    installed = tuple(each for each in SOLVERS if find_spec(each) is not None)
    if name == "all":
        return installed
    if name not in installed:
        raise UserError(
            f"--solver {name}: not installed", hint="install it with pip install 'subharmonic[solvers]'"
        )
    return (name,)


def refutes(name: str, script: str, seconds: float) -> bool | None:
    """Whether the solver finds that nothing fulfils the script; None if it gives up."""
    try:
        answer = SOLVERS[name](script, seconds)
    except MemoryError:
        return None
    if "error" in answer:
        raise InternalError(f"{name} does not read an obligation: {answer}")
    return {"unsat": True, "sat": False}.get(answer)
