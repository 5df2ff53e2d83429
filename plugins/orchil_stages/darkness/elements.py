"""Symmetry elements behind a group of operations: axes, planes, the name of the group and the conventions of labels.

Conventions (Mulliken, J. Chem. Phys. 23, 1997, 1955, from memory): in C2v and D2h the x axis stands on the plane of a
flat molecule; z of D2h and D2 runs through most atoms, and where that does not decide it is the long axis; C2' axes and
sigma-v planes go through more atoms than C2'' and sigma-d.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray

from .operations import Operation, SymmetryGroup

_NEAR = 0.4
"""An element goes through an atom that lies nearer than this (unit of the positions: angstrom)."""
_ANGLE = 0.1
_ROUND = 0.06
"""Of a step of the turn: operations of a molecule that is not quite symmetric miss their angle by a degree or two."""


@dataclass(frozen=True)
class Elements:
    """Places (in the group) of the operations that labels and names refer to; None where the group has none.

    order: of the principal operation; principal: a turn about the principal axis, improper where the group has neither
    inversion nor a horizontal plane; across: the C2' or sigma-v that tells 1 from 2; three_axes: the C2 about z, y, x
    of D2 and D2h; plane: sigma-h.
    """

    order: int
    principal: int | None
    across: int | None
    three_axes: tuple[int, ...]
    inversion: int | None
    plane: int | None
    improper: bool
    twofold: bool
    mirrors: bool
    cubic: bool


@dataclass(frozen=True)
class _Kind:
    """An operation by what it is: improper or not, order of the turn, axis (3,)."""

    improper: bool
    order: int
    turns: int
    axis: FloatArray


def elements(group: SymmetryGroup, numbers: IntArray, positions: FloatArray) -> Elements:
    """Look through the operations; positions in angstrom."""
    kinds = [_kind(operation) for operation in group.operations]
    centred = positions - np.average(positions, axis=0, weights=numbers)
    threefold = {_line(k.axis) for k in kinds if not k.improper and k.order == 3}
    cubic = len(threefold) > 1
    inversion = next((place for place, k in enumerate(kinds) if k.improper and k.order == 2), None)
    twofolds = [place for place, k in enumerate(kinds) if not k.improper and k.order == 2]
    mirrors = [place for place, k in enumerate(kinds) if k.improper and k.order == 1]
    three = _three_axes(kinds, twofolds, centred) if _is_d2(kinds, twofolds) else ()
    principal = three[0] if three else _principal(kinds, cubic=cubic)
    axis = kinds[principal].axis if principal is not None else None
    plane = next((m for m in mirrors if axis is None or abs(kinds[m].axis @ axis) > 1 - _ANGLE), None)
    if cubic:
        plane = None
    improper = principal is not None and kinds[principal].improper
    two = [t for t in twofolds if axis is not None and abs(kinds[t].axis @ axis) < _ANGLE]
    upright = [m for m in mirrors if axis is not None and abs(kinds[m].axis @ axis) < _ANGLE]
    order = kinds[principal].order if principal is not None else 1
    across = _across(kinds, two, upright, centred, order)
    return Elements(order, principal, across, three, inversion, plane, improper, bool(two), bool(upright), cubic)


def schoenflies(found: Elements) -> str:
    """The name of the group in plain letters: "C2v", "D6h", "Td"."""
    if found.cubic:
        return _cubic_name(found)
    if found.principal is None:
        return "Cs" if found.plane is not None else "Ci" if found.inversion is not None else "C1"
    if found.improper:
        return f"D{found.order // 2}d" if found.twofold else f"S{found.order}"
    tail = "h" if found.plane is not None else ""
    if found.twofold:
        return f"D{found.order}" + (tail or ("d" if found.mirrors else ""))
    if not tail and found.inversion is not None and found.order % 2:
        return f"S{2 * found.order}"
    return f"C{found.order}" + (tail or ("v" if found.mirrors else ""))


def _cubic_name(found: Elements) -> str:
    if found.order == 5:
        return "Ih" if found.inversion is not None else "I"
    if found.order == 4 and not found.improper:
        return "Oh" if found.inversion is not None else "O"
    return "Td" if found.improper else "Th" if found.inversion is not None else "T"


def _kind(operation: Operation) -> _Kind:
    """Angle and axis of the rotation, of minus the matrix for improper ones (so i has order 2, sigma order 1)."""
    improper = operation.sign < 0
    matrix = operation.matrix * (1 if not improper else -1)
    angle = float(np.arccos(np.clip((np.trace(matrix) - 1.0) / 2.0, -1.0, 1.0)))
    axis = _rotation_axis(matrix)
    if improper:
        angle = np.pi - angle  # minus a turn by a is a reflection and a turn by a + pi
    turns, order = _fraction(angle)
    return _Kind(improper, order, turns, axis)


def _rotation_axis(matrix: FloatArray) -> FloatArray:
    values, vectors = np.linalg.eigh(0.5 * (matrix + matrix.T))
    axis: FloatArray = vectors[:, -1] if values[-1] > 0 else vectors[:, 0]
    return axis


def _fraction(angle: float) -> tuple[int, int]:
    """(k, n) of the angle 2 pi k / n with the smallest n that fits."""
    turn = angle / (2.0 * np.pi)
    for order in range(1, 25):
        if abs(turn * order - round(turn * order)) < _ROUND:
            return round(turn * order), order
    return 0, 1


def _line(axis: FloatArray) -> tuple[float, ...]:
    """An axis without its sense, coarse enough to compare."""
    largest = int(np.argmax(np.abs(np.round(axis, 1))))
    return tuple(np.round(axis * np.sign(axis[largest]), 1) + 0.0)


def _is_d2(kinds: list[_Kind], twofolds: list[int]) -> bool:
    proper = [k for k in kinds if not k.improper]
    return len(proper) == 4 and len(twofolds) == 3 and not any(k.improper and k.order == 4 for k in kinds)


def _three_axes(kinds: list[_Kind], twofolds: list[int], centred: FloatArray) -> tuple[int, ...]:
    """The twofold operations about z, y, x."""
    spread = {t: float(((centred @ kinds[t].axis) ** 2).sum()) for t in twofolds}
    x = min(twofolds, key=lambda t: spread[t])
    rest = [t for t in twofolds if t != x]
    z = max(rest, key=lambda t: (_on_axis(kinds[t].axis, centred), spread[t]))
    return z, next(t for t in rest if t != z), x


def _principal(kinds: list[_Kind], *, cubic: bool) -> int | None:
    """The smallest turn about the axis of highest order."""
    proper = [p for p, k in enumerate(kinds) if not k.improper and k.order > 1]
    horizontal = any(k.improper and k.order == 1 for k in kinds)
    inversion = any(k.improper and k.order == 2 for k in kinds)
    best = max((kinds[p].order for p in proper), default=1)
    improper = [p for p, k in enumerate(kinds) if k.improper and k.order > max(best, 2)]
    if improper and not inversion and not (horizontal and _has_plane_across(kinds, improper)):
        return min(improper, key=lambda p: (-kinds[p].order, kinds[p].turns))
    return min(proper, key=lambda p: (-kinds[p].order, kinds[p].turns), default=None)


def _has_plane_across(kinds: list[_Kind], improper: list[int]) -> bool:
    axis = kinds[improper[0]].axis
    return any(k.improper and k.order == 1 and abs(k.axis @ axis) > 1 - _ANGLE for k in kinds)


def _across(kinds: list[_Kind], twofolds: list[int], mirrors: list[int], centred: FloatArray, order: int) -> int | None:
    """The operation that tells 1 from 2."""
    if twofolds:
        return max(twofolds, key=lambda t: _on_axis(kinds[t].axis, centred))
    if not mirrors:
        return None
    if order == 2:  # C2v: the xz plane, x standing on the molecule
        return min(mirrors, key=lambda m: _on_plane(kinds[m].axis, centred))
    return max(mirrors, key=lambda m: _on_plane(kinds[m].axis, centred))


def _on_axis(axis: FloatArray, centred: FloatArray) -> int:
    """Atoms on a line through the centre."""
    return int(np.count_nonzero(np.linalg.norm(np.cross(centred, axis), axis=1) < _NEAR))


def _on_plane(normal: FloatArray, centred: FloatArray) -> int:
    return int(np.count_nonzero(np.abs(centred @ normal) < _NEAR))
