"""Test benches in Verilog-2001 (IEEE 1364-2001): a refuted property replayed by an event simulator.

A bench instantiates the user's module, puts its registers into the start state of the counterexample, holds the
inputs, drives the clock, and checks the claim itself at the end of each half-cycle. So it fails on the divider that
the report is about, and passes on the same divider mended. It prints what is claimed and what came, whether that is
what the report says, and ends with PASSED or FAILED.

How a state is set: each register is forced, to the opposite of its value first so that combinational processes see a
change, and released a moment later. What is forced heeds no process, so nothing comes of the edges that this makes;
once released a variable keeps its value until a process assigns one. Words of memories can't be forced; they are
assigned last. What a claim about loops leaves time for (a mended divider has to find its way first) is a parameter.

Not every refutation has a bench: `benches` says why where one has not.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass

from prover import __version__
from prover import expr as e
from prover.design import Signal, components, ended
from prover.findings import Finding, Report
from prover.output import harmless
from prover.report.checks import CHECKS, WIDTH, Check, NoBench, came, number, register, settles, whole

HALF_CYCLE = 100
"""Units of time between two edges: far more than gates with a unit of delay each need."""

_OWN = """
HALF_CYCLES BEGINS t out last failed as_reported running rose spans rising first odd moves began wanted whole changes
kept back dut observe verdict ends_badly
"""
RESERVED = frozenset(_OWN.split())
"""Names that a bench has for itself."""


ABOUT = (
    "Compile it with the sources, this file first. From the start state of the counterexample it runs the divider",
    "for HALF_CYCLES half-cycles and checks the claim from half-cycle BEGINS on, so that it fails on this divider",
    "and passes once that is mended. The last line that it prints is PASSED or FAILED. Define TESTBENCH_FAIL as",
    "what makes your simulator end with a status that tells, such as $fatal(1) where SystemVerilog is understood.",
)
ABOUT_CLEARS = (
    "a clear come together. Simulators take such events in an order of their own. So that the clear lasts as it",
    "does in hardware, give the gates that make it a delay of one unit each in the sources, such as nand #1.",
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
    """The bench for a refuted finding on the report's own machine. Raises NoBench where there can't be one."""
    if finding.unsettled is not None:
        start = report.rhythm.system.describe(finding.unsettled.state)
        return _Writer(report, finding, start).text(settles(report, finding.unsettled))
    if finding.trace is not None:
        raise NoBench("inputs move in its run, which benches do not replay yet")
    if finding.counterexample is None:
        raise NoBench(
            "a simulator without delays shows one order of simultaneous events, and this hangs on another"
        )
    judge = CHECKS.get(finding.name)
    if judge is None:
        raise NoBench("its claim is none that a bench of one divider can check")
    start = report.rhythm.system.describe(finding.counterexample.orbit.start)
    return _Writer(report, finding, start).text(judge(report, finding.counterexample))


# -- the file ----------------------------------------------------------------------------------------------


class _Writer:
    """The text around a check: header, divider, start state, clock."""

    def __init__(self, report: Report, finding: Finding, start: Mapping[str, int]) -> None:
        self.report, self.finding, self.start = report, finding, start
        self.ports, self.design = report.ports, report.ports.design
        for each in self.design.registers:
            if each.primitive:
                raise NoBench(f"{each.name} is the state of a user-defined primitive, which nothing can set")
        self.set = self._signals()
        resets = report.rhythm.scope == "reset" and report.rhythm.starts and report.ports.reset
        self.reset = resets.port if resets else None
        """The reset, if it is given before the start state is set."""
        self.local = {name: ended(_apart(name, self.design.inputs)) for name in self.design.inputs}
        """What each input port is connected to."""

    def _signals(self) -> dict[str, tuple[Signal, int]]:
        """What is set for the start state, by its path in the bench, with its value. A register that the output does
        not depend on, so that the start does not say what it holds, is 0."""
        values = dict(self.ports.running.values)
        values |= {r.name: self.start.get(r.name, 0) for r in self.design.registers}
        values[self.ports.clock] = self.start[self.ports.clock]
        wholes = {s.name: s for s in (whole(self.report, r.name) for r in self.design.registers)}
        words = [signal.value for signal in wholes.values()]
        values = dict.fromkeys((v.name for v in e.variables(words)), 0) | values
        found = zip(wholes.values(), e.evaluate(words, values), strict=True)
        return {f"dut.{ended(signal.name)}": (signal, value) for signal, value in found}

    def text(self, check: Check) -> str:
        """The whole file, ended by a newline."""
        lines = [
            *(f"// {line}".rstrip() for line in self._header(check)),
            "",
            "`timescale 1ns / 1ns",
            "`ifndef TESTBENCH_FAIL",
            "`ifdef __ICARUS__",
            "`define TESTBENCH_FAIL $finish_and_return(1)",
            "`else",
            "`define TESTBENCH_FAIL $finish",
            "`endif",
            "`endif",
            "",
            f"module {self._name()};",
            # Before any escaped name: preprocessors may take a quote in one for the beginning of a string.
            "  task ends_badly; `TESTBENCH_FAIL; endtask",
            "",
            *(f"  {line}".rstrip() for line in self._body(check)),
            "endmodule",
        ]
        return "\n".join(lines) + "\n"

    def _name(self) -> str:
        words = (self.design.top, self.finding.name)
        return "testbench_" + "_".join(re.sub(r"\W+", "_", word, flags=re.ASCII) for word in words)

    def _header(self, check: Check) -> Iterator[str]:
        spec, finding = self.report.spec, self.finding
        yield f"Test bench for a refuted property, written by Subharmonic {__version__}."
        yield ""
        yield f"property  {_plain(finding.name)} of {_plain(self.design.top)}, output {_plain(self.ports.output)}"
        yield f"claimed   {_plain(finding.claim)}"
        yield f"reported  {_plain(finding.says)}"
        if finding.counterexample is not None:
            yield f"start     {_plain(finding.counterexample.cause)}"
        yield f"sources   {', '.join(map(_plain, self.design.files))}"
        for name, value in spec.defines.items():
            yield f"macro     {_plain(name)}={_plain(value)}"
        yield ""
        yield from ABOUT
        races = [race.register for race in self.report.rhythm.settling.races if race.kind == "release"]
        if races:
            yield ""
            yield f"The divider clears itself, at {_plain(', '.join(races))}, where a clock edge and the release of"
            yield from ABOUT_CLEARS

    def _body(self, check: Check) -> Iterator[str]:
        yield f"parameter [{WIDTH - 1}:0] HALF_CYCLES = {number(check.length)};"
        yield f"parameter [{WIDTH - 1}:0] BEGINS = {number(check.begins)};"
        yield ""
        yield from self._divider()
        yield ""
        yield f"{register('t')}"
        yield "reg out, last, failed, as_reported, running;"
        yield from check.declarations
        bits = sum(signal.value.width for signal, _ in self.set.values())
        if check.loop:
            yield f"reg [{max(bits, 1) - 1}:0] kept;"
            yield "reg back;"
        yield ""
        yield from self._tasks(check)
        yield ""
        yield from self._run(check)
        if check.processes:
            yield ""
            yield from check.processes

    def _divider(self) -> Iterator[str]:
        """The module under test with its inputs: the clock driven, all others held."""
        clock = self.ports.clock
        # Given a value where it is declared, the clock makes no edge from x when the simulation begins.
        yield f"reg {self.local[clock]} = 1'b{self.start[clock]};"
        for name, value in self.ports.running.values:
            width = self.design.inputs[name]
            size = f"[{width - 1}:0] " if width > 1 else ""
            word = "reg" if name == self.reset else "wire"
            yield f"{word} {size}{self.local[name]} = {width}'h{value:x};"
        given = ", ".join(f".{ended(n)}({_constant(v)})" for n, v in self.report.spec.parameters.items())
        wires = ", ".join(f".{ended(name)}({self.local[name]})" for name in self.design.inputs)
        yield f"{ended(self.design.top)} {f'#({given}) ' if given else ''}dut ({wires});"

    def _tasks(self, check: Check) -> Iterator[str]:
        yield "// At the end of a half-cycle, when all is at rest."
        yield "task observe;"
        yield "  begin"
        yield f"    out = dut.{ended(self.ports.output)};"
        yield "    if (t >= BEGINS && out !== 1'b0 && out !== 1'b1 && !failed) begin"
        yield from came("an unknown output in half-cycle %0d", "t", "1'b0", 6)
        yield "    end"
        if check.first:
            yield "    if (t == BEGINS) begin"
            yield from (f"      {line}" for line in check.first)
            yield "    end"
        if check.observe:
            yield "    if (t > BEGINS) begin"
            yield from (f"      {line}" for line in check.observe)
            yield "    end"
        if check.loop:
            registers = "{" + ", ".join(self.set) + "}"
            yield f"    if (t == BEGINS) kept = {registers};"
            yield f"    if (t == BEGINS + {number(check.loop)}) back = kept === {registers};"
        yield "    last = out;"
        yield "  end"
        yield "endtask"
        yield ""
        yield "task verdict;"
        yield "  begin"
        yield "    running = 1'b0;"
        yield "    if (failed) begin"
        if check.loop:
            yield "      if (back)"
            yield (
                '        $display("         the registers are back after %0d half-cycles: so it goes on for ever", '
                f"{number(check.loop)});"
            )
        yield "      if (!as_reported)"
        yield f'        $display("which is not as reported: {_literal(self.finding.says)}");'
        yield '      $display("FAILED");'
        yield "      ends_badly;"
        yield "    end else begin"
        yield '      $display("came:    nothing else in %0d half-cycles", HALF_CYCLES);'
        yield '      $display("PASSED");'
        yield "      $finish;"
        yield "    end"
        yield "  end"
        yield "endtask"

    def _run(self, check: Check) -> Iterator[str]:
        clock = self.local[self.ports.clock]
        memories = {path: pair for path, pair in self.set.items() if components(pair[0].name)[-1][1]}
        forced = {path: pair for path, pair in self.set.items() if path not in memories}
        yield "initial begin"
        yield "  {failed, as_reported, running, last, t} = 0;"
        yield from (f"  {name} = 0;" for name in _names(check.declarations))
        if check.loop:
            yield "  back = 1'b0;"
        yield f'  $display("claimed: {_literal(self.finding.claim)}");'
        yield from (f"  {line}" for line in self._reset())
        yield "  // The start state: forced so that nothing else reacts, then let go."
        for flipped in (True, False):
            yield "  #1;"
            for path, (signal, value) in forced.items():
                width = signal.value.width
                bits = value ^ ((1 << width) - 1) if flipped else value
                yield f"  force {path} = {width}'h{bits:x};"
        yield "  #1;"
        yield from (f"  release {path};" for path in forced)
        yield from (f"  {path} = {s.value.width}'h{value:x};" for path, (s, value) in memories.items())
        yield "  running = 1'b1;"
        yield "  for (t = 0; t < HALF_CYCLES; t = t + 1) begin"
        yield f"    if (t > 0) {clock} = ~{clock};"
        yield f"    #{HALF_CYCLE};"
        yield "    observe;"
        yield "  end"
        yield from (f"  {line}" for line in check.finish)
        yield "  verdict;"
        yield "end"

    def _reset(self) -> Iterator[str]:
        """Reset, for registers that a mended divider may have besides; an even number of half-cycles long."""
        reset = self.ports.reset
        if self.reset is None or reset is None:
            return
        held = (self.report.rhythm.reset_half_cycles or 0) + 2
        name, clock = self.local[reset.port], self.local[self.ports.clock]
        yield "// Reset, for the sake of registers that the divider did not have when this was written."
        yield f"#{HALF_CYCLE} {name} = 1'b{reset.active};"
        yield f"repeat ({held + held % 2}) #{HALF_CYCLE} {clock} = ~{clock};"
        yield f"#{HALF_CYCLE} {name} = 1'b{1 - reset.active};"
        yield f"#{HALF_CYCLE};"


def _apart(name: str, others: Collection[str]) -> str:
    """The name, or where the bench has one like it that name and as many underscores as tell it from all others."""
    if name not in RESERVED:
        return name
    while name in RESERVED or name in others:
        name += "_"
    return name


def _names(declarations: Sequence[str]) -> Iterator[str]:
    """The variables that are declared."""
    for line in declarations:
        yield from re.sub(r"^\w+ (\[.*?\] )?", "", line).rstrip(";").split(", ")


def _constant(value: int) -> str:
    """A parameter's value, which may be negative, as an expression."""
    if -(1 << 31) <= value < 1 << 31:
        return str(value)
    width = abs(value).bit_length() + 1
    return f"{'-' if value < 0 else ''}{width}'sd{abs(value)}"


def _plain(text: str) -> str:
    """Text that can stand in a comment of one line."""
    return harmless(text).encode("ascii", "backslashreplace").decode("ascii").replace("\n", "\\n")


def _literal(text: str) -> str:
    """Text inside a string that $display prints: what would end it or stand for a value is escaped."""
    return _plain(text).replace("\\", "\\\\").replace('"', '\\"').replace("%", "%%")
