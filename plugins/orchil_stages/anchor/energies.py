"""Maxima between nm and eV. Intervals change sides: the longer wavelength is the lower energy."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import HC_EV_NM, Column, FloatArray
from scipy.special import ndtri

LOWEST_EV = 0.05
"""No end of an interval falls below this, 25 micrometres."""


@dataclass(frozen=True)
class Energies:
    """Predictions (n,) in eV; ``error`` is the standard error: half the interval by the quantile of a normal law.

    NaN where there is no value with a proper interval.
    """

    value: FloatArray
    below: FloatArray
    above: FloatArray
    error: FloatArray

    @classmethod
    def of(cls, column: Column) -> Energies:
        """From a column in nm."""
        with np.errstate(invalid="ignore"):
            proper = (column.low > 0) & (column.low < column.value) & (column.value < column.high)
            proper &= (column.coverage > 0) & (column.coverage < 1)
        value, low, high, coverage = (
            np.where(proper, one, np.nan) for one in (column.value, column.low, column.high, column.coverage)
        )
        energy = HC_EV_NM / value
        below, above = energy - HC_EV_NM / high, HC_EV_NM / low - energy
        return cls(energy, below, above, (below + above) / 2 / ndtri((1 + coverage) / 2))

    @property
    def known(self) -> NDArray[np.bool_]:
        """Where there is a value with its interval (n,)."""
        return np.isfinite(self.error)

    def moved(self, rows: NDArray[np.intp], shift: FloatArray, ratio: FloatArray) -> FloatArray:
        """Value, low and high (3, k) in nm after a shift in eV, with both sides of the interval times ``ratio``."""
        value = np.maximum(self.value[rows] + shift, 2 * LOWEST_EV)
        low = np.maximum(value - self.below[rows] * ratio, LOWEST_EV)
        return HC_EV_NM / np.stack([value, value + self.above[rows] * ratio, low])


def reading_error(energy_ev: FloatArray, reading_nm: float, scatter_ev: float) -> FloatArray:
    """Standard error (n,) in eV of a measured maximum: reading of the wavelength and scatter between measurements."""
    return np.asarray(np.hypot(reading_nm * energy_ev**2 / HC_EV_NM, scatter_ev))
