"""The good states of a divider, written so that a question about a step can be asked of all of them.

A small machine's are a table of phases. A wide machine's are runs: a repeat of rounds becomes one question over the
repeats' indices, however many rounds there are. Where no state is good the runs are those that the ratio is claimed
of, so that what is told of them is told all the same.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace

from prover import certificate, path, tables
from prover import expr as e
from prover.expr import Expr
from prover.path import Beat, Item
from prover.rhythm import Goal, Good, Orbit, Rhythm
from prover.system import State, System, lies_at

Axes = tuple[tuple[int, State], ...]

TOGETHER = 64
"""States outside any repeat of which one question is asked."""

MOST_SINGLE = 4096
"""Such states of which questions are asked at all."""


@dataclass(frozen=True, slots=True)
class Region:
    """Some states of the whole divider: those that its registers have by `values` (else freely) where `premise` is
    true, whatever the indices in them are."""

    premise: Expr
    values: Mapping[str, Expr] = field(default_factory=dict)

    def of(self, goal: Expr) -> Expr:
        """One bit: a state of the region that fulfils the goal."""
        (here,) = e.substitute([goal], self.values)
        return e.bvand(self.premise, here)

    def state(self, whole: System, model: Mapping[str, int]) -> State:
        """The state that a model of such a goal tells of."""
        words = [self.values.get(name, e.var(name, width)) for name, width in whole.variables]
        known = {v.name: model.get(v.name, 0) for v in e.variables(words)}
        return tuple(e.evaluate(words, known))


EVERYWHERE = Region(e.TRUE)


@dataclass(frozen=True, slots=True)
class Scope:
    """Regions that make up the good states, what they are in words, and why these are not all or none; "" if all."""

    regions: tuple[Region, ...]
    told: str
    why: str = ""


def scope_of(whole: System, machine: System, good: Good | None, first: State | None = None) -> Scope:
    """The good states of a machine, or what is looked at in their place, as regions of the whole divider; before all
    others one state of it that is known to be among them."""
    found = _scope_of(whole, machine, good)
    if first is None:
        return found
    here = (e.eq(e.var(n, w), e.const(v, w)) for (n, w), v in zip(whole.variables, first, strict=True))
    return replace(found, regions=(Region(e.conj(here)), *found.regions))


def _scope_of(whole: System, machine: System, good: Good | None) -> Scope:
    if good is None:
        return Scope((), "", "the good states are not known")
    if good.phases is not None:
        member = tables.lookup(machine, [int(phase >= 0) for phase in good.phases], 1)
        return Scope((Region(e.substitute([member], _over_registers(whole, machine))[0]),), good.told)
    if machine.logs is not None:
        # Every state but the one that stays where it is lies on the one loop.
        stays = [lies_at(machine, (machine.logs.period, level), whole) for level in (0, 1)]
        away = Region(e.bvnot(e.disj(stays)))
        return Scope((away,) if good.runs else (), good.told, "" if good.runs else "no run is known")
    singles: dict[State, None] = {}
    groups: dict[tuple[State, Axes], None] = {}
    for run, begins in good.runs:
        for items, offset in ((run.lead, 0), (run.loop, run.lead_half_cycles)):
            for state, axes, last in _written(items, offset, ()):
                if last >= begins and axes:
                    groups[state, axes] = None
                elif last >= begins:
                    singles[state] = None
    listed = list(singles)[:MOST_SINGLE]
    why = f"more than {MOST_SINGLE} states outside any repeat" if len(singles) > MOST_SINGLE else ""
    regions = [_listed(whole, machine, listed[at : at + TOGETHER]) for at in range(0, len(listed), TOGETHER)]
    regions += [_repeated(whole, machine, state, axes) for state, axes in groups]
    return Scope(tuple(regions), good.told, why if regions else "no run is known")


def _written(items: Sequence[Item], last: int, axes: Axes) -> Iterator[tuple[State, Axes, int]]:
    """Beats with the repeats around them and the last half-cycle at which they come."""
    for item in items:
        if isinstance(item, Beat):
            yield item.state, axes, last
        else:
            later = last + (item.times - 1) * path.length(item.body)
            yield from _written(item.body, later, (*axes, (item.times, item.stride)))
        last += item.length


def _over_registers(whole: System, machine: System) -> dict[str, Expr]:
    """A machine's variables as expressions over the whole divider's registers."""
    widths = dict(whole.variables)
    parts = {name: (register, low) for name, register, low in machine.slices}
    codes, bits = dict(machine.grays), dict(machine.words)

    def register(name: str, width: int) -> Expr:
        if name not in parts:
            return e.var(name, width)
        of, low = parts[name]
        return e.extract(e.var(of, widths[of]), low + width - 1, low)

    out: dict[str, Expr] = {}
    for name, width in machine.variables:
        if name in bits:
            out[name] = e.concat_all([register(bit, 1) for bit in reversed(bits[name])])
        elif name in codes:
            out[name] = _number(register(codes[name], width))
        else:
            out[name] = register(name, width)
    return out


def _number(code: Expr) -> Expr:
    """What a word in Gray code stands for: each bit is the parity of those from it upwards."""
    shift = 1
    while shift < code.width:
        code = e.bvxor(code, e.binary("bvlshr", code, e.const(shift, code.width)))
        shift *= 2
    return code


def _registers(whole: System, machine: System, words: Sequence[Expr]) -> dict[str, Expr]:
    """The whole divider's registers where the machine's variables have these values, as far as they say."""
    widths = dict(whole.variables)
    codes, bits = dict(machine.grays), dict(machine.words)
    values: dict[str, Expr] = {}
    for (name, _), word in zip(machine.variables, words, strict=True):
        if name in bits:
            values |= {bit: e.extract(word, place, place) for place, bit in enumerate(bits[name])}
        elif name in codes:
            values[codes[name]] = e.bvxor(word, e.binary("bvlshr", word, e.const(1, word.width)))
        else:
            values[name] = word
    for name, of, low in machine.slices:
        part = values.pop(name)
        word = e.var(of, widths[of])
        high = low + part.width - 1
        above = [e.extract(word, word.width - 1, high + 1)] if high + 1 < word.width else []
        below = [e.extract(word, low - 1, 0)] if low else []
        values[of] = e.concat_all([*above, part, *below])
    return values


def _listed(whole: System, machine: System, states: Sequence[State]) -> Region:
    return Region(e.disj(lies_at(machine, state, whole) for state in states))


def _repeated(whole: System, machine: System, state: State, axes: Axes) -> Region:
    """A beat in every round of the repeats around it."""
    within = e.TRUE
    words = [e.const(value, width) for value, (_, width) in zip(state, machine.variables, strict=True)]
    for i, (times, stride) in enumerate(axes):
        size = times.bit_length() + 1
        index = e.var(f"!round{i}", size)
        within = e.bvand(within, e.bvult(index, e.const(times, size)))
        for j, (_, width) in enumerate(machine.variables):
            if stride[j]:
                words[j] = e.bvadd(
                    words[j], e.bvmul(e.resize(index, width, False), e.const(stride[j], width))
                )
    return Region(within, _registers(whole, machine, words))


# -- which runs are good -----------------------------------------------------------------------------------


def of_runs(rhythm: Rhythm, loops: Sequence[Orbit], complete: bool, goal: Goal) -> Good:
    """The good parts of the start states' runs and the good ones of some loops, which are all there are if complete.

    If none of them is good, all of the runs, or of the loops where the claim is about these."""
    runs = [(orbit, since) for orbit in rhythm.orbits if (since := good_since(orbit, goal)) is not None]
    good = [(orbit, orbit.lead_half_cycles) for orbit in loops if good_since(orbit, goal) is not None]
    from_where = {"reset": "from reset", "initial": "from initial values", "any": ""}[rhythm.scope]
    if runs or good:
        told = [f"the good runs {from_where}"] if runs else []
        told += ["every good loop" if complete else "the good loops that were found"] if good else []
        return Good(None, (*runs, *good), " and ".join(told))
    every = [(orbit, 0) for orbit in (loops if rhythm.scope == "any" else rhythm.orbits)]
    what = "the loops" if rhythm.scope == "any" else f"the runs {from_where}"
    return Good(None, tuple(every), f"{what}: no state is good", none=True)


def good_since(orbit: Orbit, goal: Goal) -> int | None:
    """The first half-cycle from which on the run is good; None if it never is, or changes too often to be told."""
    last = orbit.lead_half_cycles
    if not orbit.closed or not certificate.good_from(orbit, last, goal):
        return None
    low, high = 0, last
    while low < high:
        middle = (low + high) // 2
        if certificate.good_from(orbit, middle, goal):
            high = middle
        else:
            low = middle + 1
    return low
