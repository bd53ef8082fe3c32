"""Subharmonic: proofs about hand-written Verilog clock dividers.

    from prover import Spec, check, measure, read
    report = check(["divider.v"], Spec(ratio=Fraction(3)))
    report.verdict            # "proved", "refuted" or "open"
    report.findings           # one a property

Nothing heavy is imported before it is needed.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from prover.api import check, compare, measure, read
    from prover.compared import Comparison
    from prover.errors import UserError
    from prover.findings import Finding, Report
    from prover.pair import Pairing
    from prover.spec import Spec

__version__ = "0.1.0"
__all__ = [
    "Comparison",
    "Finding",
    "Pairing",
    "Report",
    "Spec",
    "UserError",
    "check",
    "compare",
    "measure",
    "read",
]

_HOMES = {
    "Comparison": "prover.compared",
    "Finding": "prover.findings",
    "Pairing": "prover.pair",
    "Report": "prover.findings",
    "Spec": "prover.spec",
    "UserError": "prover.errors",
    "check": "prover.api",
    "compare": "prover.api",
    "measure": "prover.api",
    "read": "prover.api",
}


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(name)
    from importlib import import_module

    return getattr(import_module(_HOMES[name]), name)
