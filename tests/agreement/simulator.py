"""Runs a divider in the event simulator, from any set of states, and reads its registers after every half-cycle.

The agreement tests compare what comes back with the machine and the verdicts. The registers are set with `force` while
the clock is put at its level, and released a moment later: a released register keeps its value, and the events that
setting it caused have come to nothing by then. Assumes zero-delay sources, but for the unit delays asked for.

Not for states under an active asynchronous clear: an always block waits for the clear's edge, which is past when the
force ends, so the simulator would leave such a state standing where hardware clears it.
"""

import re
import subprocess
import tempfile
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import product
from pathlib import Path

HALF_CYCLE_UNITS = 100  # far more than a chain of unit-delay gates needs to settle


class SimulatorError(Exception):
    """The simulator refused the sources, ran out of time, or showed an unknown value."""


@dataclass(frozen=True)
class Register:
    """Stored bits: the path of a variable below the top module, and which of its bits (counted from the right, 0)."""

    path: str
    width: int
    lsb: int = 0


@dataclass(frozen=True)
class Start:
    """A state to start in: one value for each register, and the level of the clock."""

    values: tuple[int, ...]
    clock: int


@dataclass(frozen=True)
class Sample:
    """What stands at the end of a half-cycle."""

    output: int
    values: tuple[int, ...]


@dataclass(frozen=True)
class Reset:
    """A reset to give after the start state is set: asserted and released between clock edges. If it is `watched`, the
    samples begin under reset, with one after its assertion and one for each half-cycle of it."""

    port: str
    active: int
    half_cycles: int
    watched: bool = False


@dataclass(frozen=True)
class Bench:
    """The divider to run. `output` may be a port, a bit of one (`q[3]`), or a path below the top module."""

    sources: Sequence[Path]
    top: str
    clock: str
    output: str
    registers: Sequence[Register]
    holds: Mapping[str, int] = field(default_factory=dict)
    parameters: Mapping[str, int] = field(default_factory=dict)
    delayed: Sequence[str] = ()  # gates and assigned nets that get one unit of delay
    replacements: Sequence[tuple[str, str]] = ()  # text to replace in the sources, each found at least once
    defines: Mapping[str, str] = field(default_factory=dict)
    includes: Sequence[Path] = ()
    language: str = "2005"  # what the simulator's option -g takes


def every_state(registers: Sequence[Register]) -> Iterator[Start]:
    """Every value of every register, at clock level 0 and 1: 2 ** (bits + 1) starts."""
    for clock in (0, 1):
        for values in product(*(range(1 << register.width) for register in registers)):
            yield Start(values, clock)


def delay_gates(text: str, names: Sequence[str]) -> str:
    """Gives gate primitives and continuous assignments one unit of delay: by instance name or name of the net.

    Raises SimulatorError for a name that is neither.
    """
    for name in names:
        quoted = re.escape(name)
        text, gates = re.subn(rf"\b(nand|and|nor|or|not|buf|xor|xnor)\s+({quoted})\s*\(", r"\1 #1 \2 (", text)
        text, nets = re.subn(rf"\bassign\s+({quoted})\s*=", r"assign #1 \1 =", text)
        if gates + nets == 0:
            raise SimulatorError(f"no gate or assignment named {name} to delay")
    return text


def run(
    bench: Bench,
    starts: Sequence[Start],
    half_cycles: int,
    reset: Reset | None = None,
    timeout_seconds: float = 120.0,
) -> list[list[Sample]]:
    """From each start state, the sample of the start itself and then one at the end of each half-cycle.

    With a reset, the reset is given first, and the first sample is the one just after its release, unless it is
    watched; the clock's level there is that of the start, turned over once for each half-cycle of reset.
    Raises SimulatorError when the sources don't compile, time runs out, or an x or z is read.
    """
    if not starts:
        return []
    words = [_word(bench.registers, start) for start in starts]
    text = _bench_text(bench, len(starts), half_cycles, reset)
    if reset is not None and reset.watched:
        half_cycles += reset.half_cycles + 1
    return _samples(bench, _simulate(bench, text, words, timeout_seconds), half_cycles)


def run_initial(bench: Bench, clock: int, half_cycles: int, timeout_seconds: float = 120.0) -> list[Sample]:
    """From the declared initial values with the clock at `clock`: the first sample and one for each half-cycle."""
    text = _bench_text(bench, None, half_cycles, None, clock)
    return _samples(bench, _simulate(bench, text, [], timeout_seconds), half_cycles)[0]


def step_map(
    bench: Bench, starts: Sequence[Start], timeout_seconds: float = 120.0
) -> tuple[dict[Start, Start], dict[Start, int]]:
    """The half-cycle map and the output on every start state, for brute.analyse.

    The starts must be closed under stepping, as all settled states are.
    """
    step: dict[Start, Start] = {}
    output: dict[Start, int] = {}
    for start, samples in zip(starts, run(bench, starts, 1, None, timeout_seconds), strict=True):
        step[start] = Start(samples[1].values, 1 - start.clock)
        output[start] = samples[0].output
    return step, output


def _variables(registers: Sequence[Register]) -> dict[str, int]:
    """Width to force of each variable, in order of first mention: registers may be slices of one variable."""
    widths: dict[str, int] = {}
    for register in registers:
        widths[register.path] = max(widths.get(register.path, 0), register.lsb + register.width)
    return widths


def _word(registers: Sequence[Register], start: Start) -> int:
    """A start state packed for the bench's memory: the clock on top, then the variables in order."""
    if len(start.values) != len(registers):
        raise SimulatorError(f"{len(start.values)} values for {len(registers)} registers")
    whole = dict.fromkeys(_variables(registers), 0)
    for register, value in zip(registers, start.values, strict=True):
        if not 0 <= value < 1 << register.width:
            raise SimulatorError(f"{register.path}: {value} doesn't fit in {register.width} bits")
        whole[register.path] |= value << register.lsb
    word = start.clock
    for path, width in _variables(registers).items():
        word = word << width | whole[path]
    return word


def _bench_text(
    bench: Bench, starts: int | None, half_cycles: int, reset: Reset | None, clock: int = 0
) -> str:
    """The bench: no start states (None) means the declared initial values."""
    widths = _variables(bench.registers)
    inputs = dict(bench.holds)
    drive = ""
    if reset is not None:
        inputs.pop(reset.port, None)
        drive = f", .{reset.port}(reset)"
    held = "".join(f", .{port}(64'd{value})" for port, value in inputs.items())
    given = ", ".join(f".{name}({value})" for name, value in bench.parameters.items())
    force, release, top = [], [], sum(widths.values())
    for path, width in widths.items():
        force.append(f"force dut.{path} = word[{top - 1}:{top - width}];")
        release.append(f"release dut.{path};")
        top -= width
    size = sum(widths.values())
    shown = ", ".join(f"dut.{path}" for path in [bench.output, *widths])
    lines = [
        "`timescale 1ns/1ps",
        "module agreement_bench;",
        f"  reg clock = {clock};",
        f"  reg reset = {1 - reset.active if reset else 0};",
        f"  reg [{size}:0] word;",
        f"  reg [{size}:0] memory [0:{(starts or 1) - 1}];",
        "  integer i, k;",
        f"  {bench.top} {f'#({given}) ' if given else ''}dut (.{bench.clock}(clock){held}{drive});",
        "  initial begin",
    ]
    show = f'$write(" {".".join(["%h"] * (len(widths) + 1))}", {shown});'
    turns = [
        f"#{HALF_CYCLE_UNITS} {show}",
        f"for (k = 0; k < {half_cycles}; k = k + 1) begin",
        f"  clock = ~clock; #{HALF_CYCLE_UNITS} {show}",
        "end",
        "$display;",
    ]
    if starts is None:
        body = turns
    else:
        pulse = []
        if reset is not None:
            watch = show if reset.watched else ";"
            pulse = [
                f"#{HALF_CYCLE_UNITS} reset = {reset.active}; #{HALF_CYCLE_UNITS} {watch}",
                f"repeat ({reset.half_cycles}) begin clock = ~clock; #{HALF_CYCLE_UNITS} {watch} end",
                f"reset = {1 - reset.active};",
            ]
        body = [
            '$readmemh("starts.hex", memory);',
            f"for (i = 0; i < {starts}; i = i + 1) begin",
            f"  word = memory[i]; {' '.join(force)}",
            f"  clock = word[{size}]; #{HALF_CYCLE_UNITS}",
            f"  {' '.join(release)}",
            *(f"  {line}" for line in pulse + turns),
            "end",
        ]
    lines += [f"    {line}" for line in body]
    return "\n".join([*lines, "    $finish;", "  end", "endmodule", ""])


def _simulate(bench: Bench, text: str, words: Sequence[int], timeout_seconds: float) -> str:
    """Compiles and runs the bench in a folder of its own; returns what it printed."""
    found = dict.fromkeys(bench.replacements, False)
    contents = []
    for source in bench.sources:
        content = source.read_text(encoding="utf-8", errors="surrogateescape")
        for old, new in bench.replacements:
            found[(old, new)] |= old in content
            content = content.replace(old, new)
        contents.append(content)
    for (old, _), seen in found.items():
        if not seen:
            raise SimulatorError(f"nothing to replace: {old!r} is in no source")
    divider = delay_gates("\n".join(contents), bench.delayed)
    folders = [*bench.includes, *dict.fromkeys(source.parent for source in bench.sources)]
    options = [f"-I{folder.resolve()}" for folder in folders]
    options += [f"-D{name}={value}" for name, value in bench.defines.items()]
    with tempfile.TemporaryDirectory() as name:
        place = Path(name)
        (place / "bench.v").write_text(text)
        (place / "divider.v").write_text(divider + "\n", encoding="utf-8", errors="surrogateescape")
        (place / "starts.hex").write_text("\n".join(f"{word:x}" for word in words) + "\n")
        compiler = ["iverilog", f"-g{bench.language}", "-s", "agreement_bench", "-o", "bench.vvp", *options]
        call([*compiler, "bench.v", "divider.v"], place, timeout_seconds)
        return call(["vvp", "-n", "bench.vvp"], place, timeout_seconds)


def call(command: Sequence[str], place: Path, timeout_seconds: float) -> str:
    """What a command prints, run in a folder. Raises SimulatorError where it fails or takes too long."""
    try:
        done = subprocess.run(
            command, cwd=place, capture_output=True, text=True, timeout=timeout_seconds, check=False
        )
    except subprocess.TimeoutExpired as error:
        raise SimulatorError(f"{command[0]} took more than {timeout_seconds} seconds") from error
    if done.returncode != 0:
        raise SimulatorError(f"{command[0]} failed: {done.stdout}{done.stderr}")
    return done.stdout


def _samples(bench: Bench, printed: str, half_cycles: int) -> list[list[Sample]]:
    """Reads the bench's lines: one a start state, of one token a half-cycle."""
    known: dict[str, Sample] = {}
    runs = []
    for number, line in enumerate(line for line in printed.splitlines() if line.startswith(" ")):
        tokens = line.split()
        if len(tokens) != half_cycles + 1:
            raise SimulatorError(f"start {number}: {len(tokens)} samples, not {half_cycles + 1}")
        for when, token in enumerate(tokens):
            if token not in known:
                if not re.fullmatch("[0-9a-f.]+", token):
                    raise SimulatorError(f"start {number}, half-cycle {when}: unknown value in {token}")
                known[token] = _unpack(bench.registers, token)
        runs.append([known[token] for token in tokens])
    return runs


def _unpack(registers: Sequence[Register], token: str) -> Sample:
    """A sample from its printed form: the output and each variable in hexadecimal, with points between."""
    output, *fields = (int(text, 16) for text in token.split("."))
    whole = dict(zip(_variables(registers), fields, strict=True))
    values = tuple(whole[r.path] >> r.lsb & ((1 << r.width) - 1) for r in registers)
    return Sample(output, values)
