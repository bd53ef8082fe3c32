"""Other coordinates for the same machine: a ripple chain of single flip-flops read as one word that counts.

Bit by bit such a chain never adds the same vector twice, and its orbit is as long as its ratio. As a word it adds
one each cycle, and the orbit engine jumps along it. The word is the bits side by side, so nothing is lost and
nothing has to be believed: the step of the word is the steps of the bits.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

from prover import expr as e
from prover import linear
from prover.effort import Effort
from prover.expr import Expr
from prover.solve import find
from prover.system import State, System, project

SHORTEST = 6
"""Stages from which a chain is worth reading as a word."""


def words(system: System, effort: Effort) -> System:
    """The system with its ripple chain as one word, or the system itself if it has none that counts."""
    chain = _chain(system)
    if len(chain) < SHORTEST:
        return system
    recoded = joined(system, chain)
    return recoded if _counts(recoded, _word_name(chain), effort) else system


def moved(state: State, system: System, recoded: System) -> State:
    """A state of the system in the recoded one's coordinates."""
    if recoded is system:
        return state
    values = dict(zip(system.names, state, strict=True))
    for word, bits in recoded.words:
        values[word] = sum(values[bit] << place for place, bit in enumerate(bits))
    return tuple(values[name] for name in recoded.names)


def placed(state: State, whole: System, machine: System) -> State:
    """A state of the whole divider as one of the machine."""
    if machine.logs is None and not machine.words:
        return project(whole, state, machine)
    read = {bit for _, names in machine.words for bit in names}
    if machine.logs is not None:
        read |= {name for name, _ in machine.logs.registers}
    kept = tuple(pair for pair in whole.variables if pair[0] in read or pair[0] in machine.names)
    inner = replace(whole, variables=kept)
    coded = linear.moved if machine.logs is not None else moved
    return coded(project(whole, state, inner), inner, machine)


def _chain(system: System) -> list[str]:
    """One-bit registers, each of which depends on itself, the clock, and exactly those before it."""
    needs = {
        name: {v.name for v in e.variables([step])} - {name, system.clock}
        for (name, width), step in zip(system.variables, system.step, strict=True)
        if width == 1 and name != system.clock
    }
    chain: list[str] = []
    while True:
        following = [n for n, needed in needs.items() if n not in chain and needed == set(chain)]
        # Of several, only one goes on: what merely resamples the chain depends on less of itself.
        following = [n for n in following if _moves_itself(system, n)]
        if len(following) != 1:
            return chain
        chain += following


def _moves_itself(system: System, name: str) -> bool:
    step = system.step[system.names.index(name)]
    return name in {v.name for v in e.variables([step])}


def joined(system: System, chain: Sequence[str]) -> System:
    """The system with those registers of one bit, lowest first, read as one word."""
    name = _word_name(chain)
    word = e.var(name, len(chain))
    bits = {bit: e.extract(word, i, i) for i, bit in enumerate(chain)}
    steps = dict(zip(system.names, system.step, strict=True))
    joined = e.concat_all([steps[bit] for bit in reversed(chain)])
    variables: list[tuple[str, int]] = []
    step: list[Expr] = []
    for variable, width in system.variables:
        if variable == chain[0]:
            variables.append((name, len(chain)))
            step.append(joined)
        elif variable not in bits:
            variables.append((variable, width))
            step.append(steps[variable])
    *step, output, settled = e.substitute([*step, system.output, system.settled], bits)
    return replace(
        system,
        variables=tuple(variables),
        step=tuple(step),
        output=output,
        settled=settled,
        words=((name, tuple(chain)),),
    )


def _word_name(chain: Sequence[str]) -> str:
    """q[23:0] for the bits of one vector, otherwise the bits in braces, the uppermost first."""
    parts = [re.fullmatch(r"(.*)\[(\d+)\]", bit) for bit in chain]
    bases = {part[1] for part in parts if part}
    if all(parts) and len(bases) == 1:
        return f"{bases.pop()}[{len(chain) - 1}:0]"
    return "{" + ", ".join(reversed(chain)) + "}"


def _counts(recoded: System, word_name: str, effort: Effort) -> bool:
    """Whether the word goes up, or down, by one in every input cycle."""
    names, steps = recoded.names, list(recoded.step)
    place = names.index(word_name)
    word = e.var(*recoded.variables[place])
    twice = e.substitute(steps, dict(zip(names, steps, strict=True)))[place]
    for change in (1, -1):
        wanted = e.bvadd(word, e.const(change, word.width))
        if find(e.bvand(recoded.settled, e.bvnot(e.eq(twice, wanted))), effort) is None:
            return True
    return False
