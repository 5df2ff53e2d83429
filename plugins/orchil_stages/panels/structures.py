"""SMILES, patterns and fingerprints, each read once.

Likeness is the Tanimoto coefficient of Morgan fingerprints (radius 2, 2048 bits; Rogers, Hahn, J. Chem. Inf. Model. 50,
742, 2010), the same as that of the diverse choice.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from rdkit.Chem import Mol
    from rdkit.DataStructs import ExplicitBitVect

KEPT = 1 << 17
"""Fingerprints kept: those of a large library, some 100 MB."""


def molecule(smiles: object) -> Mol | None:
    """The molecule of a SMILES, None for anything that is none."""
    from rdkit import Chem, rdBase

    if not isinstance(smiles, str) or not smiles.strip():
        return None
    with rdBase.BlockLogs():
        return Chem.MolFromSmiles(smiles)


@lru_cache(maxsize=512)
def pattern(smarts: str) -> Mol:
    """A SMARTS pattern; ``ValueError`` for what is none."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        found = Chem.MolFromSmarts(smarts)
    if found is None or not found.GetNumAtoms():
        raise ValueError(f'"{smarts}" is no SMARTS pattern; a nitro group, for example, is [N+](=O)[O-]')
    return found


@lru_cache(maxsize=KEPT)
def fingerprint(smiles: str) -> ExplicitBitVect | None:
    """The Morgan fingerprint of a SMILES."""
    found = molecule(smiles)
    return None if found is None else _generator().GetFingerprint(found)


@lru_cache(maxsize=1)
def _generator() -> Any:
    from rdkit.Chem.rdFingerprintGenerator import GetMorganGenerator

    return GetMorganGenerator(radius=2, fpSize=2048)
