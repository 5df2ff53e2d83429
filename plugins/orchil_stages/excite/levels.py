"""First-order shifts of the orbital levels, resolved by shell, coordination and charge.

The shift of a basis function is a smooth function of the geometry (fractional coordination number) and of the
density (atomic charge), never of bond symbols, so that the energies are smooth along a distortion.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray, IntArray

from orchil_stages.ground_state import BOHR_ANGSTROM

from .parameters import CHARGED, Parameters, level_kinds
from .window import HOPPING_CLASSES, Window

_WIDTH = 0.3
"""Width of the interpolation between coordination numbers."""

# Covalent radii in angstrom: Pyykko, Atsumi, Chem. Eur. J. 15, 186 (2009), metals apart
_RADII = {
    1: 0.32, 3: 1.33, 5: 0.85, 6: 0.75, 7: 0.71, 8: 0.63, 9: 0.64, 11: 1.55, 12: 1.39, 13: 1.26,
    14: 1.16, 15: 1.11, 16: 1.03, 17: 0.99, 19: 1.96, 32: 1.21, 33: 1.21, 34: 1.16, 35: 1.14,
    50: 1.40, 52: 1.36, 53: 1.33,
}  # fmt: skip


def coordination_numbers(numbers: IntArray, positions: FloatArray) -> FloatArray:
    """Fractional coordination number of each atom (positions in bohr).

    Counting function of the D3 dispersion model: Grimme, Antony, Ehrlich, Krieg, J. Chem. Phys. 132, 154104
    (2010).
    """
    counts: FloatArray = _bond_counts(numbers, positions).sum(axis=1)
    return counts


def bonded(numbers: IntArray, positions: FloatArray) -> NDArray[np.bool_]:
    """Which atoms are bonded by distance (positions in bohr): counted by more than a half, shape (atoms,
    atoms).
    """
    return _bond_counts(numbers, positions) > 0.5


def _bond_counts(numbers: IntArray, positions: FloatArray) -> FloatArray:
    radii = np.array([_RADII[int(n)] for n in numbers]) / BOHR_ANGSTROM
    distance = distances(positions)
    np.fill_diagonal(distance, np.inf)
    bond = 4.0 / 3.0 * (radii[:, None] + radii[None, :])
    counts: FloatArray = 1.0 / (1.0 + np.exp(-16.0 * (bond / distance - 1.0)))
    return counts


def distances(positions: FloatArray) -> FloatArray:
    """Matrix of distances between atoms, same unit as the positions."""
    steps = positions[:, None, :] - positions[None, :, :]
    matrix: FloatArray = np.sqrt((steps**2).sum(axis=2))
    return matrix


@dataclass(frozen=True)
class LevelFeatures:
    """How much each trained level and charge response enters the shift of each basis function."""

    kinds: FloatArray  # (functions, level kinds)
    charges: FloatArray  # (functions, charged elements)


def level_features(window: Window) -> LevelFeatures:
    """Features of the basis functions; rows of ``kinds`` sum to 1 for elements that are trained, else 0."""
    coordination = coordination_numbers(window.numbers, window.positions)
    atom, momentum = window.where.atom, window.where.momentum
    number = window.numbers[atom]
    kinds = np.zeros((len(atom), len(level_kinds())))
    for (element, shell), columns in _kinds_by_shell().items():
        rows = np.flatnonzero((number == element) & (momentum == shell))
        if len(rows):
            centres = [level_kinds()[c].coordination or 0.0 for c in columns]
            kinds[rows[:, None], columns] = _soft_choice(coordination[atom[rows]], np.array(centres))
    charges = (number[:, None] == np.array(CHARGED)) * window.charges[atom][:, None]
    return LevelFeatures(kinds, charges)


@cache
def _kinds_by_shell() -> dict[tuple[int, int], list[int]]:
    groups: dict[tuple[int, int], list[int]] = {}
    for place, kind in enumerate(level_kinds()):
        groups.setdefault((kind.number, kind.momentum), []).append(place)
    return groups


def _soft_choice(coordination: FloatArray, centres: FloatArray) -> FloatArray:
    """Weights over the centres, summing to 1, smooth in the coordination number; shape (atoms, centres)."""
    closeness = -((coordination[:, None] - centres) ** 2) / (2 * _WIDTH**2)
    weights = np.exp(closeness - closeness.max(axis=1, keepdims=True))
    chosen: FloatArray = weights / weights.sum(axis=1, keepdims=True)
    return chosen


@dataclass(frozen=True)
class Levels:
    """Corrected one-electron matrices in eV: (occupied, occupied) and (virtual, virtual)."""

    occupied: FloatArray
    virtual: FloatArray


def corrected_levels(window: Window, features: LevelFeatures, parameters: Parameters) -> Levels:
    """GFN2 levels, scaled, with the trained shifts and couplings on top."""
    o = window.occupied
    hop = np.einsum("c,cmn->mn", parameters.several(hopping_names()), window.hopping)
    blocks = []
    for side, part in (("occ", slice(None, o)), ("virt", slice(o, None))):
        shift = features.kinds @ parameters.several(level_names(side))
        shift = shift + features.charges @ parameters.several(charge_names(side))
        c = window.loewdin[:, part]
        block = (c * shift[:, None]).T @ c + hop[part, part]
        block[np.diag_indices_from(block)] += parameters["gap_scale"] * window.energies[part]
        blocks.append(block)
    return Levels(*blocks)


@cache
def level_names(side: str) -> tuple[str, ...]:
    """Parameter names of the level shifts of one side, in the order of the features."""
    return tuple(f"{side}:{kind.name}" for kind in level_kinds())


@cache
def charge_names(side: str) -> tuple[str, ...]:
    """Parameter names of the charge responses of one side."""
    return tuple(f"{side}_charge:{number}" for number in CHARGED)


@cache
def hopping_names() -> tuple[str, ...]:
    """Parameter names of the p-p couplings."""
    return tuple(f"hop:{one}-{other}" for one, other in HOPPING_CLASSES)
