"""Redundant internal coordinates of a bonded molecule: values and Wilson's B matrix, vectorised.

Stretches (bohr), bends (radian), two components of near-linear bends, torsions (radian; about a whole
chain of linear atoms when there is one) and out-of-plane triple products. Wilson, Decius, Cross, Molecular
Vibrations (1955).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
from orchil_schemas import FloatArray, IntArray

LINEAR_COSINE = -0.966
"""Cosine of 165 degrees: wider bends are treated as linear."""


@dataclass(frozen=True)
class Internals:
    """Index lists of shape (m, atoms of the kind); ``frames`` (linear, 2, 3) spans the planes across."""

    stretches: IntArray
    bends: IntArray
    linear: IntArray
    frames: FloatArray
    torsions: IntArray
    planes: IntArray

    @property
    def size(self) -> int:
        """Number of coordinates."""
        return len(self.stretches) + len(self.bends) + 2 * len(self.linear) + len(self.torsions) + len(self.planes)

    def values(self, x: FloatArray) -> FloatArray:
        """All coordinates at positions ``x`` (atoms, 3) in bohr."""
        return self.values_and_rows(x, derivatives=False)[0]

    def difference(self, after: FloatArray, before: FloatArray) -> FloatArray:
        """``after - before`` with torsions the short way round."""
        change: FloatArray = after - before
        start = self.size - len(self.planes) - len(self.torsions)
        turn = change[start : start + len(self.torsions)]
        turn -= 2 * np.pi * np.round(turn / (2 * np.pi))
        return change

    def values_and_rows(self, x: FloatArray, derivatives: bool = True) -> tuple[FloatArray, FloatArray]:
        """Values (m,) and B matrix (m, 3 atoms); the matrix is empty without ``derivatives``."""
        kinds = (
            (self.stretches, _stretch(x, self.stretches)),
            (self.bends, _bend(x, self.bends)),
            (self.linear, _linear(x, self.linear, self.frames[:, 0])),
            (self.linear, _linear(x, self.linear, self.frames[:, 1])),
            (self.torsions, _torsion(x, self.torsions)),
            (self.planes, _plane(x, self.planes)),
        )
        values = np.concatenate([value for _, (value, _) in kinds])
        if not derivatives:
            return values, np.empty((0, 0))
        rows = np.zeros((self.size, len(x), 3))
        start = 0
        for atoms, (value, slopes) in kinds:
            place = np.arange(start, start + len(value))
            for column, slope in enumerate(slopes):
                rows[place, atoms[:, column]] += slope
            start += len(value)
        return values, rows.reshape(self.size, -1)


Part = tuple[FloatArray, list[FloatArray]]


def _unit(vectors: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Unit vectors and lengths (m, 1)."""
    length = np.sqrt(np.einsum("ij,ij->i", vectors, vectors))[:, None]
    return vectors / length, length


def _dot(a: FloatArray, b: FloatArray) -> FloatArray:
    return np.asarray(np.einsum("ij,ij->i", a, b))


def _cross(a: FloatArray, b: FloatArray) -> FloatArray:
    """Row by row; numpy.cross spends more on its generality than on the work."""
    made = np.empty_like(a)
    made[:, 0] = a[:, 1] * b[:, 2] - a[:, 2] * b[:, 1]
    made[:, 1] = a[:, 2] * b[:, 0] - a[:, 0] * b[:, 2]
    made[:, 2] = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return made


def _stretch(x: FloatArray, atoms: IntArray) -> Part:
    u, length = _unit(x[atoms[:, 1]] - x[atoms[:, 0]])
    return length[:, 0], [-u, u]


def _bend(x: FloatArray, atoms: IntArray) -> Part:
    u, a = _unit(x[atoms[:, 0]] - x[atoms[:, 1]])
    v, b = _unit(x[atoms[:, 2]] - x[atoms[:, 1]])
    cosine = np.clip(_dot(u, v), -1, 1)[:, None]
    sine = np.sqrt(np.maximum(1 - cosine**2, 1e-8))
    first, last = (cosine * u - v) / (a * sine), (cosine * v - u) / (b * sine)
    return np.arccos(cosine[:, 0]), [first, -first - last, last]


def _linear(x: FloatArray, atoms: IntArray, across: FloatArray) -> Part:
    """Projection of the sum of both unit vectors on a fixed direction across the axis."""
    u, a = _unit(x[atoms[:, 0]] - x[atoms[:, 1]])
    v, b = _unit(x[atoms[:, 2]] - x[atoms[:, 1]])
    along_u, along_v = _dot(u, across), _dot(v, across)
    first, last = (across - along_u[:, None] * u) / a, (across - along_v[:, None] * v) / b
    return along_u + along_v, [first, -first - last, last]


def _torsion(x: FloatArray, atoms: IntArray) -> Part:
    """Signed angle and gradient (Blondel and Karplus, J. Comput. Chem. 17, 1132, 1996)."""
    f, g, h = (
        x[atoms[:, 0]] - x[atoms[:, 1]],
        x[atoms[:, 1]] - x[atoms[:, 2]],
        x[atoms[:, 3]] - x[atoms[:, 2]],
    )
    a, b = _cross(f, g), _cross(h, g)
    a2, b2 = np.maximum(_dot(a, a), 1e-6)[:, None], np.maximum(_dot(b, b), 1e-6)[:, None]
    length = np.sqrt(_dot(g, g))[:, None]
    angle = np.arctan2(_dot(_cross(b, a), g) / length[:, 0], _dot(a, b))
    first, last = -length / a2 * a, length / b2 * b
    pull = (_dot(f, g)[:, None] / (a2 * length)) * a - (_dot(h, g)[:, None] / (b2 * length)) * b
    return angle, [first, pull - first, -pull - last, last]


def _plane(x: FloatArray, atoms: IntArray) -> Part:
    """Triple product of the three unit vectors from the centre (column 0); zero when flat."""
    (u, a), (v, b), (w, c) = (_unit(x[atoms[:, k]] - x[atoms[:, 0]]) for k in (1, 2, 3))
    normal_u, normal_v, normal_w = _cross(v, w), _cross(w, u), _cross(u, v)
    volume = _dot(u, normal_u)
    slopes = [
        (normal - volume[:, None] * unit) / length
        for normal, unit, length in ((normal_u, u, a), (normal_v, v, b), (normal_w, w, c))
    ]
    return volume, [-slopes[0] - slopes[1] - slopes[2], *slopes]


def neighbours(atoms: int, bonds: IntArray) -> list[list[int]]:
    """Bonded atoms of each atom."""
    found: list[list[int]] = [[] for _ in range(atoms)]
    for i, j in bonds.tolist():
        found[i].append(j)
        found[j].append(i)
    return found


def build_internals(x: FloatArray, bonds: IntArray) -> Internals:
    """The coordinates of a connected molecule at the starting positions (bohr)."""
    around = neighbours(len(x), bonds)
    triples = np.array([(a, b, c) for b, near in enumerate(around) for a, c in combinations(near, 2)])
    triples = triples.reshape(-1, 3).astype(np.int64)
    u, _ = _unit(x[triples[:, 0]] - x[triples[:, 1]])
    v, _ = _unit(x[triples[:, 2]] - x[triples[:, 1]])
    straight = _dot(u, v) < LINEAR_COSINE
    linear = triples[straight]
    through = {(int(b), int(a)): int(c) for a, b, c in linear} | {(int(b), int(c)): int(a) for a, b, c in linear}
    return Internals(
        stretches=np.asarray(bonds, dtype=np.int64).reshape(-1, 2),
        bends=triples[~straight],
        linear=linear,
        frames=_frames(u[straight]),
        torsions=_find_torsions(around, bonds, through),
        planes=np.array([(b, *near) for b, near in enumerate(around) if len(near) == 3], dtype=np.int64).reshape(-1, 4),
    )


def _frames(axes: FloatArray) -> FloatArray:
    """Two unit vectors across each axis, shape (m, 2, 3)."""
    helper = np.eye(3)[np.argmin(np.abs(axes), axis=1)] if len(axes) else np.empty((0, 3))
    first, _ = _unit(_cross(axes, helper))
    return np.stack([first, _cross(axes, first)], axis=1)


def _find_torsions(around: list[list[int]], bonds: IntArray, through: dict[tuple[int, int], int]) -> IntArray:
    """Torsions about every bond; a chain of linear atoms counts as one long bond between its ends."""
    axes = {_axis(int(i), int(j), through) for i, j in bonds}
    found: list[tuple[int, int, int, int]] = []
    for b, before, c, after in axes:
        ends = [(a, d) for a in around[b] if a != before for d in around[c] if d != after]
        found.extend((a, b, c, d) for a, d in ends if len({a, b, c, d}) == 4)
    return np.array(sorted(found), dtype=np.int64).reshape(-1, 4)


def _axis(i: int, j: int, through: dict[tuple[int, int], int]) -> tuple[int, int, int, int]:
    """(end, its neighbour on the chain, other end, its neighbour on the chain) with the smaller end first."""
    (b, before), (c, after) = sorted((_walk(j, i, through), _walk(i, j, through)))
    return b, before, c, after


def _walk(came: int, here: int, through: dict[tuple[int, int], int]) -> tuple[int, int]:
    """Go on through linear atoms; the last atom and the one before it."""
    while (here, came) in through:
        came, here = here, through[here, came]
    return here, came
