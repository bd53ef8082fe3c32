"""The certificate of a claim on each value, schema "subharmonic/values-certificate-1".

Like that of a single claim it holds nothing but what follows from the sources, the options and the evidence, so that
`recheck` can make it again and compare; nothing in it tells of the run that made it.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Sequence
from json import dumps
from pathlib import Path

from prover import values_evidence
from prover.effort import Effort
from prover.errors import InternalError, UserError
from prover.findings import Finding, Report, overall
from prover.rebuild import Rejected
from prover.report.certificate import (
    Certificate,
    Object,
    Subject,
    digest,
    options,
    relative,
    render,
)
from prover.spec import Spec
from prover.values_evidence import ValuesEvidence
from prover.values_rebuild import Made, made_of

SCHEMA = "subharmonic/values-certificate-1"


def certify(report: Report, files: Sequence[str | Path], effort: Effort) -> Certificate:
    """The certificate of a report on each value. Raises InternalError where the evidence says something else than the
    report."""
    from prover.values_collect import collect_values

    basis = report.each.basis if report.each is not None else None
    if basis is None:
        raise UserError("--certificate with --each: not where tasks are sent elsewhere", hint="check it here")
    found = collect_values(basis, effort)
    try:
        made = made_of(basis.design, basis.spec, found, Effort(math.inf))
    except Rejected as fault:
        raise InternalError(f"the evidence for a certificate fails: {fault}") from fault
    left_open = []
    for ours, theirs in zip(made.report.findings, report.findings, strict=True):
        if ours.verdict != theirs.verdict:
            if "open" not in (ours.verdict, theirs.verdict):
                raise InternalError(
                    f"the evidence shows {ours.name} {ours.verdict}, the report {theirs.verdict}"
                )
            left_open += [ours.name] if ours.verdict == "open" else []
    subject = Subject(
        basis.spec,
        tuple(relative(file) for file in files),
        tuple(relative(folder) for folder in basis.spec.include),
        tuple((relative(file), digest(Path(file))) for file in basis.design.files),
    )
    return Certificate(render(document(subject, basis.design.top, found, made)), tuple(left_open))


def document(subject: Subject, top: str, found: ValuesEvidence, made: Made) -> Object:
    """The certificate as plain dictionaries and lists."""
    findings = made.report.findings
    return {
        "schema": SCHEMA,
        "verdict": overall(findings),
        "claim": claim(subject.spec),
        "options": options(subject),
        "sources": sources(subject),
        "top": top,
        "properties": [_property(finding) for finding in findings],
        "evidence": values_evidence.as_object(found),
        "obligations": [{"name": each.name, "script": each.script()} for each in made.obligations],
    }


def sources(subject: Subject) -> Object:
    """The files that were read, and what binds them to the claim."""
    files = [{"path": path, "sha256": sha256} for path, sha256 in subject.digests]
    return {"files": files, "sha256": bound_to(subject)}


def claim(spec: Spec) -> Object:
    """What is claimed, with formulas as they are written; times are half-cycles."""
    return {
        "ratio": spec.ratio_formula.text if spec.ratio_formula is not None else spec.ratio_text,
        "mean": spec.mean,
        "high": spec.high_formula.text if spec.high_formula is not None else spec.high,
        "each": {n: None if r is None else [list(ends) for ends in r] for n, r in spec.each.items()},
        "where": [condition.text for condition in spec.where],
        "within": spec.within,
        "reset_cycles": spec.reset_cycles,
        "start": spec.start,
        "waivers": dict(spec.waivers),
    }


def bound_to(subject: Subject) -> str:
    """The SHA-256 that binds the claim, the options and the files' digests to one another, in hexadecimal."""
    said = [claim(subject.spec), options(subject), subject.digests]
    return hashlib.sha256(dumps(said).encode()).hexdigest()


def _property(finding: Finding) -> Object:
    return {
        "name": finding.name,
        "verdict": finding.verdict,
        "claim": finding.claim,
        "says": finding.says,
        "timing_obligations": [each.text for each in finding.obligations],
        "waived": finding.waived,
    }
