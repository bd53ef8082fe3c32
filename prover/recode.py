"""Other coordinates for the same machine, in which it counts and the orbit engine can jump along it.

A ripple chain of single flip-flops is read as one word. Bit by bit such a chain never adds the same vector twice, and
its orbit is as long as its ratio; as a word it adds one each cycle. The word is the bits side by side, so nothing is
lost and nothing has to be believed: the step of the word is the steps of the bits.

A register in Gray code (Gray 1953: g = b xor b/2) is read as the number b that it stands for. What its step and the
other steps come to then is guessed from samples, and the guess is an obligation (`certificate.gray_obligations`).

Of a register that is read in part only, the part is kept.
"""

from __future__ import annotations

import random
import re
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import replace

from prover import expr as e
from prover import linear
from prover.effort import Effort
from prover.expr import Expr
from prover.solve import find
from prover.system import State, System, project
from prover.verilog.words import cut, reads
from prover.verilog.words import replace as replaced

SHORTEST = 6
"""Stages from which a chain is worth reading as a word."""

SAMPLES = 24
"""Values on which a guess has to be right before the solver is asked."""


def words(system: System, effort: Effort) -> System:
    """The system with its ripple chain as one word, or the system itself if it has none that counts."""
    chain = _chain(system)
    if len(chain) < SHORTEST:
        return system
    recoded = joined(system, chain)
    return recoded if _counts(recoded, _word_name(chain), effort) else system


def placed(state: State, whole: System, machine: System) -> State:
    """A state of the whole divider as one of the machine."""
    if machine.logs is None:
        return project(whole, state, machine)
    read = {name for name, _ in machine.logs.registers} | {machine.clock}
    inner = replace(whole, variables=tuple(pair for pair in whole.variables if pair[0] in read))
    return linear.moved(project(whole, state, inner), inner, machine)


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


# -- parts of registers -------------------------------------------------------------------------------------


def live(system: System) -> System:
    """The system with each register cut down to the stretch of its bits on which the output depends, now or later.

    The system itself if all bits of all registers count."""
    steps = dict(zip(system.names, system.step, strict=True))
    memo: dict[tuple[Expr, int, int], Expr] = {}
    spans: dict[str, tuple[int, int]] = {system.clock: (0, 0)}
    roots = {"": [system.output, system.settled]}
    while True:
        found = reads(root for several in roots.values() for root in several)
        wider = {n: _span(mask, spans.get(n)) for n, mask in found.items() if n in steps}
        if all(spans.get(name) == span for name, span in wider.items()):
            break
        spans |= wider
        roots |= {name: [cut(steps[name], *span, memo)] for name, span in wider.items()}
    whole = dict(system.variables)
    names = {n: n if span == (whole[n] - 1, 0) else _part_name(n, *span) for n, span in spans.items()}
    if all(names.get(name) == name for name in whole) or not set(names.values()).isdisjoint(
        whole.keys() - names.keys()
    ):
        return system
    parts = {n: _widened(e.var(names[n], h - lo + 1), lo, whole[n]) for n, (h, lo) in spans.items()}
    kept = [name for name in system.names if name in spans]
    step = [cut(steps[name], *spans[name], memo) for name in kept]
    *step, output, settled = e.substitute([*step, system.output, system.settled], parts)
    return replace(
        system,
        variables=tuple((names[n], spans[n][0] - spans[n][1] + 1) for n in kept),
        step=tuple(step),
        output=output,
        settled=settled,
        slices=tuple((names[n], n, spans[n][1]) for n in kept if names[n] != n),
    )


def _span(mask: int, known: tuple[int, int] | None) -> tuple[int, int]:
    """The uppermost and the lowest bit of a mask and of what is known to be read."""
    high, low = mask.bit_length() - 1, (mask & -mask).bit_length() - 1
    return (high, low) if known is None else (max(high, known[0]), min(low, known[1]))


def _part_name(name: str, high: int, low: int) -> str:
    return f"{name}[{high}]" if high == low else f"{name}[{high}:{low}]"


def _widened(part: Expr, low: int, width: int) -> Expr:
    """A word of that width with the part in its place; the other bits are not read."""
    above = width - low - part.width
    word = e.concat(part, e.const(0, low)) if low else part
    return e.concat(e.const(0, above), word) if above else word


# -- Gray code ----------------------------------------------------------------------------------------------


def coded(number: Expr) -> Expr:
    """The Gray code of a number."""
    return e.bvxor(number, e.binary("bvlshr", number, e.const(1, number.width)))


def decoded(code: int) -> int:
    """The number that a Gray code stands for."""
    number = code
    while code := code >> 1:
        number ^= code
    return number


def gray(system: System) -> tuple[System, Mapping[Expr, Expr]]:
    """The system with every register that goes from one Gray code to another read as a number, or the system itself;
    and the expressions that are taken for such a number, over the registers, with the variable that stands for it."""
    known: dict[Expr, Expr] = {}
    for name, width in system.variables:
        if width >= SHORTEST and all(name != part for part, _, _ in system.slices):
            system, more = _as_number(system, name, width)
            known |= more
    return system, known


def _as_number(system: System, register: str, width: int) -> tuple[System, dict[Expr, Expr]]:
    number = e.var(f"{register} in binary", width)
    code = e.var(register, width)
    place = system.names.index(register)
    roots = [*system.step, system.output, system.settled]
    samples = _samples(roots)
    known = dict.fromkeys(_standing_for(roots, code, samples), number)
    back = {register: coded(number)}

    def renamed(some: Iterable[Expr]) -> list[Expr]:
        return e.substitute(replaced(list(some), known), back)

    leaves: dict[Expr, Expr] = {}
    codes = 0
    for leaf in _leaves(system.step[place]):
        if leaf.is_const:
            leaves[leaf] = e.const(decoded(leaf.value), width)
        elif leaf is code:
            leaves[leaf] = number
        else:
            found = _coded_by(leaf, samples)
            if found is None:
                return system, {}
            (leaves[leaf],) = renamed([found])
            codes += 1
    if not codes:
        return system, {}
    step = renamed(system.step)
    step[place] = _with_leaves(system.step[place], leaves, renamed)
    output, settled = renamed([system.output, system.settled])
    made = replace(
        system,
        variables=tuple((number.name, w) if n == register else (n, w) for n, w in system.variables),
        step=tuple(step),
        output=output,
        settled=settled,
        grays=(*system.grays, (number.name, register)),
    )
    return made, known


def _samples(roots: Sequence[Expr]) -> list[dict[str, int]]:
    rng = random.Random(0)
    variables = e.variables(roots)
    return [{v.name: rng.getrandbits(v.width) for v in variables} for _ in range(SAMPLES)]


def _standing_for(roots: Sequence[Expr], code: Expr, samples: Sequence[Mapping[str, int]]) -> Iterator[Expr]:
    """The expressions below the roots that are the number the code stands for, on all samples."""
    only: set[Expr] = set()
    for node in e.topological(roots):
        if node is code or (node.args and all(a in only or a.is_const for a in node.args)):
            only.add(node)
    right = [decoded(sample[code.name]) for sample in samples]
    for node in e.topological(roots):
        if node in only and node.width == code.width and node is not code and _is(node, right, samples):
            yield node


def _is(node: Expr, values: Sequence[int], samples: Sequence[Mapping[str, int]]) -> bool:
    return all(e.evaluate([node], s) == [value] for s, value in zip(samples, values, strict=True))


def _coded_by(leaf: Expr, samples: Sequence[Mapping[str, int]]) -> Expr | None:
    """The expression below the leaf whose Gray code the leaf is, on all samples."""
    # The nearest below the leaf: one farther down may differ where no sample goes, such as at the counter's end.
    for node in reversed(e.topological([leaf])):
        if node.width == leaf.width and node is not leaf:
            values = (e.evaluate([node, leaf], sample) for sample in samples)
            if all(number ^ number >> 1 == code for number, code in values):
                return node
    return None


def _leaves(root: Expr) -> list[Expr]:
    """What a tree of choices chooses between, each once."""
    out: dict[Expr, None] = {}
    stack = [root]
    seen: set[Expr] = set()
    while stack:
        node = stack.pop()
        if node in seen:
            continue
        seen.add(node)
        if node.op == "ite":
            stack += node.args[1:]
        else:
            out[node] = None
    return list(out)


def _with_leaves(
    root: Expr, leaves: Mapping[Expr, Expr], renamed: Callable[[Iterable[Expr]], list[Expr]]
) -> Expr:
    """The tree of choices with other leaves, its conditions renamed."""
    memo: dict[Expr, Expr] = dict(leaves)
    stack = [root]
    while stack:
        node = stack[-1]
        missing = [a for a in node.args[1:] if a not in memo] if node not in memo else []
        if missing:
            stack += missing
            continue
        stack.pop()
        if node not in memo:
            (condition,) = renamed([node.args[0]])
            memo[node] = e.ite(condition, memo[node.args[1]], memo[node.args[2]])
    return memo[root]
