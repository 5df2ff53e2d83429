"""Stored spectra are rounded, so that a store of tens of thousands of dyes stays small."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray

_NOTHING = 1e-7
"""Values below this share of the largest are nothing."""


def rounded(values: FloatArray, digits: int = 5) -> FloatArray:
    """Values of one sign to some significant digits; the far tails become zero."""
    largest = float(np.abs(values).max(initial=0.0))
    if largest == 0.0:
        return values
    kept = np.where(np.abs(values) < _NOTHING * largest, 0.0, values)
    scale = 10.0 ** (digits - 1 - np.floor(np.log10(np.where(kept == 0, 1.0, np.abs(kept)))))
    return np.asarray(np.round(kept * scale) / scale)
