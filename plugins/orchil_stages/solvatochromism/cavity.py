"""Onsager's sphere of a dye, from its van der Waals volume."""

from __future__ import annotations

from math import pi

# cubic angstrom; Zhao, Abraham, Zissimos, J. Org. Chem. 68, 7368 (2003), Table 2 (radii of Bondi); Ge, As, Te by their
# Bondi or similar radii
_ATOM = {
    1: 7.24,
    5: 40.48,
    6: 20.58,
    7: 15.60,
    8: 14.71,
    9: 13.31,
    14: 38.79,
    15: 24.43,
    16: 24.43,
    17: 22.45,
    32: 39.0,
    33: 26.52,
    34: 28.73,
    35: 26.52,
    52: 36.62,
    53: 32.52,
}
_BOND, _AROMATIC_RING, _OTHER_RING = 5.92, 14.7, 3.8


def volume(smiles: str) -> float:
    """Van der Waals volume (cubic angstrom) by atoms, bonds and rings: Zhao, Abraham, Zissimos 2003."""
    from rdkit import Chem

    molecule = Chem.AddHs(Chem.MolFromSmiles(smiles))
    atoms = sum(_ATOM[atom.GetAtomicNum()] for atom in molecule.GetAtoms())
    rings = molecule.GetRingInfo().BondRings()
    aromatic = sum(all(molecule.GetBondWithIdx(i).GetIsAromatic() for i in ring) for ring in rings)
    other = len(rings) - aromatic
    return float(atoms - _BOND * molecule.GetNumBonds() - _AROMATIC_RING * aromatic - _OTHER_RING * other)


def onsager_radius(volume_angstrom3: float) -> float:
    """Radius (angstrom) of the sphere of a van der Waals volume and half an angstrom more for the first solvent shell.

    The half angstrom is common practice in quantum chemistry programs.
    """
    return float((3 * volume_angstrom3 / (4 * pi)) ** (1 / 3)) + 0.5
