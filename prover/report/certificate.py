"""The certificate, schema "subharmonic/certificate-1": a report's verdicts with all that they rest on.

It holds nothing but what follows from the sources, the options and the evidence, so that `recheck` can make it again
and compare. Nothing in it tells of the run that made it: the same input gives the same bytes.
"""

from __future__ import annotations

import hashlib
import math
import os
from dataclasses import dataclass
from json import dumps
from pathlib import Path
from typing import TYPE_CHECKING, Any

from prover import evidence, rebuild
from prover import expr as e
from prover.effort import Effort
from prover.errors import InternalError
from prover.evidence import Evidence
from prover.findings import Finding, Report, overall
from prover.ports import Ports
from prover.rebuild import Rebuilt
from prover.spec import Spec

if TYPE_CHECKING:
    from collections.abc import Sequence

    from prover.rhythm import Orbit, Start

SCHEMA = "subharmonic/certificate-1"

Object = dict[str, Any]


@dataclass(frozen=True, slots=True)
class Subject:
    """What a certificate is about.

    files, include  the options as written, paths relative to where they are looked for and with slashes
    digests         every file that was read, in order, and the SHA-256 of its bytes"""

    spec: Spec
    files: tuple[str, ...]
    include: tuple[str, ...]
    digests: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class Certificate:
    """A certificate as text, and the verdicts of the report that it does not bear out, by property."""

    text: str
    left_open: tuple[str, ...]


def certify(report: Report, files: Sequence[str | Path], effort: Effort) -> Certificate:
    """The certificate of a report on these files; the effort is for evidence that is still to be found. Raises
    InternalError where the evidence says something else than the report."""
    from properties import judge_all
    from prover.collect import collect

    if report.standing is not None:
        # What inputs that move do rests on evidence that is not written.
        moved = tuple(f.name for f in report.findings[len(report.standing.findings) :])
        still = certify(report.standing, files, effort)
        return Certificate(still.text, (*still.left_open, *moved))
    if report.each is not None:
        from prover.report import values_certificate

        return values_certificate.certify(report, files, effort)
    found = collect(report, effort)
    try:
        made = rebuild.rebuild(report.ports, report.spec, found, Effort(math.inf))
    except rebuild.Rejected as fault:
        raise InternalError(f"the evidence for a certificate fails: {fault}") from fault
    findings = judge_all(made.rhythm, report.spec)
    left_open = []
    for ours, theirs in zip(findings, report.findings, strict=True):
        if ours.verdict != theirs.verdict:
            if "open" not in (ours.verdict, theirs.verdict):
                raise InternalError(
                    f"the evidence shows {ours.name} {ours.verdict}, the report {theirs.verdict}"
                )
            left_open += [ours.name] if ours.verdict == "open" else []
    subject = subject_of(report, files)
    return Certificate(render(document(subject, report.ports, found, made, findings)), tuple(left_open))


def subject_of(report: Report, files: Sequence[str | Path]) -> Subject:
    """What the report is about, with paths relative to the working folder."""
    read = report.ports.design.files
    return Subject(
        report.spec,
        tuple(relative(file) for file in files),
        tuple(relative(folder) for folder in report.spec.include),
        tuple((relative(file), digest(Path(file))) for file in read),
    )


def relative(path: str | Path) -> str:
    """The path from the working folder, with slashes."""
    text = os.path.relpath(path) if os.path.isabs(path) else os.path.normpath(path)
    return text.replace(os.sep, "/")


def digest(path: Path) -> str:
    """The SHA-256 of a file's bytes, in hexadecimal."""
    return hashlib.sha256(path.read_bytes()).hexdigest()


# -- the document ------------------------------------------------------------------------------------------


def document(
    subject: Subject, ports: Ports, found: Evidence, made: Rebuilt, findings: Sequence[Finding]
) -> Object:
    """The certificate as plain dictionaries and lists."""
    said = {"claim": claim(subject.spec), "options": options(subject)}
    return {
        "schema": SCHEMA,
        "verdict": overall(findings),
        **said,
        "sources": sources(subject),
        "machine": _machine(ports, made),
        "properties": [_property(finding) for finding in findings],
        "evidence": evidence.as_object(found),
        "obligations": [{"name": each.name, "script": each.script()} for each in made.obligations],
    }


def sources(subject: Subject) -> Object:
    """The files that were read, and what binds them to the claim."""
    files = [{"path": path, "sha256": sha256} for path, sha256 in subject.digests]
    return {"files": files, "sha256": bound_to(subject)}


def bound_to(subject: Subject) -> str:
    """The SHA-256 that binds the claim, the options and the files' digests to one another, in hexadecimal."""
    said = [claim(subject.spec), options(subject), subject.digests]
    return hashlib.sha256(dumps(said).encode()).hexdigest()


def claim(spec: Spec) -> Object:
    """What is claimed; times are half-cycles."""
    return {
        "ratio": spec.ratio_text,
        "mean": spec.mean,
        "period_half_cycles": None if spec.mean else spec.period,
        "high_half_cycles": spec.high if spec.mean else spec.high_half_cycles,
        "within": spec.within,
        "reset_cycles": spec.reset_cycles,
        "start": spec.start,
        "waivers": dict(spec.waivers),
    }


def options(subject: Subject) -> Object:
    """The options by which the sources are read and their ports recognised."""
    spec = subject.spec
    return {
        "files": list(subject.files),
        "include": list(subject.include),
        "defines": dict(spec.defines),
        "module": spec.module,
        "parameters": dict(spec.parameters),
        "clock": spec.clock,
        "reset": spec.reset,
        "output": spec.output,
        "holds": dict(spec.holds),
    }


def _machine(ports: Ports, made: Rebuilt) -> Object:
    """The transition relation that the evidence speaks of, as SMT-LIB definitions over its variables."""
    system = made.rhythm.system
    reset = ports.reset
    named = {f"next {name}": step for name, step in zip(system.names, system.step, strict=True)}
    named |= {"output now": system.output, "at rest": system.settled}
    return {
        "top": ports.design.top,
        "clock": ports.clock,
        "reset": {"port": reset.port, "active": reset.active, "kind": reset.kind} if reset else None,
        "output": ports.output,
        "holds": dict(ports.holds),
        "registers": {register.name: register.width for register in ports.design.registers},
        "parts": {name: [register, low] for name, register, low in system.slices},
        "gray": dict(system.grays),
        "words": {name: list(bits) for name, bits in system.words},
        "variables": dict(system.variables),
        "micro_steps": made.rhythm.settling.depth,
        "scope": made.rhythm.scope,
        "starts": [_start(*pair) for pair in zip(made.rhythm.starts, made.rhythm.orbits, strict=True)],
        "definitions": e.smtlib_definitions(named),
    }


def _start(start: Start, orbit: Orbit) -> Object:
    return {
        "state": list(start.state),
        "cause": start.cause,
        "lead_half_cycles": orbit.lead_half_cycles,
        "loop_half_cycles": orbit.loop_half_cycles,
    }


def _property(finding: Finding) -> Object:
    proved = finding.verdict == "proved"
    return {
        "name": finding.name,
        "verdict": finding.verdict,
        "claim": finding.claim,
        "bound": finding.bound,
        "says": None if proved else finding.says,
        "timing_obligations": [each.text for each in finding.obligations],
        "waived": finding.waived,
    }


# -- text --------------------------------------------------------------------------------------------------


def render(made: Object) -> str:
    """The document as JSON text: a line for each entry, or for each element of the long lists."""
    entries = []
    for key, value in made.items():
        if key == "evidence":
            inner = ",\n".join(f"{dumps(name)}: {_listed(part)}" for name, part in value.items())
            entries.append(f"{dumps(key)}: {{\n{inner}\n}}")
        else:
            entries.append(f"{dumps(key)}: {_listed(value)}")
    return "{\n" + ",\n".join(entries) + "\n}\n"


def _listed(value: object) -> str:
    if isinstance(value, list) and value and all(isinstance(part, dict) for part in value):
        return "[\n" + ",\n".join(dumps(part) for part in value) + "\n]"
    return dumps(value)
