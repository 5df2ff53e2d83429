"""Irreducible representations of a finite group of operations, with their Mulliken symbols.

The characters come from the group itself: an element of the centre of its algebra is diagonalised in the regular
representation, whose eigenspaces are the representations (Serre, Linear Representations of Finite Groups, Springer
1977, from memory). Complex-conjugate pairs come out as one real representation, as chemists write them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray

from .elements import Elements, elements, schoenflies
from .operations import SymmetryGroup

_SEED = 7
_SAME = 1e-6


@dataclass(frozen=True)
class Irreps:
    """Irreducible representations of a point group.

    labels: Mulliken symbols; characters (irreps, operations), real; projectors (irreps, operations): weight of each
    operation in the projector, so that the share of a vector v is sum_g projectors[:, g] <v|g|v>; allowed (irreps,):
    1 where a component of the dipole moment transforms so, else 0.
    """

    point_group: str
    labels: tuple[str, ...]
    characters: FloatArray
    projectors: FloatArray
    allowed: FloatArray


def irreps(group: SymmetryGroup, numbers: IntArray, positions: FloatArray) -> Irreps:
    """Representations of a group found on a molecule; atoms fix the conventions (see :mod:`.elements`)."""
    projectors, dimensions = _representations(group)
    characters = projectors * group.order / dimensions[:, None]
    found = elements(group, numbers, positions)
    vector = np.array([np.trace(operation.matrix) for operation in group.operations])
    allowed = (np.abs(projectors @ vector) > 0.5 * dimensions / group.order).astype(float)
    labels = _labels(characters, found)
    order = sorted(range(len(labels)), key=lambda place: labels[place])
    return Irreps(
        schoenflies(found),
        tuple(labels[place] for place in order),
        characters[order],
        projectors[order],
        allowed[order],
    )


def _representations(group: SymmetryGroup) -> tuple[FloatArray, FloatArray]:
    """Projector coefficients (irreps, operations) and, for each, the d that turns them into characters."""
    table, order = group.table, group.order
    regular = np.zeros((order, order, order))
    for g in range(order):
        regular[g, table[g], np.arange(order)] = 1.0
    values, vectors = np.linalg.eigh(np.tensordot(_central(table), regular, axes=1))
    starts = np.flatnonzero(np.diff(values, prepend=-np.inf) > _SAME)
    spaces = np.split(vectors, starts[1:], axis=1)
    projectors = np.array([np.einsum("xk,gxy,yk->g", space, regular, space) for space in spaces]) / order
    sizes = np.array([space.shape[1] for space in spaces], dtype=float)
    roots = np.round(np.sqrt(sizes))
    # a pair of complex-conjugate representations of dimension d fills 2 d^2 places
    return projectors, np.where(np.abs(roots**2 - sizes) < 0.5, roots, np.sqrt(sizes / 2.0))


def _central(table: IntArray) -> FloatArray:
    """Random coefficients, equal within a class and for an operation and its inverse."""
    order = len(table)
    inverse = np.argmin(table, axis=1)  # the identity has place 0
    random = np.random.default_rng(_SEED).normal(size=order)
    conjugates = table[table, inverse[:, None]]
    averaged: FloatArray = np.array([random[conjugates[:, g]].mean() for g in range(order)])
    mean: FloatArray = 0.5 * (averaged + averaged[inverse])
    return mean


def _labels(characters: FloatArray, found: Elements) -> list[str]:
    labels = [_letter(row, found) + _index(row, found) + _parity(row, found) for row in characters]
    for place, label in enumerate(labels):
        if labels.count(label) > 1:
            labels[place] = f"{label}({place + 1})"
    return labels


def _letter(row: FloatArray, found: Elements) -> str:
    size = round(row[0])
    if size > 1:
        return {2: "E", 3: "T", 4: "G", 5: "H"}.get(size, f"{size}-fold ")
    if found.three_axes:
        return "A" if all(row[axis] > 0 for axis in found.three_axes) else "B"
    return "B" if found.principal is not None and not found.cubic and row[found.principal] < 0 else "A"


def _index(row: FloatArray, found: Elements) -> str:
    """1, 2, 3 behind the letter."""
    size = round(row[0])
    if found.three_axes:
        signs = [row[axis] > 0 for axis in found.three_axes]
        return "" if all(signs) else str(1 + signs.index(True))
    if size == 2 and not found.cubic:
        return _turns(row, found)
    reference = found.principal if found.cubic else found.across
    if reference is None or size in {2, 4, 5}:
        return ""
    return "1" if row[reference] > 0 else "2"


def _turns(row: FloatArray, found: Elements) -> str:
    """K of E_k, from the character 2 cos(2 pi k / n) of the principal operation; nothing where there is one E."""
    if found.principal is None or found.order <= 4:
        return ""
    turns = found.order * np.arccos(np.clip(row[found.principal] / 2.0, -1.0, 1.0)) / (2.0 * np.pi)
    return str(round(turns))


def _parity(row: FloatArray, found: Elements) -> str:
    if found.inversion is not None:
        return "g" if row[found.inversion] > 0 else "u"
    if found.plane is not None:
        return "'" if row[found.plane] > 0 else "''"
    return ""
