"""The values of the inputs of --each for which a claim is made, and the claim at each of them."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace

from prover import expr as e
from prover.design import Design, Register
from prover.effort import Effort
from prover.errors import UserError, Where
from prover.expr import Expr
from prover.forms import Beyond, Poly, at_least, condition
from prover.formula import Formula
from prover.spec import EACH_HINT, Ranges, Spec

MOST_LISTED = 1 << 16
"""Values, before the conditions, that are gone through one by one."""

Values = Mapping[str, int]


def domain_text(inputs: Iterable[tuple[str, Ranges]], where: Iterable[str]) -> str:
    """Values and conditions in words: div=1..15, where div != 3."""
    told = ", ".join(f"{name}={ranges_text(ranges)}" for name, ranges in inputs)
    conditions = " and ".join(where)
    return told + (f", where {conditions}" if conditions else "")


def among(spec: Spec, names: Iterable[str]) -> str:
    """The values that inputs may take, in words that go on from their names: " within div=1..15, where div != 3"; ""
    for all that they have."""
    given = {**spec.each, **spec.moving}
    bounded = [(name, ranges) for name in names if (ranges := given.get(name)) is not None]
    told = domain_text(bounded, (condition.text for condition in spec.where))
    return f" within {told}" if bounded else told


def ranges_text(ranges: Iterable[tuple[int, int]]) -> str:
    """Ranges as they are written: 0,2,8..15."""
    return ",".join(str(low) if low == high else f"{low}..{high}" for low, high in ranges)


def values_text(values: Values) -> str:
    """One value of each input: A=3, B=1."""
    return ", ".join(f"{name}={value}" for name, value in values.items())


@dataclass(frozen=True, slots=True)
class Domain:
    """The values for which a claim is made: ranges for each input, and conditions over these and what is fixed.

    begins  a number of a value before which the conditions are known to admit none"""

    inputs: tuple[tuple[str, Ranges], ...]
    where: tuple[Formula, ...]
    fixed: Values
    begins: int = 0

    @staticmethod
    def of(design: Design, spec: Spec) -> Domain:
        """The domain of a claim. Raises UserError for values that the port cannot have, or if there are none; where
        that takes a search, see `begun`."""
        inputs = []
        for name, ranges in spec.each.items():
            most = (1 << design.inputs[name]) - 1
            if ranges is not None and ranges[-1][1] > most:
                raise UserError(
                    f"{name}={ranges_text(ranges)}: the port has {design.inputs[name]} bits",
                    _where(design, name),
                    hint=f"give values from 0 to {most}",
                )
            inputs.append((name, ranges if ranges is not None else ((0, most),)))
        domain = Domain(tuple(inputs), spec.where, fixed_values(design, spec))
        if domain.size <= MOST_LISTED and next(domain.values(), None) is None:
            raise no_values()
        return domain

    def begun(self, widths: Mapping[str, int], effort: Effort) -> Domain:
        """The same, beginning with its first value. Raises UserError if there is none, or none can be found, and
        OutOfEffort."""
        from prover.solve import least

        if next(self.values(), None) is not None:
            return self
        try:
            first = least(self.admitted(widths), [(name, widths[name]) for name, _ in self.inputs], effort)
        except Beyond:
            raise UserError(
                f"--where: none of the first {MOST_LISTED} values meets it, and it is too hard to search for others",
                hint="begin nearer to the first one, with --each PORT=LOW..HIGH",
            ) from None
        if first is None:
            raise no_values()
        return replace(self, begins=self.number(first))

    def admitted(self, widths: Mapping[str, int]) -> Expr:
        """One bit over the inputs: they are of the domain. Raises Beyond."""
        parts = []
        names = {name: Poly.atom(name, widths[name]) for name, _ in self.inputs}
        names |= {name: Poly.const(value) for name, value in self.fixed.items()}
        for name, ranges in self.inputs:
            inside = (
                e.bvand(at_least(names[name], Poly.const(low)), at_least(Poly.const(high), names[name]))
                for low, high in ranges
            )
            parts.append(e.disj(inside))
        return e.conj([*parts, *(condition(each, names) for each in self.where)])

    @property
    def size(self) -> int:
        """How many values there are, before the conditions."""
        return math.prod(sum(high - low + 1 for low, high in ranges) for _, ranges in self.inputs)

    @property
    def count(self) -> int | None:
        """How many values there are, None where they are too many to look at each."""
        if not self.where:
            return self.size
        return sum(1 for _ in self.values()) if self.size <= MOST_LISTED else None

    def values(self) -> Iterator[dict[str, int]]:
        """The values that meet the conditions, in order; the search for them stops after MOST_LISTED others."""
        missed = 0
        for number in range(self.begins, self.size):
            values = self.value(number)
            if self.holds(values):
                yield values
            else:
                missed += 1
                if missed > MOST_LISTED:
                    return

    def value(self, number: int) -> dict[str, int]:
        """The value with that number, the last input changing fastest, whether the conditions admit it or not."""
        out: dict[str, int] = {}
        for name, ranges in reversed(self.inputs):
            number, place = divmod(number, sum(high - low + 1 for low, high in ranges))
            for low, high in ranges:
                if place <= high - low:
                    out[name] = low + place
                    break
                place -= high - low + 1
        return {name: out[name] for name, _ in self.inputs}

    def number(self, values: Values) -> int:
        """The number of a value: `value` the other way round."""
        out = 0
        for name, ranges in self.inputs:
            before = 0
            for low, high in ranges:
                if low <= values[name] <= high:
                    before += values[name] - low
                    break
                before += high - low + 1
            out = out * sum(high - low + 1 for low, high in ranges) + before
        return out

    def __str__(self) -> str:
        return domain_text(self.inputs, (condition.text for condition in self.where))

    def holds(self, values: Values) -> bool:
        """Whether the conditions admit the values."""
        return all(condition.value({**self.fixed, **values}) for condition in self.where)


def no_values() -> UserError:
    """The error of conditions that no value meets."""
    return UserError("--where leaves no values to judge", hint="give a condition that some values meet")


def _where(design: Design, name: str) -> Where | None:
    return design.signals[name].where if name in design.signals else None


# -- the claim ---------------------------------------------------------------------------------------------


def in_numbers(design: Design, spec: Spec) -> Spec:
    """The claim with the one value that its formulas have in this design."""
    return claimed_at(spec, fixed_values(design, spec))


def claimed_at(spec: Spec, values: Values, held: Values | None = None) -> Spec:
    """The claim as numbers, where the names have these values; inputs in `held` are held at theirs.

    Raises UserError where the formulas give no ratio or no high time."""
    held = held or {}
    ratio, high = spec.ratio, spec.high
    if spec.ratio_formula is not None:
        ratio = spec.ratio_formula.value(values)
    if spec.high_formula is not None:
        high = _whole(spec.high_formula, values)
    try:
        return replace(
            spec,
            ratio=ratio,
            high=high,
            ratio_formula=None,
            high_formula=None,
            each={},
            where=(),
            holds={**spec.holds, **held},
        )
    except UserError as error:
        if not held:
            raise
        hint = f"{error.hint}, or leave the value out with --each or --where"
        raise UserError(f"at {values_text(held)}: {error.message}", hint=hint) from None


def _whole(formula: Formula, values: Values) -> int:
    value = formula.value(values)
    if value.denominator != 1:
        told = values_text({name: values[name] for name in formula.names})
        raise UserError(
            f"--high '{formula.text}' is {value}{' at ' if told else ''}{told}: not a whole number of half-cycles",
            hint="give half-cycles, such as 2*(div+1)",
        )
    return int(value)


def fixed_values(design: Design, spec: Spec) -> dict[str, int]:
    """What has one value: parameters, and the inputs that --hold holds."""
    held = {
        name: value % (1 << design.inputs[name])
        for name, value in spec.holds.items()
        if name in design.inputs
    }
    return {**design.parameters, **held}


def check_names(design: Design, spec: Spec) -> None:
    for name in spec.each:
        if name not in design.inputs:
            raise UserError(
                f"--each {name}: {design.top} has no such input",
                hint=f"its inputs are {', '.join(design.inputs) or 'none'}",
            )
        if name in spec.holds:
            raise UserError(f"{name} is named both by --each and by --hold", hint="leave one of the two out")
        reset = (spec.reset or "").partition("=")[0]
        if name in (spec.clock, reset):
            raise UserError(f"--each {name}: the port is the clock or the reset", hint="leave it out")
    given = [("--ratio", spec.ratio_formula), ("--high", spec.high_formula)]
    given += [("--where", condition) for condition in spec.where]
    known = {**fixed_values(design, spec), **dict.fromkeys(spec.each, 0)}
    for option, formula in [(option, formula) for option, formula in given if formula is not None]:
        for name in formula.names:
            if name not in known:
                raise UserError(
                    f"{option} '{formula.text}': {_unknown(design, name)}", hint=_remedy(design, name)
                )
    if spec.where and not spec.each:
        raise UserError("--where without --each", hint=EACH_HINT)


def _unknown(design: Design, name: str) -> str:
    if name in design.inputs:
        return f"input {name} has no value"
    return f"{name} is neither an input nor a parameter of {design.top}"


def _remedy(design: Design, name: str) -> str:
    if name in design.inputs:
        return f"claim it for each value with --each {name}, or for one with --hold {name}=VALUE"
    names = [*design.inputs, *design.parameters]
    return f"there are {', '.join(names)}" if names else "it has neither"


def rigid(design: Design, names: Iterable[str]) -> Design:
    """The design with inputs as registers that nothing ever moves: each of their values is a state's."""
    moved = [name for name in design.inputs if name in set(names)]
    where = Where(design.files[0] if design.files else "", 1)
    made = [
        Register(name, design.inputs[name], "flip-flop", (), (), None, _where(design, name) or where)
        for name in moved
    ]
    left = {name: width for name, width in design.inputs.items() if name not in moved}
    return replace(design, inputs=left, registers=(*design.registers, *made))
