"""Orbital windows of the training rows: one GFN2 point in the medium of each row, kept as arrays on disk."""

from __future__ import annotations

import hashlib
import pickle
from dataclasses import dataclass
from pathlib import Path

from orchil_schemas import FloatArray, Geometry, Medium, StageError

from orchil_stages.excite.model import open_states
from orchil_stages.excite.response import Prepared, prepare
from orchil_stages.excite.window import Window
from orchil_stages.medium import lookup

from .dataset import Measurement, scaffold


@dataclass(frozen=True)
class Row:
    """One measurement with its prepared window."""

    measured: Measurement
    scaffold: str
    medium: Medium
    prepared: Prepared
    ground_dipole: FloatArray


def load_row(measured: Measurement, geometry: Geometry, cache: Path, window: tuple[int, int]) -> Row | None:
    """The prepared row, from the cache where it is there; None when the ground state fails in this medium."""
    medium = lookup(measured.medium)
    key = hashlib.sha256(f"{geometry.digest}|{medium.solvation}|{window}".encode()).hexdigest()[:24]
    path = cache / "windows" / key[:2] / f"{key}.pkl"
    if path.exists():
        opened, dipole = pickle.loads(path.read_bytes())
    else:
        try:
            found = open_states(geometry, medium, *window)
        except StageError:
            return None
        opened, dipole = found.window, found.wave.dipole
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(pickle.dumps((opened, dipole), protocol=5))
    assert isinstance(opened, Window)
    return Row(measured, scaffold(measured.smiles), medium, prepare(opened), dipole)
