"""Run some stages on one row in this process, without engine and store: for training and checks."""

from __future__ import annotations

import hashlib
import tempfile
from collections.abc import Iterable
from pathlib import Path

from orchil_schemas import Context, Inputs, LibraryRow, Record, Stage


def run_stages(row: LibraryRow, stages: Iterable[Stage]) -> Inputs:
    """All records made by the stages, each with its default settings; StageError as the stages raise it."""
    records: list[Record] = [row]
    with tempfile.TemporaryDirectory() as scratch:
        context = Context(scratch=Path(scratch), seed=seed_of(row))
        for stage in stages:
            records.extend(stage.run(Inputs(records), stage.Settings(), context))
    return Inputs(records)


def seed_of(row: LibraryRow) -> int:
    """A positive seed that depends on the structure alone."""
    return int(hashlib.sha256(row.structure.encode()).hexdigest()[:7], 16) + 1
