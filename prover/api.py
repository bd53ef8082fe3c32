"""The public interface: read sources, check a claim, measure a divider, compare two."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from prover import analyse, facts
from prover.design import Design
from prover.effort import Effort
from prover.errors import UserError
from prover.findings import Report, remarks
from prover.ports import recognise
from prover.spec import Spec

if TYPE_CHECKING:
    from prover.compared import Comparison
    from prover.pair import Pairing

Files = Sequence[str | Path]
Tell = Callable[[str], None]


def read(files: Files, spec: Spec | None = None) -> Design:
    """The elaborated design in the files; the spec's module, parameters, defines and include folders apply.

    Raises UserError, with file and line, for whatever can't be read or isn't supported.
    """
    from prover.verilog import read_design

    spec = spec or Spec()
    return read_design(
        files,
        module=spec.module,
        defines=spec.defines,
        include=[Path(folder) for folder in spec.include],
        parameters=spec.parameters,
    )


def check(files: Files, spec: Spec, tell: Tell | None = None) -> Report:
    """Every sign-off property of the divider in the files, judged against the spec.

    `tell` is called with a line of progress now and then. Raises UserError for unusable input or options.
    """
    if not spec.claims:
        raise UserError("no ratio to check", hint="give --ratio N, or ask `measure`")
    return _report(files, spec, tell)


def measure(files: Files, spec: Spec | None = None, tell: Tell | None = None) -> Report:
    """What the divider in the files does: its rhythm, with no claim and no findings."""
    spec = spec or Spec()
    if spec.each or spec.where:
        raise UserError("values to claim something for, and no claim", hint="give --ratio to `check`")
    return _report(files, spec, tell)


def compare(old: Files, new: Files, pairing: Pairing | None = None, tell: Tell | None = None) -> Comparison:
    """Whether two dividers have the same output in every half-cycle, in the sense that `pairing` asks for.

    `tell` is called with a line of progress now and then. Raises UserError for unusable input or options.
    """
    from prover import comparison
    from prover.pair import Pairing, read_pair

    began = time.monotonic()
    pairing = pairing or Pairing()
    effort = Effort(pairing.effort, tell)
    effort.say("reading the sources")
    found = comparison.compare(read_pair(old, new, pairing), pairing, effort)
    return replace(found, seconds=time.monotonic() - began)


def _report(files: Files, spec: Spec, tell: Tell | None) -> Report:
    from properties import ALL

    began = time.monotonic()
    unknown = [name for name in spec.waivers if name not in ALL]
    if unknown:
        raise UserError(
            f"--waive {unknown[0]}: no such property", hint=f"the properties are {', '.join(ALL)}"
        )
    effort = Effort(spec.effort, tell)
    effort.say("reading the sources")
    design = read(files, spec)
    if spec.moving:
        from prover import questions

        report = questions.report(design, spec, effort, _judged)
    elif spec.each or spec.where or spec.ratio_formula is not None or spec.high_formula is not None:
        from prover import each

        report = each.report(design, spec, effort, _judged)
    else:
        report = _judged(design, spec, effort)
    return replace(report, seconds=time.monotonic() - began)


def _judged(design: Design, spec: Spec, effort: Effort) -> Report:
    """The report on one claim in numbers; how long it took is left to the caller."""
    from properties import judge_all

    ports = recognise(design, spec)
    rhythm = analyse.rhythm_of(ports, spec, effort)
    return Report(
        ports=ports,
        spec=spec,
        rhythm=rhythm,
        findings=judge_all(rhythm, spec) if spec.claims else (),
        facts=facts.collect(rhythm, spec),
        assumptions=facts.assumptions(ports, rhythm),
        notes=remarks(design),
        seconds=0.0,
    )
