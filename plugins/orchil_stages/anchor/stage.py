"""The library stage `anchor`: predicted columns and measured values -> one Anchor for every candidate that moves."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
import orchil_schemas
from orchil_schemas import MEASURED, AnchoredQuantity, Availability, Brief, Frozen, LibraryTable, Record
from pydantic import Field

from orchil_stages.installed import availability

QUANTITIES = ("absorption_max_nm", "emission_max_nm")
ROWS_AT_ONCE = 2000


class AnchorSettings(Frozen):
    """How well the measured maxima of the library were read."""

    reading_nm: float = Field(default=2.0, gt=0, description="standard error of a measured maximum")


class Anchor:
    """Corrects predictions by the measured values of relatives."""

    name = "anchor"
    version = "1"
    makes: tuple[type[Record], ...] = (orchil_schemas.Anchor,)
    Settings: type[Frozen] = AnchorSettings

    def found(self) -> Availability:
        """Are RDKit (for the likeness of structures) and SciPy installed?"""
        return availability("rdkit", "scipy")

    def reads(self, brief: Brief, settings: AnchorSettings) -> tuple[str, ...]:
        """Predicted and measured maxima."""
        return *QUANTITIES, *(MEASURED + name for name in QUANTITIES)

    def run(self, table: LibraryTable, brief: Brief, settings: AnchorSettings) -> Iterable[tuple[int, Record]]:
        """Yield (candidate, Anchor) in the order of the table for those that move."""
        from .likeness import Likeness
        from .series import Dyes, Series

        dyes = Dyes.of(table)
        series = [Series(table, dyes, name, settings.reading_nm) for name in QUANTITIES]
        measured = sorted({row for one in series for row in one.rows.tolist()})
        if not measured:
            return
        likeness = Likeness([dyes.smiles[row] for row in measured])
        for one in series:
            one.compare(likeness, np.searchsorted(measured, one.rows))
        for start in range(0, len(dyes.smiles), ROWS_AT_ONCE):
            rows = np.arange(start, min(start + ROWS_AT_ONCE, len(dyes.smiles)))
            similarity = likeness.rows([dyes.smiles[row] for row in rows])
            changes = [one.changes(rows, similarity) for one in series]
            for row in rows.tolist():
                if made := _of_row(changes, row):
                    yield table.candidate[row], orchil_schemas.Anchor(changes=made)


def _of_row(changes: Sequence[dict[int, AnchoredQuantity]], row: int) -> tuple[AnchoredQuantity, ...]:
    return tuple(one[row] for one in changes if row in one)
