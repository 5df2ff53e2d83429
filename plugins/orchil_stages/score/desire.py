"""How probable it is that a quantity meets a want.

A quantity with an interval is read as a distribution whose median is the value and whose two halves are
halves of normal distributions: the left standard deviation from ``low``, the right one from ``high``, so
that the central interval holds ``coverage`` with equal tails. It is taken in the quantity's own unit (nm
stay nm): median and tails are those of the interval in any unit, only the shape between them differs.

A quantity without an interval is met (1), not met (0), or in between over a soft edge just outside the
limit (a linear desirability; Derringer, Suich, J. Qual. Technol. 12, 214, 1980).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import Column, FloatArray, Want
from scipy.special import ndtr, ndtri

FLOOR = 0.01
"""No want costs a candidate more than this probability: one blind spot must not erase the rest."""

SOFT_EDGE = 0.05
"""Width of the soft edge, as a share of the window (of the limit itself when the window is open)."""


def probabilities(column: Column, want: Want) -> FloatArray:
    """Probability (n,) of meeting the want, at least FLOOR; a missing value has FLOOR."""
    low, high = want.limits
    sharp = _soft_step(column.value, low, high)
    spread = _cumulative(column, high) - _cumulative(column, low)
    known = np.where(_has_interval(column), spread, sharp)
    return np.asarray(np.clip(np.nan_to_num(known, nan=FLOOR), FLOOR, 1.0))


def _has_interval(column: Column) -> NDArray[np.bool_]:
    ordered = (column.low <= column.value) & (column.value <= column.high) & (column.low < column.high)
    return np.asarray(ordered & (column.coverage > 0) & (column.coverage < 1))


def _cumulative(column: Column, limit: float) -> FloatArray:
    """Probability (n,) of a value below the limit."""
    if np.isinf(limit):
        return np.full(len(column.value), float(limit > 0))
    with np.errstate(invalid="ignore", divide="ignore"):
        quantile = ndtri((1 + column.coverage) / 2)
        away = limit - column.value
        sigma = np.where(away < 0, column.value - column.low, column.high - column.value) / quantile
        return np.asarray(ndtr(np.where(away == 0, 0.0, away / sigma)))


def _soft_step(value: FloatArray, low: float, high: float) -> FloatArray:
    """1 inside the window, falling to 0 over the soft edge outside."""
    if np.isinf(low) or np.isinf(high):
        edge = SOFT_EDGE * abs(high if np.isinf(low) else low)
    else:
        edge = SOFT_EDGE * (high - low)
    outside = np.maximum(np.maximum(low - value, value - high), 0.0)
    if edge == 0:
        return np.where(np.isnan(outside), np.nan, (outside == 0).astype(float))
    return np.asarray(np.clip(1 - outside / edge, 0.0, 1.0))
