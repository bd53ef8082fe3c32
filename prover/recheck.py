"""Checking a certificate: sources and evidence read anew, everything in it derived again and compared, every
obligation refuted again. No engine takes part.

The certificate is accepted if the sources are those it names, if the machine, the verdicts and the obligations that
follow from its evidence are word for word those it states, and if solvers refute each obligation's script (or
CaDiCaL refutes its clauses, with a proof that is checked).
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any

from prover import clausal, domain, solvers
from prover.certificate import Obligation
from prover.design import Design
from prover.effort import Effort, OutOfEffort
from prover.errors import UserError
from prover.evidence import Malformed, read
from prover.findings import Finding
from prover.ports import Ports, recognise
from prover.rebuild import Rebuilt, Rejected, rebuild
from prover.release import NotShown
from prover.report import certificate as written
from prover.report.certificate import SCHEMA, Subject
from prover.spec import Spec

COMPARED = "subharmonic/comparison-certificate-1"
VALUES = "subharmonic/values-certificate-1"
KEYS = {
    SCHEMA: ("claim", "options", "sources", "evidence", "obligations"),
    VALUES: ("claim", "options", "sources", "evidence", "obligations"),
    COMPARED: ("asked", "sides", "evidence", "obligations"),
}
"""By schema: what has to be there for anything else to be looked at."""

MOST_BYTES = 400_000_000
MOST_DIFFERENCES = 5


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of a recheck.

    differences  why the certificate is rejected, a sentence each; empty if nothing is wrong with it
    gave_up      obligations that a solver gave up on, with the solver
    findings     the verdicts that the evidence bears, empty where it was rejected before that was known
    ways         by solver, or "clausal": how many obligations it refuted
    steps        steps of clausal proofs that were checked
    trusted      what remains trusted where the clausal road was taken
    """

    differences: tuple[str, ...]
    gave_up: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    top: str = ""
    obligations: int = 0
    ways: tuple[tuple[str, int], ...] = ()
    steps: int = 0
    trusted: tuple[str, ...] = ()

    @property
    def accepted(self) -> bool:
        return not self.differences and not self.gave_up


@dataclass(frozen=True, slots=True)
class Derived:
    """A certificate that is word for word what its sources and its evidence lead to."""

    top: str
    findings: tuple[Finding, ...]
    obligations: tuple[Obligation, ...]
    scripts: tuple[tuple[str, str], ...]


def recheck(
    path: str | Path,
    solver: str = "z3",
    sources: str | Path | None = None,
    by_clauses: bool = False,
    seconds: float = 600.0,
    tell: Callable[[str], None] | None = None,
) -> Outcome:
    """Check the certificate in a file; `sources` is the folder that its paths start from.

    Without it the certificate's own folder and the working folder are tried. Raises UserError where the certificate
    or the sources can't be read, or a solver isn't installed.
    """
    names = solvers.chosen(solver)
    if by_clauses:
        clausal.needs()
    effort = Effort(seconds, tell)
    text = _text_of(Path(path))
    bases = [Path(sources)] if sources is not None else [Path(path).parent, Path()]
    return _outcome(lambda: derive(text, bases, effort), names, by_clauses, effort)


def recheck_kept(
    text: str, files: Sequence[str], spec: Spec, seconds: float, tell: Callable[[str], None] | None = None
) -> Outcome:
    """Check the text of a certificate again, for these files in the working folder and this claim. What it says of
    the files' names and bytes does not count: it is taken as said of these files. Raises UserError where they can't
    be read."""
    effort = Effort(seconds, tell)
    return _outcome(lambda: derive(_readdressed(text, files, spec), [Path()], effort), ("z3",), False, effort)


def _readdressed(text: str, files: Sequence[str], spec: Spec) -> str:
    """The certificate as it would be for these files. Raises Rejected where it is about another claim."""
    from prover.api import read as read_it
    from prover.domain import in_numbers
    from prover.verilog.source import read_source

    stated = _object(text)
    form = _form_of(stated)
    if form is written and (spec.ratio_formula is not None or spec.high_formula is not None):
        spec = in_numbers(read_it(files, spec), spec)
    read = read_source(files, defines=spec.defines, include=[Path(folder) for folder in spec.include]).files
    digests = tuple((written.relative(name), written.digest(Path(name))) for name in read)
    subject = Subject(
        spec, tuple(map(written.relative, files)), tuple(map(written.relative, spec.include)), digests
    )
    options = written.options(subject)
    named = {name: options[name] for name in ("files", "include")}
    different = list(
        differences([stated["claim"], {**stated["options"], **named}], [form.claim(spec), options], "claim")
    )
    if different:
        raise Rejected("\n".join(different))
    return written.render({**stated, "options": options, "sources": form.sources(subject)})


def _form_of(stated: dict[str, Any]) -> Any:
    """The module that writes certificates of this kind. Raises Rejected where this one is not of one piece."""
    if stated["schema"] == VALUES:
        from prover.report import values_certificate
        from prover.values_recheck import subject_in

        subject_in(stated)
        return values_certificate
    _subject(stated)
    return written


def _outcome(
    derived: Callable[[], Derived], names: Sequence[str], by_clauses: bool, effort: Effort
) -> Outcome:
    """What comes of a certificate from which all is derived so."""
    try:
        found = derived()
    except Rejected as fault:
        return Outcome(tuple(str(fault).split("\n")))
    except OutOfEffort as out:
        return Outcome((), (str(out),))
    outcome = Outcome((), (), found.findings, found.top, len(found.scripts))
    return _discharged(outcome, found, () if by_clauses else names, by_clauses, effort)


def _text_of(path: Path) -> str:
    try:
        with path.open("rb") as file:
            data = file.read(MOST_BYTES + 1)
    except OSError as fault:
        reason = fault.strerror or str(fault)
        raise UserError(f"can't read {path}: {reason}", hint="give the path of a certificate") from fault
    if len(data) > MOST_BYTES:
        raise UserError(f"{path}: more than {MOST_BYTES} bytes", hint="is this a certificate?")
    return data.decode("utf-8", errors="replace")


# -- deriving it again -------------------------------------------------------------------------------------


def derive(text: str, bases: Sequence[Path], effort: Effort) -> Derived:
    """Everything that the certificate claims, derived again. Raises Rejected where that comes to something else, and
    UserError where there are no sources."""
    effort.say("reading the certificate")
    stated = _object(text)
    if stated["schema"] == COMPARED:
        from prover.pair_recheck import derive as derive_pair

        return derive_pair(stated, text, bases, effort)
    if stated["schema"] == VALUES:
        from prover.values_recheck import derive as derive_values

        return derive_values(stated, text, bases, effort)
    subject = _subject(stated)
    base = base_of(subject, bases)
    effort.say("reading the sources")
    ports = _ports(subject, base)
    effort.say("deriving what the certificate claims")
    try:
        found = read(stated["evidence"])
        made = rebuild(ports, subject.spec, found, effort)
        findings = _judged(made, subject.spec)
        derived = written.document(subject, ports, found, made, findings)
    except (Malformed, Rejected, NotShown) as fault:
        raise Rejected(f"the evidence doesn't bear it: {fault}") from None
    except UserError as fault:
        raise Rejected(f"the options don't fit the sources: {fault.message}") from None
    if written.render(derived) != text:
        different = [
            each for each, _ in zip(differences(stated, derived), range(MOST_DIFFERENCES), strict=False)
        ]
        raise Rejected(
            "\n".join(different) or "the text is not in the form in which certificates are written"
        )
    scripts = tuple((each["name"], each["script"]) for each in stated["obligations"])
    return Derived(with_held(ports.design.top, ports.holds), findings, made.obligations, scripts)


def with_held(top: str, holds: Mapping[str, int]) -> str:
    """A divider's name with what its inputs are held at."""
    held = domain.values_text(holds)
    return f"{top}, with {held} held" if held else top


def _object(text: str) -> dict[str, Any]:
    try:
        stated = json.loads(text)
    except (ValueError, RecursionError) as fault:
        raise Rejected(f"no JSON: {fault}") from None
    if not isinstance(stated, dict) or stated.get("schema") not in list(KEYS):
        raise Rejected(f"schema: not {' or '.join(KEYS)}")
    for key in KEYS[stated["schema"]]:
        if key not in stated:
            raise Rejected(f"{key}: missing")
    return stated


def _judged(made: Rebuilt, spec: Spec) -> tuple[Finding, ...]:
    from properties import judge_all

    return judge_all(made.rhythm, spec)


def reading(options: Mapping[str, Any]) -> dict[str, Any]:
    """The options of a certificate that the reading of a divider hangs on, as a Spec takes them."""
    same = ("module", "clock", "reset", "output", "parameters", "holds", "defines")
    return {**{name: options[name] for name in same}, "include": tuple(options["include"])}


def _subject(stated: dict[str, Any]) -> Subject:
    """What the certificate says that it is about, and that it is of one piece."""
    try:
        claim, options, files = stated["claim"], stated["options"], stated["sources"]["files"]
        spec = Spec(
            ratio=Fraction(claim["ratio"]),
            mean=claim["mean"] is True,
            high=claim["high_half_cycles"],
            **reading(options),
            start=claim["start"],
            within=claim["within"],
            reset_cycles=claim["reset_cycles"],
            waivers=claim["waivers"],
        )
        subject = Subject(
            spec,
            tuple(options["files"]),
            tuple(options["include"]),
            tuple((file["path"], file["sha256"]) for file in files),
        )
        check_kinds(subject)
        different = list(
            differences([claim, options], [written.claim(spec), written.options(subject)], "claim")
        )
    except UserError as fault:
        raise Rejected(f"claim: {fault.message}") from None
    except (AttributeError, KeyError, TypeError, ValueError, ZeroDivisionError):
        raise Rejected("claim, options or sources: not of the form of a certificate's") from None
    if different:
        raise Rejected("\n".join(different))
    bound = written.bound_to(subject)
    if stated["sources"].get("sha256") != bound:
        raise Rejected("sources/sha256: not of this claim, these options and these files")
    return subject


def check_kinds(subject: Subject) -> None:
    """Raise ValueError where an option is of another kind than it has to be."""
    spec = subject.spec
    texts = [spec.module, spec.clock, spec.reset, spec.output]
    names = [*subject.files, *subject.include, *spec.waivers.values(), *spec.defines.values()]
    numbers = [*spec.parameters.values(), *spec.holds.values()]
    numbers += [each for each in (spec.high, spec.within, spec.reset_cycles) if each is not None]
    if any(text is not None and not isinstance(text, str) for text in texts):
        raise ValueError
    if any(not isinstance(name, str) for name in names) or not subject.files:
        raise ValueError
    if any(not isinstance(number, int) or isinstance(number, bool) for number in numbers):
        raise ValueError
    if spec.start not in (None, "reset", "initial", "any"):
        raise ValueError


def base_of(subject: Subject, bases: Sequence[Path]) -> Path:
    """The folder that the sources' paths start from: the first in which all are as stated, else in which all are."""
    there = [base for base in bases if all((base / name).is_file() for name, _ in subject.digests)]
    if not there:
        tried = " or ".join(str(base) for base in bases)
        missing = next(n for n, _ in subject.digests if not (bases[-1] / n).is_file())
        raise UserError(
            f"{missing}: no such file in {tried}",
            hint="say with --sources where the sources' paths start from",
        )
    changed: list[str] = []
    for base in there:
        changed = [name for name, sha256 in subject.digests if written.digest(base / name) != sha256]
        if not changed:
            return base
    raise Rejected("\n".join(f"{name}: not the file that the certificate is about" for name in changed))


def _ports(subject: Subject, base: Path) -> Ports:
    """The design read anew and its ports. Raises Rejected where other files are read than stated."""
    design = design_of(subject, base)
    try:
        return recognise(design, subject.spec)
    except UserError as fault:
        raise Rejected(f"the sources can't be read as the certificate says: {fault.message}") from None


def design_of(subject: Subject, base: Path) -> Design:
    """The design read anew. Raises Rejected where other files are read than stated."""
    from prover.verilog import read_design

    spec = subject.spec
    try:
        design = read_design(
            [base / name for name in subject.files],
            module=spec.module,
            defines=spec.defines,
            include=tuple(str(base / folder) for folder in subject.include),
            parameters=spec.parameters,
        )
    except UserError as fault:
        raise Rejected(f"the sources can't be read as the certificate says: {fault.message}") from None
    check_files(design, subject, base)
    return design


def check_files(design: Design, subject: Subject, base: Path) -> None:
    """Raise Rejected where other files were read than those that are stated."""
    if len(design.files) != len(subject.digests) or any(
        Path(name).resolve() != (base / stated).resolve()
        for name, (stated, _) in zip(design.files, subject.digests, strict=True)
    ):
        raise Rejected("sources/files: not the files that are read")


def differences(stated: object, derived: object, where: str = "") -> Iterator[str]:
    """Where two documents differ, a sentence each."""
    if type(stated) is not type(derived):
        yield f"{where}: {_short(stated)}, which should be {_short(derived)}"
    elif isinstance(stated, dict) and isinstance(derived, dict):
        for key in [*stated, *(key for key in derived if key not in stated)]:
            here = f"{where}/{key}" if where else str(key)
            if key not in derived:
                yield f"{here}: does not belong there"
            elif key not in stated:
                yield f"{here}: missing"
            else:
                yield from differences(stated[key], derived[key], here)
        if list(stated) != list(derived) and set(stated) == set(derived):
            yield f"{where or 'the whole'}: in another order"
    elif isinstance(stated, list) and isinstance(derived, list):
        if len(stated) != len(derived):
            yield f"{where}: {len(stated)} entries, which should be {len(derived)}"
        for number, (a, b) in enumerate(zip(stated, derived, strict=False)):
            yield from differences(a, b, f"{where}/{number}")
    elif isinstance(stated, str) and isinstance(derived, str) and "\n" in derived:
        lines = zip(stated.split("\n"), derived.split("\n"), strict=False)
        number, a, b = next(((i, a, b) for i, (a, b) in enumerate(lines, 1) if a != b), (0, "", ""))
        if stated != derived:
            yield f"{where}, line {number}: {_short(a)}, which should be {_short(b)}"
    elif stated != derived:
        yield f"{where}: {_short(stated)}, which should be {_short(derived)}"


def _short(value: object) -> str:
    text = json.dumps(value)
    return text if len(text) <= 80 else f"{text[:77]}..."


# -- refuting the obligations ------------------------------------------------------------------------------


def _discharged(
    outcome: Outcome, derived: Derived, names: Sequence[str], by_clauses: bool, effort: Effort
) -> Outcome:
    wrong: list[str] = []
    left: list[str] = []
    counts = dict.fromkeys(names, 0)
    for name in names:
        for title, script in derived.scripts:
            effort.doing = f"{name} on {title}"
            if effort.left <= 0:
                left.append(f"{name}: out of time before {title}")
                break
            answer = solvers.refutes(name, script, effort.left)
            if answer:
                counts[name] += 1
            elif answer is None:
                left.append(f"{name}: {title}")
            else:
                wrong.append(f"obligation {title}: {name} finds that it can be fulfilled")
    outcome = replace(outcome, differences=tuple(wrong), gave_up=tuple(left), ways=tuple(counts.items()))
    return _by_clauses(outcome, derived, effort) if by_clauses else outcome


def _by_clauses(outcome: Outcome, derived: Derived, effort: Effort) -> Outcome:
    wrong: list[str] = []
    left: list[str] = []
    count = steps = 0
    for each in derived.obligations:
        if effort.left <= 0:
            left.append(f"clausal: out of time before {each.name}")
            break
        try:
            proof = clausal.refute(each.goal)
        except clausal.Unsupported as fault:
            left.append(f"clausal: {each.name}: {fault}")
            continue
        if proof is None:
            wrong.append(f"obligation {each.name}: CaDiCaL finds that it can be fulfilled")
            continue
        count, steps = count + 1, steps + proof.steps
    return replace(
        outcome,
        differences=tuple(wrong),
        gave_up=tuple(left),
        ways=(("clausal", count),),
        steps=steps,
        trusted=clausal.TRUSTED,
    )
