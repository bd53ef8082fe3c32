"""Evidence of a comparison to its verdict, without any engine, and the obligations that this hangs on.

Both dividers are derived anew. What the evidence says of them either follows by computing, or becomes an obligation
that no assignment may fulfil; anything else is `Rejected`. Writing a certificate and checking one both come this way.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import product

from prover import compared, equality, recode
from prover import expr as e
from prover import rebuild as single
from prover.certificate import Obligation
from prover.compared import Apiece, Followed, Outcome, Run, Together
from prover.effort import Effort, OutOfEffort
from prover.equality import Invariant
from prover.errors import InternalError
from prover.evidence import Evidence
from prover.joint import Joint, build, starts_apart
from prover.pair import SIDES, Pair, Pairing
from prover.pair_evidence import Both, PairEvidence, Runs, Settled
from prover.ports import Ports
from prover.rebuild import Owed, Rejected, Replay
from prover.rhythm import Rhythm, Start
from prover.settling import settle
from prover.solve import Model
from prover.spec import Spec
from prover.system import State

MOST_INPUT_BITS = 8
"""Bits of shared inputs up to which evidence for each of their values is read."""


@dataclass(frozen=True, slots=True)
class Rebuilt:
    """What evidence comes to, provided that no obligation can be fulfilled; `joint` where it is of both together."""

    outcome: Outcome
    obligations: tuple[Obligation, ...]
    joint: Joint | None = None


def rebuild(pair: Pair, pairing: Pairing, found: PairEvidence, effort: Effort) -> Rebuilt:
    """The verdict that the evidence shows, and its obligations. Raises Rejected."""
    owed = Owed()
    try:
        if isinstance(found, Both):
            return _both(pair, pairing, found, owed, effort)
        if isinstance(found, Settled) != pairing.settled:
            raise Rejected("evidence of another kind than what is asked for")
        if isinstance(found, Settled):
            outcome = compared.of_wave(_settled(pair, pairing, found, owed, effort))
        else:
            outcome = compared.of_runs(_runs(pair, found, owed, effort), pairing.lag, effort)
    except (OutOfEffort, InternalError) as fault:
        raise Rejected(str(fault)) from None
    return Rebuilt(outcome, owed.listed())


# -- each on its own ---------------------------------------------------------------------------------------


def _inputs(pair: Pair) -> list[Model]:
    """Every value of the shared inputs, in order."""
    if any(each.moving for each in pair.inputs):
        raise Rejected("values of inputs that move")
    names = [each.name for each in pair.inputs]
    every = product(*(range(1 << each.width) for each in pair.inputs))
    return [dict(zip(names, values, strict=True)) for values in every]


def _check_inputs(pair: Pair, stated: Sequence[Model]) -> None:
    if pair.input_bits > MOST_INPUT_BITS or [list(m.items()) for m in stated] != [
        list(m.items()) for m in _inputs(pair)
    ]:
        raise Rejected("values: not all values of the shared inputs, in order")


def _runs(pair: Pair, found: Runs, owed: Owed, effort: Effort) -> Apiece:
    _check_inputs(pair, [value.inputs for value in found.values])
    ask = Replay(found.answers, "side by side", owed)
    joint = build(pair, 0, effort, ask.answer, races=False)
    ask.finish()
    followed = []
    for number, value in enumerate(found.values):
        ports = pair.held_at(value.inputs)
        begun = starts_apart(joint, value.inputs)
        starts = (
            [Start(state, cause) for cause, state, _ in begun],
            [Start(state, cause) for cause, _, state in begun],
        )
        old, new = (
            _followed(one, mine, begins, f"{number}: {side}", owed, effort)
            for side, one, mine, begins in zip(SIDES, ports, value.sides, starts, strict=True)
        )
        followed.append(Followed(value.inputs, ports, (old, new)))
    return Apiece(tuple(followed), joint)


def _followed(
    ports: Ports, mine: Evidence, starts: Sequence[Start], name: str, owed: Owed, effort: Effort
) -> Rhythm:
    """One divider's runs from its starts, owing their steps."""
    ask = Replay(mine.settling, f"{name}, micro-steps", owed)
    whole, settling = settle(
        ports.design, ports.clock, ports.running, ports.output_value, effort, ask=ask.answer
    )
    ask.finish()
    if (mine.reset, mine.everywhere, mine.lassos, mine.glitches) != (None, None, (), ()):
        raise Rejected(f"{name}: evidence that plays no part")
    machine = single.machine_of(whole, mine, owed)
    places: dict[State, Start] = {}
    for start in starts:
        places.setdefault(recode.placed(start.state, whole, machine), start)
    if len(mine.starts) != len(places):
        raise Rejected(f"{name}: {len(mine.starts)} runs of {len(places)} start states")
    orbits = []
    for track, state in zip(mine.starts, places, strict=True):
        orbit = single.orbit_of(track, machine, name, looked_through=False)
        if orbit.start != state:
            raise Rejected(f"{name}: a run that begins elsewhere than its start")
        orbits.append(orbit)
    single.owe_orbits(machine, orbits, name, owed)
    begun = tuple(replace(start, state=state) for state, start in places.items())
    return Rhythm(machine, settling, "initial", begun, tuple(orbits), (), False, None, None, False)


# -- once both have settled --------------------------------------------------------------------------------


def _settled(
    pair: Pair, pairing: Pairing, found: Settled, owed: Owed, effort: Effort
) -> list[tuple[str, Rhythm]]:
    """The dividers of which every power-up state comes to show a wave, owing that; for each value both show one."""
    if pairing.lag is not None:
        raise Rejected("waves, which show nothing of their lag")
    _check_inputs(pair, [inputs for inputs, _ in found.values])
    shown: list[tuple[str, Rhythm]] = []
    for number, (inputs, sides) in enumerate(found.values):
        if (sides[0].period, sides[0].high) != (sides[1].period, sides[1].high):
            raise Rejected(f"values/{number}: two waves")
        each = zip(SIDES, pair.held_at(inputs), (pairing.old, pairing.new), sides, strict=True)
        for side, ports, spec, shows in each:
            made = single.rebuild(ports, claim_of(spec, shows.period, shows.high), shows.found, effort)
            if made.rhythm.recovery is None or made.rhythm.recovery.worst is None:
                raise Rejected(f"values/{number}: nothing of all power-up states of the {side} one")
            owed.add(Obligation(f"{number}: {side}, {o.name}", o.goal) for o in made.obligations)
            shown.append((side, made.rhythm))
    return shown


def claim_of(spec: Spec, period: int, high: int) -> Spec:
    """The claim that every power-up state comes to show a wave of so many half-cycles."""
    return replace(spec, ratio=Fraction(period, 2), high=high, start="any")


# -- side by side ------------------------------------------------------------------------------------------


def _both(pair: Pair, pairing: Pairing, found: Both, owed: Owed, effort: Effort) -> Rebuilt:
    if pairing.settled or (pairing.lag is not None and pairing.lag != found.lag):
        raise Rejected("evidence of another kind, or for another lag, than what is asked for")
    ask = Replay(found.answers, "side by side", owed)
    joint = build(pair, found.lag, effort, ask.answer)
    ask.finish()
    shown = found.shown
    if isinstance(shown, Run):
        _check_run(joint, shown)
        if pairing.lag is None:
            raise Rejected("a run, which shows nothing of other lags")
    else:
        if not isinstance(shown, Invariant) and not all(_fits(joint, state) for state in shown):
            raise Rejected("states of something else")
        claim = shown if isinstance(shown, Invariant) else Invariant((equality.in_set(joint, shown),), 1)
        known = set(joint.variables)
        for part in claim.parts:
            if part.width != 1 or not {(v.name, v.width) for v in e.variables([part])} <= known:
                raise Rejected("relations between something else than the two dividers")
        owed.add(equality.obligations(joint, claim))
    outcome = compared.of_both(Together(joint, shown), found.lag)
    difference = outcome.difference
    if isinstance(shown, Run) and difference is not None:
        moved = difference.half_cycle + (not difference.at_edge) if joint.moves else 0
        if len(shown.moves) != moved:
            raise Rejected("run: not as many moves as there are before its end")
    return Rebuilt(outcome, owed.listed(), joint)


def _fits(joint: Joint, state: State) -> bool:
    """Whether the values are such as the variables can have."""
    widths = [width for _, width in joint.variables]
    return len(state) == len(widths) and not any(x >> w for x, w in zip(state, widths, strict=True))


def _check_run(joint: Joint, run: Run) -> None:
    widths = [width for _, width in joint.moves]
    fits = all(
        len(move) == len(widths) and not any(x >> w for x, w in zip(move, widths, strict=True))
        for move in run.moves
    )
    if not fits or run.start >= len(joint.starts) or len(run.moves) > run.half_cycle + 1:
        raise Rejected("run: not of these two dividers")
    known = {v.name: v.width for v in e.variables(joint.starts[run.start].rest)}
    for name, value in run.values.items():
        if name not in known or value >> known[name]:
            raise Rejected(f"run: {name} has no value {value}")
