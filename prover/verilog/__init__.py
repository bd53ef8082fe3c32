"""Verilog text to a Design. `read_design` is the whole interface."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from prover.design import Design


def read_design(
    files: Sequence[Path | str],
    *,
    module: str | None = None,
    defines: Mapping[str, str] | None = None,
    include: Sequence[Path | str] = (),
    parameters: Mapping[str, int] | None = None,
) -> Design:
    """Read Verilog-2005 files, and some SystemVerilog, into a Design.

    module      the top; by default the only module with ports that no other one contains
    defines     macros as if by `define, name to text
    include     folders where `include looks, after the including file's own
    parameters  values for parameters of the top module

    Raises UserError, with place and hint, for anything that can't be read exactly.
    """
    from prover.verilog.elaborate import elaborate
    from prover.verilog.source import read_source

    return elaborate(read_source(files, defines=defines, include=include), module, parameters or {})
