"""Rings at a trans azo group lie near its plane; the force field stands them up.

MMFF94 has no torsion of its own for aryl-N=N and turns the rings of azobenzene by 90 degrees, a symmetric saddle that a
relaxation may not leave. Trans azobenzene is flat: Traetteberg, Hilmo, Hagen, J. Mol. Struct. 39, 231 (1977).
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache
from typing import Any

from rdkit import Chem
from rdkit.Chem import rdMolTransforms as transforms

TILT_DEG = 20.0
"""Left free either way, so that the start is not a symmetric saddle either."""

_TRANS_DEG = 120.0


def flat_torsions(molecule: Chem.Mol, conformer: int) -> Iterator[tuple[tuple[int, int, int, int], float, float]]:
    """Torsions ring-ring-N=N at trans azo groups, each with the range (degrees) that holds the ring near the plane."""
    positions = molecule.GetConformer(conformer)
    for carbon, nitrogen, other, far in molecule.GetSubstructMatches(_pattern(), uniquify=False):
        if abs(transforms.GetDihedralDeg(positions, carbon, nitrogen, other, far)) < _TRANS_DEG:
            continue
        neighbours = (atom.GetIdx() for atom in molecule.GetAtomWithIdx(carbon).GetNeighbors())
        ortho = min(atom for atom in neighbours if atom != nitrogen)
        near = abs(transforms.GetDihedralDeg(positions, ortho, carbon, nitrogen, other)) < 90.0
        middle = 0.0 if near else 180.0
        yield (ortho, carbon, nitrogen, other), middle - TILT_DEG, middle + TILT_DEG


@cache
def _pattern() -> Any:
    return Chem.MolFromSmarts("c-[N;X2;!R]=[N;X2;!R]-[#6]")
