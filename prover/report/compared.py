"""The report on two dividers, for people: what was compared, what was found, and where they differ."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from prover.compared import Apart, Comparison, Together
from prover.errors import InternalError
from prover.joint import Joint
from prover.pair import SIDES
from prover.ports import Ports
from prover.report import apart, words
from prover.report.look import Look, finished
from prover.report.terminal import EXTENT, WIDTH, indented, not_drawn, small_print, wrapped
from prover.report.trace import drawing
from prover.report.vcd import moves
from prover.report.wave import ASCII, UNICODE, Style, draw
from prover.trace import Trace


def render(comparison: Comparison, look: Look, traces: Sequence[str] = ()) -> str:
    """The report as text. `traces` are the paths that a wave was written to."""
    lines: list[str] = []
    for section in (
        _header(comparison),
        _found(comparison),
        _different(comparison, UNICODE if look.unicode else ASCII),
        small_print(comparison.notes, comparison.assumptions, traces),
    ):
        body = list(section)
        if body:
            lines += [*body, ""]
    lines += [f"verdict  {comparison.verdict.upper()}", f"took {comparison.seconds:.2f} s"]
    return finished(lines, look)


def _header(comparison: Comparison) -> Iterator[str]:
    for side, ports in zip(SIDES, (comparison.pair.old, comparison.pair.new), strict=True):
        design = ports.design
        yield f"{side}  {design.top}  {', '.join(design.files)}"
        yield "     " + ", ".join(_parts(ports))
        for told, values in (("parameters", design.parameters), ("held", ports.holds)):
            if values:
                yield f"     {told} " + ", ".join(f"{name}={value}" for name, value in values.items())
    yield from wrapped(f"claim  {comparison.claim}", "")


def _parts(ports: Ports) -> Iterator[str]:
    yield f"clock {ports.clock}"
    reset = ports.reset
    yield f"reset {reset.port} (active {reset.active}, {reset.kind})" if reset else "no reset"
    yield f"output {ports.output}"
    yield words.plural(ports.design.state_bits, "state bit")


def _found(comparison: Comparison) -> Iterator[str]:
    outcome = comparison.outcome
    indent = " " * 10
    head = f"{outcome.verdict.upper():8}  "
    for line in wrapped(outcome.says, indent):
        yield head + line.lstrip() if head else line
        head = ""
    if outcome.method:
        yield from wrapped(f"method: {outcome.method}", indent)
    for side, owed in outcome.obligations:
        yield from wrapped(f"obligation, {side}: {owed.text}", indent)
        yield f"{indent}  {owed.where}: {owed.where.text.strip()}"


def _different(comparison: Comparison, style: Style) -> Iterator[str]:
    found = comparison.outcome.difference
    if found is None:
        return
    yield from wrapped(f"start: {found.cause}", "  ")
    if isinstance(found.shown, Trace):
        rest = found.shown.rests[0]
        yield from wrapped(words.fact({**rest.inputs, **rest.registers}), "    ")
        joint = joint_of(comparison)
        made, left = drawing(joint.both.design, joint.both.clock, found.shown, EXTENT)
    else:
        for line in _states(found.shown):
            yield from wrapped(line, "    ")
        made, left = apart.drawing(comparison, found, found.shown, EXTENT)
    yield ""
    yield from indented(draw(made, style, WIDTH - 2))
    yield from not_drawn(left)


def joint_of(comparison: Comparison) -> Joint:
    """Both side by side, where a run of them so was found."""
    evidence = comparison.outcome.evidence
    if not isinstance(evidence, Together):
        raise InternalError("a run of both side by side, and nothing of them together")
    return evidence.joint


def _states(shown: Apart) -> Iterator[str]:
    if shown.inputs:
        yield words.fact(dict(shown.inputs))
    for side, orbit, system in zip(SIDES, shown.orbits, shown.systems, strict=True):
        yield f"{side}: {words.fact(dict(system.describe(orbit.start)))}"


def dump(comparison: Comparison) -> str | None:
    """The difference as a value change dump; None where there is none."""
    found = comparison.outcome.difference
    if found is None:
        return None
    if isinstance(found.shown, Trace):
        joint = joint_of(comparison)
        return moves(joint.both.design, joint.both.clock, "difference", found.shown)
    return apart.dump(comparison, found, found.shown)
