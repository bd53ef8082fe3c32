"""What a test bench checks: the claim of each property in Verilog, about the run of a divider.

A check looks at the output at the end of each half-cycle, and only at that: it says whether the claim holds, not
whether the run is the one that was reported, so that it serves a mended divider as well. What came is compared with
the report besides. What a claim needs of a run that never ends is shown in a finite one by the registers, which are
back where they were, or by a wave that was right for long enough.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from math import ceil, floor

from properties.runs import Span, gaps, high_runs
from prover.errors import InternalError
from prover.findings import Counterexample, Finding, Report
from prover.path import Run
from prover.report.dut import Dut, NoBench, Scene, came, names, number, register
from prover.rhythm import Orbit
from prover.settling import Unsettled
from prover.spec import Spec

HALF_CYCLE = 100
"""Units of time between two edges: far more than gates with a unit of delay each need."""

MOST_HALF_CYCLES = 5_000_000
"""Half-cycles that a bench may run for; a simulator takes seconds for these."""

MOST_CHANGES = 10_000
"""Changes of a register within a half-cycle from which on it counts as never settling."""

SETTLED_WITHIN = 8
"""Half-cycles after which a divider that settles has shown that it does."""

ABOUT = (
    "From the start state it runs the divider for HALF_CYCLES half-cycles and checks the claim at the end of each,",
    "from half-cycle BEGINS on.",
)


@dataclass(frozen=True, slots=True)
class Check:
    """What a bench does besides running the divider.

    length        half-cycles to run
    begins        half-cycle from which on the claim is checked
    declarations  variables of its own
    first         statements at the end of half-cycle `begins`
    observe       the same for each later one, `t`, where `out` is the output and `last` what it was before
    finish        statements after the last half-cycle
    loop          half-cycles after which the registers are back where they were at `begins`; None if not looked at
    processes     beside the one that runs it all
    """

    length: int
    begins: int
    declarations: Sequence[str] = ()
    first: Sequence[str] = ()
    observe: Sequence[str] = ()
    finish: Sequence[str] = ()
    loop: int | None = None
    processes: Sequence[str] = field(default=())


def scene(report: Report, finding: Finding, dut: Dut) -> Scene:
    """The run of a counterexample, or of what never settles, with the check of the claim. Raises NoBench."""
    if finding.unsettled is not None:
        when = "with no clock edge" if finding.unsettled.power_up else "before a clock edge"
        start, cause, check = finding.unsettled.state, when, settles(report, finding.unsettled)
    elif finding.counterexample is not None and finding.name in CHECKS:
        start, cause = finding.counterexample.orbit.start, finding.counterexample.cause
        check = CHECKS[finding.name](report, finding.counterexample)
    else:
        raise NoBench("its claim is none that a bench of one divider can check")
    registers = report.rhythm.system.describe(start)
    reset = report.ports.reset if report.rhythm.scope == "reset" and report.rhythm.starts else None
    own, wires = list(check.declarations), [dut.shown]
    if check.loop:
        own += [f"reg [{dut.bits - 1}:0] kept;", "reg back;"]
        wires.append(dut.registers)
    returned = (
        '$display("         the registers are back after %0d half-cycles: so it goes on for ever", {});'
    )
    return Scene(
        start=cause,
        about=ABOUT,
        level=registers[report.ports.clock],
        moving={reset.port: 1 - reset.active} if reset else {},
        parameters={"HALF_CYCLES": check.length, "BEGINS": check.begins},
        declarations=[register("t"), "reg out, last, running;", *own, *wires],
        code=[
            *_observation(check),
            "",
            "initial begin",
            "  {running, last, t} = 0;",
            *(f"  {name} = 0;" for name in names(own) if name != "kept"),
            *(f"  {line}" for line in (reset_first(report, dut) if reset else ())),
            "  // The start state: forced so that nothing else reacts, then let go.",
            *(f"  {line}" for line in dut.set(registers)),
            "  running = 1'b1;",
            f"  for (t = 0; t < HALF_CYCLES{'' if check.loop else ' && !failed'}; t = t + 1) begin",
            f"    if (t > 0) {dut.clock} = ~{dut.clock};",
            f"    #{HALF_CYCLE};",
            "    observe;",
            "  end",
            *(f"  {line}" for line in check.finish),
            "  running = 1'b0;",
            "  verdict;",
            "end",
            *check.processes,
        ],
        passed=("nothing else in %0d half-cycles", "HALF_CYCLES"),
        failed=["if (back)", f"  {returned.format(number(check.loop))}"] if check.loop else [],
    )


def _observation(check: Check) -> Iterator[str]:
    yield "// At the end of a half-cycle, when all is at rest."
    yield "task observe;"
    yield "  begin"
    yield "    out = shown;"
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
        yield "    if (t == BEGINS) kept = registers;"
        yield f"    if (t == BEGINS + {number(check.loop)}) back = kept === registers;"
    yield "    last = out;"
    yield "  end"
    yield "endtask"


def reset_first(report: Report, dut: Dut) -> Iterator[str]:
    """Reset, for registers that a mended divider may have besides; an even number of half-cycles long."""
    reset = report.ports.reset
    if reset is None:
        return
    held = (report.rhythm.reset_half_cycles or 0) + 2
    yield "// Reset, for the sake of registers that the divider did not have when this was written."
    yield f"#{HALF_CYCLE} {dut.local[reset.port]} = 1'b{reset.active};"
    yield f"repeat ({held + held % 2}) #{HALF_CYCLE} {dut.clock} = ~{dut.clock};"
    yield f"#{HALF_CYCLE} {dut.local[reset.port]} = 1'b{1 - reset.active};"
    yield f"#{HALF_CYCLE};"


def _ratio(report: Report, broken: Counterexample) -> Check:
    """Every gap between two rises that are both seen."""
    if report.spec.mean:
        period = _period(report.spec)
        return _mean(report, broken, _allowance(broken.orbit, period) if report.rhythm.scope == "any" else 0)
    return _spans(
        report, broken, report.spec.period, gaps, "rise-to-rise gap", "out && !last", keeps_counting=True
    )


def _high_time(report: Report, broken: Counterexample) -> Check:
    """Every high run of which the rise and the fall are seen."""
    return _spans(report, broken, report.spec.high_half_cycles, high_runs, "high run", "!out && last")


def _spans(
    report: Report,
    broken: Counterexample,
    wanted: int,
    measure: Callable[[Iterable[Run]], Iterator[Span]],
    noun: str,
    ends: str,
    keeps_counting: bool = False,
) -> Check:
    """Spans that begin with a rise and end where `ends` holds. A span that never ends breaks the claim as well."""
    period, orbit = _period(report.spec), broken.orbit
    begins = _bounded(_allowance(orbit, period) if report.rhythm.scope == "any" else 0)
    wrong = _first(orbit, begins, wanted, measure)
    if wrong is None and begins + 4 * period + 2 > MOST_HALF_CYCLES:
        return _frozen(orbit)
    once = begins + orbit.lead_half_cycles + 2 * orbit.loop_half_cycles
    needed = wrong.begins + wrong.length + 2 if wrong else max(once, begins + 4 * period) + 2
    length = _bounded(needed, max(needed, min(begins + 4 * period + 2, MOST_HALF_CYCLES)))
    # From the start, only a run that is long enough can tell that no span ever ends.
    tells = length >= begins + 4 * period + 2
    told = f"t - rose == {number(wrong.length)} && rose == {number(wrong.begins)}" if wrong else "1'b0"
    longer = f"{noun} of more than %0d half-cycles, from half-cycle %0d on"
    return Check(
        length,
        begins,
        [register("rose"), register("spans"), "reg rising;"],
        [],
        [
            f"if (rising && {ends}) begin",
            "  spans = spans + 1;",
            f"  if (t - rose != {number(wanted)} && !failed) begin",
            *came(f"a {noun} of %0d half-cycles, from half-cycle %0d on", "t - rose, rose", told, 4),
            "  end",
            *([] if keeps_counting else ["  rising = 1'b0;"]),
            "end",
            "if (out && !last) begin",
            "  rising = 1'b1;",
            "  rose = t;",
            "end",
        ],
        [
            f"if (!failed && rising && HALF_CYCLES - rose > {number(wanted)}) begin",
            *came(f"a {longer}", f"{number(wanted)}, rose", "1'b0" if wrong else "1'b1", 2),
            *(
                [
                    "end else if (!failed && spans == 0) begin",
                    *came(f"no {noun} in %0d half-cycles", "HALF_CYCLES", "1'b0" if wrong else "1'b1", 2),
                ]
                if tells
                else []
            ),
            "end",
        ],
        None if wrong else orbit.loop_half_cycles or None,
    )


def _mean(report: Report, broken: Counterexample, begins: int) -> Check:
    """Every gap is one of the two lengths next to the ratio, and the gaps so far take as long as that many mean ones,
    give or take what may even out within the fewest gaps that can have this mean."""
    ratio, orbit = report.spec.ratio or Fraction(1), broken.orbit
    twice, bound = 2 * ratio, 2 * (2 * ratio).denominator + 2
    cycles, halves = (2 * floor(ratio), 2 * ceil(ratio)), (floor(twice), ceil(twice))
    wrong = _first_off_mean(orbit, _bounded(begins), twice, bound)
    wave = orbit.wave()
    if wrong is None and (wave is None or not wave.stuck):
        raise NoBench("its gaps have this mean, and only their order is another than it should be")
    enough = begins + 4 * twice.denominator * cycles[1] + 2
    length = _bounded(wrong.ends + 2 if wrong else enough)
    many = f"{{}} * {number(twice.denominator)}"
    took, due = many.format("(t - first)"), f"spans * {number(twice.numerator)}"
    slack = number(bound * twice.denominator)
    gap = "(t - rose)"
    return Check(
        max(length, min(enough, MOST_HALF_CYCLES)),
        begins,
        [register("rose"), register("first"), register("spans"), "reg rising, odd;"],
        [],
        [
            "if (out && !last) begin",
            "  if (rising) begin",
            "    spans = spans + 1;",
            "    odd = odd | t[0] ^ rose[0];",
            f"    if (!failed && {_neither(gap, halves)} && (odd || {_neither(gap, cycles)})) begin",
            *came(
                "a rise-to-rise gap of %0d half-cycles, from half-cycle %0d on",
                "t - rose, rose",
                f"{gap} == {number(wrong.gap)} && rose == {number(wrong.begins)}"
                if wrong and wrong.gap
                else "1'b0",
                6,
            ),
            "    end",
            f"    if (!failed && ({took} > {due} + {slack} || {took} + {slack} < {due})) begin",
            *came(
                f"%0d gaps in %0d half-cycles, not {twice} each, from half-cycle %0d on",
                "spans, t - first, first",
                f"spans == {number(wrong.count)}" if wrong and not wrong.gap else "1'b0",
                6,
            ),
            "    end",
            "  end else first = t;",
            "  rising = 1'b1;",
            "  rose = t;",
            "end",
        ],
        [
            "if (!failed && spans == 0) begin",
            *came("no rise-to-rise gap in %0d half-cycles", "HALF_CYCLES", "1'b0" if wrong else "1'b1", 2),
            "end",
        ],
        None if wrong else orbit.loop_half_cycles or None,
    )


def _neither(gap: str, lengths: tuple[int, int]) -> str:
    return " && ".join(f"{gap} != {number(length)}" for length in dict.fromkeys(lengths))


@dataclass(frozen=True, slots=True)
class _Off:
    """Where gaps part from their mean: at one of a wrong length, or (`gap` 0) at so many that take too long or not
    long enough."""

    begins: int
    ends: int
    gap: int
    count: int


def _first_off_mean(orbit: Orbit, begins: int, twice: Fraction, bound: int) -> _Off | None:
    """Where the orbit first parts from it, as the bench sees that; None for one that never does."""
    cycles, halves = {2 * floor(twice / 2), 2 * ceil(twice / 2)}, {floor(twice), ceil(twice)}
    total, odd = 0, False
    rounds = 3 + MOST_HALF_CYCLES // orbit.loop_half_cycles if orbit.loop_half_cycles else 0
    for count, span in enumerate(gaps(_from(orbit.runs(rounds), begins)), 1):
        ends = begins + span.begins + span.length
        odd |= span.length % 2 == 1
        if span.length not in halves and (odd or span.length not in cycles):
            return _Off(begins + span.begins, _bounded(ends), span.length, count)
        total += span.length
        if abs(total - count * twice) > bound:
            return _Off(ends - total, _bounded(ends), 0, count)
        if ends > MOST_HALF_CYCLES:
            return None
    return None


def _first(
    orbit: Orbit, begins: int, wanted: int, measure: Callable[[Iterable[Run]], Iterator[Span]]
) -> Span | None:
    """The first wrong span of the orbit from a half-cycle on, counted from the orbit's start."""
    rounds = 3 + (begins // orbit.loop_half_cycles if orbit.loop_half_cycles else 0)
    for span in measure(_from(orbit.runs(rounds), begins)):
        if span.length != wanted:
            return Span(begins + span.begins, span.length)
        _bounded(begins + span.begins)
    return None


def _from(runs: Iterable[Run], begins: int) -> Iterator[Run]:
    """The runs from a half-cycle on, the one that it lies in cut short."""
    at = 0
    for level, size in runs:
        if at + size > begins:
            yield level, at + size - max(at, begins)
        at += size


def _no_stuck(report: Report, broken: Counterexample) -> Check:
    """The output changes within two periods or once round the loop, whichever is longer."""
    orbit, period = broken.orbit, _period(report.spec)
    if 5 * period > MOST_HALF_CYCLES:
        return _frozen(orbit)
    begins = _allowance(orbit, period)
    length = _bounded(begins + max(orbit.loop_half_cycles, 2 * period) + 2)
    return Check(
        length,
        begins,
        ["reg moves;"],
        [],
        ["if (out !== last) moves = 1'b1;"],
        [
            "if (!failed && !moves) begin",
            *came(
                "the output stays %b from half-cycle %0d to %0d", "out, BEGINS, HALF_CYCLES - 1", "1'b1", 2
            ),
            "end",
        ],
        orbit.loop_half_cycles,
    )


def _recovery(report: Report, broken: Counterexample) -> Check:
    """From the limit on, or where there is none once a mended divider has had its time, the wave is the specified
    one."""
    spec, recovery = report.spec, report.rhythm.recovery
    if recovery is None or recovery.lost is not None or spec.within is None:
        return _right_again(report, broken)
    if spec.mean:
        return _mean(report, broken, spec.within)
    return _wave(report, broken.orbit, spec.within, recovers=True)


def _right_again(report: Report, broken: Counterexample) -> Check:
    """However it began, the wave becomes the specified one."""
    orbit, spec = broken.orbit, report.spec
    if spec.mean:
        return _mean(report, broken, _allowance(orbit, _period(spec)))
    if 5 * spec.period > MOST_HALF_CYCLES and orbit.loop_half_cycles < spec.period:
        return _returning(orbit, spec.period)
    return _wave(report, orbit, _allowance(orbit, spec.period), recovers=False)


def _wave(report: Report, orbit: Orbit, begins: int, recovers: bool) -> Check:
    """From then on the wave is the specified one: runs are as long as they should be, and the one that is cut off in
    front no longer. `recovers` says that in the end it is so."""
    spec = report.spec
    # Two waves of periods p and q that agree for p + q half-cycles agree for ever (Fine and Wilf 1965).
    once = orbit.loop_half_cycles + (orbit.lead_half_cycles if recovers else 0)
    length = _bounded(begins + once + 2 * spec.period + 2)
    level, at, size = _misfit(orbit, begins, length, spec.high_half_cycles, spec.period)
    same = f"last == {level} && began == {number(at)}"
    return Check(
        length,
        begins,
        [register("began"), register("wanted"), "reg whole;"],
        ["began = t;"],
        [
            f"wanted = last ? {number(spec.high_half_cycles)} : {number(spec.period - spec.high_half_cycles)};",
            "if (out !== last && whole && t - began < wanted && !failed) begin",
            *came(
                "a run at %b of %0d half-cycles, not %0d, from half-cycle %0d on",
                "last, t - began, wanted, began",
                f"{same} && t - began == {number(size)}",
                2,
            ),
            "end",
            "if (out === last && t - began >= wanted && !failed) begin",
            *came(
                "a run at %b of more than %0d half-cycles, from half-cycle %0d on",
                "last, wanted, began",
                "1'b0" if size else same,
                2,
            ),
            "end",
            "if (out !== last) begin",
            "  began = t;",
            "  whole = 1'b1;",
            "end",
        ],
        [],
        None if recovers else orbit.loop_half_cycles,
    )


def _misfit(orbit: Orbit, begins: int, length: int, high: int, period: int) -> tuple[int, int, int]:
    """The first run from `begins` on that the specified wave has not: its level, the half-cycle it begins at, and its
    length, 0 for one that is too long."""
    rounds = 3 + (length // orbit.loop_half_cycles if orbit.loop_half_cycles else 0)
    at = begins
    for level, size in _from(orbit.runs(rounds), begins):
        wanted = high if level else period - high
        if size > wanted:
            return level, at, 0
        if size < wanted and at > begins:
            return level, at, size
        at += size
    raise InternalError("the run of a state that never becomes good is good")


def _frozen(orbit: Orbit) -> Check:
    """For periods too long to wait for: the output stands still while the registers go once round their loop."""
    return _once_round(
        orbit,
        "back && !moves",
        came("the output stays %b from half-cycle %0d to %0d", "out, BEGINS, HALF_CYCLES - 1", "1'b1", 2),
    )


def _returning(orbit: Orbit, period: int) -> Check:
    """The same for a wave: registers that are back sooner than the wave would be make another wave."""
    said = "what repeats after %0d half-cycles, less than the period of %0d"
    values = f"{number(orbit.loop_half_cycles)}, {number(period)}"
    return _once_round(orbit, "back", came(said, values, "1'b1", 2))


def _once_round(orbit: Orbit, condition: str, came: Sequence[str]) -> Check:
    begins = orbit.lead_half_cycles
    return Check(
        _bounded(begins + 2 * orbit.loop_half_cycles + 2),
        begins,
        ["reg moves;"],
        [],
        ["if (out !== last) moves = 1'b1;"],
        [f"if (!failed && {condition}) begin", *came, "end"],
        orbit.loop_half_cycles,
    )


def settles(report: Report, unsettled: Unsettled) -> Check:
    """No register changes without end within one half-cycle."""
    rows = [report.rhythm.system.describe(state) for state in unsettled.cycle]
    moving = [name for name in rows[0] if len({row[name] for row in rows}) > 1]
    if not moving:
        raise NoBench("nothing that a bench can see moves")
    dut = Dut(report)
    watched = list(dict.fromkeys(dut.path(name) for name in moving))
    return Check(
        SETTLED_WITHIN,
        0,
        ["integer changes;"],
        [],
        ["changes = 0;"],
        [],
        None,
        [
            "// No time passes while nothing settles: the changes are counted, and stopped by force.",
            f"always @({' or '.join(watched)})",
            "  if (running) begin",
            "    changes = changes + 1;",
            f"    if (changes == {MOST_CHANGES}) begin",
            *came("%0d changes within half-cycle %0d, and no end", "changes, t", "1'b1", 6),
            *(f"      force {path} = 0;" for path in watched),
            "      running = 1'b0;",
            "      verdict;",
            "    end",
            "  end",
        ],
    )


CHECKS: Mapping[str, Callable[[Report, Counterexample], Check]] = {
    "ratio": _ratio,
    "high-time": _high_time,
    "no-stuck": _no_stuck,
    "recovery": _recovery,
    "reset": _right_again,
}
"""How the claim of each property is checked."""


def _allowance(orbit: Orbit, period: int) -> int:
    """Half-cycles before a claim about loops is checked: the lead-in, then whole rounds that take two periods or
    more, so that a mended divider has found its way; fewer where that takes too long."""
    loop = orbit.loop_half_cycles or 1
    wait = min(2 * period, MOST_HALF_CYCLES // 4)
    return orbit.lead_half_cycles + loop * max(1, -(-wait // loop))


def _period(spec: Spec) -> int:
    """Half-cycles of an output period, or of the longest gap where the ratio is a mean."""
    return 2 * ceil(spec.ratio or 1) if spec.mean else spec.period


def _bounded(needed: int, length: int | None = None) -> int:
    """The half-cycles to run. Raises NoBench where it needs too many."""
    if needed > MOST_HALF_CYCLES:
        raise NoBench(f"it would have to run for {needed} half-cycles, and benches end at {MOST_HALF_CYCLES}")
    return needed if length is None else length
