"""The report for machines, schema "subharmonic/report-1": key order is stable, and times are half-cycles
unless the key says otherwise. Keys may be added; none is renamed."""

from __future__ import annotations

from json import dumps
from typing import Any

from prover.arrival import Glitch
from prover.each import Each, ValueRow
from prover.errors import Where
from prover.facts import LIMITS
from prover.findings import Counterexample, Finding, Obligation, Report
from prover.ports import Ports
from prover.rhythm import Loop, Orbit, Rhythm, Start
from prover.settling import Unsettled
from prover.system import State
from prover.trace import Trace

SCHEMA = "subharmonic/report-1"

MOST_RUNS = 64
"""Runs of a wave that are written out; `wave_cut` gives the number of all where there are more, else null."""

MOST_LOOPS = 10_000
"""Loops that are written out; `loops_found` is the number of all."""

MOST_MICRO_STEPS = 64

MOST_RESTS = 4096
"""Rests of a trace that are written out; `rests_cut` gives the number of all where there are more, else null."""

Object = dict[str, Any]


def render(report: Report) -> str:
    """The report as JSON text, one object, ended by a newline."""
    return dumps(as_object(report), indent=2) + "\n"


def as_object(report: Report) -> Object:
    """The report as plain dictionaries and lists."""
    return {
        "schema": SCHEMA,
        "verdict": verdict(report),
        "design": of_ports(report.ports),
        "spec": _spec(report),
        "measured": _measured(report.rhythm),
        "properties": [_property(f, (f.witness or report).rhythm) for f in report.findings],
        "each": None if report.each is None else _each(report.each),
        "facts": dict(report.facts),
        "assumptions": list(report.assumptions),
        "notes": list(report.notes),
        "limits": LIMITS,
        "seconds": round(report.seconds, 3),
    }


def verdict(report: Report) -> str | None:
    """The overall verdict; null for a measurement, which claims nothing."""
    return report.verdict if report.findings else None


def of_ports(ports: Ports) -> Object:
    """A divider that was read, with the roles of its ports."""
    design, reset = ports.design, ports.reset
    return {
        "top": design.top,
        "files": list(design.files),
        "clock": ports.clock,
        "reset": {"port": reset.port, "active": reset.active, "kind": reset.kind} if reset else None,
        "output": ports.output,
        "parameters": dict(design.parameters),
        "holds": dict(ports.holds),
        "state_bits": design.state_bits,
        "sha256": design.sha256,
    }


def _spec(report: Report) -> Object:
    spec = report.spec
    claimed = spec.ratio is not None
    single = claimed and not report.each
    return {
        "ratio": (report.each.ratio if report.each else spec.ratio_text) if claimed else None,
        "mean": spec.mean,
        "period_half_cycles": spec.period if single and not spec.mean else None,
        "high_half_cycles": (spec.high if spec.mean else spec.high_half_cycles) if single else None,
        "within": spec.within,
        "moving": {name: ranges and [list(ends) for ends in ranges] for name, ranges in spec.moving.items()}
        or None,
        "reset_cycles": spec.reset_cycles,
    }


def _each(each: Each) -> Object:
    """What the values of the inputs came to; `high` is null where it is half the period."""
    return {
        "inputs": {name: [list(ends) for ends in ranges] for name, ranges in each.inputs},
        "where": list(each.where),
        "high": each.high or None,
        "values": each.count,
        "judged": each.tried,
        "shapes": each.shapes,
        "shown": dict(each.shown),
        "rows": [_row(row) for row in each.rows],
    }


def _row(row: ValueRow) -> Object:
    return {
        "values": {name: list(ends) for name, ends in row.values},
        "together": row.together,
        "verdict": row.verdict,
        "refuted": list(row.refuted),
        "open": list(row.open),
        "ratios": [str(ratio) for ratio in row.ratios],
        "worst_recovery_half_cycles": row.worst,
    }


def _measured(rhythm: Rhythm) -> Object:
    starts = list(zip(rhythm.starts, rhythm.orbits, strict=True))
    return {
        "from_reset": _from_reset(rhythm),
        "loops": [_loop(loop, rhythm) for loop in rhythm.loops[:MOST_LOOPS]],
        "complete": rhythm.complete,
        "loops_found": len(rhythm.loops),
        "scope": rhythm.scope,
        "reset_half_cycles": rhythm.reset_half_cycles,
        "starts": [_start(start, orbit, rhythm) for start, orbit in starts],
        "open": rhythm.open,
    }


def _from_reset(rhythm: Rhythm) -> Object | None:
    """The wave of the first start state that has one (reset released at either level, or initial values)."""
    for orbit in rhythm.orbits:
        wave = _wave(orbit)
        if rhythm.accumulator is not None:
            goal = rhythm.accumulator.goal
            wave |= {"period_half_cycles": goal.period, "high_half_cycles": goal.high}
        if wave["period_half_cycles"] is not None:
            return wave
    return None


def _wave(orbit: Orbit) -> Object:
    wave = orbit.wave()
    runs = wave.runs if wave else ()
    return {
        "period_half_cycles": wave.period if wave else None,
        "high_half_cycles": wave.high if wave else None,
        "wave": [list(run) for run in runs[:MOST_RUNS]] if wave else None,
        "wave_cut": len(runs) if len(runs) > MOST_RUNS else None,
    }


def _start(start: Start, orbit: Orbit, rhythm: Rhythm) -> Object:
    return {
        "cause": start.cause,
        "state": rhythm.system.describe(start.state),
        **_wave(orbit),
        "lead_half_cycles": orbit.lead_half_cycles if orbit.closed else None,
        "loop_half_cycles": orbit.loop_half_cycles,
        "open": orbit.why,
    }


def _loop(loop: Loop, rhythm: Rhythm) -> Object:
    return {
        "period_half_cycles": loop.wave.period,
        "high_half_cycles": loop.wave.high,
        "good": loop.good,
        "stuck": loop.stuck,
        "states": loop.length,
        "example": rhythm.system.describe(loop.example),
    }


def _property(finding: Finding, rhythm: Rhythm) -> Object:
    out: Object = {
        "name": finding.name,
        "verdict": finding.verdict,
        "claim": finding.claim,
        "says": finding.says,
        "method": finding.method,
        "bound": finding.bound,
        "facts": dict(finding.facts),
        "obligations": [of_obligation(obligation) for obligation in finding.obligations],
        "counterexample": _counterexample(finding.counterexample, rhythm),
        "waived": finding.waived,
    }
    if finding.trace is not None:
        out["trace"] = of_trace(finding.trace)
    if finding.glitch is not None:
        out["glitch"] = _glitch(finding.glitch)
    if finding.unsettled is not None:
        out["unsettled"] = _unsettled(finding.unsettled, rhythm)
    return out


def of_obligation(obligation: Obligation) -> Object:
    """A timing obligation, with its place in the sources."""
    via = [{"name": name, **_where(where)} for name, where in obligation.via]
    return {"text": obligation.text, "register": obligation.register, **_where(obligation.where), "via": via}


def _where(where: Where) -> Object:
    return {"file": where.file, "line": where.line, "source": where.text.strip()}


def _counterexample(broken: Counterexample | None, rhythm: Rhythm) -> Object | None:
    if broken is None:
        return None
    return {
        "cause": broken.cause,
        "start": rhythm.system.describe(broken.orbit.start),
        "begins": broken.begins,
        "ends": broken.ends,
        "text": broken.text,
    }


def of_trace(trace: Trace) -> Object:
    """A run whose inputs move: the machine at rest after each edge, and after each move between two edges."""
    rests = [
        {
            "half_cycle": rest.half_cycle,
            "moved": rest.moved,
            "inputs": dict(rest.inputs),
            "registers": dict(rest.registers),
            "outputs": dict(rest.outputs),
        }
        for rest in trace.rests[:MOST_RESTS]
    ]
    return {
        "cause": trace.cause,
        "begins": trace.begins,
        "ends": trace.ends,
        "text": trace.text,
        "half_cycles": trace.half_cycles,
        "rests": rests,
        "rests_cut": len(trace.rests) if len(trace.rests) > MOST_RESTS else None,
    }


def _glitch(glitch: Glitch) -> Object:
    """A half-cycle in which the output pulses: what arrives at it, in an order that shows this."""
    arrivals = [
        {
            "name": arrival.name,
            "micro_step": arrival.micro_step,
            "old": arrival.old,
            "new": arrival.new,
            "output": arrival.level,
            "values": dict(arrival.seen),
        }
        for arrival in glitch.arrivals
    ]
    return {
        "kind": glitch.kind,
        **_where(glitch.where),
        "state": dict(glitch.state),
        "edge": glitch.edge,
        "output": glitch.level,
        "arrivals": arrivals,
        "first": glitch.first,
    }


def _unsettled(unsettled: Unsettled, rhythm: Rhythm) -> Object:
    def told(state: State) -> dict[str, int]:
        return rhythm.system.describe(state)

    return {
        "power_up": unsettled.power_up,
        "state": told(unsettled.state),
        "micro_steps": len(unsettled.cycle),
        "cycle": [told(state) for state in unsettled.cycle[:MOST_MICRO_STEPS]],
    }
