"""Is the relaxed structure still the molecule that was asked for?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray, TopologyChanged
from rdkit.Chem import GetPeriodicTable

FORMED, BROKEN = 1.2, 1.35
"""Times the sum of covalent radii: closer is a bond, farther is none; in between the old state stands."""
DATIVE_ACCEPTORS, DATIVE_DONORS = (14, 15, 32, 33), (7, 8, 9)
"""Drawings leave out the fifth and sixth bonds of Si, P, Ge, As: they do not count as formed."""


@dataclass(frozen=True)
class Change:
    """One bond made or broken: its label such as "C10-O18", the atoms and the sum of their covalent radii."""

    label: str
    atoms: tuple[int, int]
    formed: bool
    distance_angstrom: float
    radii_angstrom: float

    def __str__(self) -> str:
        verb = "formed" if self.formed else "broke"
        return f"bond {self.label} {verb} ({self.distance_angstrom:.2f} angstrom)"


def find_changes(numbers: IntArray, bonds: IntArray, positions_angstrom: FloatArray) -> list[Change]:
    """Bonds made or broken against the list of bonds; a proton that moved makes one of each."""
    table = GetPeriodicTable()
    radii = np.array([table.GetRcovalent(int(number)) for number in numbers])
    sums = radii[:, None] + radii[None]
    distance = np.linalg.norm(positions_angstrom[:, None] - positions_angstrom[None], axis=-1)
    bonded = np.zeros(sums.shape, dtype=bool)
    bonded[bonds[:, 0], bonds[:, 1]] = bonded[bonds[:, 1], bonds[:, 0]] = True
    acceptor, donor = np.isin(numbers, DATIVE_ACCEPTORS), np.isin(numbers, DATIVE_DONORS)
    dative = (acceptor[:, None] & donor[None]) | (donor[:, None] & acceptor[None])
    changed = np.where(bonded, distance > BROKEN * sums, (distance < FORMED * sums) & ~dative)
    return [
        Change(
            label="-".join(f"{table.GetElementSymbol(int(numbers[k]))}{k + 1}" for k in (i, j)),
            atoms=(i, j),
            formed=not bonded[i, j],
            distance_angstrom=float(distance[i, j]),
            radii_angstrom=float(sums[i, j]),
        )
        for i, j in np.argwhere(np.triu(changed, 1)).tolist()
    ]


def check_topology(numbers: IntArray, bonds: IntArray, positions_angstrom: FloatArray) -> None:
    """Raise ``TopologyChanged`` naming the bonds (atoms counted from 1) that were made or broken."""
    changes = find_changes(numbers, bonds, positions_angstrom)
    if changes:
        named = "; ".join(str(change) for change in changes[:4])
        raise TopologyChanged(f"the relaxed structure is another molecule: {named}")
