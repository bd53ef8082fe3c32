"""Evidence of a claim on each value to verdicts, without any engine: values judged singly, the proof of all others.

The evidence of a value is taken as that of a divider whose inputs are held there (`rebuild`). The proof of the others
becomes obligations over the inputs as variables (`family`). What both come to is merged as the report was (`each`).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from prover import family, glitch, rebuild
from prover.certificate import Obligation
from prover.design import Design
from prover.domain import Domain, Values, check_names, claimed_at, rigid, values_text
from prover.each import AtOnce, Merged, bounds_text, with_roles
from prover.effort import Effort
from prover.family import Claim, Unfit
from prover.findings import Report
from prover.forms import Beyond
from prover.ports import Ports, recognise
from prover.rebuild import Owed, Rejected, Replay
from prover.rigid import Rigid, bound_obligations
from prover.settling import Settling, settle
from prover.spec import Spec
from prover.system import Inputs, System
from prover.values_evidence import AllAtOnce, ValuesEvidence

OPEN = "the certificate has no evidence for the others"


@dataclass(frozen=True, slots=True)
class Made:
    """What evidence comes to, provided that no obligation can be fulfilled: a report with findings and without what
    only accompanies them."""

    report: Report
    obligations: tuple[Obligation, ...]


def made_of(design: Design, spec: Spec, found: ValuesEvidence, effort: Effort) -> Made:
    """The report that the evidence bears, and its obligations. Raises Rejected, and UserError for a claim that is
    none of this divider."""
    from properties import judge_all

    check_names(design, spec)
    domain = Domain.of(design, spec)
    spec = with_roles(spec, recognise(rigid(design, spec.each), spec))
    merged = Merged(spec, domain)
    owed: list[Obligation] = []
    _check_order(domain, [values for values, _ in found.singly])
    for values, evidence in found.singly:
        held = claimed_at(spec, {**domain.fixed, **values}, values)
        ports = recognise(design, held)
        made = rebuild.rebuild(ports, held, evidence, effort)
        findings = judge_all(made.rhythm, held)
        merged.add(values, Report(ports, held, made.rhythm, findings, {}, (), (), 0.0))
        at = values_text(values)
        owed += (Obligation(f"at {at}: {each.name}", each.goal) for each in made.obligations)
    if found.together is not None:
        singly = tuple(values for values, _ in found.singly)
        scope = merged.reports[0][1].rhythm.scope
        at_once, more = _at_once(design, spec, domain, found.together, singly, scope, effort)
        merged.together = at_once
        owed += more
    return Made(merged.report(domain.count, OPEN), tuple(owed))


def _check_order(domain: Domain, listed: Sequence[Values]) -> None:
    """Raise Rejected for values that are none of the claim's, or out of order."""
    before = -1
    for values in listed:
        inside = all(
            any(low <= values[name] <= high for low, high in ranges) for name, ranges in domain.inputs
        )
        if not inside or not domain.holds(values) or domain.number(values) <= before:
            raise Rejected(f"singly: {values_text(values)} is not claimed, or out of order")
        before = domain.number(values)
    if not listed:
        raise Rejected("singly: no value is judged")


def _at_once(
    design: Design,
    spec: Spec,
    domain: Domain,
    found: AllAtOnce,
    singly: tuple[Values, ...],
    scope: str,
    effort: Effort,
) -> tuple[AtOnce, tuple[Obligation, ...]]:
    """What the proof of all other values comes to, and what it owes."""
    owed = Owed()
    replays = {
        True: Replay(found.settling, "micro-steps at every value", owed),
        False: Replay(found.reset or (), "micro-steps at every value, under reset", owed),
    }

    def settled(ports: Ports, inputs: Inputs, races: bool) -> tuple[System, Settling]:
        answer = replays[races].answer
        return settle(ports.design, ports.clock, inputs, ports.output_value, effort, ask=answer, races=races)

    proof = replace(found.proof, singly=singly)
    try:
        machine = Rigid(design, spec, domain, effort, settled)
        if machine.settling.depth is None or machine.system.choices or spec.mean:
            raise Rejected("together: a proof about what is not known to settle, hangs on x, or is a mean")
        origin = machine.origin()
        claim = Claim(
            spec.ratio_formula or spec.ratio or Fraction(1), spec.high_formula or spec.high, domain.fixed
        )
        owed.add(family.proof_obligations(origin, machine.admitted(), dict(machine.inputs), claim, proof))
    except (Unfit, Beyond) as fault:
        raise Rejected(f"together: {fault}") from None
    if (found.reset is None) != (machine.under_reset is None):
        raise Rejected("together/reset: answers to what is not asked")
    if (found.bound is None) != (proof.everywhere is None) or (found.glitches and proof.everywhere is None):
        raise Rejected("together/bound: of what is not claimed")
    ask = Replay(found.glitches, "glitches at every value", owed)
    glitches = None
    if proof.everywhere is not None and found.bound is not None:
        owed.add(bound_obligations(machine, proof, found.bound))
        glitches = glitch.find(
            machine.ports, machine.with_inputs, machine.on_loops(proof), lambda state: None, ask.answer
        )
    for replay in (*replays.values(), ask):
        replay.finish()
    return (
        AtOnce(
            why=_why(machine, proof, glitches, scope),
            first_known=frozenset(),
            dues=machine.dues(glitches),
            singly=singly,
            ratios=None,
            bound=found.bound,
            bounds=bounds_text(proof),
            shapes=len(proof.starts or ()) + len(proof.everywhere or ()),
        ),
        owed.listed(),
    )


def _why(machine: Rigid, proof: family.Proof, glitches: glitch.Glitches | None, scope: str) -> dict[str, str]:
    """By property, why it is not known for all values."""
    everywhere = "" if proof.everywhere is not None else OPEN
    starts = "" if proof.starts is not None else OPEN
    why = {"no-stuck": everywhere, "recovery": everywhere}
    if scope == "any":
        why |= {"ratio": everywhere, "high-time": everywhere}
    else:
        why |= {
            "ratio": starts or ("" if proof.gaps else OPEN),
            "high-time": starts or ("" if proof.high else OPEN),
        }
    why["settling"] = "; ".join(text for text, _ in machine.pulses)
    if machine.ports.reset is not None:
        why["reset"] = starts or everywhere or machine.too_short(proof)
        if not (proof.gaps and proof.high and proof.release and scope == "reset"):
            why["reset"] = why["reset"] or OPEN
    why["glitch-free"] = everywhere if glitches is None else glitches.open
    return why
