"""Run some stages on one row in this process, without engine and store: for training and checks."""

from __future__ import annotations

import hashlib
import tempfile
from collections.abc import Iterable, Mapping
from pathlib import Path

from orchil_schemas import Context, Frozen, Inputs, LibraryRow, Record, Stage


def run_stages(row: LibraryRow, stages: Iterable[Stage], settings: Mapping[str, Frozen] | None = None) -> Inputs:
    """All records made by the stages, with default settings where ``settings`` has none for a stage by name.

    StageError as the stages raise it.
    """
    given = settings or {}
    records: list[Record] = [row]
    with tempfile.TemporaryDirectory() as scratch:
        context = Context(scratch=Path(scratch), seed=seed_of(row))
        for stage in stages:
            records.extend(stage.run(Inputs(records), given.get(stage.name, stage.Settings()), context))
    return Inputs(records)


def seed_of(row: LibraryRow) -> int:
    """A positive seed that depends on the structure alone."""
    return int(hashlib.sha256(row.structure.encode()).hexdigest()[:7], 16) + 1
