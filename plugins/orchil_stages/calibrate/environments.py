"""Where hole and electron sit, written in the structure around them.

Every heavy atom has circular environments (Rogers, Hahn, J. Chem. Inf. Model. 50, 742, 2010) of radius 0 to 2. Each
environment weighs as much as the share of the hole, or of the electron, on its atom. A side chain that the excitation
does not touch therefore counts nothing, and a sum over environments is a first-order shift of the levels.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from typing import Any

import numpy as np
from orchil_schemas import BadResult, FloatArray

RADIUS = 2


def environment_weights(smiles: str, hole: FloatArray, electron: FloatArray) -> Mapping[int, tuple[float, float]]:
    """Hole and electron share by environment code; ``hole`` and ``electron`` (atoms,) in the order of the geometry.

    The order is that of the SMILES with its hydrogens after the heavy atoms; BadResult when the numbers differ.
    """
    from rdkit import Chem
    from rdkit.Chem import rdFingerprintGenerator

    molecule = Chem.MolFromSmiles(smiles)
    full = Chem.AddHs(molecule)
    if full.GetNumAtoms() != len(hole):
        raise BadResult(f"{len(hole)} atoms in the states, {full.GetNumAtoms()} in the structure")
    shares = _on_heavy_atoms(full, molecule.GetNumAtoms(), np.stack([hole, electron], axis=1))
    extra = rdFingerprintGenerator.AdditionalOutput()
    extra.AllocateBitInfoMap()
    _generator().GetSparseCountFingerprint(molecule, additionalOutput=extra)
    found: dict[int, tuple[float, float]] = {}
    for code, places in extra.GetBitInfoMap().items():
        summed = shares[[atom for atom, _ in places]].sum(axis=0)
        found[int(code)] = (float(summed[0]), float(summed[1]))
    return found


@cache
def _generator() -> Any:
    from rdkit.Chem import rdFingerprintGenerator

    return rdFingerprintGenerator.GetMorganGenerator(radius=RADIUS)


def _on_heavy_atoms(full: Any, heavy: int, shares: FloatArray) -> FloatArray:
    """Shares (heavy, 2) with those of the hydrogens on their neighbours."""
    made = shares[:heavy].copy()
    for atom in range(heavy, len(shares)):
        made[full.GetAtomWithIdx(atom).GetNeighbors()[0].GetIdx()] += shares[atom]
    return made
