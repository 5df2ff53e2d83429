"""Bring the basis functions of an engine to the order and signs of libcint.

libcint: p x, y, z; d xy, yz, z2, xz, x2-y2. Found by comparing overlap matrices; the overlap assertion of the
excitation stage (C^T S C = 1) would fail on any mistake here.
"""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, IntArray

from .basis import basis_map

_PLACES: dict[str, dict[int, tuple[list[int], list[float]]]] = {
    # libxtb d: x2-y2, -z2, xy, xz, yz
    "libxtb": {0: ([0], [1.0]), 1: ([0, 1, 2], [1.0] * 3), 2: ([2, 4, 1, 3, 0], [1.0, 1.0, -1.0, 1.0, 1.0])},
    # tblite: m = -l ... l, so p y, z, x and d as in libcint
    "tblite": {0: ([0], [1.0]), 1: ([2, 0, 1], [1.0] * 3), 2: ([0, 1, 2, 3, 4], [1.0] * 5)},
}


def libcint_order(numbers: IntArray, engine: str) -> tuple[IntArray, FloatArray]:
    """Permutation and signs: ``coefficients[order] * sign[:, None]`` is in the order of libcint."""
    places = _PLACES[engine]
    where = basis_map(numbers)
    starts = np.flatnonzero(np.diff(where.shell, prepend=-1))
    order: list[int] = []
    sign: list[float] = []
    for start in starts:
        steps, signs = places[int(where.momentum[start])]
        order.extend(int(start) + step for step in steps)
        sign.extend(signs)
    return np.array(order), np.array(sign)
