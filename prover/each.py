"""A claim for each value of some inputs: every value is judged by itself, and the findings are made one.

An input of `--each` is held at one value after another; it never moves. A property is proved where it is proved for
every value, and refuted by the smallest value for which it is, with that value's counterexample. Values are in the
order of the inputs as they are given, the last one changing fastest.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from fractions import Fraction
from typing import TYPE_CHECKING

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
from prover.effort import Effort, OutOfEffort
from prover.errors import Where
from prover.findings import Fact, Finding, Obligation, Report, Verdict, overall, with_waivers
from prover.ports import Ports, recognise
from prover.spec import Ranges, Spec

if TYPE_CHECKING:
    from prover.family import Proof
    from prover.together import Together

ENUMERATED = 64
"""Values up to which each is judged by itself without looking for a proof of all at once."""

FEW, SHARE_OF_FEW, SHARE = 512, 0.25, 0.75
"""Values up to which judging each takes no longer than a search; the share of the effort that a proof of all at once
may take for so few, and for more."""

MOST_ENUMERATED = 1 << 14
"""Values up to which each is judged by itself, while there is effort, where not all can be had at once."""

LEAST_SHARE = 2.0
"""Seconds that a value has at least, while there are any: less would decide nothing."""

Judge = Callable[[Design, Spec, Effort], Report]


@dataclass(frozen=True, slots=True)
class ValueRow:
    """Neighbouring values with one outcome.

    values   each input with the first and the last of its values; only the last input has several
    together whether these are all values within the ranges that have no row of their own, proved at once
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
    together: bool = False


@dataclass(frozen=True, slots=True)
class AtOnce:
    """What a proof of all values at once comes to, but for those that are judged singly.

    why     by property, why it is not known for the values that are not judged singly; "" if it is
    first_known  properties of which the first value that fails, if there is one, is among those judged singly
    dues    timing obligations that hold for all values together, by property
    singly  values to be judged singly: those that the proof does not hold for, and those that decide something
    ratios  the least and the greatest ratio that is claimed of the others, in input cycles, as far as they are known
    bound   the greatest bound on their recovery, in half-cycles; `bounds` as they hang on the inputs
    shapes  shapes of paths that are proved
    """

    why: Mapping[str, str]
    first_known: frozenset[str]
    dues: Mapping[str, tuple[Obligation, ...]]
    singly: tuple[Values, ...]
    ratios: tuple[Fraction, Fraction] | None
    bound: int | None
    bounds: tuple[str, ...]
    shapes: int


def bounds_text(proof: Proof) -> tuple[str, ...]:
    """The bounds on the recovery, as they hang on the inputs."""
    return tuple(dict.fromkeys(str(bound) for _, claim in proof.everywhere or () for bound in claim.bounds))


@dataclass(frozen=True, slots=True)
class Basis:
    """What a report on each value rests on: the design, the claim as it was given, the report on each value that was
    judged singly, and the proof of all others."""

    design: Design
    spec: Spec
    reports: tuple[tuple[Values, Report], ...]
    together: Together | None


@dataclass(frozen=True, slots=True)
class Each:
    """What a report on each value of some inputs covers.

    inputs  each input with its values; `where` the conditions on them
    ratio, high  the claim as text; high is "" where it is half the period
    count   values for which the claim is made, None where they have not been counted
    tried   how many of them were judged by themselves
    shapes  shapes of paths that were proved for all other values at once; 0 where each was judged by itself
    shown   the value that the report's rhythm, facts and waves are about
    rows    all values that were judged, grouped
    basis   what it rests on, while it is in the process that judged it
    """

    inputs: tuple[tuple[str, Ranges], ...]
    where: tuple[str, ...]
    ratio: str
    high: str
    count: int | None
    tried: int
    shapes: int
    shown: dict[str, int]
    rows: tuple[ValueRow, ...]
    basis: Basis | None = field(init=False, default=None, repr=False, compare=False)

    @property
    def domain(self) -> str:
        """The values in words: div=1..15, where div != 3."""
        return domain_text(self.inputs, self.where)


def row_text(row: ValueRow) -> str:
    """A row's values: A=3, B=1..7."""
    told = ", ".join(f"{name}={ranges_text([ends])}" for name, ends in row.values)
    return f"all others of {told}" if row.together else told


def report(design: Design, spec: Spec, effort: Effort, judge: Judge) -> Report:
    """The report on a claim with formulas: for the one value that they have, or for each value of the inputs.

    Raises UserError for names that stand for nothing, and for values at which the claim means nothing."""
    check_names(design, spec)
    fixed = fixed_values(design, spec)
    if not spec.each:
        return judge(design, in_numbers(design, spec), effort)
    domain = Domain.of(design, spec).begun(design.inputs, effort)
    given, spec = spec, with_roles(spec, recognise(rigid(design, spec.each), spec))
    found = Merged(spec, domain)
    count = domain.count
    values: Iterator[dict[str, int]] = itertools.islice(domain.values(), MOST_ENUMERATED)
    most, why = min(count or MOST_ENUMERATED, MOST_ENUMERATED), ""
    proved: Together | None = None
    if count is None or count > ENUMERATED:
        from prover.together import prove

        share = SHARE_OF_FEW if count is not None and count <= FEW else SHARE
        together = prove(design, spec, domain, effort.share(effort.left * share))
        if isinstance(together, str):
            why = together
        else:
            found.together = together.at_once
            proved, singly = together, together.at_once.singly
            values, most = (dict(each) for each in singly), len(singly)
            if count is not None and count <= MOST_ENUMERATED and any(together.at_once.why.values()):
                values, most = domain.values(), count
    for number, each in enumerate(values):
        effort.doing = f"judging {values_text(each)}"
        # What a value leaves of its share goes to the others.
        share = max(LEAST_SHARE, effort.left / max(1, (most - number) / 8))
        try:
            found.add(each, judge(design, claimed_at(spec, {**fixed, **each}, each), effort.share(share)))
        except OutOfEffort:
            # What was found out about the values before stands.
            if not found.tried:
                raise
        if effort.left <= 0:
            break
    made = found.report(count, why)
    if made.each is not None:
        basis = Basis(design, given, tuple(found.reports), proved if found.tried != count else None)
        object.__setattr__(made.each, "basis", basis)
    return made


def with_roles(spec: Spec, ports: Ports) -> Spec:
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


class Merged:
    """The values' reports, made one as they come in."""

    def __init__(self, spec: Spec, domain: Domain) -> None:
        self.spec = spec
        self.domain = domain
        self.tallies: dict[str, _Tally] = {}
        self.rows: list[ValueRow] = []
        self.reports: list[tuple[Values, Report]] = []
        self.tried = 0
        self.together: AtOnce | None = None

    def add(self, values: Values, report: Report) -> None:
        """Take in the report on the next value."""
        self.tried += 1
        self.reports.append((values, report))
        for finding in report.findings:
            self.tallies.setdefault(finding.name, _Tally()).add(_Found(values, finding, report))
        row = _row(values, report)
        if self.rows and (joined := _joined(self.rows[-1], row)) is not None:
            self.rows[-1] = joined
        else:
            self.rows.append(row)

    def report(self, count: int | None, why: str) -> Report:
        """All in one: about the value that is refuted first, else that is open first, else the first of all."""
        verdicts: dict[Verdict, Report] = {}
        for _, report in self.reports:
            verdicts.setdefault(overall(report.findings), report)
        shown = next(verdicts[v] for v in ("refuted", "open", "proved") if v in verdicts)
        findings = [self._finding(name, tally, shown, count, why) for name, tally in self.tallies.items()]
        held = {name: shown.spec.holds[name] for name in self.spec.each}
        each = Each(
            inputs=self.domain.inputs,
            where=tuple(condition.text for condition in self.spec.where),
            ratio=self.spec.ratio_formula.text if self.spec.ratio_formula else self.spec.ratio_text,
            high=self.spec.high_formula.text if self.spec.high_formula else str(self.spec.high or ""),
            count=count,
            tried=self.tried,
            shapes=self.together.shapes if self.together else 0,
            shown=held,
            rows=(*self.rows, *self._others(count)),
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

    def _finding(self, name: str, tally: _Tally, shown: Report, count: int | None, why: str) -> Finding:
        """The property's finding for all values, with the evidence of the value that decides it."""
        verdict = tally.verdict
        decides = tally.first[verdict]
        if verdict == "proved" and tally.slowest is not None:
            decides = tally.slowest
        finding, many = decides.finding, f"{self.tried} value{'s' * (self.tried != 1)}"
        whole = count is not None and count == self.tried
        missing = "" if whole else self._missing(name, why)
        bound = finding.bound
        method = (
            f"each value judged by itself; {finding.method}" if finding.method else "each value by itself"
        )
        if verdict != "proved":
            at, of = values_text(decides.values), f"{many} judged singly" if not whole else many
            says = f"at {at}: {finding.says}; {verdict} at {tally.counts[verdict]} of {of}"
            if verdict == "refuted" and not whole and not self._is_first(name, decides.values):
                says += "; whether a smaller value fails is not known"
            bound = f"judged: {many} of {'many' if count is None else count}"
        elif whole:
            says = self._proved(decides, many)
        elif missing:
            verdict = "open"
            says = f"{self._proved(decides, many)}; the others are open: {missing}"
            bound = f"judged: {many} of {'many' if count is None else count}"
        else:
            says = self._at_once(decides, many)
            method = "for all values at once, the inputs being variables: every step of each shape (solver)"
        facts: dict[str, Fact] = {**finding.facts, "at": dict(decides.values), "values_judged": self.tried}
        if name == "recovery" and verdict == "proved" and self.together is not None and not whole:
            facts |= self._worst_at_once(_worst(finding))
        return replace(
            finding,
            verdict=verdict,
            claim=self._claim(finding),
            says=says,
            method=method,
            bound=bound,
            facts=facts,
            obligations=self._obligations(name, tally, whole),
            waived=None,
            witness=None if decides.report is shown else decides.report,
        )

    def _obligations(self, name: str, tally: _Tally, whole: bool) -> tuple[Obligation, ...]:
        """The timing obligations of the values that were judged singly, and those of all others."""
        out = dict(tally.obligations)
        together = self.together.dues.get(name, ()) if self.together is not None and not whole else ()
        named = {obligation.register for obligation in out.values()}
        for obligation in together:
            if name != "reset" or obligation.register not in named:
                out.setdefault((obligation.text, obligation.where), obligation)
        return tuple(out.values())

    def _is_first(self, name: str, values: Values) -> bool:
        """Whether no smaller value than this one can fail."""
        known = self.together is not None and name in self.together.first_known
        return known or next(self.domain.values(), None) == values

    def _missing(self, name: str, why: str) -> str:
        """Why a property is not known for the values that were not judged by themselves, "" if it is."""
        if self.together is None:
            return why or "there was no time for them"
        judged = [values for values, _ in self.reports]
        left = [values for values in self.together.singly if values not in judged]
        if left:
            return f"there was no time for {values_text(left[0])}"
        return self.together.why.get(name, "this property is judged one value at a time")

    def _proved(self, slowest: _Found, many: str) -> str:
        finding = slowest.finding
        if _worst(finding) < 0:
            return f"holds for each of {many}"
        return f"holds for each of {many}: {finding.says}, at {values_text(slowest.values)}"

    def _at_once(self, slowest: _Found, many: str) -> str:
        """What is said where a proof of all values at once and some values by themselves cover the domain."""
        assert self.together is not None
        told = f"holds for every value: {many} judged singly, all others at once"
        if _worst(slowest.finding) < 0:
            return told
        facts = self._worst_at_once(_worst(slowest.finding))
        word = "exactly" if facts["exact"] else "at most"
        at = f", at {values_text(slowest.values)}" if facts["exact"] else ""
        bounds = [bound for bound in self.together.bounds if not bound.isdigit()]
        within = f" ({' or '.join(bounds)})" if bounds else ""
        return f"{told}: worst recovery {word} {facts['worst_half_cycles']} half-cycles{at}{within}"

    def _worst_at_once(self, judged: int) -> dict[str, Fact]:
        """The worst recovery, which a value that was judged by itself may need or not, with all others' bound."""
        bound = self.together.bound if self.together else None
        worst = max(judged, bound or 0)
        return {"worst_half_cycles": worst, "exact": worst == judged}

    def _others(self, count: int | None) -> list[ValueRow]:
        """A row for the values that were proved at once."""
        together = self.together
        if together is None or together.ratios is None or count == self.tried:
            return []
        names = [name for name, tally in self.tallies.items() if self._missing(name, "")]
        ends = tuple((name, (ranges[0][0], ranges[-1][1])) for name, ranges in self.domain.inputs)
        verdict: Verdict = "open" if names else "proved"
        return [ValueRow(ends, verdict, (), tuple(names), together.ratios, together.bound, together=True)]

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
