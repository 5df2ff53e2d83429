"""How the uncertainty of the band's position and absorptivity carries over to what is computed from its spectrum.

Both are read as two halves of normal distributions about the median, as the ranking reads them, and taken as
independent. A grid of equally probable values of each replaces random numbers: the same input gives the same output.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import HC_EV_NM, Band, FloatArray, Spread
from scipy.special import ndtri

POSITIONS, STRENGTHS = 21, 9


@dataclass(frozen=True)
class Possible:
    """Equally probable shifts (eV) of all bands and factors of all absorptivities, and the probability reported."""

    shift_ev: FloatArray
    factor: FloatArray
    coverage: float

    def spread(self, values: FloatArray) -> Spread:
        """Median and central interval of values over all shifts and factors, whatever their shape."""
        tail = (1 - self.coverage) / 2
        low, middle, high = np.quantile(values, [tail, 0.5, 1 - tail])
        return Spread(value=float(middle), low=float(low), high=float(high), coverage=self.coverage)


def possible(band: Band) -> Possible:
    """What the intervals of a band allow."""
    middle = HC_EV_NM / band.absorption_max_nm
    low, high = HC_EV_NM / band.absorption_high_nm, HC_EV_NM / band.absorption_low_nm
    logs = np.log([band.molar_absorptivity, band.molar_absorptivity_low, band.molar_absorptivity_high])
    return Possible(
        two_halves(POSITIONS, low - middle, high - middle, band.coverage),
        np.exp(two_halves(STRENGTHS, logs[1] - logs[0], logs[2] - logs[0], band.coverage)),
        band.coverage,
    )


def two_halves(count: int, low: float, high: float, coverage: float) -> FloatArray:
    """Equally probable deviations (count,) from a median whose central interval runs from ``low`` to ``high``."""
    z = ndtri((np.arange(count) + 0.5) / count)
    sigma = np.where(z < 0, -min(low, 0.0), max(high, 0.0)) / ndtri((1 + coverage) / 2)
    return np.asarray(z * sigma)


def factor_spread(value: float, band: Band) -> Spread:
    """Interval of a number that is proportional to the molar absorptivity."""
    return Spread(
        value=value,
        low=value * min(band.molar_absorptivity_low / band.molar_absorptivity, 1.0),
        high=value * max(band.molar_absorptivity_high / band.molar_absorptivity, 1.0),
        coverage=band.coverage,
    )
