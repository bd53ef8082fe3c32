"""What is asked while inputs move: from options to questions, and the report that the answers go into.

An input that moves and stands in the formula of the ratio makes the ratio change; one of a single bit that does not
is an enable. The other properties are judged with it held: an enable at the value at which the divider runs, any
other input at each value of its own (see each). While the ratio changes, enables stay where the divider runs; while
an enable moves, the ratio's inputs keep any one value."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import replace

from prover import domain, each, moves, nominal
from prover import expr as e
from prover.design import Design
from prover.domain import Values
from prover.each import Judge
from prover.effort import Effort
from prover.errors import UserError
from prover.expr import Expr
from prover.findings import Finding, Report, with_waivers
from prover.formula import Formula
from prover.moves import Moves, Question
from prover.observer import Nominal
from prover.ports import Ports, recognise, recognise_open
from prover.solve import find
from prover.spec import Ranges, Spec
from prover.watch import Seed


def report(design: Design, spec: Spec, effort: Effort, judge: Judge) -> Report:
    """The report on a claim while inputs move: the other properties with them held, then what is claimed of moves.

    Raises UserError for inputs of which nothing can be claimed."""
    varying, enables = _roles(design, spec)
    named = named_ports(design, spec)
    half = effort.share(effort.left / 2)
    found, active = _standing(design, named, varying, enables, half, judge)
    ports = recognise_open(design, named, [*spec.moving, *spec.each])
    asked = list(_questions(ports, design, named, varying, enables, active, found, effort))
    answers = []
    for number, question in enumerate(asked):
        answers.append(moves.answer(ports, question, effort.share(effort.left / (len(asked) - number))))
    findings = with_waivers([*found.findings, *(_finding(each, spec) for each in answers)], spec)
    assumed = _assumptions(asked)
    return replace(
        found,
        spec=replace(spec, ratio=found.spec.ratio, high=found.spec.high),
        findings=findings,
        assumptions=(*found.assumptions, *assumed),
        standing=found,
    )


def _finding(answer: Moves, spec: Spec) -> Finding:
    from properties import enable, ratio_change

    return ratio_change.judge(answer, spec) if answer.question.varies else enable.judge(answer, spec)


def _assumptions(asked: Sequence[Question]) -> list[str]:
    """What is assumed of the moves, in a sentence."""
    told = []
    for question in asked:
        name = "ratio-change" if question.varies else "enable"
        moves = f"in {name} {_doing(question.moving, 'move')}"
        told.append(
            moves + (f" while {_doing(question.rigid, 'keep')} any one value" if question.rigid else "")
        )
    return [
        f"{' and '.join(told)}, at most once between two edges of the clock, all bits at once, and all settles "
        "before the next edge, in the order of the micro-steps, with no pulse that the move makes on the way; "
        "everywhere else they are held"
    ]


def _doing(names: Sequence[str], verb: str) -> str:
    return f"{' and '.join(names)} {verb}{'s' * (len(names) == 1)}"


# -- who is what -------------------------------------------------------------------------------------------


def _roles(design: Design, spec: Spec) -> tuple[list[str], list[str]]:
    """The moving inputs that make the ratio change, and the enables."""
    if spec.mean:
        raise UserError(
            "--moving with --mean: no pulse of a mean ratio is nominal", hint="leave one of the two out"
        )
    formulas = [f for f in (spec.ratio_formula, spec.high_formula) if f is not None]
    named = {name for formula in formulas for name in formula.names}
    varying, enables = [], []
    reset = (spec.reset or "").partition("=")[0]
    for name in spec.moving:
        if name not in design.inputs:
            raise UserError(
                f"--moving {name}: {design.top} has no such input",
                hint=f"its inputs are {', '.join(design.inputs) or 'none'}",
            )
        for option, given in (("--hold", spec.holds), ("--each", spec.each)):
            if name in given:
                raise UserError(
                    f"{name} is named both by --moving and by {option}", hint="leave one of the two out"
                )
        if name in (spec.clock, reset):
            raise UserError(f"--moving {name}: the port is the clock or the reset", hint="leave it out")
        if name in named:
            varying.append(name)
        elif design.inputs[name] == 1:
            enables.append(name)
        else:
            raise UserError(
                f"--moving {name}: nothing is claimed of the ratio that its {design.inputs[name]} bits make",
                hint=f"write the ratio as a formula of it, such as --ratio '2*({name}+1)'",
            )
    if len(enables) > 1:
        raise UserError(
            f"several enables move: {', '.join(enables)}", hint="let one move and hold the others"
        )
    if varying and spec.each:
        raise UserError(
            f"--each {next(iter(spec.each))} while the ratio moves with {varying[0]}",
            hint="let it move too, or hold it",
        )
    return varying, enables


def named_ports(design: Design, spec: Spec) -> Spec:
    """The claim with the ports named that are recognised while none of the moving inputs is taken for one."""
    names = [*spec.moving, *spec.each]
    ports = recognise(domain.rigid(design, names), spec)
    reset = f"{ports.reset.port}={ports.reset.active}" if ports.reset else None
    return replace(spec, clock=ports.clock, reset=reset, output=ports.output, holds=dict(ports.holds))


def _standing(
    design: Design, spec: Spec, varying: Sequence[str], enables: Sequence[str], effort: Effort, judge: Judge
) -> tuple[Report, dict[str, int]]:
    """The report with nothing moving, and the value of each enable at which the divider runs: 1 where it runs at
    either, or at neither."""
    ranges: dict[str, Ranges | None] = {name: spec.moving[name] for name in varying}
    still = replace(spec, moving={}, each={**spec.each, **ranges})
    reports = []
    for value in (1, 0) if enables else (1,):
        held = dict.fromkeys(enables, value)
        claimed = replace(still, holds={**still.holds, **held})
        needed = (
            claimed.each
            or claimed.where
            or claimed.ratio_formula is not None
            or claimed.high_formula is not None
        )
        found = each.report(design, claimed, effort, judge) if needed else judge(design, claimed, effort)
        reports.append((found, held))
        if any(f.name == "ratio" and f.verdict == "proved" for f in found.findings):
            return found, held
    return reports[0]


# -- what is asked -----------------------------------------------------------------------------------------


def _questions(
    ports: Ports,
    design: Design,
    spec: Spec,
    varying: Sequence[str],
    enables: Sequence[str],
    active: Values,
    found: Report,
    effort: Effort,
) -> list[Question]:
    """A question for the inputs that make the ratio change, and one for an enable."""
    inputs = [*varying, *spec.each]
    claimed = nominal_of(design, spec, inputs, effort)
    held = {**dict(ports.running.values), **active}
    scope, recovers = found.rhythm.scope, _recovers(found)
    # What pulses with nothing moving is told there, and may be waived there.
    steady = all(f.verdict == "proved" for f in found.findings if f.name in ("settling", "glitch-free"))
    asked = []
    if varying:
        asked.append(Question(tuple(varying), (), held, claimed, True, scope, recovers, steady=steady))
    for name in enables:
        others = {other: value for other, value in held.items() if other != name}
        seeds = _seeds(ports, found, {name: active[name]})
        asked.append(
            Question(
                (name,), tuple(inputs), others, claimed, False, scope, recovers, seeds, active[name], steady
            )
        )
    return asked


MOST_CHANGES = 5
"""Changes of the output, along each orbit, that runs begin before."""

BEFORE = (1, 2, 3, 6, 20, 100)
"""Half-cycles before such a change at which they do."""


def _seeds(ports: Ports, found: Report, inputs: Values) -> tuple[Seed, ...]:
    """Places on the orbits of the start states before changes of the output; none where these are not all
    registers."""
    names = {r.name for r in ports.design.registers}
    seeds = []
    for start, orbit in zip(found.rhythm.starts, found.rhythm.orbits, strict=True):
        at, last = 0, None
        for _, length in itertools.islice(orbit.runs(rounds=3), MOST_CHANGES):
            at += length
            for before in BEFORE:
                if (
                    last is not None
                    and before < length
                    and at <= orbit.lead_half_cycles + 2 * orbit.loop_half_cycles
                ):
                    values = found.rhythm.system.describe(orbit.state(at - before))
                    cause = f"{start.cause}, then {at - before} half-cycles with nothing moving"
                    seeds.append(Seed(values, inputs, length - before, cause))
            last = at
    return tuple(seed for seed in seeds if names <= set(seed.registers))


def _recovers(found: Report) -> int | None:
    """Half-cycles within which every state recovers, at every value, if that is proved."""
    recovery = next((f for f in found.findings if f.name == "recovery" and f.verdict == "proved"), None)
    worst = recovery.facts.get("worst_half_cycles") if recovery else None
    return worst if isinstance(worst, int) else None


def nominal_of(design: Design, spec: Spec, names: Sequence[str], effort: Effort) -> Nominal:
    """The nominal pulses and the values that they are claimed for. Raises UserError where they mean nothing."""
    given = {**spec.each, **spec.moving}
    ranges = {name: given[name] or ((0, (1 << design.inputs[name]) - 1),) for name in names}
    for name, parts in ranges.items():
        if parts[-1][1] >> design.inputs[name]:
            raise UserError(
                f"--moving {name}={domain.ranges_text(parts)}: the port has {design.inputs[name]} bits",
                hint=f"give values from 0 to {(1 << design.inputs[name]) - 1}",
            )
    inputs = {name: design.inputs[name] for name in names}
    ends = {name: (parts[0][0], parts[-1][1]) for name, parts in ranges.items()}
    fixed = domain.fixed_values(design, spec)

    def word(formula: Formula | None, number: int, times: int) -> Expr:
        if formula is None:
            return e.const(number, max(1, number.bit_length()))
        used = {name: inputs[name] for name in inputs if name in formula.names}
        return nominal.whole(formula, times, used, ends, fixed)

    try:
        period = word(spec.ratio_formula, int(2 * (spec.ratio or 0)), 2)
        half = spec.high is None and spec.high_formula is None
        if half:
            high = word(spec.ratio_formula, int(spec.ratio or 0), 1)
        else:
            high = word(spec.high_formula, spec.high or 0, 1)
        bits = [
            nominal.condition(f, {n: w for n, w in inputs.items() if n in f.names}, ends, fixed)
            for f in spec.where
        ]
    except nominal.NoWord as fault:
        raise UserError(
            f"--moving: {fault}", hint="write the formula with + - * and divisions by numbers"
        ) from None
    wide = max(period.width, high.width)
    period, high = e.resize(period, wide, False), e.resize(high, wide, False)
    claimed = e.conj([*(_within(e.var(n, inputs[n]), parts) for n, parts in ranges.items()), *bits])
    inside = e.bvand(e.bvult(e.const(0, wide), high), e.bvult(high, period))
    model = find(e.bvand(claimed, e.bvnot(inside)), effort)
    if model is not None:
        told = domain.values_text({name: model.get(name, 0) for name in names})
        values = {name: model.get(name, 0) for name in names}
        numbers = e.evaluate([high, period], values)
        raise UserError(
            f"at {told}: high time {numbers[0]}: not within a period of {numbers[1]} half-cycles",
            hint="leave the value out, such as --moving div=1..15",
        )
    return Nominal(high, high if half else e.bvsub(period, high), claimed)


def _within(word: Expr, ranges: Ranges) -> Expr:
    """One bit: the word is in one of the ranges."""
    most = (1 << word.width) - 1
    parts = []
    for low, high in ranges:
        above = e.bvule(e.const(low, word.width), word) if low else e.TRUE
        parts.append(e.bvand(above, e.bvule(word, e.const(high, word.width)) if high < most else e.TRUE))
    return e.disj(parts)
