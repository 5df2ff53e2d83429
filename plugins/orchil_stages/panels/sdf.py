"""Rows of a question as an SDF: one mol block a row, drawn from the column `smiles`, all columns as properties."""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING, Any

from orchil_schemas.panel import TableFormat

from .structures import molecule

if TYPE_CHECKING:
    import pandas as pd


def write_sdf(rows: pd.DataFrame, path: Path) -> int:
    """Write the rows; returns how many had no structure that can be read. ``ValueError`` without a SMILES column."""
    from rdkit.Chem import SDWriter

    if "smiles" not in rows.columns:
        raise ValueError("an SDF needs a column named smiles: write SELECT smiles, ... FROM ranking")
    left_out = 0
    writer = SDWriter(str(path))
    writer.SetForceV3000(False)
    try:
        for row in rows.to_dict("records"):
            left_out += not _write(writer, row)
    finally:
        writer.close()
    return left_out


def _write(writer: Any, row: dict[Any, Any]) -> bool:
    from rdkit.Chem.rdDepictor import Compute2DCoords

    drawn = molecule(row["smiles"])
    if drawn is None:
        return False
    Compute2DCoords(drawn)
    drawn.SetProp("_Name", _line(row.get("candidate", "")))
    for name, value in row.items():
        if not _missing(value):
            drawn.SetProp(_line(name).translate(_NO_ANGLES) or "unnamed", _line(value))
    writer.write(drawn)
    return True


_NO_ANGLES = str.maketrans("<>", "()")
"""A property's name stands between angle brackets."""


def _line(value: object) -> str:
    """Text on one line: an empty line ends a property, and $$$$ the whole entry."""
    return " ".join(str(value).split()).replace("$$$$", "$$ $$")


def _missing(value: object) -> bool:
    return value is None or str(value) == "<NA>" or (isinstance(value, float) and math.isnan(value))


SDF = TableFormat("sdf", "structures with all columns as properties; needs a column smiles", write_sdf)
