"""Test benches in Verilog-2001 (IEEE 1364-2001): a refuted property replayed by an event simulator.

A bench instantiates the user's module, puts its registers into the start state of the counterexample, drives clock
and inputs, and checks the claim itself. So it fails on the divider that the report is about, and passes on the same
divider mended; a mended divider has to find its way first, and is given time for that. The bench prints what is
claimed and what came, whether that is what the report says, and ends with PASSED or FAILED.

What is played is a scene: a run whose claim is checked at the end of each half-cycle (`checks`), a reset
(`releases`), inputs that move (`movement`), or changes that arrive in an order which zero delays do not show
(`orders`). Not every refutation has a bench: `benches` says why where one has not."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from properties import WHILE_MOVING
from prover import __version__
from prover.findings import Finding, Report
from prover.report import checks, movement, orders, releases
from prover.report.dut import Dut, NoBench, Scene, literal, number, plain

ABOUT = (
    "Compile it with the sources, this file first. The last line that it prints is PASSED or FAILED. Define",
    "TESTBENCH_FAIL as what makes your simulator end with a status that tells, such as $fatal(1) where",
    "SystemVerilog is understood.",
)
ABOUT_CLEARS = (
    "a clear come together. Simulators take such events in an order of their own. So that the clear lasts as it",
    "does in hardware, give the gates that make it a delay of one unit each in the sources, such as nand #1.",
)

OPENING = (
    "`timescale 1ns / 1ns",
    "`ifndef TESTBENCH_FAIL",
    "`ifdef __ICARUS__",
    "`define TESTBENCH_FAIL $finish_and_return(1)",
    "`else",
    "`define TESTBENCH_FAIL $finish",
    "`endif",
    "`endif",
)


@dataclass(frozen=True, slots=True)
class Bench:
    """The text of a test bench, and the property that it refutes."""

    name: str
    text: str


def benches(report: Report) -> tuple[list[Bench], list[str]]:
    """A bench for each refuted property that can have one, and a note for each that can't."""
    made: list[Bench] = []
    notes: list[str] = []
    for finding in report.findings:
        if finding.verdict == "refuted":
            try:
                made.append(Bench(finding.name, render(finding.witness or report, finding)))
            except NoBench as why:
                notes.append(f"no test bench for {finding.name}: {why}")
    return made, notes


def render(report: Report, finding: Finding) -> str:
    """The bench for a refuted finding on the report's own machine, ended by a newline. Raises NoBench where there
    can't be one."""
    dut = Dut(report)
    if finding.trace is not None and finding.name in {module.NAME for module in WHILE_MOVING}:
        played = movement.scene(report, finding, dut)
    elif finding.trace is not None or finding.name == "reset":
        played = releases.scene(report, finding, dut)
    elif finding.unsettled is not None or finding.counterexample is not None:
        played = checks.scene(report, finding, dut)
    else:
        played = orders.scene(report, finding, dut)
    lines = [
        *(f"// {line}".rstrip() for line in _header(report, finding, played)),
        "",
        *OPENING,
        "",
        f"module {_name(report, finding)};",
        # Before any escaped name: preprocessors may take a quote in one for the beginning of a string.
        "  task ends_badly; `TESTBENCH_FAIL; endtask",
        "`ifdef TESTBENCH_DUMP",
        "  initial begin $dumpfile(`TESTBENCH_DUMP); $dumpvars; end",
        "`endif",
        "",
        *(f"  {line}".rstrip() for line in _body(finding, dut, played)),
        "endmodule",
    ]
    return "\n".join(lines) + "\n"


def _name(report: Report, finding: Finding) -> str:
    words = (report.ports.design.top, finding.name)
    return "testbench_" + "_".join(re.sub(r"\W+", "_", word, flags=re.ASCII) for word in words)


def _header(report: Report, finding: Finding, played: Scene) -> Iterator[str]:
    ports, design = report.ports, report.ports.design
    yield f"Test bench for a refuted property, written by Subharmonic {__version__}."
    yield ""
    yield f"property  {plain(finding.name)} of {plain(design.top)}, output {plain(ports.output)}"
    yield f"claimed   {plain(finding.claim)}"
    yield f"reported  {plain(finding.says)}"
    yield f"start     {plain(played.start)}"
    yield f"sources   {', '.join(map(plain, design.files))}"
    for name, value in report.spec.defines.items():
        yield f"macro     {plain(name)}={plain(value)}"
    yield ""
    yield from played.about
    yield "So it fails on the divider as it was when this was written, and passes once that is mended."
    yield ""
    yield from ABOUT
    races = [race.register for race in report.rhythm.settling.races if race.kind == "release"]
    if races:
        yield ""
        yield f"The divider clears itself, at {plain(', '.join(races))}, where a clock edge and the release of"
        yield from ABOUT_CLEARS


def _body(finding: Finding, dut: Dut, played: Scene) -> Iterator[str]:
    for name, value in played.parameters.items():
        yield f"parameter [63:0] {name} = {number(value)};"
    yield ""
    yield from dut.instance(played.level, played.moving)
    yield ""
    yield "reg failed, as_reported;"
    yield from played.declarations
    yield ""
    yield "initial begin"
    yield "  {failed, as_reported} = 0;"
    yield f'  $display("claimed: {literal(finding.claim)}");'
    yield "end"
    yield ""
    yield from played.code
    yield ""
    yield "task verdict;"
    yield "  if (failed) begin"
    yield from (f"    {line}" for line in played.failed)
    yield "    if (!as_reported)"
    yield f'      $display("which is not as reported: {literal(finding.says)}");'
    yield '    $display("FAILED");'
    yield "    ends_badly;"
    yield "  end else begin"
    said, values = played.passed
    yield f'    $display("came:    {said}"{f", {values}" if values else ""});'
    yield '    $display("PASSED");'
    yield "    $finish;"
    yield "  end"
    yield "endtask"
