"""Checking the certificate of a claim on each value: the divider read anew, all derived again and compared."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import islice, pairwise
from pathlib import Path
from typing import Any

from prover import formula, recheck
from prover.effort import Effort
from prover.errors import UserError
from prover.evidence import Malformed, each_of, list_of, number_of, text_of
from prover.rebuild import Rejected
from prover.release import NotShown
from prover.report import values_certificate as written
from prover.report.certificate import Subject, options, render
from prover.spec import PLAIN_RATIO, Ranges, Spec
from prover.values_evidence import read
from prover.values_rebuild import made_of


def derive(stated: dict[str, Any], text: str, bases: Sequence[Path], effort: Effort) -> recheck.Derived:
    """Everything that the certificate claims, derived again. Raises Rejected where that comes to something else, and
    UserError where there are no sources."""
    subject = subject_in(stated)
    effort.say("reading the sources")
    design = recheck.design_of(subject, recheck.base_of(subject, bases))
    effort.say("deriving what the certificate claims")
    try:
        missing = [name for name in subject.spec.each if name not in design.inputs]
        if missing:
            raise Rejected(f"no such input: {missing[0]}")
        found = read(stated["evidence"], {name: design.inputs[name] for name in subject.spec.each})
        made = made_of(design, subject.spec, found, effort)
    except (Malformed, Rejected, NotShown) as fault:
        raise Rejected(f"the evidence doesn't bear it: {fault}") from None
    except UserError as fault:
        raise Rejected(f"the options don't fit the sources: {fault.message}") from None
    derived = written.document(subject, design.top, found, made)
    if render(derived) != text:
        different = list(islice(recheck.differences(stated, derived), recheck.MOST_DIFFERENCES))
        raise Rejected(
            "\n".join(different) or "the text is not in the form in which certificates are written"
        )
    scripts = tuple((each["name"], each["script"]) for each in stated["obligations"])
    top = recheck.with_held(design.top, subject.spec.holds)
    return recheck.Derived(top, made.report.findings, made.obligations, scripts)


def subject_in(stated: dict[str, Any]) -> Subject:
    """What the certificate says that it is about. Raises Rejected where it is not of one piece."""
    try:
        claim, given, files = stated["claim"], stated["options"], stated["sources"]["files"]
        subject = Subject(
            _spec(claim, given),
            tuple(given["files"]),
            tuple(given["include"]),
            tuple((file["path"], file["sha256"]) for file in files),
        )
        recheck.check_kinds(subject)
        said = [written.claim(subject.spec), options(subject)]
        different = list(recheck.differences([claim, given], said, "claim"))
    except (UserError, Malformed) as fault:
        raise Rejected(f"claim: {fault}") from None
    except (AttributeError, KeyError, TypeError, ValueError, ZeroDivisionError):
        raise Rejected("claim, options or sources: not of the form of a certificate's") from None
    if different:
        raise Rejected("\n".join(different))
    if stated["sources"].get("sha256") != written.bound_to(subject):
        raise Rejected("sources/sha256: not of this claim, these options and these files")
    return subject


def _spec(claim: dict[str, Any], given: dict[str, Any]) -> Spec:
    """The claim and the options. Raises any of the errors of what is not of their form."""
    ratio, high = text_of(claim["ratio"], "ratio"), claim["high"]
    plain = PLAIN_RATIO.fullmatch(ratio)
    return Spec(
        ratio=Fraction(ratio) if plain else None,
        ratio_formula=None if plain else formula.read(ratio, "ratio"),
        mean=claim["mean"] is True,
        high=high if isinstance(high, int) else None,
        high_formula=formula.read(high, "high") if isinstance(high, str) else None,
        each={text_of(name, "each"): _ranges(ranges, name) for name, ranges in claim["each"].items()},
        where=tuple(formula.read(text_of(each, "where"), "where") for each in claim["where"]),
        **recheck.reading(given),
        start=claim["start"],
        within=claim["within"],
        reset_cycles=claim["reset_cycles"],
        waivers=claim["waivers"],
    )


def _ranges(value: Any, name: str) -> Ranges | None:
    if value is None:
        return None

    def ends(each: Any, where: str) -> tuple[int, int]:
        low, high = (number_of(end, where, 0) for end in list_of(each, where))
        if low > high:
            raise Malformed(f"{where}: no values")
        return low, high

    found = each_of(value, f"each/{name}", ends)
    if not found or any(a[1] + 1 >= b[0] for a, b in pairwise(found)):
        raise Malformed(f"each/{name}: not ranges in order")
    return found
