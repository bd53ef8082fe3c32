"""The gate: a manifest of dividers and claims, a ledger of what was found, and the run that brings it up to date."""

from __future__ import annotations

import os
from pathlib import Path

from prover.errors import UserError
from prover.gate.ledger import Event, Ledger
from prover.gate.manifest import Manifest, Options, SpecOf, find_manifest, read_manifest
from prover.gate.runner import Run, run_gate
from prover.output import STANDARD_OUTPUT

__all__ = ["Event", "Ledger", "Manifest", "Run", "events_of", "opened", "read", "run_gate"]

FOLDER = ".subharmonic"
"""Beside the manifest: what belongs to the gate and into no repository."""


def read(path: str | None, options: Options, spec_of: SpecOf) -> Manifest:
    """The manifest at the path, or the one that is in force here."""
    return read_manifest(Path(path) if path is not None else find_manifest(Path()), options, spec_of)


def opened(manifest: Manifest, path: str | None) -> Ledger:
    """The ledger at the path, or the manifest's own."""
    if path is not None and path in ("", STANDARD_OUTPUT):
        raise UserError(f"--ledger '{path}' names no file", hint="give the path of one")
    return Ledger(Path(path)) if path is not None else _own(manifest.folder)


def _own(folder: Path) -> Ledger:
    """The ledger beside a manifest; its folder is ignored by version control from the beginning."""
    own = folder / FOLDER
    ledger = Ledger(own / "ledger.sqlite")
    ignore = own / ".gitignore"
    try:
        if not ignore.exists():
            ignore.write_text("*\n", encoding="utf-8")
    except OSError:
        # A ledger that can be written is what counts.
        pass
    return ledger


def events_of(file: str, path: str | None) -> list[Event]:
    """What the ledger has on the dividers that the file is or was part of. The manifest in force is the working
    folder's, or else the file's. Raises UserError where that is nothing."""
    try:
        folder = find_manifest(Path()).parent
    except UserError:
        folder = find_manifest(Path(file).parent).parent
    place = Path(path) if path is not None else folder / FOLDER / "ledger.sqlite"
    if not place.is_file():
        raise UserError(f"there is no ledger {place}", hint="run the gate first")
    name = os.path.relpath(file, folder).replace(os.sep, "/")
    ledger = Ledger(place, to_read=True)
    try:
        events = list(ledger.history())
    finally:
        ledger.close()
    dividers = {event.divider for event in events if name in event.files}
    if not dividers:
        raise UserError(
            f"the ledger {place} has nothing on {name}", hint="run the gate with it in the manifest"
        )
    return [event for event in events if event.divider in dividers]
