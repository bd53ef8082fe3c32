"""A claim for each value of some inputs: every value is judged by itself, and the findings are made one.

An input of `--each` is held at one value after another; it never moves. A property is proved where it is proved for
every value, and refuted by the smallest value for which it is, with that value's counterexample. Values are in the
order of the inputs as they are given, the last one changing fastest.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction

from prover.design import Design
from prover.domain import (
    Domain,
    Values,
    check_names,
    claimed_at,
    domain_text,
    fixed_values,
    in_numbers,
    ranges_text,
    rigid,
    values_text,
)
from prover.effort import Effort
from prover.errors import Where
from prover.findings import Fact, Finding, Obligation, Report, Verdict, overall, with_waivers
from prover.ports import Ports, recognise
from prover.spec import Ranges, Spec

ENUMERATED = 256
"""Values up to which each is judged by itself without looking for a proof of all at once."""

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


def row_text(row: ValueRow) -> str:
    """A row's values: A=3, B=1..7."""
    return ", ".join(f"{name}={ranges_text([ends])}" for name, ends in row.values)


def report(design: Design, spec: Spec, effort: Effort, judge: Judge) -> Report:
    """The report on a claim with formulas: for the one value that they have, or for each value of the inputs.

    Raises UserError for names that stand for nothing, and for values at which the claim means nothing."""
    check_names(design, spec)
    fixed = fixed_values(design, spec)
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
