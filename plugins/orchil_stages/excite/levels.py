"""First-order shifts of the orbital levels, resolved by shell, surroundings, direction and charge.

The shift of a basis function is a smooth function of the geometry (neighbours, fractional coordination number,
directions of bonds) and of the density (atomic charge), never of bond symbols, so that the energies are smooth along a
distortion.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from orchil_schemas import FloatArray

from .environment import bond_counts, bond_directions, coordination_numbers, neighbour_directions
from .parameters import CHARGED, NEIGHBOURED, SHAPED, Parameters, level_kinds
from .window import HOPPING_CLASSES, Window

_WIDTH = 0.3
"""Width of the interpolation between coordination numbers."""


@dataclass(frozen=True)
class LevelFeatures:
    """What the trained numbers multiply.

    diagonal: (functions, numbers) for the shift of each basis function; shapes: (numbers, m, m) for the shifts of p
    functions by their direction, between the orbitals of the window.
    """

    diagonal: FloatArray
    shapes: FloatArray


def level_features(window: Window) -> LevelFeatures:
    """Features of a window; they do not depend on any trained number."""
    return LevelFeatures(np.hstack([_kinds(window), _charges(window), _neighbours(window)]), _shapes(window))


def _kinds(window: Window) -> FloatArray:
    """Rows sum to 1 for elements that are trained, else 0; shape (functions, level kinds)."""
    coordination = coordination_numbers(window.numbers, window.positions)
    atom, momentum = window.where.atom, window.where.momentum
    number = window.numbers[atom]
    kinds = np.zeros((len(atom), len(level_kinds())))
    for (element, shell), columns in _kinds_by_shell().items():
        rows = np.flatnonzero((number == element) & (momentum == shell))
        if len(rows):
            centres = [level_kinds()[c].coordination or 0.0 for c in columns]
            kinds[rows[:, None], columns] = _soft_choice(coordination[atom[rows]], np.array(centres))
    return kinds


def _charges(window: Window) -> FloatArray:
    """Atomic charge in the column of the element, shape (functions, elements)."""
    atom = window.where.atom
    charges: FloatArray = (window.numbers[atom][:, None] == np.array(CHARGED)) * window.charges[atom][:, None]
    return charges


def _neighbours(window: Window) -> FloatArray:
    """For p functions: number of neighbours that are neither C nor H, of H, and the charge of all neighbours."""
    atom = window.where.atom
    counts = bond_counts(window.numbers, window.positions)
    hetero = counts @ ~np.isin(window.numbers, (1, 6))
    hydrogen = counts @ (window.numbers == 1)
    around = counts @ window.charges
    p_type = (window.where.momentum == 1)[:, None]
    element = p_type & (window.numbers[atom][:, None] == np.array(NEIGHBOURED))
    return np.hstack([element * values[atom][:, None] for values in (hetero, hydrogen, around)])


def _shapes(window: Window) -> FloatArray:
    """Window matrix elements of the bond directions on the p functions of each element group."""
    starts = np.flatnonzero((window.where.momentum == 1) & (np.diff(window.where.shell, prepend=-1) != 0))
    atoms = window.where.atom[starts]
    c = window.loewdin[starts[:, None] + np.arange(3)]
    made = []
    for tensors in (bond_directions, neighbour_directions):
        found = tensors(window.numbers, window.positions)[atoms]
        for group in SHAPED:
            inside = np.isin(window.numbers[atoms], group)
            half = found[inside] @ c[inside]
            made.append(np.einsum("axm,axn->mn", c[inside], half, optimize=True))
    return np.array(made)


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
    hop = np.tensordot(parameters.several(hopping_names()), window.hopping, axes=1)
    blocks = []
    for side, part in (("occ", slice(None, o)), ("virt", slice(o, None))):
        shift = features.diagonal @ parameters.several(diagonal_names(side))
        shape = np.tensordot(parameters.several(shape_names(side)), features.shapes[:, part, part], axes=1)
        c = window.loewdin[:, part]
        block = (c * shift[:, None]).T @ c + shape + hop[part, part]
        block[np.diag_indices_from(block)] += parameters["gap_scale"] * window.energies[part]
        blocks.append(block)
    return Levels(*blocks)


@cache
def diagonal_names(side: str) -> tuple[str, ...]:
    """Parameter names of the shifts of one side, in the order of ``LevelFeatures.diagonal``."""
    kinds = (f"{side}:{kind.name}" for kind in level_kinds())
    charges = (f"{side}_charge:{number}" for number in CHARGED)
    around = (f"{side}_{what}:{number}" for what in ("hetero", "hydrogen", "around") for number in NEIGHBOURED)
    return (*kinds, *charges, *around)


@cache
def shape_names(side: str) -> tuple[str, ...]:
    """Parameter names of the shifts by direction, in the order of ``LevelFeatures.shapes``."""
    return tuple(f"{side}_{what}:{group[0]}" for what in ("along", "plane") for group in SHAPED)


@cache
def hopping_names() -> tuple[str, ...]:
    """Parameter names of the p-p couplings."""
    return tuple(f"hop:{one}-{other}" for one, other in HOPPING_CLASSES)
