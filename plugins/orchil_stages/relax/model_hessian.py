"""Model force constants for the internal coordinates, in hartree and bohr or radian.

Stretches and bends have the form of Lindh, Bernhardsson, Karlstroem, Malmqvist, Chem. Phys. Lett. 241, 423
(1995): a number times exponentials of the squared bond lengths along the coordinate. Every number is
scaled by kind of bond, angle or torsion; the scales in ``force_constants.csv`` were fitted to numerical
GFN2-xTB Hessians of dyes so that the model times the inverse of the true Hessian is close to one.
"""

from __future__ import annotations

import csv
from functools import cache
from importlib.resources import files

import numpy as np
from orchil_schemas import FloatArray, IntArray
from rdkit import Chem

from .internals import Internals

STRETCH, BEND, TORSION, PLANE = 0.45, 0.15, 0.02, 0.05
REFERENCE = np.array([[1.35, 2.10, 2.53], [2.10, 2.87, 3.40], [2.53, 3.40, 3.40]])
STEEPNESS = np.array([[1.0, 0.3949, 0.3949], [0.3949, 0.28, 0.28], [0.3949, 0.28, 0.28]])
BOND_CLASSES_BOHR = (2.646, 2.721)
"""1.40 and 1.44 angstrom: torsions are stiff about shorter bonds, soft about longer ones."""


def force_constants(internals: Internals, numbers: IntArray, bonds: IntArray, x: FloatArray) -> FloatArray:
    """Diagonal force constants in the order of the coordinates at positions ``x`` (bohr)."""
    base = _base(internals, numbers, x)
    scales, fallback = _scales()
    return np.array(
        [
            constant * scales.get(kind, fallback[kind[0]])
            for constant, kind in zip(base.tolist(), kinds(internals, numbers, bonds, x), strict=True)
        ]
    )


def _base(internals: Internals, numbers: IntArray, x: FloatArray) -> FloatArray:
    """Unscaled constants; those of the torsions about one bond share one constant."""
    row = np.digitize(numbers, [3, 11])

    def strength(*atoms: IntArray) -> FloatArray:
        i, j = atoms
        squared = np.sum((x[i] - x[j]) ** 2, axis=1)
        return np.asarray(np.exp(STEEPNESS[row[i], row[j]] * (REFERENCE[row[i], row[j]] ** 2 - squared)))

    def bend(atoms: IntArray) -> FloatArray:
        return BEND * strength(atoms[:, 0], atoms[:, 1]) * strength(atoms[:, 1], atoms[:, 2])

    linear, torsions = bend(internals.linear), internals.torsions
    _, which, count = np.unique(torsions[:, 1:3], axis=0, return_inverse=True, return_counts=True)
    return np.concatenate(
        [
            STRETCH * strength(internals.stretches[:, 0], internals.stretches[:, 1]),
            bend(internals.bends),
            linear,
            linear,
            TORSION / count[which.reshape(-1)] if len(torsions) else np.empty(0),
            np.full(len(internals.planes), PLANE),
        ]
    )


Kind = tuple[str, str]
"""Kind of coordinate and what surrounds it, for example ("stretch", "C3 N2")."""


def kinds(internals: Internals, numbers: IntArray, bonds: IntArray, x: FloatArray) -> list[Kind]:
    """The row of the table that each coordinate belongs to: elements, numbers of neighbours, rings."""
    degree = np.bincount(bonds.ravel(), minlength=len(numbers))
    symbol = Chem.GetPeriodicTable().GetElementSymbol
    names = [f"{symbol(int(number))}{count}" for number, count in zip(numbers, degree, strict=True)]
    hydrogen = (numbers == 1).tolist()
    in_ring = _ring_bonds(len(numbers), bonds)
    found: list[Kind] = [("stretch", _pair(names, i, j)) for i, j in internals.stretches.tolist()]
    for a, b, c in internals.bends.tolist():
        ring = " ring" if {_key(a, b), _key(b, c)} <= in_ring else ""
        found.append(("bend", f"{names[b]} {hydrogen[a] + hydrogen[c]}H{ring}"))
    found.extend([("linear", "")] * (2 * len(internals.linear)))
    bonded = {_key(i, j) for i, j in bonds.tolist()}
    for _, b, c, _ in internals.torsions.tolist():
        found.append(("torsion", _axis_kind(names, b, c, x, in_ring) if _key(b, c) in bonded else "linear axis"))
    for b, *near in internals.planes.tolist():
        found.append(("plane", f"{names[b]} {sum(hydrogen[i] for i in near)}H"))
    return found


def _key(i: int, j: int) -> tuple[int, int]:
    return (i, j) if i < j else (j, i)


def _pair(names: list[str], i: int, j: int) -> str:
    return " ".join(sorted((names[i], names[j])))


def _axis_kind(names: list[str], b: int, c: int, x: FloatArray, in_ring: set[tuple[int, int]]) -> str:
    """Both ends, ring or chain, and for bonds between flat atoms the length class (0 short, 2 long)."""
    flat = int(names[b][-1]) <= 3 and int(names[c][-1]) <= 3
    length = float(np.linalg.norm(x[b] - x[c]))
    return (
        _pair(names, b, c)
        + (" ring" if _key(b, c) in in_ring else " chain")
        + (f" {int(np.digitize(length, BOND_CLASSES_BOHR))}" if flat else "")
    )


def _ring_bonds(atoms: int, bonds: IntArray) -> set[tuple[int, int]]:
    graph = Chem.RWMol()
    for _ in range(atoms):
        graph.AddAtom(Chem.Atom(0))
    for i, j in bonds.tolist():
        graph.AddBond(i, j, Chem.BondType.SINGLE)
    Chem.FastFindRings(graph)
    return {_key(b.GetBeginAtomIdx(), b.GetEndAtomIdx()) for b in graph.GetBonds() if b.IsInRing()}


@cache
def _scales() -> tuple[dict[Kind, float], dict[str, float]]:
    """(scale of every kind in the table, scale for the rest by kind of coordinate)."""
    text = files(__package__).joinpath("force_constants.csv").read_text(encoding="utf-8")
    rows = list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))
    table = {(row["coordinate"], row["around"]): float(row["scale"]) for row in rows}
    return table, {coordinate: scale for (coordinate, around), scale in table.items() if around == "other"}
