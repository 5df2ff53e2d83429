"""Fragments of a molecule: ring systems, and what hangs on them or between them."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray, IntArray
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from orchil_stages.excite.environment import bonded


@dataclass(frozen=True)
class Fragments:
    """Fragment of each atom (atoms,) and a name for each: its formula, as "C6H4"."""

    of_atom: IntArray
    names: tuple[str, ...]

    def summed(self, by_atom: FloatArray) -> FloatArray:
        """Sums over the atoms of each fragment, last axis atoms -> fragments."""
        inside = self.of_atom[:, None] == np.arange(len(self.names))
        total: FloatArray = by_atom @ inside
        return total


def fragments(numbers: IntArray, positions: FloatArray) -> Fragments:
    """Cut the bonds that join a ring system to anything else (positions in bohr); hydrogen stays with its atom.

    Two rings joined by a bond are two fragments, a vinylene or azo bridge between rings is one of its own. A single
    atom without hydrogen, as that of a carbonyl group or a halogen, stays with its ring.
    """
    bonds = bonded(numbers, positions)
    ring = _ring_bonds(bonds)
    in_ring = np.asarray(ring.any(axis=1))
    heavy = numbers > 1
    whole = heavy & (bonds.sum(axis=1) > 1)
    cut = bonds & ~ring & (in_ring[:, None] | in_ring) & whole[:, None] & whole
    count, of_atom = connected_components(csr_array(bonds & ~cut), directed=False)
    names = tuple(_formula(numbers[of_atom == place]) for place in range(count))
    return Fragments(of_atom.astype(np.int64), names)


def _ring_bonds(bonds: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Bonds that lie in a ring: their ends stay connected without them."""
    import rdkit.Chem as chem

    molecule = chem.RWMol()
    for _ in range(len(bonds)):
        molecule.AddAtom(chem.Atom(0))
    for one, other in zip(*np.nonzero(np.triu(bonds)), strict=True):
        molecule.AddBond(int(one), int(other), chem.BondType.SINGLE)
    chem.FastFindRings(molecule)
    ring = np.zeros_like(bonds)
    for bond in molecule.GetBonds():
        if bond.IsInRing():
            ends = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
            ring[ends] = ring[ends[::-1]] = True
    return ring


def _formula(numbers: IntArray) -> str:
    """Hill order: C, H, then by the alphabet."""
    from rdkit.Chem import GetPeriodicTable

    table = GetPeriodicTable()
    counts = Counter(table.GetElementSymbol(int(number)) for number in numbers)
    first = [symbol for symbol in ("C", "H") if symbol in counts and "C" in counts]
    order = [*first, *sorted(symbol for symbol in counts if symbol not in first)]
    return "".join(f"{symbol}{counts[symbol] if counts[symbol] > 1 else ''}" for symbol in order)
