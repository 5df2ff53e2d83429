"""The diverse choice: down the ranking, leaving out what is too much alike to something already picked.

Likeness is the Tanimoto coefficient of Morgan fingerprints (radius 2, 2048 bits; Rogers, Hahn, J. Chem.
Inf. Model. 50, 742, 2010). Fingerprints are made only as far down the ranking as the choice goes.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from functools import lru_cache
from typing import TYPE_CHECKING

from orchil_schemas import Pick

if TYPE_CHECKING:
    from rdkit.Chem.rdFingerprintGenerator import FingerprintGenerator64
    from rdkit.DataStructs import ExplicitBitVect


def pick_diverse(ranked: Iterable[int], smiles: Sequence[str], pick: Pick) -> dict[int, int]:
    """Pick number (from 1) by row, walking the rows in ranked order; what does not parse is passed over."""
    from rdkit.DataStructs import BulkTanimotoSimilarity

    picked: dict[int, int] = {}
    taken: list[ExplicitBitVect] = []
    for row in ranked:
        if len(picked) == pick.count:
            break
        print_of_row = _fingerprint(smiles[row])
        if print_of_row is None or max(BulkTanimotoSimilarity(print_of_row, taken), default=0.0) > 1 - pick.spread:
            continue
        taken.append(print_of_row)
        picked[row] = len(picked) + 1
    return picked


def _fingerprint(smiles: str) -> ExplicitBitVect | None:
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None or molecule.GetNumAtoms() == 0:
        return None
    made: ExplicitBitVect = _generator().GetFingerprint(molecule)
    return made


@lru_cache(maxsize=1)
def _generator() -> FingerprintGenerator64:
    from rdkit.Chem import rdFingerprintGenerator

    return rdFingerprintGenerator.GetMorganGenerator(radius=2, fpSize=2048)
