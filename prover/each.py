"""A claim for each value of some inputs: every value is judged by itself, and the findings are made one.

An input of `--each` is held at one value after another; it never moves. A property is proved where it is proved for
every value, and refuted by the smallest value for which it is, with that value's counterexample. Values are in the
order of the inputs as they are given, the last one changing fastest.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

from prover.design import Design, Register
from prover.effort import Effort
from prover.errors import UserError, Where
from prover.findings import Fact, Finding, Obligation, Report, Verdict, overall, with_waivers
from prover.formula import Formula
from prover.ports import Ports, recognise
from prover.spec import EACH_HINT, Ranges, Spec

ENUMERATED = 256
"""Values up to which each is judged by itself without looking for a proof of all at once."""

MOST_LISTED = 1 << 16
"""Values, before the conditions, that are gone through one by one."""

Values = Mapping[str, int]
Judge = Callable[[Design, Spec, Effort], Report]


@dataclass(frozen=True, slots=True)
class ValueRow:
    """Neighbouring values with one outcome.

    values   each input with the first and the last of its values; only the last input has several
    refuted, open  properties that are, waived ones among them
    ratios   the least and the greatest ratio that is claimed, in input cycles
    worst    the worst recovery, in half-cycles; None where some state never recovers, or that is not known
    """

    values: tuple[tuple[str, tuple[int, int]], ...]
    verdict: Verdict
    refuted: tuple[str, ...]
    open: tuple[str, ...]
    ratios: tuple[Fraction, Fraction]
    worst: int | None


@dataclass(frozen=True, slots=True)
class Each:
    """What a report on each value of some inputs covers.

    inputs  each input with its values; `where` the conditions on them
    ratio, high  the claim as text; high is "" where it is half the period
    count   values for which the claim is made, None where they have not been counted
    tried   how many of them were judged
    shown   the value that the report's rhythm, facts and waves are about
    rows    all values that were judged, grouped
    """

    inputs: tuple[tuple[str, Ranges], ...]
    where: tuple[str, ...]
    ratio: str
    high: str
    count: int | None
    tried: int
    shown: dict[str, int]
    rows: tuple[ValueRow, ...]

    @property
    def domain(self) -> str:
        """The values in words: div=1..15, where div != 3."""
        return domain_text(self.inputs, self.where)


def domain_text(inputs: Iterable[tuple[str, Ranges]], where: Iterable[str]) -> str:
    """Values and conditions in words: div=1..15, where div != 3."""
    told = ", ".join(f"{name}={ranges_text(ranges)}" for name, ranges in inputs)
    conditions = " and ".join(where)
    return told + (f", where {conditions}" if conditions else "")


def ranges_text(ranges: Iterable[tuple[int, int]]) -> str:
    """Ranges as they are written: 0,2,8..15."""
    return ",".join(str(low) if low == high else f"{low}..{high}" for low, high in ranges)


def row_text(row: ValueRow) -> str:
    """A row's values: A=3, B=1..7."""
    return ", ".join(f"{name}={ranges_text([ends])}" for name, ends in row.values)


def values_text(values: Values) -> str:
    """One value of each input: A=3, B=1."""
    return ", ".join(f"{name}={value}" for name, value in values.items())


def report(design: Design, spec: Spec, effort: Effort, judge: Judge) -> Report:
    """The report on a claim with formulas: for the one value that they have, or for each value of the inputs.

    Raises UserError for names that stand for nothing, and for values at which the claim means nothing."""
    _check_names(design, spec)
    fixed = _fixed(design, spec)
    if not spec.each:
        return judge(design, in_numbers(design, spec), effort)
    domain = Domain.of(design, spec)
    spec = _with_roles(spec, recognise(rigid(design, spec.each), spec))
    found = _Merged(spec, domain)
    count = domain.count
    most = min(count or ENUMERATED, ENUMERATED)
    for number, each in enumerate(itertools.islice(domain.values(), most)):
        effort.doing = f"judging {values_text(each)}"
        # What a value leaves of its share goes to the others.
        share = effort.left / max(1, (most - number) / 8)
        found.add(each, judge(design, claimed_at(spec, {**fixed, **each}, each), effort.share(share)))
        if effort.left <= 0:
            break
    return found.report(count)


def in_numbers(design: Design, spec: Spec) -> Spec:
    """The claim with the one value that its formulas have in this design."""
    return claimed_at(spec, _fixed(design, spec))


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


# -- names and values --------------------------------------------------------------------------------------


def _fixed(design: Design, spec: Spec) -> dict[str, int]:
    """What has one value: parameters, and the inputs that --hold holds."""
    held = {
        name: value % (1 << design.inputs[name])
        for name, value in spec.holds.items()
        if name in design.inputs
    }
    return {**design.parameters, **held}


def _check_names(design: Design, spec: Spec) -> None:
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
    known = {**_fixed(design, spec), **dict.fromkeys(spec.each, 0)}
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


@dataclass(frozen=True, slots=True)
class Domain:
    """The values for which a claim is made: ranges for each input, and conditions over these and what is fixed."""

    inputs: tuple[tuple[str, Ranges], ...]
    where: tuple[Formula, ...]
    fixed: Values

    @staticmethod
    def of(design: Design, spec: Spec) -> Domain:
        """The domain of a claim. Raises UserError for values that the port cannot have, or if there are none."""
        inputs = []
        for name, ranges in spec.each.items():
            most = (1 << design.inputs[name]) - 1
            if ranges is not None and ranges[-1][1] > most:
                raise UserError(
                    f"--each {name}={ranges_text(ranges)}: the port has {design.inputs[name]} bits",
                    _where(design, name),
                    hint=f"give values from 0 to {most}",
                )
            inputs.append((name, ranges if ranges is not None else ((0, most),)))
        domain = Domain(tuple(inputs), spec.where, _fixed(design, spec))
        if next(domain.values(), None) is None:
            raise UserError(
                "--where leaves no values to judge", hint="give a condition that some values meet"
            )
        return domain

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
        for number in range(self.size):
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

    def __str__(self) -> str:
        return domain_text(self.inputs, (condition.text for condition in self.where))

    def holds(self, values: Values) -> bool:
        """Whether the conditions admit the values."""
        return all(condition.value({**self.fixed, **values}) for condition in self.where)


def _where(design: Design, name: str) -> Where | None:
    return design.signals[name].where if name in design.signals else None


# -- ports -------------------------------------------------------------------------------------------------


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


def _with_roles(spec: Spec, ports: Ports) -> Spec:
    """The claim with the ports named as they were recognised for all values together."""
    reset = f"{ports.reset.port}={ports.reset.active}" if ports.reset else None
    holds = {name: value for name, value in ports.holds.items() if name not in spec.each}
    return replace(spec, clock=ports.clock, reset=reset, output=ports.output, holds=holds)


# -- findings ----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Found:
    """One property's finding at one value, and the report that it stands in."""

    values: Values
    finding: Finding
    report: Report


class _Tally:
    """What the values' findings on one property come to."""

    def __init__(self) -> None:
        self.counts: dict[Verdict, int] = {"proved": 0, "refuted": 0, "open": 0}
        self.first: dict[Verdict, _Found] = {}
        self.slowest: _Found | None = None
        self.obligations: dict[tuple[str, Where], Obligation] = {}

    def add(self, found: _Found) -> None:
        finding = found.finding
        self.counts[finding.verdict] += 1
        self.first.setdefault(finding.verdict, found)
        for obligation in finding.obligations:
            self.obligations.setdefault((obligation.text, obligation.where), obligation)
        if _worst(finding) > (_worst(self.slowest.finding) if self.slowest else -1):
            self.slowest = found

    @property
    def verdict(self) -> Verdict:
        return "refuted" if self.counts["refuted"] else "open" if self.counts["open"] else "proved"


def _worst(finding: Finding) -> int:
    worst = finding.facts.get("worst_half_cycles")
    return worst if isinstance(worst, int) else -1


class _Merged:
    """The values' reports, made one as they come in."""

    def __init__(self, spec: Spec, domain: Domain) -> None:
        self.spec = spec
        self.domain = domain
        self.tallies: dict[str, _Tally] = {}
        self.rows: list[ValueRow] = []
        self.reports: dict[Verdict, Report] = {}
        self.tried = 0

    def add(self, values: Values, report: Report) -> None:
        """Take in the report on the next value."""
        self.tried += 1
        self.reports.setdefault(overall(report.findings), report)
        for finding in report.findings:
            self.tallies.setdefault(finding.name, _Tally()).add(_Found(values, finding, report))
        row = _row(values, report)
        if self.rows and (joined := _joined(self.rows[-1], row)) is not None:
            self.rows[-1] = joined
        else:
            self.rows.append(row)

    def report(self, count: int | None) -> Report:
        """All in one: about the value that is refuted first, else that is open first, else the first of all."""
        shown = next(self.reports[v] for v in ("refuted", "open", "proved") if v in self.reports)
        findings = [self._finding(name, tally, shown, count) for name, tally in self.tallies.items()]
        held = {name: shown.spec.holds[name] for name in self.spec.each}
        each = Each(
            inputs=self.domain.inputs,
            where=tuple(condition.text for condition in self.spec.where),
            ratio=self.spec.ratio_formula.text if self.spec.ratio_formula else self.spec.ratio_text,
            high=self.spec.high_formula.text if self.spec.high_formula else str(self.spec.high or ""),
            count=count,
            tried=self.tried,
            shown=held,
            rows=tuple(self.rows),
        )
        spec = replace(
            shown.spec,
            ratio_formula=self.spec.ratio_formula,
            high_formula=self.spec.high_formula,
            each=self.spec.each,
            where=self.spec.where,
        )
        return replace(
            shown, spec=spec, findings=with_waivers(findings, spec), facts=self._facts(shown), each=each
        )

    def _finding(self, name: str, tally: _Tally, shown: Report, count: int | None) -> Finding:
        """The property's finding for all values, with the evidence of the value that decides it."""
        verdict = tally.verdict
        if verdict == "proved" and tally.slowest is not None:
            decides = tally.slowest
        else:
            decides = next((f for f in tally.first.values() if f.report is shown), tally.first[verdict])
        if decides.finding.verdict != verdict:
            decides = tally.first[verdict]
        finding, many = decides.finding, f"{self.tried} value{'s' * (self.tried != 1)}"
        missing = count is None or count > self.tried
        if verdict == "refuted":
            says = f"at {values_text(decides.values)}: {finding.says}; refuted at {tally.counts['refuted']} of {many}"
        elif verdict == "open":
            says = (
                f"at {values_text(decides.values)}: {finding.says}; open at {tally.counts['open']} of {many}"
            )
        else:
            says = self._proved(decides, many)
        if verdict == "proved" and missing:
            verdict, says = "open", f"{says}; the others were not judged"
        return replace(
            finding,
            verdict=verdict,
            claim=self._claim(finding),
            says=says,
            method=f"each value judged by itself; {finding.method}"
            if finding.method
            else "each value by itself",
            bound=finding.bound
            if verdict == "proved"
            else f"judged: {many} of {'many' if count is None else count}",
            facts={**finding.facts, "at": dict(decides.values), "values_judged": self.tried},
            obligations=tuple(tally.obligations.values()),
            waived=None,
            witness=None if decides.report is shown else decides.report,
        )

    def _proved(self, slowest: _Found, many: str) -> str:
        finding = slowest.finding
        if _worst(finding) < 0:
            return f"holds for each of {many}"
        return f"holds for each of {many}: {finding.says}, at {values_text(slowest.values)}"

    def _claim(self, finding: Finding) -> str:
        """The claim with formulas in place of the numbers of one value."""
        from properties import claim

        return f"{claim(finding.name, self.spec) or finding.claim}, for each of {self.domain}"

    def _facts(self, shown: Report) -> dict[str, Fact]:
        """The facts of the value that is shown, with the worst recovery of all."""
        slowest = self.tallies["recovery"].slowest if "recovery" in self.tallies else None
        facts = {k: v for k, v in shown.facts.items() if not k.startswith("worst_recovery_")}
        if slowest is None or self.tallies["recovery"].verdict != "proved":
            return facts
        return facts | {k: v for k, v in slowest.report.facts.items() if k.startswith("worst_recovery_")}


def _row(values: Values, report: Report) -> ValueRow:
    verdicts = {f.name: f.verdict for f in report.findings}
    recovery = report.rhythm.recovery
    return ValueRow(
        values=tuple((name, (value, value)) for name, value in values.items()),
        verdict=overall(report.findings),
        refuted=tuple(name for name, verdict in verdicts.items() if verdict == "refuted"),
        open=tuple(name for name, verdict in verdicts.items() if verdict == "open"),
        ratios=(report.spec.ratio or Fraction(0),) * 2,
        worst=recovery.worst if recovery else None,
    )


def _joined(a: ValueRow, b: ValueRow) -> ValueRow | None:
    """Both rows as one, if the second goes on where the first ends and has the same outcome."""
    *fixed, (name, (low, end)) = a.values
    *others, (_, (begin, high)) = b.values
    if fixed != others or begin != end + 1 or (a.worst is None) != (b.worst is None):
        return None
    if (a.verdict, a.refuted, a.open) != (b.verdict, b.refuted, b.open):
        return None
    ratios = [*a.ratios, *b.ratios]
    return replace(
        a,
        values=(*fixed, (name, (low, high))),
        ratios=(min(ratios), max(ratios)),
        worst=None if a.worst is None or b.worst is None else max(a.worst, b.worst),
    )
