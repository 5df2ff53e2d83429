"""Symmetry operations that a geometry has within a tolerance.

An operation is found by laying one triple of points (centre of the molecule and two atoms) over every other triple of
the same kind; what maps the whole molecule onto itself is kept, best fitted, and cut down to a closed group.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from itertools import product

import numpy as np
from orchil_schemas import FloatArray, IntArray

TOLERANCE_ANGSTROM = 0.15
"""How far an atom may end beside its image. Minima of GFN2-xTB miss their symmetry by some 0.01 angstrom,
shallow torsions and flat amino groups by 0.1.
"""
HYDROGEN_FACTOR = 2.0
"""Hydrogen atoms may miss by so many times more: they carry next to nothing of an excitation."""
BOND_TOLERANCE_ANGSTROM = 0.03
"""How far a bond between heavy atoms may differ from its image: an alternation of bonds is felt by the electrons where
a shallow torsion of the same displacement is not.
"""
_LONGEST_BOND = 2.2
_FLAT = 1e-3


@dataclass(frozen=True)
class Operation:
    """One operation: orthogonal matrix (3, 3), image of each atom (atoms,), largest miss in angstrom (that of
    hydrogen atoms divided by HYDROGEN_FACTOR).
    """

    matrix: FloatArray
    images: IntArray
    miss: float

    @cached_property
    def sign(self) -> int:
        """1 for a rotation, -1 for a reflection, inversion or improper rotation."""
        return 1 if np.linalg.det(self.matrix) > 0 else -1

    @cached_property
    def key(self) -> tuple[int, ...]:
        """What tells it from the others of its group, exactly."""
        return (self.sign, *(int(image) for image in self.images))


@dataclass(frozen=True)
class SymmetryGroup:
    """A closed group of operations, the identity first; ``table[i, j]`` is the place of operation i after j."""

    operations: tuple[Operation, ...]
    table: IntArray

    @property
    def order(self) -> int:
        """Number of operations."""
        return len(self.operations)

    @property
    def miss(self) -> float:
        """Largest miss of an atom under any operation, angstrom."""
        return max(operation.miss for operation in self.operations)


def symmetry_group(numbers: IntArray, positions: FloatArray, tolerance: float) -> SymmetryGroup:
    """The largest closed group within the tolerance; positions in angstrom.

    The infinite axis of a linear molecule counts as a twofold one.
    """
    centred = positions - np.average(positions, axis=0, weights=numbers)
    frame = _linear_frame(centred)
    if frame is not None:
        return _linear_group(numbers, centred, frame, tolerance)
    found: dict[tuple[int, ...], Operation] = {}
    for matrix in _candidates(numbers, centred, tolerance):
        operation = _fit(numbers, centred, matrix, tolerance)
        if operation is not None and (operation.key not in found or operation.miss < found[operation.key].miss):
            found[operation.key] = operation
    still = np.arange(len(numbers))
    return _closed(sorted(found.values(), key=lambda o: (o.sign < 0 or not np.array_equal(o.images, still), o.miss)))


def _candidates(numbers: IntArray, centred: FloatArray, tolerance: float) -> Iterator[FloatArray]:
    """Matrices that lay a chosen pair of atoms over every pair like it."""
    heavy = np.flatnonzero(numbers > 1)
    some = heavy if len(heavy) > 1 else np.arange(len(numbers))
    if len(some) < 3 or _linear_frame(centred[some]) is not None:
        some = np.arange(len(numbers))
    radius = np.linalg.norm(centred, axis=1)
    kinds = _kinds(numbers[some], radius[some], centred[some], tolerance)
    first, second = _reference(kinds, centred[some])
    here = _axes(centred[some][first], centred[some][second])
    apart = np.linalg.norm(centred[some][first] - centred[some][second])
    for one, other in product(np.flatnonzero(kinds[first]), np.flatnonzero(kinds[second])):
        gap = np.linalg.norm(centred[some][one] - centred[some][other])
        if one != other and abs(gap - apart) < 2 * tolerance:
            there = _axes(centred[some][one], centred[some][other])
            yield there.T @ here
            yield there.T @ np.diag([1.0, 1.0, -1.0]) @ here


def _linear_frame(centred: FloatArray) -> FloatArray | None:
    """Axes of a linear arrangement as rows (along first), None when it is not linear."""
    _, spread, axes = np.linalg.svd(centred, full_matrices=True)
    return axes if len(spread) < 2 or spread[1] < _FLAT * max(spread[0], 1.0) else None


def _linear_group(numbers: IntArray, centred: FloatArray, frame: FloatArray, tolerance: float) -> SymmetryGroup:
    """D2h or C2v, which stand for the groups of linear molecules: sign changes of the axes of the frame."""
    kept, signs = [], []
    for flips in product((1, -1), repeat=3):
        matrix = frame.T @ np.diag(flips).astype(float) @ frame
        images = _images(numbers, centred, matrix)
        miss = np.inf if images is None else float(np.linalg.norm(centred @ matrix.T - centred[images], axis=1).max())
        if images is not None and miss < tolerance:
            kept.append(Operation(matrix, images, miss))
            signs.append(flips)
    products = [[signs.index(tuple(a * b for a, b in zip(i, j, strict=True))) for j in signs] for i in signs]
    return SymmetryGroup(tuple(kept), np.array(products))


def _kinds(numbers: IntArray, radius: FloatArray, centred: FloatArray, tolerance: float) -> FloatArray:
    """Which atoms could be images of which: element, distance from the centre and sorted distances agree."""
    steps = np.sort(np.linalg.norm(centred[:, None] - centred[None], axis=2), axis=1)
    alike = np.abs(steps[:, None] - steps[None]).max(axis=2) < 2 * tolerance
    same: FloatArray = (numbers[:, None] == numbers) & (np.abs(radius[:, None] - radius) < tolerance) & alike
    return same


def _reference(kinds: FloatArray, centred: FloatArray) -> tuple[int, int]:
    """Two atoms with few possible images that span a plane with the centre."""
    few = np.argsort(kinds.sum(axis=1), kind="stable")
    area = np.linalg.norm(np.cross(centred[:, None], centred[None]), axis=2)
    largest = area.max()
    for first in few:
        for second in few:
            if area[first, second] > 0.2 * largest:
                return int(first), int(second)
    raise AssertionError("a set that is not linear spans a plane")


def _axes(one: FloatArray, other: FloatArray) -> FloatArray:
    """Right-handed orthonormal rows from two directions."""
    x = one / max(float(np.linalg.norm(one)), 1e-12)
    z = np.cross(one, other)
    z = z / max(float(np.linalg.norm(z)), 1e-12)
    return np.array([x, np.cross(z, x), z])


def _fit(numbers: IntArray, centred: FloatArray, matrix: FloatArray, tolerance: float) -> Operation | None:
    """The operation near a matrix that fits best, None when the molecule has none there."""
    slack = np.where(numbers > 1, 1.0, HYDROGEN_FACTOR)
    images = _images(numbers, centred, matrix)
    if images is None:
        return None
    left, _, right = np.linalg.svd((centred * numbers[:, None]).T @ centred[images])
    best = (left @ right).T
    if np.linalg.det(best) * np.linalg.det(matrix) < 0:
        # a flat molecule fits a rotation and a reflection equally well: keep the handedness asked for
        left[:, -1] *= -1
        best = (left @ right).T
    miss = float((np.linalg.norm(centred @ best.T - centred[images], axis=1) / slack).max())
    return Operation(best, images, miss) if miss < tolerance and _bonds_agree(numbers, centred, images) else None


def _bonds_agree(numbers: IntArray, centred: FloatArray, images: IntArray) -> bool:
    heavy = numbers > 1
    apart = np.linalg.norm(centred[:, None] - centred[None], axis=2)
    bonds = (apart < _LONGEST_BOND) & heavy[:, None] & heavy
    return bool(np.abs(apart - apart[np.ix_(images, images)])[bonds].max(initial=0.0) < BOND_TOLERANCE_ANGSTROM)


def _images(numbers: IntArray, centred: FloatArray, matrix: FloatArray) -> IntArray | None:
    moved = centred @ matrix.T
    apart = np.linalg.norm(moved[:, None] - centred[None], axis=2)
    apart[numbers[:, None] != numbers] = np.inf
    images: IntArray = apart.argmin(axis=1)
    return images if len(set(images.tolist())) == len(images) else None


def _closed(operations: list[Operation]) -> SymmetryGroup:
    """The group that closes with the smallest misses: the worst operation goes until it does."""
    kept = operations
    while (table := _table(kept)) is None:
        kept = kept[:-1]
    return SymmetryGroup(tuple(kept), table)


def _table(operations: list[Operation]) -> IntArray | None:
    """Products of all pairs, None when one lies outside."""
    places = {operation.key: place for place, operation in enumerate(operations)}
    table = np.zeros((len(operations), len(operations)), dtype=np.int64)
    for i, first in enumerate(operations):
        for j, second in enumerate(operations):
            place = places.get((first.sign * second.sign, *first.images[second.images].tolist()))
            if place is None:
                return None
            table[i, j] = place
    return table
