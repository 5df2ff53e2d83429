"""Pareto fronts by non-dominated sorting (front 1 is not beaten on every want by anybody; Goldberg 1989).

Fronts are exact for the best EXACT candidates by score, also in larger libraries: whoever dominates a
candidate has a higher score, so its dominators are among the best too. The rest get one front behind the
last.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray, IntArray
from scipy.stats import rankdata

EXACT = 5000
_BLOCK = 500


def pareto_fronts(probability: FloatArray, order: IntArray) -> IntArray:
    """Front number (n,) from 1, for probabilities (n, wants) and the order (n,) of falling score."""
    fronts = np.zeros(len(order), dtype=np.int64)
    best = order[:EXACT]
    fronts[best] = _exact_fronts(probability[best])
    fronts[order[EXACT:]] = fronts.max(initial=0) + 1
    return fronts


def _exact_fronts(probability: FloatArray) -> IntArray:
    distinct, place = np.unique(probability, axis=0, return_inverse=True)
    dominates = _dominance(distinct)
    beaten = dominates.sum(axis=0)
    fronts = np.zeros(len(distinct), dtype=np.int64)
    number = 0
    while (fronts == 0).any():
        number += 1
        front = np.flatnonzero((beaten == 0) & (fronts == 0))
        fronts[front] = number
        beaten -= dominates[front].sum(axis=0)
    return fronts[place.reshape(-1)]


def _dominance(distinct: FloatArray) -> NDArray[np.bool_]:
    """Does row i dominate row j? (m, m) for m different rows."""
    levels = np.stack([rankdata(want, method="dense").astype(np.int16) for want in distinct.T])
    dominates = np.ones((len(distinct), len(distinct)), dtype=bool)
    for start in range(0, len(distinct), _BLOCK):
        block = dominates[start : start + _BLOCK]
        for want in levels:
            block &= want[start : start + _BLOCK, None] >= want
    np.fill_diagonal(dominates, False)
    return dominates
