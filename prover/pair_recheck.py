"""Checking the certificate of a comparison: both dividers read anew, everything in it derived again and compared."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import islice
from pathlib import Path
from typing import Any

from prover import recheck
from prover.compared import claim
from prover.design import Design
from prover.effort import Effort
from prover.errors import UserError
from prover.evidence import Malformed
from prover.findings import Finding
from prover.pair import Pair, Pairing, match
from prover.pair_evidence import read
from prover.pair_rebuild import Rebuilt, rebuild
from prover.rebuild import Rejected
from prover.report import pair_certificate as written
from prover.report.certificate import Subject, render
from prover.report.pair_certificate import Subjects
from prover.spec import Spec


def derive(stated: dict[str, Any], text: str, bases: Sequence[Path], effort: Effort) -> recheck.Derived:
    """Everything that the certificate claims, derived again. Raises Rejected where that comes to something else, and
    UserError where there are no sources."""
    subjects = _subjects(stated)
    effort.say("reading the sources")
    designs = [_design(subject, recheck.base_of(subject, bases)) for subject in subjects.sides]
    effort.say("deriving what the certificate claims")
    try:
        pair = match(designs[0], designs[1], subjects.pairing)
        found = read(stated["evidence"])
        made = rebuild(pair, subjects.pairing, found, effort)
    except (Malformed, Rejected) as fault:
        raise Rejected(f"the evidence doesn't bear it: {fault}") from None
    except UserError as fault:
        raise Rejected(f"the options don't fit the sources: {fault.message}") from None
    derived = written.document(subjects, pair, found, made)
    if render(derived) != text:
        different = list(islice(recheck.differences(stated, derived), recheck.MOST_DIFFERENCES))
        raise Rejected(
            "\n".join(different) or "the text is not in the form in which certificates are written"
        )
    scripts = tuple((each["name"], each["script"]) for each in stated["obligations"])
    top = f"{pair.old.design.top} and {pair.new.design.top}"
    return recheck.Derived(top, (_finding(pair, subjects.pairing, made),), made.obligations, scripts)


def _finding(pair: Pair, pairing: Pairing, made: Rebuilt) -> Finding:
    outcome = made.outcome
    return Finding("compare", outcome.verdict, claim(pair, pairing), outcome.says, outcome.method)


def _subjects(stated: dict[str, Any]) -> Subjects:
    """What the certificate says that it is about, and that it is of one piece."""
    try:
        asked, (old, new) = stated["asked"], stated["sides"]
        sides = _subject(old), _subject(new)
        pairing = Pairing(
            old=sides[0].spec,
            new=sides[1].spec,
            holds=asked["holds"],
            maps=asked["maps"],
            moving=tuple(asked["moving"]),
            start=asked["start"],
            lag=None if asked["lag"] == "any" else asked["lag"],
            settled=asked["settled"],
        )
        subjects = Subjects(sides, pairing)
        _check_kinds(pairing)
        said = {"asked": written.asked(pairing), "sides": written.sides(subjects)}
        different = list(recheck.differences({"asked": asked, "sides": [old, new]}, said))
    except UserError as fault:
        raise Rejected(f"asked: {fault.message}") from None
    except (AttributeError, KeyError, TypeError, ValueError):
        raise Rejected("asked or sides: not of the form of a certificate's") from None
    if different:
        raise Rejected("\n".join(different))
    if stated.get("sha256") != written.bound_to(subjects):
        raise Rejected("sha256: not of what is asked, these options and these files")
    return subjects


def _subject(of: dict[str, Any]) -> Subject:
    spec = Spec(**recheck.reading(of))
    digests = tuple((file["path"], file["sha256"]) for file in of["read"])
    subject = Subject(spec, tuple(of["files"]), tuple(of["include"]), digests)
    recheck.check_kinds(subject)
    return subject


def _check_kinds(pairing: Pairing) -> None:
    """Raise ValueError where something that is asked is of another kind than it has to be."""
    numbers = [*pairing.holds.values(), 0 if pairing.lag is None else pairing.lag]
    names = [*pairing.holds, *pairing.maps, *pairing.maps.values(), *pairing.moving]
    if any(not isinstance(number, int) or isinstance(number, bool) for number in numbers):
        raise ValueError
    if any(not isinstance(name, str) for name in names) or not isinstance(pairing.settled, bool):
        raise ValueError
    if pairing.start not in (None, "reset", "initial"):
        raise ValueError


def _design(subject: Subject, base: Path) -> Design:
    """A divider read anew. Raises Rejected where other files are read than stated."""
    from prover.verilog import read_design

    spec = replace(subject.spec, include=tuple(str(base / folder) for folder in subject.include))
    try:
        design = read_design(
            [base / name for name in subject.files],
            module=spec.module,
            defines=spec.defines,
            include=spec.include,
            parameters=spec.parameters,
        )
    except UserError as fault:
        raise Rejected(f"the sources can't be read as the certificate says: {fault.message}") from None
    recheck.check_files(design, subject, base)
    return design
