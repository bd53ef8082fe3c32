"""What comes of a comparison's evidence: equal, different, or neither. No engine is imported.

Evidence is what was found of each divider on its own, for every value of inputs that are held; or an invariant, or a
set of states, of both side by side; or a run on which they differ. Engines bring it, and so do certificates: both are
judged here.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, field, replace

from prover import equality, path
from prover import expr as e
from prover.effort import Effort
from prover.equality import Invariant, Shifts
from prover.errors import InternalError
from prover.findings import Fact, Obligation, Verdict
from prover.joint import Joint, certain, lasts
from prover.pair import SIDES, Pair, Pairing
from prover.ports import Ports
from prover.rhythm import Loop, Orbit, Rhythm, Start, Wave
from prover.settling import Settling
from prover.solve import Model
from prover.system import State, System
from prover.trace import Trace


@dataclass(frozen=True, slots=True)
class Apart:
    """Two runs, each with its inputs held, whose outputs differ.

    inputs      values of the shared inputs
    starts, orbits, systems  of the old divider and of the new one"""

    inputs: Model
    starts: tuple[Start, Start]
    orbits: tuple[Orbit, Orbit]
    systems: tuple[System, System]


@dataclass(frozen=True, slots=True)
class Difference:
    """Where the outputs are seen to differ.

    old_half_cycle, new_half_cycle  half-cycles after the start that should have been the same
    levels    the old output there, and the new one
    at_edge   whether they differ before inputs move in the middle of the half-cycle
    cause     how the start comes about
    text      what is seen
    shown     the two runs: apart with held inputs, or side by side
    """

    old_half_cycle: int
    new_half_cycle: int
    levels: tuple[int, int]
    at_edge: bool
    cause: str
    text: str
    shown: Apart | Trace

    @property
    def half_cycle(self) -> int:
        """The later of the two: so many half-cycles have to be run to see it."""
        return max(self.old_half_cycle, self.new_half_cycle)


@dataclass(frozen=True, slots=True)
class Followed:
    """Both dividers with their inputs held at some values, and what was found of each."""

    inputs: Model
    ports: tuple[Ports, Ports]
    rhythms: tuple[Rhythm, Rhythm]


@dataclass(frozen=True, slots=True)
class Run:
    """A run of both side by side: the number of its start, what is not known of that, and what inputs move to."""

    start: int
    values: Model
    moves: tuple[State, ...]
    half_cycle: int


@dataclass(frozen=True, slots=True)
class Apiece:
    """Evidence: each divider on its own, for each value of the inputs that are held. `joint` is what the start states
    were found from; None where there are none."""

    followed: tuple[Followed, ...]
    joint: Joint | None = None


@dataclass(frozen=True, slots=True)
class Together:
    """Evidence: both side by side, and what holds of them, all they can be in, or a run on which they differ."""

    joint: Joint
    shown: Invariant | frozenset[State] | Run


Evidence = Apiece | Together


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the evidence comes to.

    says         what was found, in words
    lag          half-cycles by which the new output is late; None where there is none, or not known
    obligations  timing inequalities that it hangs on, with the side that each is about
    """

    verdict: Verdict
    says: str
    method: str = ""
    lag: int | None = None
    difference: Difference | None = None
    obligations: tuple[tuple[str, Obligation], ...] = ()
    facts: dict[str, Fact] = field(default_factory=dict)
    evidence: Evidence | None = None


@dataclass(frozen=True, slots=True)
class Comparison:
    """The verdict on two dividers, with all that a report tells of it; `notes` are remarks on the sources."""

    pair: Pair
    pairing: Pairing
    claim: str
    outcome: Outcome
    assumptions: tuple[str, ...]
    notes: tuple[str, ...]
    seconds: float

    @property
    def verdict(self) -> Verdict:
        return self.outcome.verdict


# -- what is claimed ---------------------------------------------------------------------------------------


def claim(pair: Pair, pairing: Pairing) -> str:
    """What is claimed, in one sentence."""
    begins = {
        "reset": "from reset, released at either level of the clock",
        "initial": "from the declared initial values",
        "any": "from every two power-up states, once both have settled",
    }[pair.scope]
    text = f"the same output in every half-cycle, {begins}"
    if pairing.lag is None:
        text += ", but for a lag"
    elif pairing.lag:
        late = "late" if pairing.lag > 0 else "early"
        text += f", the new output {_half_cycles(abs(pairing.lag))} {late}"
    held = [each.name for each in pair.inputs if not each.moving]
    moving = [each.name for each in pair.inputs if each.moving]
    if held:
        text += f"; {', '.join(held)} held at any value"
    if moving:
        text += f"; {', '.join(moving)} moving at will"
    return text


def assumptions(pair: Pair, outcome: Outcome) -> tuple[str, ...]:
    """The model that the verdict holds under, a sentence each."""
    out = [
        f"{pair.old.clock} toggles without end, and is the same clock for both; nothing else changes at its edges",
        "registers and gates have no delay; what happens at once is ordered as the micro-steps say",
        "registers are two-valued; an unknown stands for both values",
    ]
    if pair.scope == "reset":
        held = outcome.evidence.joint.held if outcome.evidence and outcome.evidence.joint else None
        sure = held is not None and (held.lasting or isinstance(outcome.evidence, Together))
        long = f"for {_half_cycles(held.half_cycles)} or longer" if held and sure else "long enough for both"
        out.append(f"both are reset at the same time, {long}, and released between two edges")
    if outcome.lag:
        side, count = ("new", outcome.lag) if outcome.lag > 0 else ("old", -outcome.lag)
        out.append(f"what the {side} output shows before half-cycle {count} is compared with nothing")
    moving = [each.name for each in pair.inputs if each.moving]
    if moving:
        out.append(
            f"{', '.join(moving)} may change between any two edges of the clock, for both at the same moment, "
            "and all settles before the next edge"
        )
    for side, ports in zip(SIDES, (pair.old, pair.new), strict=True):
        out += [f"{name} of the {side} one is held at {value}" for name, value in ports.holds.items()]
    joint = outcome.evidence.joint if outcome.evidence is not None else None
    if joint is not None and pair.scope == "reset":
        known = {each.name for each in pair.inputs}
        unforced = {v.name for start in joint.starts for v in e.variables(start.rest)} - known
        names = [name for name, _ in joint.own if name in unforced]
        if names:
            out.append(f"reset never forces {', '.join(names)}: every value is followed")
    return tuple(out)


# -- timing ------------------------------------------------------------------------------------------------


def timing(found: Sequence[tuple[str, Settling]]) -> tuple[tuple[tuple[str, Obligation], ...], str]:
    """The timing obligations of both sides, each once, and why no outcome is certain; "" where it is."""
    owed: dict[tuple[str, str, str], tuple[str, Obligation]] = {}
    why = ""
    for side, settling in found:
        if settling.depth is None or settling.open:
            why = why or f"{side}: {settling.open or 'the micro-steps do not settle'}"
        for race in settling.races:
            if race.kind == "pulse":
                why = why or f"{side}: the outcome hangs on the order of simultaneous events: {race.text}"
            else:
                key = (side, race.register, race.text)
                owed.setdefault(key, (side, Obligation(race.text, race.where, race.register)))
    return tuple(owed.values()), why


def _equal(lag: int) -> str:
    if not lag:
        return "the outputs are equal in every half-cycle"
    late = "late" if lag > 0 else "early"
    return f"the outputs are equal, the new one {_half_cycles(abs(lag))} {late}"


def _half_cycles(count: int) -> str:
    return f"{count} half-cycle{'s' * (count != 1)}"


def _place(old: int, lag: int) -> str:
    return f"half-cycle {old}" + (f" of the old output, {old + lag} of the new one" if lag else "")


# -- each on its own ---------------------------------------------------------------------------------------


def of_runs(evidence: Apiece, lag: int | None, effort: Effort) -> Outcome:
    """What the runs from all starts come to, for one lag, or for whatever lag fits all of them.

    Raises OutOfEffort."""
    effort.say("comparing the outputs")
    pairs = [(side, r.settling) for f in evidence.followed for side, r in zip(SIDES, f.rhythms, strict=True)]
    obligations, why = timing(pairs)
    for each in evidence.followed:
        for side, rhythm in zip(SIDES, each.rhythms, strict=True):
            if not rhythm.orbits:
                why = why or f"{side}: {rhythm.open or 'no start state is known'}"
    method = "orbits of both from each start, traced with jumps and compared stretch by stretch; every step checked"
    if len(evidence.followed) > 1:
        method += f"; each of {len(evidence.followed)} values of the held inputs"
    if why:
        return Outcome("open", why, obligations=obligations)
    together = [pair for each in evidence.followed for pair in _together(each)]
    judged = _whatever_lag(together, effort) if lag is None else _with_lag(together, lag, effort)
    if judged.verdict == "refuted":
        held = evidence.joint.held if evidence.joint is not None else None
        if held is not None and not held.lasting and certain(held) is None:
            return Outcome(
                "open", "a difference may hang on how long reset has been held", obligations=obligations
            )
        method = "both runs replayed on their machines"
    return replace(judged, method=method, obligations=obligations, evidence=evidence)


@dataclass(frozen=True, slots=True)
class _Pair:
    """Two orbits that begin at one level of the clock."""

    followed: Followed
    places: tuple[int, int]

    @property
    def orbits(self) -> tuple[Orbit, Orbit]:
        old, new = self.followed.rhythms
        return old.orbits[self.places[0]], new.orbits[self.places[1]]

    def difference(self, at: int, lag: int) -> Difference:
        """The difference in a half-cycle of the old output, looked up in both."""
        rhythms, orbits = self.followed.rhythms, self.orbits
        starts = rhythms[0].starts[self.places[0]], rhythms[1].starts[self.places[1]]
        levels = orbits[0].place(at).level, orbits[1].place(at + lag).level
        if levels[0] == levels[1]:
            raise InternalError("outputs that are said to differ and do not")
        cause = "; ".join(dict.fromkeys(start.cause for start in starts))
        text = f"{_place(at, lag)}: the old output is {levels[0]}, the new one {levels[1]}"
        shown = Apart(self.followed.inputs, starts, orbits, (rhythms[0].system, rhythms[1].system))
        return Difference(at, at + lag, levels, True, cause, text, shown)


def _together(followed: Followed) -> Iterator[_Pair]:
    """Every two starts with the clock at one level: what reset or power-up leaves of one divider says nothing of
    what it leaves of the other."""
    old, new = followed.rhythms
    for i, a in enumerate(old.orbits):
        for j, b in enumerate(new.orbits):
            if a.start[-1] == b.start[-1]:
                yield _Pair(followed, (i, j))


def _with_lag(pairs: Sequence[_Pair], lag: int, effort: Effort) -> Outcome:
    first: Difference | None = None
    unknown = ""
    for pair in pairs:
        effort.check()
        at = equality.first_difference(*pair.orbits, lag)
        if at is not None:
            if first is None or max(at, at + lag) < first.half_cycle:
                first = pair.difference(at, lag)
        elif not all(orbit.closed for orbit in pair.orbits):
            known = int(equality.known_for(*pair.orbits, lag))
            why = next(orbit.why for orbit in pair.orbits if not orbit.closed)
            unknown = unknown or f"equal for {known} half-cycles, beyond which one is not known: {why}"
    if first is not None:
        return Outcome("refuted", first.text, difference=first)
    return Outcome("open", unknown) if unknown else Outcome("proved", _equal(lag), lag=lag)


def _whatever_lag(pairs: Sequence[_Pair], effort: Effort) -> Outcome:
    """Whether there is one lag at which all runs are equal; the least, if there are several."""
    late: list[Shifts] = []
    early: list[Shifts] = []
    for pair in pairs:
        for orbit in pair.orbits:
            if not orbit.closed:
                return Outcome("open", orbit.why)
        old, new = pair.orbits
        for sets, a, b in ((late, old, new), (early, new, old)):
            shifts = equality.shifts(a, b, effort)
            if shifts is None:
                return Outcome("open", "an output that changes too often for a lag to be looked for")
            sets.append(shifts)
    behind, ahead = equality.least_common(late), equality.least_common(early)
    if behind is not None and (ahead is None or behind <= ahead):
        return Outcome("proved", _equal(behind), lag=behind)
    if ahead is not None:
        return Outcome("proved", _equal(-ahead), lag=-ahead)
    places = [(at, pair) for pair in pairs if (at := equality.first_difference(*pair.orbits)) is not None]
    at, pair = min(places, key=lambda found: found[0])
    shown = pair.difference(at, 0)
    text = f"{_own_lags(pairs, late, early)}; without one they differ in {shown.text}"
    return Outcome("refuted", text, difference=replace(shown, text=text))


def _own_lags(pairs: Sequence[_Pair], late: Sequence[Shifts], early: Sequence[Shifts]) -> str:
    """What is said where no one lag fits all starts: each may have one of its own."""
    own: dict[int, str] = {}
    for pair, behind, ahead in zip(pairs, late, early, strict=True):
        lags = [equality.least_common([behind]), equality.least_common([ahead])]
        fitting = [lag for lag in (lags[0], None if lags[1] is None else -lags[1]) if lag is not None]
        if not fitting:
            return "no lag makes the outputs equal"
        cause = pair.followed.rhythms[0].starts[pair.places[0]].cause
        inputs = "".join(f", {name}={value}" for name, value in pair.followed.inputs.items())
        own.setdefault(min(fitting, key=abs), f"{cause}{inputs}")
    told = "; ".join(f"{lag} half-cycles where {cause}" for lag, cause in list(own.items())[:4])
    return f"the starts have different lags: {told}"


# -- once both have settled --------------------------------------------------------------------------------


MOST_LOOPS = 64
"""Loops of each divider that are compared, those of one sort counted once."""

Sort = tuple[Wave, int | None]
"""A loop's wave; of one that changes in every half-cycle also its level while the clock is low."""


def sort_of(rhythm: Rhythm, loop: Loop) -> Sort:
    """What tells a loop from those that need no comparison beside it. A wave that lasts one input cycle keeps to the
    clock, or to its complement, for ever; one that lasts longer differs from itself an input cycle later anyway."""
    if loop.wave.period != 2:
        return loop.wave, None
    system = rhythm.system
    values = {v.name: 0 for v in e.variables([system.output])} | dict(
        zip(system.names, loop.example, strict=True)
    )
    (level,) = e.evaluate([system.output], values)
    return loop.wave, level ^ loop.example[-1]


def on_loops(rhythm: Rhythm) -> Rhythm:
    """The rhythm with states on its loops, where the clock is low, for starts: of each sort one, and the same one
    input cycle later."""
    runs: dict[Sort, list[Orbit]] = {}
    for loop in rhythm.loops:
        orbit = rhythm.shown.get(loop.example)
        if orbit is None or not orbit.closed or len(runs) == MOST_LOOPS:
            continue
        first, sort = loop.example[-1], sort_of(rhythm, loop)
        if sort not in runs:
            runs[sort] = [_begun(orbit, at) for at in (first, first + 2)]
    orbits = tuple(orbit for pair in runs.values() for orbit in pair)
    starts = tuple(Start(orbit.start, "power-up on a loop, the clock low") for orbit in orbits)
    return replace(rhythm, starts=starts, orbits=orbits)


def _begun(orbit: Orbit, at: int) -> Orbit:
    """A loop begun so many half-cycles later."""
    return Orbit(path.onward(orbit.loop, at % orbit.loop_half_cycles, orbit.widths), orbit.loop, orbit.widths)


def of_loops(evidence: Apiece, lag: int | None, effort: Effort) -> Outcome:
    """What the loops of all power-up states come to: every loop of one shows the wave of every loop of the other, at
    whatever lag or, without a lag, at the same levels of the clock. Raises OutOfEffort."""
    rhythms = [(side, r) for f in evidence.followed for side, r in zip(SIDES, f.rhythms, strict=True)]
    obligations, why = timing([(side, rhythm.settling) for side, rhythm in rhythms])
    for side, rhythm in rhythms:
        sorts = {sort_of(rhythm, loop) for loop in rhythm.loops}
        if len(sorts) * 2 != len(rhythm.orbits) or not rhythm.complete:
            why = why or f"{side}: {rhythm.open or 'not all loops are known'}"
        # Only a state graph lists every loop; a cover lists every wave.
        if lag is not None and rhythm.census is None and any(level is not None for _, level in sorts):
            why = why or f"{side}: whether every power-up state comes to follow the clock alike is not known"
    if why:
        return Outcome("open", why, obligations=obligations)
    together = [pair for each in evidence.followed for pair in _together(each)]
    facts, after = _after([rhythm for _, rhythm in rhythms])
    judged = _rotations(together, after, effort) if lag is None else _with_lag(together, lag, effort)
    if judged.verdict == "proved" and lag is not None:
        judged = replace(judged, says=f"the outputs are equal {after}, whatever the two power-up states")
    method = "both runs replayed on their machines" if judged.verdict == "refuted" else LOOPS_COMPARED
    if len(evidence.followed) > 1:
        method += f"; each of {len(evidence.followed)} values of the held inputs"
    return replace(judged, method=method, facts=facts, obligations=obligations, evidence=evidence)


LOOPS_COMPARED = "the loops of all power-up states of both, compared with each other"


def _after(rhythms: Sequence[Rhythm]) -> tuple[dict[str, Fact], str]:
    """After how many half-cycles all of them show what they come to show, as a fact and in words."""
    worst = [rhythm.recovery.worst if rhythm.recovery else None for rhythm in rhythms]
    known = [each for each in worst if each is not None]
    if len(known) < len(worst):
        return {}, "once both have settled"
    return {"settled_half_cycles": max(known)}, f"from half-cycle {max(known)} on" if max(
        known
    ) else "at once"


def of_wave(rhythms: Sequence[tuple[str, Rhythm]]) -> Outcome:
    """What it comes to that every power-up state of all these dividers comes to show one and the same wave."""
    obligations, why = timing([(side, rhythm.settling) for side, rhythm in rhythms])
    if why:
        return Outcome("open", why, obligations=obligations)
    facts, after = _after([rhythm for _, rhythm in rhythms])
    return Outcome("proved", _rotated(after), LOOPS_COMPARED, facts=facts, obligations=obligations)


def _rotated(after: str) -> str:
    return f"the outputs are equal {after}, but for a lag that the two power-up states decide"


def _rotations(pairs: Sequence[_Pair], after: str, effort: Effort) -> Outcome:
    """Whether all runs show one wave, each at a phase of its own."""
    for pair in pairs:
        shifts = equality.shifts(*pair.orbits, effort)
        if shifts is None:
            return Outcome("open", "an output that changes too often for a lag to be looked for")
        if shifts.after is None:
            at = equality.first_difference(*pair.orbits)
            if at is None:
                raise InternalError("two loops with one wave that are no lag apart")
            shown = pair.difference(at, 0)
            text = (
                f"two loops with different waves, whatever the lag; without one they differ in {shown.text}"
            )
            return Outcome("refuted", text, difference=replace(shown, text=text))
    return Outcome("proved", _rotated(after))


# -- side by side ------------------------------------------------------------------------------------------


def of_both(evidence: Together, lag: int) -> Outcome:
    """What is shown of both side by side, provided that it was checked."""
    joint, shown = evidence.joint, evidence.shown
    found, why = timing([("", joint.settling)])
    obligations = tuple((owed.register.partition(".")[0], owed) for _, owed in found)
    if why:
        return Outcome("open", why.removeprefix(": "), obligations=obligations)
    if isinstance(shown, Run):
        judged = _of_run(joint, lag, shown)
    else:
        judged = Outcome("proved", _equal(lag), _method(shown), lag)
    return replace(judged, obligations=obligations, evidence=evidence if judged.verdict != "open" else None)


def _method(shown: Invariant | Collection[State]) -> str:
    if not isinstance(shown, Invariant):
        return f"all {len(shown)} states that both can be in together; every step checked"
    count = len(shown.parts)
    method = (
        f"{count} relation{'s' * (count != 1)} between the two that go on holding; checked by separate code"
    )
    return method + (f"; induction over {shown.depth} half-cycles" if shown.depth > 1 else "")


def _of_run(joint: Joint, lag: int, run: Run) -> Outcome:
    """The difference that a run shows when both are run again; open where it hangs on what x stands for."""
    start = joint.starts[run.start]
    if not lasts(joint, start, run.values):
        return Outcome(
            "open", f"a difference in half-cycle {run.half_cycle} may hang on how long reset has been held"
        )
    rests = equality.replayed(joint, start, run.values, run.moves, run.half_cycle)
    if equality.hangs_on_x(joint, rests):
        return Outcome(
            "open", f"a difference in half-cycle {run.half_cycle} hangs on a value that x stands for"
        )
    seen = equality.rests_differ(rests, lag)
    if seen is None or seen.half_cycle != run.half_cycle:
        raise InternalError("a difference that does not replay")
    old, new = run.half_cycle - max(lag, 0), run.half_cycle - max(-lag, 0)
    when = "" if seen.at_edge else ", once inputs have moved"
    text = f"{_place(old, lag)}{when}: the old output is {seen.levels[0]}, the new one {seen.levels[1]}"
    trace = Trace(rests, run.half_cycle, run.half_cycle + 1, text, start.cause)
    faults = equality.trace_faults(joint, trace, lag)
    if faults:
        raise InternalError(f"a difference that does not replay: {faults[0]}")
    shown = Difference(old, new, seen.levels, seen.at_edge, start.cause, text, trace)
    return Outcome("refuted", text, "both run side by side again", difference=shown)
