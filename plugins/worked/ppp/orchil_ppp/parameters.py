"""Published numbers of the pi-electron Hamiltonian. Nothing here is fitted to anything of this project.

Valence-state ionisation energies and electron affinities: D. L. Beveridge, J. Hinze, J. Am. Chem. Soc. 93, 3107
(1971), mostly after J. Hinze, H. H. Jaffe, J. Am. Chem. Soc. 84, 540 (1962). One-centre repulsion is their
difference (Pariser 1953). Resonance integrals: R. Pariser, R. G. Parr, J. Chem. Phys. 21, 767 (1953) for two carbon
atoms, times the ratios of F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980) for other pairs, which were made to
repeat pi-electron calculations of this kind.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, OutOfScope


@dataclass(frozen=True)
class Site:
    """A kind of atom in a pi system: ionisation energy and electron affinity in eV, electrons it brings."""

    ionisation_ev: float
    affinity_ev: float
    electrons: int

    @property
    def repulsion_ev(self) -> float:
        """Two electrons in one orbital."""
        return self.ionisation_ev - self.affinity_ev


SITES = {
    "C": Site(11.16, 0.03, 1),
    "N1": Site(14.12, 1.78, 1),
    "N2": Site(28.71, 11.96, 2),
    "O1": Site(17.70, 2.47, 1),
    "O2": Site(34.08, 15.30, 2),
    "F": Site(40.70, 18.52, 2),
    "S1": Site(12.70, 2.76, 1),
    "S2": Site(23.74, 11.65, 2),
    "Cl": Site(27.28, 14.51, 2),
}
"""``1`` and ``2``: the atom brings one electron (two sigma bonds or fewer) or two (one more sigma bond)."""

STAND_INS = {"Br": "Cl", "I": "Cl"}
"""Bromine and iodine are not in the set; as donors of little weight they are taken for chlorine."""

RATIOS = {
    ("C", "C"): 1.00,
    ("C", "Cl"): 0.62,
    ("C", "F"): 0.52,
    ("C", "N1"): 1.02,
    ("C", "N2"): 0.89,
    ("C", "O1"): 1.06,
    ("C", "O2"): 0.66,
    ("C", "S1"): 0.81,
    ("C", "S2"): 0.69,
    ("N1", "N1"): 1.09,
    ("N1", "N2"): 0.99,
    ("N1", "O1"): 1.14,
    ("N1", "O2"): 0.80,
    ("N1", "S1"): 0.83,
    ("N1", "S2"): 0.78,
    ("N2", "N2"): 0.98,
    ("N2", "O1"): 1.13,
    ("N2", "O2"): 0.89,
    ("N2", "S1"): 0.68,
    ("N2", "S2"): 0.73,
    ("O1", "O1"): 1.26,
    ("O1", "O2"): 1.02,
    ("O1", "S1"): 0.84,
    ("O1", "S2"): 0.85,
    ("O2", "O2"): 0.95,
    ("O2", "S1"): 0.43,
    ("O2", "S2"): 0.54,
    ("S1", "S1"): 0.68,
    ("S1", "S2"): 0.58,
    ("S2", "S2"): 0.63,
}
"""Resonance integral of a bond over that of two carbon atoms."""

BETA_CC_EV = -2.39
"""Of two carbon atoms in benzene (Pariser, Parr 1953)."""


def resonance_ev(first: str, second: str) -> float:
    """Resonance integral of a planar bond between two kinds of atoms; :class:`OutOfScope` names an unknown pair."""
    pair = min(first, second), max(first, second)
    if pair not in RATIOS:
        raise OutOfScope(f"a bond between {pair[0]} and {pair[1]} in the pi system: no published resonance integral")
    return BETA_CC_EV * RATIOS[pair]


def array_of(kinds: list[str], field: str) -> FloatArray:
    """One number for each atom."""
    return np.array([getattr(SITES[kind], field) for kind in kinds], dtype=float)
