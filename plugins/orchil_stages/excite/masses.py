"""Standard atomic masses."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, IntArray


def atomic_masses(numbers: IntArray) -> FloatArray:
    """Mass of each atom in g/mol, from RDKit's table of the elements."""
    from rdkit import Chem

    table = Chem.GetPeriodicTable()
    return np.array([table.GetAtomicWeight(int(n)) for n in numbers])
