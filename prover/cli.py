"""The command line: the only place that prints and exits.

Exit status: 0 proved or measured, 1 refuted, 2 usage, unreadable or unsupported input, 3 open, 70 a fault of
ours. Options are read here and results sent on their way. Nothing heavy is imported before a command runs.
"""

from __future__ import annotations

import math
import os
import sys
import threading
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass
from datetime import UTC, datetime
from enum import IntEnum
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any, Literal, NoReturn, TextIO

import click

from prover import __version__, completion
from prover.errors import UserError, Where
from prover.output import STANDARD_OUTPUT, Result, check_targets, harmless, write_files
from prover.spec import (
    PLAIN_NUMBER,
    PLAIN_RATIO,
    Spec,
    read_duty_range,
    read_each,
    read_frequency,
    read_number,
    read_pair,
    read_ratio,
)

if TYPE_CHECKING:
    from prover.compared import Comparison
    from prover.findings import Report
    from prover.gate import Ledger, Manifest
    from prover.gate.runner import Run
    from prover.pair import Pairing
    from prover.pool import Crew
    from prover.report.look import Look
    from prover.several import Lapse, Outcome

PATIENCE = 1.0
"""Seconds a run may last before it shows what it is doing."""

REFRESH = 0.1
"""Seconds between two drawings of the progress line."""

LONGEST_EFFORT = 10_000_000
"""Seconds that --effort may ask for."""

MOST_WORKERS = 1000
"""Processes that --workers may ask for."""


class Status(IntEnum):
    """What the command's exit status means."""

    PROVED = 0
    REFUTED = 1
    USAGE = 2
    OPEN = 3
    FAULT = 70
    INTERRUPTED = 130


SEVERITY = [Status.PROVED, Status.OPEN, Status.REFUTED, Status.USAGE, Status.FAULT]
"""The statuses of several dividers, the worst last: what the run exits with."""


def status_of(report: Report) -> Status:
    """The exit status that a report stands for: its verdict, or whether there was something to measure."""
    if report.findings:
        return {"proved": Status.PROVED, "refuted": Status.REFUTED, "open": Status.OPEN}[report.verdict]
    rhythm = report.rhythm
    if rhythm.settling.unsettled is not None:
        return Status.REFUTED
    known = rhythm.complete or any(orbit.wave() is not None for orbit in rhythm.orbits)
    return Status.PROVED if known else Status.OPEN


def status_after(work: Callable[[], object]) -> int:
    """The status of a piece of work: what it returns if that is one, or what its failure stands for, told."""
    try:
        done = work()
        return int(done) if isinstance(done, int) else Status.PROVED
    except UserError as error:
        _complain(_user_error(error))
        return Status.USAGE
    except click.exceptions.Exit as left:
        return left.exit_code
    except click.ClickException as error:
        _complain(_usage_error(error))
        return Status.USAGE
    except (KeyboardInterrupt, click.Abort) as stop:
        # One that click has caught is the cause of its own.
        _complain("; ".join(filter(None, ("interrupted", str(stop.__cause__ or stop)))))
        return Status.INTERRUPTED
    except MemoryError:
        _complain("open: out of memory; nothing is claimed")
        return Status.OPEN
    except Exception as fault:
        if _out_of_effort(fault):
            _complain(f"open: {fault}; nothing is claimed\nhint: give more --effort")
            return Status.OPEN
        if os.environ.get("SUBHARMONIC_TRACEBACK"):
            raise
        _complain(
            f"a fault of this program, not of your input: {type(fault).__name__}: {fault}\n"
            "hint: set SUBHARMONIC_TRACEBACK=1 to see where, and report it with the input that shows it"
        )
        return Status.FAULT


def _out_of_effort(fault: Exception) -> bool:
    from prover.effort import OutOfEffort

    return isinstance(fault, OutOfEffort)


def _user_error(error: UserError) -> str:
    """The message with the source line made harmless, and its caret still in place."""
    where = error.where
    if where is not None:
        text = where.text.replace("\t", " ")
        before = harmless(text[: where.column - 1])
        where = Where(where.file, where.line, len(before) + 1, harmless(text))
    return f"error: {UserError(error.message, where, error.hint)}"


def _usage_error(error: click.ClickException) -> str:
    hint = ""
    if isinstance(error, click.UsageError) and error.ctx is not None:
        hint = f"\nhint: see {error.ctx.command_path} --help"
    return f"error: {error.format_message()}{hint}"


def _complain(text: str) -> None:
    click.echo(harmless(text), err=True)


class Program(click.Group):
    """The group of commands; however it is called, the status is picked in one place."""

    def main(self, *args: Any, **extra: Any) -> NoReturn:
        for stream in (sys.stdout, sys.stderr):
            if hasattr(stream, "reconfigure"):
                # A terminal that lacks a character shows its code, and never stops the report.
                stream.reconfigure(errors="backslashreplace")
        options: dict[str, Any] = {**extra, "standalone_mode": False}
        options["prog_name"] = "subharmonic"
        sys.exit(status_after(lambda: click.Group.main(self, *args, **options)))


# -- options -----------------------------------------------------------------------------------------------

Decorator = Callable[[Callable[..., Any]], Callable[..., Any]]


def _options(*chosen: Decorator) -> Decorator:
    def decorate(function: Callable[..., Any]) -> Callable[..., Any]:
        for option in reversed(chosen):
            function = option(function)
        return function

    return decorate


def _written(name: str, told: str) -> Decorator:
    """An option that names where a result goes."""
    variable = f"{name.removeprefix('--')}_path"
    return click.option(name, variable, metavar="PATH", help=told, shell_complete=completion.files)


READ_AS: tuple[Decorator, ...] = (
    click.option("--module", metavar="NAME", help="Top module.", shell_complete=completion.modules),
    click.option("--clock", metavar="PORT", help="Input clock."),
    click.option("--reset", metavar="PORT[=LEVEL]", help="Reset, and its active level (PORT=0: low)."),
    click.option("--output", metavar="PORT", help="Divided clock: port, net or bit 'PORT[3]'."),
    click.option(
        "--set", "parameters", multiple=True, metavar="PARAM=VALUE", help="Parameter of the top module."
    ),
    click.option(
        "--hold", "holds", multiple=True, metavar="PORT=VALUE", help="Value at which an input is held."
    ),
    click.option("--define", "defines", multiple=True, metavar="NAME=TEXT", help="Macro, as by `define."),
    click.option(
        "--include",
        multiple=True,
        metavar="DIR",
        help="Folder to look in for `include.",
        shell_complete=completion.folders,
    ),
)
READING: tuple[Decorator, ...] = (
    click.argument("files", nargs=-1, required=True, metavar="FILE...", shell_complete=completion.files),
    *READ_AS,
    click.option(
        "--start",
        type=click.Choice(["reset", "initial", "any"]),
        help="Where the claim begins [reset if there is one].",
    ),
)
CLAIMING = (
    click.option("--ratio", required=True, metavar="N", help="Input cycles a period: 2.5, 2*n."),
    click.option("--mean", is_flag=True, help="The ratio is that of the mean gap: 16/3."),
    click.option("--high", metavar="H", help="High time in half-cycles [N, which is 50 %]."),
    click.option(
        "--each", multiple=True, metavar="PORT[=VALUES]", help="Claim it for each value: div=1..15."
    ),
    click.option("--where", multiple=True, metavar="CONDITION", help="Of these values only those: 'B >= A'."),
    click.option(
        "--moving", multiple=True, metavar="PORT[=VALUES]", help="The input may move between edges."
    ),
    click.option("--within", metavar="K", help="Limit on the recovery, in half-cycles."),
    click.option("--reset-cycles", metavar="K", help="Input cycles for which reset is held."),
    click.option(
        "--waive",
        "waivers",
        multiple=True,
        metavar="PROPERTY=REASON",
        help="Excuse a property.",
        shell_complete=completion.properties,
    ),
)
EFFORT: Decorator = click.option("--effort", metavar="SECONDS", help="Time to try, then leave open [60].")
JSON: Decorator = _written("--json", "Write the report as JSON.")
HTML: Decorator = _written("--html", "Write the report as one page for a browser.")
LEDGER: Decorator = click.option(
    "--ledger",
    metavar="PATH",
    help="Where verdicts are kept [.subharmonic/ledger.sqlite].",
    shell_complete=completion.files,
)
FIGURES: tuple[Decorator, ...] = (
    click.option("--fin", metavar="FREQ", help="Input frequency, such as 50MHz."),
    click.option("--source-duty", metavar="LOW..HIGH", help="Input duty in per cent: 45..55."),
    EFFORT,
    JSON,
    HTML,
)
TRACES = (
    _written("--vcd", "Write the wave of what is refuted."),
    _written("--junit", "Write the verdicts as JUnit XML."),
    _written("--sarif", "Write the verdicts as SARIF 2.1.0."),
    click.option(
        "--testbench",
        "testbench_folder",
        metavar="DIR",
        help="Write a test bench for what is refuted.",
        shell_complete=completion.folders,
    ),
)
CERTIFYING = (_written("--certificate", "Write what the verdicts rest on, for `recheck`."),)
CREW: tuple[Decorator, ...] = (
    click.option("--workers", metavar="N", help="Dividers at once, in processes [the cores]."),
    click.option("--cluster", metavar="ADDRESS", help="Judge several on this Dask cluster."),
)
WAIT = "Time the cluster may be without workers [60]."
# Where a screen is full only the README tells of the last one.
CREWS: tuple[Decorator, ...] = (*CREW, click.option("--wait", metavar="SECONDS", help=WAIT, hidden=True))
CREWS_OF_GATE: tuple[Decorator, ...] = (*CREW, click.option("--wait", metavar="SECONDS", help=WAIT))


def _sided(side: str) -> tuple[Decorator, ...]:
    """The options of reading once more, for one of two dividers. They are told of together, not each by itself."""
    single = {"module": "NAME", "clock": "PORT", "reset": "PORT[=LEVEL]", "output": "PORT"}
    several = {
        "set": ("parameters", "PARAM=VALUE"),
        "hold": ("holds", "PORT=VALUE"),
        "define": ("defines", "NAME=TEXT"),
        "include": ("include", "DIR"),
        "with": ("files", "FILE"),
    }
    made = [click.option(f"--{side}-{name}", metavar=shape, hidden=True) for name, shape in single.items()]
    for name, (key, shape) in several.items():
        made.append(
            click.option(f"--{side}-{name}", f"{side}_{key}", multiple=True, metavar=shape, hidden=True)
        )
    return tuple(made)


PAIRING: tuple[Decorator, ...] = (
    click.argument("old", metavar="OLD", shell_complete=completion.files),
    click.argument("new", metavar="NEW", shell_complete=completion.files),
    click.option(
        "--with",
        "files",
        multiple=True,
        metavar="FILE",
        help="Further file of both dividers.",
        shell_complete=completion.files,
    ),
    *READ_AS,
    click.option("--map", "maps", multiple=True, metavar="PORT=PORT", help="Input of OLD that is NEW's."),
    click.option(
        "--moving", multiple=True, metavar="PORT", help="Input that may change between any two edges."
    ),
    click.option("--start", type=click.Choice(["reset", "initial"]), help="Where it begins [reset]."),
    click.option("--lag", metavar="K", help="Half-cycles that NEW is late, or `any` [0]."),
    click.option(
        "--after", type=click.Choice(["any"]), help="From all pairs of power-up states, once settled."
    ),
    *_sided("old"),
    *_sided("new"),
    EFFORT,
    JSON,
    HTML,
    _written("--vcd", "Write the waves that differ."),
    *CERTIFYING,
)
SETTINGS: dict[str, Any] = {"help_option_names": ["-h", "--help"], "max_content_width": 80}


@click.group(cls=Program, context_settings=SETTINGS)
@click.version_option(__version__, prog_name="subharmonic", message="%(prog)s %(version)s")
def main() -> None:
    """Prove what a hand-written Verilog clock divider does, from every state its registers can be in.

    \b
    Example:
      subharmonic measure divider.v
      subharmonic check divider.v --ratio 3
    """


@main.command(short_help="Prove or refute that a divider divides by N.")
@_options(*CLAIMING, *READING, *FIGURES, *TRACES, *CERTIFYING, *CREWS)
def check(
    files: tuple[str, ...],
    json_path: str | None,
    html_path: str | None,
    vcd_path: str | None,
    junit_path: str | None,
    sarif_path: str | None,
    testbench_folder: str | None,
    certificate_path: str | None,
    **options: Any,
) -> Status:
    """Prove or refute what is claimed of a divider, and that it never locks up.

    \b
    Example: subharmonic check divider.v --ratio 2.5 --high 2 --vcd broken.vcd
    Exit status: 0 proved, 1 refuted, 2 unusable input, 3 open, 70 our fault.
    A PATH of - is standard output, in place of the report for people.
    """
    targets = Targets(
        json_path, html_path, vcd_path, junit_path, sarif_path, testbench_folder, certificate_path
    )
    return _run(files, options, targets)


@main.command(short_help="Tell what a divider divides by.")
@_options(*READING, *FIGURES, *CREWS)
def measure(files: tuple[str, ...], json_path: str | None, html_path: str | None, **options: Any) -> Status:
    """Tell what a divider does: its period, its high time, and every loop that its registers can run into.

    \b
    Example: subharmonic measure divider.v --output tick
    Exit status: 0 measured, 1 never settles, 2 bad input, 3 open, 70 our fault.
    A PATH of - is standard output, in place of the report for people.
    """
    return _run(files, options, Targets(json_path, html_path))


@main.command(short_help="Prove or refute that two dividers have the same output.")
@_options(*PAIRING)
def compare(
    old: str,
    new: str,
    files: tuple[str, ...],
    json_path: str | None,
    html_path: str | None,
    vcd_path: str | None,
    certificate_path: str | None,
    **options: Any,
) -> Status:
    """Prove or refute that two dividers have the same output in every half-cycle, from reset or initial values,
    whatever the values of the inputs that both share.

    \b
    Options of reading have forms for one of them: --old-output, --new-set, ...
    Example: subharmonic compare rtl.v gates.v --moving enable --lag any
    Exit status: 0 equal, 1 different, 2 bad input, 3 open, 70 our fault.
    A PATH of - is standard output, in place of the report for people.
    """
    of_old = (old, *files, *options.pop("old_files"))
    of_new = (new, *files, *options.pop("new_files"))
    targets = Targets(json=json_path, html=html_path, vcd=vcd_path, certificate=certificate_path)
    return _compare(of_old, of_new, _pairing(options), targets)


@main.command(short_help="Check a certificate again, with other solvers if you like.")
@click.argument("certificate", shell_complete=completion.files)
@click.option(
    "--solver",
    type=click.Choice(["z3", "bitwuzla", "cvc5", "all"]),
    default="z3",
    help="Who refutes the obligations; all: every one that is installed [z3].",
)
@click.option(
    "--sources",
    metavar="DIR",
    help="Folder that the sources' paths start from.",
    shell_complete=completion.folders,
)
@click.option("--clausal", "by_clauses", is_flag=True, help="Refute them by clauses, with a checked proof.")
@click.option("--effort", metavar="SECONDS", help="Time to try, then give up [600].")
def recheck(
    certificate: str, solver: str, sources: str | None, by_clauses: bool, effort: str | None
) -> Status:
    """Check a certificate that `check` or `compare` wrote: the sources are read anew, all that it claims is derived
    again and compared, and its obligations are refuted again. No search engine takes part.

    \b
    Example: subharmonic recheck ping.json --solver all
    Exit status: 0 accepted, 1 rejected, 2 bad input, 3 given up, 70 our fault.
    """
    from prover.recheck import recheck
    from prover.report import outcome as told

    given = {} if effort is None else {"seconds": _seconds(effort)}
    with Progress(sys.stderr) as progress:
        outcome = recheck(certificate, solver, sources, by_clauses, tell=progress.tell, **given)
    _print(told.render(outcome, _look()) + "\n")
    return Status.REFUTED if outcome.differences else Status.OPEN if outcome.gave_up else Status.PROVED


@main.command(short_help="Judge what changed of the dividers in a manifest.")
@click.argument("manifest", required=False, shell_complete=completion.files)
@_options(
    LEDGER,
    click.option("--afresh", is_flag=True, help="Judge all, whatever is kept."),
    click.option("--recheck", is_flag=True, help="Check the certificates of what is kept."),
    JSON,
    HTML,
    *TRACES,
    *CREWS_OF_GATE,
)
def gate(manifest: str | None, ledger: str | None, **options: Any) -> Status:
    """Judge the dividers of a manifest, subharmonic.toml, of which something has changed, and tell all verdicts.

    \b
    Example: subharmonic gate --junit gate.xml
    Exit status: 0 proved, 1 refuted or a waiver expired, 2 bad input, 3 open,
    70 our fault.
    """
    named = {name: options[f"{name}_path"] for name in ("json", "html", "vcd", "junit", "sarif")}
    targets = Targets(**named, testbench=options["testbench_folder"])
    _check_folder(targets)
    crew = _crew(options["workers"], options["cluster"], options["wait"])
    from prover import gate as gates
    from prover.report import gate as told

    listed = gates.read(manifest, _manifest_options(), _spec_of)
    sources = (str(listed.folder / file) for divider in listed.dividers for file in divider.files)
    check_targets(targets.paths(), [str(listed.path), *dict.fromkeys(sources)])
    with Progress(sys.stderr) as progress, closing(_opened(listed, ledger, progress)) as kept:
        how = {name: options[name] for name in ("afresh", "recheck")}
        try:
            run = gates.run_gate(listed, kept, crew, **how, tell=progress.tell)
        except KeyboardInterrupt:
            raise KeyboardInterrupt(
                "what was judged by then is kept, and the next run goes on from there"
            ) from None
        progress.tell("writing the reports")
        shown = run.rows if any(targets.paths()) else [row for row in run.rows if row.verdict != "proved"]
        found = [row.outcome(kept) for row in shown]
        written = _results_of(found, targets, told.as_object(run), told.waivers(run), told.lapses(run))
        texts = [
            told.headed(row, _text_of(outcome, paths))
            for outcome, row, paths in zip(found, shown, written.waves, strict=True)
            if row.verdict != "proved"
        ]
        table = told.render(run, _look(), bool(written.results))
        full = "\n".join([*filter(None, texts), table])
        text, unwritten = _sent(written.results, _sources(found), full, table)
    _print(text)
    for remark in written.remarks:
        _complain(remark)
    if unwritten is not None:
        _complain(_user_error(unwritten))
    for error in filter(None, (run.lost, run.unkept)):
        _complain(_user_error(error))
    return _worst([*_statuses(run), Status.PROVED if unwritten is None else Status.USAGE])


def _opened(listed: Manifest, path: str | None, progress: Progress) -> Ledger:
    """The ledger, for which a run may have to wait."""
    from prover import gate as gates

    progress.tell("opening the ledger, which another run may be writing to")
    return gates.opened(listed, path)


@main.command(short_help="Tell a divider's verdicts over time.")
@click.argument("file", shell_complete=completion.files)
@LEDGER
def history(file: str, ledger: str | None) -> Status:
    """Tell what `gate` has found of the dividers that a file is part of: when, on which content, what had changed.

    \b
    Example: subharmonic history cases/gauge/ping_by_7_rtl.v
    Exit status: 0 told, 2 nothing known or bad input, 70 our fault.
    """
    from prover import gate as gates
    from prover.report import gate as told

    _print(told.render_history(gates.events_of(file, ledger), _look()))
    return Status.PROVED


def _manifest_options() -> dict[str, Literal["one", "many", "flag"]]:
    """The options of `check` that a manifest has, and what is given with them."""
    apart = ("waivers", "workers", "cluster", "wait")
    return {
        option.opts[0].removeprefix("--"): "flag" if option.is_flag else "many" if option.multiple else "one"
        for option in check.params
        if isinstance(option, click.Option)
        and option.name not in apart
        and not str(option.name).endswith(("_path", "_folder"))
    }


def _spec_of(arguments: Sequence[str]) -> Spec:
    """The claim that arguments of `check` make."""
    try:
        # A manifest has files of its own.
        context = check.make_context("check", ["-", *arguments])
    except click.ClickException as error:
        raise UserError(error.format_message()) from None
    return _spec(context.params)


def _statuses(run: Run) -> Iterator[Status]:
    yield Status.PROVED
    kinds = {"error": Status.USAGE, "fault": Status.FAULT, "open": Status.OPEN, "refuted": Status.REFUTED}
    yield from (kinds[row.verdict] for row in run.rows if row.verdict != "proved")
    if run.expired:
        yield Status.REFUTED
    if run.unkept is not None or run.lost is not None:
        yield Status.USAGE


def _spec(options: dict[str, Any]) -> Spec:
    """The options of the command line as a claim. Raises UserError for those that mean nothing."""
    fin, duty, effort = (options.get(name) for name in ("fin", "source_duty", "effort"))
    limits: dict[str, Any] = {"effort": _seconds(effort)} if effort is not None else {}
    return Spec(
        **_claimed(options),
        module=options["module"],
        clock=options["clock"],
        reset=options["reset"],
        output=options["output"],
        parameters=_numbers(options["parameters"], "--set"),
        holds=_numbers(options["holds"], "--hold"),
        defines=_pairs(options["defines"], "--define"),
        include=options["include"],
        start=options["start"],
        within=_number(options, "within"),
        reset_cycles=_number(options, "reset_cycles", "input cycles"),
        waivers=_waivers(options.get("waivers", ())),
        fin=read_frequency(fin) if fin is not None else None,
        source_duty=read_duty_range(duty) if duty is not None else None,
        **limits,
    )


def _pairing(options: dict[str, Any]) -> Pairing:
    """What is asked of two dividers. Raises UserError for options that mean nothing."""
    from prover.pair import Pairing

    def side(name: str) -> Spec:
        given = {
            key: options[f"{name}_{key}"] or options[key] for key in ("module", "clock", "reset", "output")
        }
        own = {key: options[f"{name}_{key}"] for key in ("parameters", "holds", "defines")}
        defines = _pairs(options["defines"], "--define") | _pairs(own["defines"], f"--{name}-define")
        parameters = _numbers(options["parameters"], "--set") | _numbers(own["parameters"], f"--{name}-set")
        return Spec(
            **given,
            parameters=parameters,
            defines=defines,
            holds=_numbers(own["holds"], f"--{name}-hold"),
            include=(*options["include"], *options[f"{name}_include"]),
        )

    lag, effort = options["lag"], options["effort"]
    limits: dict[str, Any] = {"effort": _seconds(effort)} if effort is not None else {}
    return Pairing(
        old=side("old"),
        new=side("new"),
        holds=_numbers(options["holds"], "--hold"),
        maps=_pairs(options["maps"], "--map"),
        moving=tuple(dict.fromkeys(name.strip() for name in options["moving"])),
        start=options["start"],
        lag=0 if lag is None else None if lag == "any" else read_number(lag, "--lag"),
        settled=options["after"] is not None,
        **limits,
    )


def _claimed(options: dict[str, Any]) -> dict[str, Any]:
    """The ratio and the high time, each a number or a formula, and the values that they are claimed for."""
    from prover import formula

    claimed: dict[str, Any] = {"each": {}, "moving": {}, "mean": bool(options.get("mean"))}
    ratio, high = options.get("ratio"), options.get("high")
    if ratio is not None and PLAIN_RATIO.fullmatch(ratio):
        claimed["ratio"] = read_ratio(ratio)
    elif ratio is not None:
        claimed["ratio_formula"] = formula.read(ratio, "--ratio")
    if high is not None and PLAIN_NUMBER.fullmatch(high):
        claimed["high"] = _number(options, "high")
    elif high is not None:
        claimed["high_formula"] = formula.read(high, "--high")
    for key in ("each", "moving"):
        for text in options.get(key, ()):
            name, ranges = read_each(text, f"--{key}")
            if name in claimed[key]:
                raise UserError(f"--{key} {name} is given twice", hint="give it once")
            claimed[key][name] = ranges
    claimed["where"] = tuple(formula.read(text, "--where") for text in options.get("where", ()))
    return claimed


def _number(options: dict[str, Any], name: str, unit: str = "half-cycles") -> int | None:
    text = options.get(name)
    if text is None:
        return None
    option = f"--{name.replace('_', '-')}"
    value = read_number(text, option)
    if value < 0:
        raise UserError(f"{option} {text}: less than nothing", hint=f"give a number of {unit}")
    return value


def _pairs(texts: Iterable[str], option: str) -> dict[str, str]:
    out: dict[str, str] = {}
    for text in texts:
        name, value = read_pair(text, option)
        if name in out:
            raise UserError(f"{option} {name} is given twice", hint="give it once")
        out[name] = value
    return out


def _numbers(texts: Iterable[str], option: str) -> dict[str, int]:
    return {name: read_number(value, f"{option} {name}:") for name, value in _pairs(texts, option).items()}


def _waivers(texts: Iterable[str]) -> dict[str, str]:
    waivers = _pairs(texts, "--waive")
    for name, reason in waivers.items():
        if not reason:
            raise UserError(f"--waive {name}: no reason", hint="write --waive 'PROPERTY=why it is excused'")
    return waivers


def _seconds(text: str, option: str = "--effort") -> float:
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not 0 < value <= LONGEST_EFFORT:
        raise UserError(
            f"{option} {text}: not a time", hint=f"give seconds, more than 0 and up to {LONGEST_EFFORT}"
        )
    return value


# -- running -----------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Targets:
    """Where results go: a path each, `-` for standard output, None for what isn't asked for."""

    json: str | None = None
    html: str | None = None
    vcd: str | None = None
    junit: str | None = None
    sarif: str | None = None
    testbench: str | None = None
    certificate: str | None = None

    def paths(self) -> list[str]:
        """All of them, a file in place of a folder that waves or test benches go to."""
        bench = None if self.testbench is None else os.path.join(self.testbench, "ratio_tb.v")
        named = (self.json, self.html, _target(self.vcd), self.junit, self.sarif, bench, self.certificate)
        return [path for path in named if path]


def _run(files: Sequence[str], options: dict[str, Any], targets: Targets) -> Status:
    spec = _spec(options)
    check_targets(targets.paths(), files)
    dividers = _groups(files, spec)
    if dividers is not None:
        crew = _crew(options["workers"], options["cluster"], options["wait"])
        return _run_several(dividers, spec, crew, targets)
    with Progress(sys.stderr) as progress:
        report = _judged(files, spec, targets, progress.tell)
        waves = _vcd(report, targets.vcd)
        certified, remarks = _certificate(report, targets.certificate, files, progress.tell)
        benches, without = _benches(report, targets.testbench)
        results = [*_json(report, targets.json), *_html(report, targets.html), *waves, *benches]
        results += [*_exchanged(files, report, targets), *certified]
        full = "" if STANDARD_OUTPUT in targets.paths() else _told(report, [wave.path for wave in waves])
        alone = full and _told(report, [])
        text, unwritten = _sent(results, report.ports.design.files, full, alone)
    _print(text)
    if unwritten is not None:
        raise unwritten
    for remark in [*remarks, *without]:
        _complain(remark)
    return status_of(report)


def _compare(old: Sequence[str], new: Sequence[str], pairing: Pairing, targets: Targets) -> Status:
    check_targets(targets.paths(), [*old, *new])
    with Progress(sys.stderr) as progress:
        from prover.api import compare
        from prover.report import compared as told
        from prover.report import compared_json

        found = compare(old, new, pairing, progress.tell)
        waves = told.dump(found) if targets.vcd is not None else None
        results = [] if waves is None else [Result(_wave_file(targets.vcd or ""), waves)]
        written = [result.path for result in results]
        if targets.json is not None:
            results.append(Result(targets.json, compared_json.render(found)))
        if targets.html is not None:
            from prover.report import html

            results.append(Result(targets.html, html.render_compared(found)))
        certified, remarks = _pair_certificate(found, targets.certificate, old, new, progress.tell)
        results += certified
        sources = [*found.pair.old.design.files, *found.pair.new.design.files]
        aside = STANDARD_OUTPUT in targets.paths()
        full, alone = ("" if aside else f"{told.render(found, _look(), waves)}\n" for waves in (written, []))
        text, unwritten = _sent(results, sources, full, alone)
    _print(text)
    if unwritten is not None:
        raise unwritten
    for remark in remarks:
        _complain(remark)
    return {"proved": Status.PROVED, "refuted": Status.REFUTED, "open": Status.OPEN}[found.verdict]


def _pair_certificate(
    found: Comparison,
    path: str | None,
    old: Sequence[str],
    new: Sequence[str],
    tell: Callable[[str], None],
) -> tuple[list[Result], list[str]]:
    """The certificate of a comparison, or why there is none."""
    if path is None:
        return [], []
    from prover.effort import Effort
    from prover.report.pair_certificate import certify

    text = certify(found, old, new, Effort(found.pairing.effort, tell))
    if text is not None:
        return [Result(path, text)], []
    why = "an open verdict" if found.verdict == "open" else "what the verdict rests on can't be written"
    return [], [f"note: no certificate: {why}"]


def _wave_file(path: str) -> str:
    return str(Path(path) / "difference.vcd") if _is_folder(path) else path


def _judged(files: Sequence[str], spec: Spec, targets: Targets, tell: Callable[[str], None]) -> Report:
    """The report. Where there is none, results that can say why are written before the failure takes its way."""
    from prover.api import check, measure

    try:
        return (check if spec.claims else measure)(files, spec, tell)
    except Exception as fault:
        results = _exchanged(files, fault, targets)
        write_files([result for result in results if result.path != STANDARD_OUTPUT])
        _print("".join(result.text for result in results if result.path == STANDARD_OUTPUT))
        raise


def _groups(files: Sequence[str], spec: Spec) -> list[tuple[str, ...]] | None:
    """The files of each divider, if there are several. A single file needs no look, and no import."""
    if len(files) < 2 and not os.path.isdir(files[0]):
        return None
    from prover.several import groups

    return groups(files, spec)


def _crew(workers: str | None, cluster: str | None, wait: str | None) -> Crew:
    """Who judges several dividers."""
    if cluster is not None:
        if workers is not None:
            raise UserError(
                "--workers and --cluster", hint="give one of them: a cluster has workers of its own"
            )
        from prover.cluster import WAIT, Cluster, needs

        needs()
        return Cluster(cluster, WAIT if wait is None else _seconds(wait, "--wait"))
    if wait is not None:
        raise UserError("--wait without --cluster", hint="it is for a cluster's workers")
    from prover.pool import Local, cores

    count = cores() if workers is None else read_number(workers, "--workers")
    if not 0 < count <= MOST_WORKERS:
        raise UserError(f"--workers {workers}: no number of processes", hint=f"give 1 to {MOST_WORKERS}")
    return Local(count)


def _run_several(dividers: Sequence[tuple[str, ...]], spec: Spec, crew: Crew, targets: Targets) -> Status:
    """A verdict for each divider, a line for each at the end, and the worst status."""
    _check_folder(targets)
    if targets.certificate is not None:
        raise UserError("--certificate: there are several dividers", hint="check one at a time")
    with Progress(sys.stderr) as progress:
        from prover.report import several as told
        from prover.several import outcomes

        found = outcomes(dividers, spec, crew, progress.tell)
        written = _results_of(found, targets)
        texts = [_text_of(*pair) for pair in zip(found, written.waves, strict=True)]
        table = told.summary(found, _look()) + "\n"
        text, unwritten = _sent(
            written.results, _sources(found), "\n".join([*filter(None, texts), table]), table
        )
    _print(text)
    if unwritten is not None:
        raise unwritten
    for remark in written.remarks:
        _complain(remark)
    return _worst(_status_of_outcome(outcome) for outcome in found)


def _check_folder(targets: Targets) -> None:
    if targets.vcd is not None and not _is_folder(targets.vcd):
        raise UserError(f"--vcd {targets.vcd}: there are several dividers", hint="name a folder")


@dataclass(frozen=True, slots=True)
class Written:
    """What goes to the targets, on all dividers of a run: the results, the paths of each one's waves, remarks."""

    results: list[Result]
    waves: list[list[str]]
    remarks: list[str]


def _results_of(
    found: Sequence[Outcome],
    targets: Targets,
    more: dict[str, Any] | None = None,
    waivers: Sequence[tuple[str, str]] = (),
    lapses: Sequence[Lapse] = (),
) -> Written:
    """What goes to the targets; `more` goes into the JSON, `waivers` into the page, `lapses` into what other programs
    collect."""
    from prover.report import several as told
    from prover.several import labels

    written = Written([], [], [])
    for outcome, label in zip(found, labels(found), strict=True):
        waves: list[Result] = []
        if outcome.report is not None:
            waves = _vcd(outcome.report, targets.vcd, f"{label}-")
            benches, without = _benches(outcome.report, targets.testbench, f"{label}-")
            written.results.extend([*waves, *benches])
            written.remarks.extend(f"{outcome.title or outcome.name}: {remark}" for remark in without)
        written.waves.append([wave.path for wave in waves])
    written.results.extend(_of_all(found, targets, lapses))
    if targets.json is not None:
        written.results.append(Result(targets.json, told.render_json(found, more)))
    if targets.html is not None:
        from prover.report import html

        written.results.append(Result(targets.html, html.render_several(found, waivers)))
    return written


def _text_of(outcome: Outcome, waves: Sequence[str]) -> str:
    """An outcome for people; "" where the table says all."""
    if outcome.report is not None:
        return _told(outcome.report, waves)
    return harmless(_user_error(outcome.error)) + "\n" if outcome.error is not None else ""


def _sources(found: Sequence[Outcome]) -> list[str]:
    return [file for outcome in found for file in outcome.files]


def _sent(
    results: Sequence[Result], sources: Sequence[str], text: str, alone: str
) -> tuple[str, UserError | None]:
    """Write the results to their files. What goes to standard output: one of them, or the text for people; where no
    file could be written, the text that speaks of none, for verdicts are not lost by that; and why none was."""
    piped = "".join(result.text for result in results if result.path == STANDARD_OUTPUT)
    try:
        check_targets([result.path for result in results], sources)
        write_files([result for result in results if result.path != STANDARD_OUTPUT])
    except UserError as error:
        return piped or alone, error
    return piped or text, None


def _worst(statuses: Iterable[Status]) -> Status:
    return max(statuses, key=SEVERITY.index)


def _exchanged(files: Sequence[str], came: Report | Exception, targets: Targets) -> list[Result]:
    """What goes into formats that other programs collect, on one divider: its report, or what kept it from one."""
    if targets.junit is None and targets.sarif is None:
        return []
    from prover.several import Outcome, failed

    one = tuple(files)
    return _of_all([failed(one, came) if isinstance(came, Exception) else Outcome(one, came)], targets)


def _of_all(found: Sequence[Outcome], targets: Targets, lapses: Sequence[Lapse] = ()) -> list[Result]:
    """The same on all dividers of a run."""
    results: list[Result] = []
    if targets.junit is not None:
        from prover.report import junit

        results.append(Result(targets.junit, junit.render(found, datetime.now(UTC), lapses)))
    if targets.sarif is not None:
        from prover.report import sarif

        results.append(Result(targets.sarif, sarif.render(found, lapses)))
    return results


def _status_of_outcome(outcome: Outcome) -> Status:
    if outcome.report is not None:
        return status_of(outcome.report)
    return Status.USAGE if outcome.error else Status.FAULT if outcome.fault else Status.OPEN


def _json(report: Report, path: str | None) -> list[Result]:
    if path is None:
        return []
    from prover.report import json

    return [Result(path, json.render(report))]


def _html(report: Report, path: str | None) -> list[Result]:
    if path is None:
        return []
    from prover.report import html

    return [Result(path, html.render(report))]


def _certificate(
    report: Report, path: str | None, files: Sequence[str], tell: Callable[[str], None]
) -> tuple[list[Result], list[str]]:
    """The certificate and what to say of it: it may bear out less than the report says."""
    if path is None:
        return [], []
    from properties import WHILE_MOVING
    from prover.effort import Effort
    from prover.report.certificate import certify

    made = certify(report, files, Effort(report.spec.effort, tell))
    moved = [name for name in made.left_open if name in {module.NAME for module in WHILE_MOVING}]
    left = ", ".join(name for name in made.left_open if name not in moved)
    remarks = [f"note: the certificate leaves {left} open: what that rests on is too large to be written"]
    held = f"note: the certificate is of the divider with its inputs held: it bears out nothing of {', '.join(moved)}"
    return [Result(path, made.text)], [*(remarks if left else []), *([held] if moved else [])]


def _is_folder(path: str) -> bool:
    return path.endswith(os.sep) or os.path.isdir(path)


def _target(vcd_path: str | None) -> str | None:
    """A path in the place where waves will go, to be checked before there are any."""
    if vcd_path is None or not _is_folder(vcd_path):
        return vcd_path
    return str(Path(vcd_path) / "ratio.vcd")


def _vcd(report: Report, path: str | None, prefix: str = "") -> list[Result]:
    """Where each refuted property's wave goes. On standard output there is room for the first only."""
    if path is None:
        return []
    from prover.report import vcd

    dumps = vcd.dumps(report)
    if path == STANDARD_OUTPUT:
        return [Result(path, dump.text) for dump in dumps[:1]]
    place = Path(path)
    if _is_folder(path):
        return [Result(str(place / f"{prefix}{dump.name}.vcd"), dump.text) for dump in dumps]
    others = [place.with_name(f"{place.stem}-{dump.name}{place.suffix}") for dump in dumps]
    return [Result(path if i == 0 else str(others[i]), dump.text) for i, dump in enumerate(dumps)]


def _benches(report: Report, folder: str | None, prefix: str = "") -> tuple[list[Result], list[str]]:
    """Each refuted property's test bench, and what to say of those that have none."""
    if folder is None:
        return [], []
    from prover.report import testbench

    made, without = testbench.benches(report)
    results = [Result(os.path.join(folder, f"{prefix}{bench.name}_tb.v"), bench.text) for bench in made]
    return results, [f"note: {why}" for why in without]


def _told(report: Report, traces: Sequence[str]) -> str:
    from prover.report import terminal

    return terminal.render(report, _look(), traces) + "\n"


def _look() -> Look:
    from prover.report.look import Look

    return Look(_speaks_unicode(), _has_colour())


def _print(text: str) -> None:
    if sys.stdout is None:
        return
    try:
        click.echo(text, nl=False, color=_has_colour())
        sys.stdout.flush()
    except OSError as fault:
        # Python would try to write the rest once more when it ends.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        # A reader that has seen enough leaves the verdict standing.
        if not isinstance(fault, BrokenPipeError):
            raise UserError(
                f"can't write to standard output: {fault.strerror}", hint="send it where there is room"
            ) from fault


def _speaks_unicode() -> bool:
    encoding = getattr(sys.stdout, "encoding", None) or ""
    return encoding.lower().replace("-", "") in ("utf8", "utf16", "utf32", "cp65001")


def _has_colour() -> bool:
    if sys.stdout is None or not sys.stdout.isatty():
        return False
    return not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


class Progress:
    """A line on the terminal that says what is being done, from a second on; nothing anywhere else.

    It is gone when the run ends, and so is the thread that draws it.
    """

    def __init__(self, stream: TextIO | None) -> None:
        self._doing = ""
        self._over = threading.Event()
        self._thread: threading.Thread | None = None
        if stream is not None and stream.isatty() and os.environ.get("TERM") != "dumb":
            self._thread = threading.Thread(target=self._draw, daemon=True)

    def __enter__(self) -> Progress:
        if self._thread is not None:
            self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None
    ) -> None:
        self._over.set()
        if self._thread is not None:
            self._thread.join()

    def tell(self, doing: str) -> None:
        """Say what is being done."""
        self._doing = harmless(doing)

    def _draw(self) -> None:
        if self._over.wait(PATIENCE):
            return
        from rich.console import Console
        from rich.live import Live
        from rich.spinner import Spinner
        from rich.text import Text

        spinner = Spinner("dots")
        # A stream in another one's place would not tell what it can show.
        with Live(
            spinner,
            console=Console(stderr=True),
            auto_refresh=False,
            transient=True,
            redirect_stdout=False,
            redirect_stderr=False,
        ) as live:
            # A run that is killed can't give back a cursor that it hid.
            live.console.show_cursor(True)
            while not self._over.wait(REFRESH):
                spinner.update(text=Text(self._doing))
                live.refresh()
