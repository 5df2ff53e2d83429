"""How alike dyes are to the measured ones: cosine of their Morgan counts, many rows at once.

Counts of circular environments up to radius 2 (Rogers, Hahn, J. Chem. Inf. Model. 50, 742, 2010), as square roots, so
that many like atoms do not drown a rare one. A cosine is a positive-definite kernel, which the regression needs;
on the errors of measured dyes it does better than the Tanimoto coefficient of the same counts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from orchil_schemas import FloatArray
from scipy.sparse import csr_matrix

if TYPE_CHECKING:
    from rdkit.Chem.rdFingerprintGenerator import FingerprintGenerator64

RADIUS = 2
ONE_AFTER_ANOTHER = 4096
"""Structures whose environments are kept: one dye in several media is read once."""


class Likeness:
    """Similarity to m dyes. A structure that cannot be read is like nothing."""

    def __init__(self, smiles: Sequence[str]) -> None:
        found = [environments(one) for one in smiles]
        self._place = {bit: at for at, bit in enumerate({bit: None for counts in found for bit in counts})}
        self._to = self._matrix(found).T.tocsr()

    def rows(self, smiles: Sequence[str]) -> FloatArray:
        """Similarities (n, m) from 0 to 1 of n dyes to those this was made for."""
        found = self._matrix([environments(one) for one in smiles])
        return np.asarray(np.minimum((found @ self._to).toarray(), 1.0))

    def _matrix(self, found: Sequence[Mapping[int, int]]) -> csr_matrix:
        """Rows of unit length, without those environments that no dye of ours has."""
        kept = [[(self._place[bit], count) for bit, count in counts.items() if bit in self._place] for counts in found]
        lengths = np.sqrt(np.maximum([float(sum(counts.values())) for counts in found], 1.0))
        ends = np.cumsum([0, *map(len, kept)])
        columns, counts = np.array([pair for row in kept for pair in row], dtype=np.int64).reshape(-1, 2).T
        values = np.sqrt(counts) / np.repeat(lengths, np.diff(ends))
        return csr_matrix((values, columns, ends), shape=(len(found), len(self._place)))


@lru_cache(maxsize=ONE_AFTER_ANOTHER)
def environments(smiles: str) -> dict[int, int]:
    """How often each circular environment occurs; empty for what cannot be read."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        return {}
    counts: dict[int, int] = _generator().GetSparseCountFingerprint(molecule).GetNonzeroElements()
    return counts


@lru_cache(maxsize=1)
def _generator() -> FingerprintGenerator64:
    from rdkit.Chem import rdFingerprintGenerator

    return rdFingerprintGenerator.GetMorganGenerator(radius=RADIUS)
