"""What holds for all values of some inputs at once, and the values that are to be judged by themselves."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import chain

from prover import expr as e
from prover import family, glitch
from prover.certificate import Obligation, discharge
from prover.design import Design
from prover.domain import Domain, Values
from prover.each import AtOnce, bounds_text
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr
from prover.family import Claim, Piece, Proof, Unfit
from prover.forms import Beyond, Poly, at_least
from prover.generalise import Found, FromEverywhere, FromStarts, Kind, Lost, Search, cases_at
from prover.rigid import bound_obligations
from prover.sample import Machines
from prover.solve import Model, find, least
from prover.spec import Spec


@dataclass(frozen=True, slots=True)
class Together:
    """What holds for all values at once, but for those that are to be judged by themselves.

    machines  the divider for all values
    proof     what holds of it, every obligation discharged
    glitches  the answers to the questions about glitches
    at_once   what it comes to
    """

    machines: Machines
    proof: Proof
    glitches: tuple[Model | None, ...]
    at_once: AtOnce


def prove(design: Design, spec: Spec, domain: Domain, effort: Effort) -> Together | str:
    """What holds for all values of the domain at once; a text if that can't even be asked."""
    if spec.mean:
        return "a mean is judged for one value of the inputs at a time"
    try:
        return _proved(Machines(design, spec, domain, effort), spec, domain)
    except (Beyond, Unfit, OutOfEffort) as fault:
        return str(fault)


def _proved(machines: Machines, spec: Spec, domain: Domain) -> Together | str:
    if machines.settling.depth is None:
        return machines.settling.open or "the micro-steps do not settle for every value"
    if machines.system.choices:
        return "values that x stands for are followed for one value of the inputs at a time"
    claim = Claim(
        spec.ratio_formula or spec.ratio or Fraction(1), spec.high_formula or spec.high, domain.fixed
    )
    return _Proof(machines, claim).made()


class _Proof:
    def __init__(self, machines: Machines, claim: Claim) -> None:
        self.machines, self.claim = machines, claim
        self.admitted = machines.admitted()
        self.singly: dict[tuple[int, ...], dict[str, int]] = {}
        self.waves: list[tuple[Piece, family.Wave]] = []

    def made(self) -> Together:
        machines = self.machines
        first = next(machines.domain.values())
        self._add(first)
        scope = machines.at(first)[1]
        starts, why_starts, wrong = None, "", dict.fromkeys(("ratio", "high-time", "reset"), "")
        if scope != "any":
            starts, why_starts = self._searched(FromStarts(machines), 0.5)
            starts, wrong = self._gaps(starts)
        everywhere, why_everywhere = self._searched(FromEverywhere(machines, self.claim), 0.7)
        why = dict.fromkeys(("ratio", "high-time", "no-stuck", "recovery"), why_everywhere)
        known = {name for name, reason in why.items() if not reason}
        why["settling"] = "; ".join(text for text, _ in machines.pulses)
        for _, values in machines.pulses:
            if e.evaluate([self.admitted], values) == [1]:
                self._add(values)
        if starts is not None:
            known = known | set(wrong) if not why_starts else known - set(wrong)
            why |= {name: why_starts or wrong[name] for name in wrong}
            if why_everywhere:
                # Where a flip-flop is released late the wave may fail to come right at any value.
                known.discard("reset")
        if machines.ports.reset is None:
            why.pop("reset", None)
        else:
            # What comes of a flip-flop that is released late is a power-up state, from which the wave comes right.
            why["reset"] = why.get("reset", "the claim does not begin at reset") or why_everywhere
        bound = self._worst(everywhere) if not why_everywhere else None
        singly = tuple(sorted(self.singly.values(), key=lambda values: list(values.values())))
        proof = Proof(
            starts.pieces if starts and not (why["ratio"] and why["high-time"]) else None,
            everywhere.pieces if not why_everywhere else None,
            not why["ratio"],
            not why["high-time"],
            why.get("reset", "no reset") == "",
            singly,
        )
        if "reset" in why:
            why["reset"] = why["reset"] or machines.too_short(proof)
        glitches = self._glitches(proof) if proof.everywhere is not None else None
        why["glitch-free"] = why_everywhere if glitches is None else glitches.open
        self._check(proof, bound)
        at_once = AtOnce(
            why=why,
            first_known=frozenset(known),
            dues=machines.dues(glitches),
            singly=singly,
            ratios=self._ratios(),
            bound=bound,
            bounds=bounds_text(proof),
            shapes=len(proof.starts or ()) + len(proof.everywhere or ()),
        )
        return Together(machines, proof, glitches.answers if glitches else (), at_once)

    def _glitches(self, proof: Proof) -> glitch.Glitches:
        """Whether the output may pulse on a step from a state of a loop, at any value."""
        machines = self.machines
        machines.effort.say("looking for glitches at every value")

        def ask(goal: Expr) -> Model | None:
            return find(goal, machines.effort)

        found = glitch.find(
            machines.ports, machines.with_inputs, machines.on_loops(proof), lambda state: None, ask
        )
        for number, goal in enumerate(found.goals):
            if not discharge(Obligation(f"glitches {number}", goal), machines.effort):
                raise InternalError("the absence of a glitch fails its check")
        return found

    def _check(self, proof: Proof, bound: int | None) -> None:
        """Ask every obligation afresh."""
        machines = self.machines
        machines.effort.say("checking what was found for all values")
        proved = family.proof_obligations(
            machines.origin(), self.admitted, dict(machines.inputs), self.claim, proof
        )
        owed = chain(proved, bound_obligations(machines, proof, bound) if bound is not None else ())
        faults = family.faults(owed, lambda each: discharge(each, machines.effort))
        if faults:
            raise InternalError(f"what was found for all values fails its check: {'; '.join(faults[:3])}")

    def _add(self, values: Values) -> None:
        self.singly[tuple(values.values())] = dict(values)

    def _searched(self, kind: Kind, share: float) -> tuple[Found, str]:
        """The pieces of a kind, and why they are not all; found in a share of the time that there is."""
        machines, effort = self.machines, self.machines.effort
        machines.effort = effort.share(effort.left * share)
        try:
            found = Search(machines, kind).run()
        except Lost as lost:
            self._add(self._earlier(kind, lost.values))
            return Found((), ()), str(lost)
        finally:
            machines.effort = effort
        for values in found.left:
            self._add(values)
        return found, found.why

    def _earlier(self, kind: Kind, lost: Values) -> Values:
        """A value at which a state is lost, found by halving what is before one at which that is known."""
        domain = self.machines.domain
        if len(lost) > 1 or domain.where:
            return lost
        low, high = -1, domain.number(lost)
        while high - low > 1:
            middle = (low + high) // 2
            try:
                kind.sample(domain.value(middle))
                low = middle
            except Lost:
                high = middle
        return domain.value(high)

    def _premise(self, piece: Piece) -> Expr:
        return e.bvand(self.admitted, piece.holds())

    def _gaps(self, found: Found) -> tuple[Found, dict[str, str]]:
        """The pieces with the claimed formulas' cases, and by property why the start states' courses are not as
        claimed. Where they are not, the first value of the piece at which that is so is judged by itself."""
        wrong, pieces = {"ratio": "", "high-time": "", "reset": ""}, []
        origin = self.machines.origin()
        for piece, starts in found.pieces:
            premise = self._premise(piece)
            base = least(premise, self.machines.inputs, self.machines.effort)
            if base is None:
                continue
            piece = replace(piece, cases=cases_at(self.claim, piece, base))
            pieces.append((piece, starts))
            try:
                wave, owed = family.wave_of(self.claim, piece, premise)
                self.waves.append((piece, wave))
                for each in owed:
                    self._or_singly(each, wrong, *wrong)
                for course in starts.courses:
                    gaps, high, low = family.gap_obligations(premise, course, wave)
                    self._or_singly(gaps, wrong, "ratio", "reset")
                    self._or_singly(high, wrong, "high-time", "reset")
                    self._or_singly(low, wrong, "reset")
                for each in family.release_obligations(origin, premise, starts) if starts.held else ():
                    self._or_singly(each, wrong, "reset")
            except Unfit as fault:
                wrong = dict.fromkeys(wrong, str(fault))
                self._add(base)
        return replace(found, pieces=tuple(pieces)), wrong

    def _or_singly(self, obligation: Obligation, wrong: dict[str, str], *names: str) -> None:
        """Note the first value at which an obligation fails, and the properties that hang on it."""
        if not discharge(obligation, self.machines.effort):
            wrong.update(dict.fromkeys(names, f"{obligation.name}: not as claimed for every value"))
            values = least(obligation.goal, self.machines.inputs, self.machines.effort)
            if values is not None:
                self._add(values)

    def _worst(self, found: Found) -> int | None:
        """The greatest bound over the pieces; the value that has it is judged by itself, and so is the first that
        exceeds the limit."""
        worst: tuple[int, dict[str, int]] | None = None
        for piece, claim in found.pieces:
            self.waves.append((piece, family.wave_of(self.claim, piece, self._premise(piece))[0]))
            for bound in claim.bounds:
                most = self._greatest(self._premise(piece), bound)
                if most is None:
                    continue
                if worst is None or most[0] > worst[0]:
                    worst = most
                within = self.machines.spec.within
                if within is not None and most[0] > within:
                    late = e.bvand(self._premise(piece), at_least(bound, Poly.const(within + 1)))
                    values = least(late, self.machines.inputs, self.machines.effort)
                    if values is not None:
                        self._add(values)
        if worst is not None:
            self._add(worst[1])
        return worst[0] if worst else None

    def _greatest(self, premise: Expr, number: Poly) -> tuple[int, dict[str, int]] | None:
        """The greatest value of a number, and the inputs that have it."""
        best: tuple[int, dict[str, int]] | None = None
        step = 1 << number.size
        while True:
            wanted = Poly.const(best[0] + step if best else -(1 << number.size))
            model = find(e.bvand(premise, at_least(number, wanted)), self.machines.effort)
            if model is not None:
                values = {name: model.get(name, 0) for name, _ in self.machines.inputs}
                best = number.number(values), values
            elif best is None:
                return None
            elif step == 1:
                return best
            else:
                step >>= 1

    def _ratios(self) -> tuple[Fraction, Fraction] | None:
        ends: list[Fraction] = []
        for piece, wave in self.waves:
            for number in (wave.period, -wave.period):
                most = self._greatest(self._premise(piece), number)
                if most is not None:
                    ends.append(abs(Fraction(most[0], 2)))
        return (min(ends), max(ends)) if ends else None
