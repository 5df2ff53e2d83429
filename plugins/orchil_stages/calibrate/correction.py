"""The learned correction: from a band as computed to the numbers that are measured.

One Gaussian process for each target, carried by pseudo-inputs (centres of clusters, no dye of the training set): what
has to be added to the computed value. The interval around it is conformal (Vovk, Gammerman, Shafer, Algorithmic
Learning in a Random World, 2005): errors on scaffolds that the model had not seen, divided by the size of error to be
expected for such a band, give the quantiles.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray
from scipy.sparse import csr_array

from .kernel import Bands, covariance, overlaps

Weights = Mapping[int, tuple[float, float]]
"""Hole and electron share by environment code, of one band."""

TARGETS = ("position", "absorptivity", "width", "stokes", "emission_strength")
"""What is learned: shift of the position (eV), log10 absorptivity, log10 width in eV, physics minus emission (eV), and
log10 of the oscillator strength that gives the radiative rate at the emission maximum."""

CLIP = 4.0
"""Features so many spreads from the middle are held there: nothing is extrapolated."""

_SIZE_CLIP = 1.3
"""The expected size of an error stays within a factor exp(1.3) of the typical one."""


@dataclass(frozen=True)
class ErrorSize:
    """Expected size of the error from features (n, k), and quantiles of error / size by coverage."""

    intercept: float
    offset: FloatArray
    slope: FloatArray
    low: Mapping[str, float]
    high: Mapping[str, float]

    def size(self, features: FloatArray) -> FloatArray:
        """Expected size of the error, unit of the target, (n,)."""
        spread = np.clip((features - self.offset) @ self.slope, -_SIZE_CLIP, _SIZE_CLIP)
        made: FloatArray = np.exp(self.intercept + spread)
        return made

    def interval(self, features: FloatArray, coverage: float) -> tuple[FloatArray, FloatArray]:
        """Both ends of the central interval of a trained coverage, relative to the value (KeyError otherwise)."""
        size, key = self.size(features), f"{coverage:g}"
        return self.low[key] * size, self.high[key] * size


@dataclass(frozen=True)
class Head:
    """One target: middle value, weights of the pseudo-inputs (points,), size of the error."""

    middle: float
    weights: FloatArray
    error: ErrorSize


@dataclass(frozen=True)
class View:
    """How bands are seen: the environments with a column of their own, and the spread of the features.

    codes: (v,) ascending; centre and scale: (features,).
    """

    codes: IntArray
    centre: FloatArray
    scale: FloatArray

    def bands(self, features: FloatArray, weights: Sequence[Weights]) -> Bands:
        """Features (n, k) and environment weights of n bands as the processes see them."""
        environments, known = self._environments(weights)
        return Bands(environments, np.clip((features - self.centre) / self.scale, -CLIP, CLIP), known)

    def _environments(self, weights: Sequence[Weights]) -> tuple[csr_array, FloatArray]:
        """Roots of the known weights, rows of length 1, hole before electron; and the known share of all weight."""
        rows = [self._row(found) for found in weights]
        starts = np.cumsum([0, *(len(places) for places, _, _ in rows)])
        shape = (len(rows), 2 * len(self.codes))
        joined = [np.concatenate([row[part] for row in rows]) for part in (1, 0)]
        return csr_array((joined[0], joined[1], starts), shape=shape), np.array([known for _, _, known in rows])

    def _row(self, found: Weights) -> tuple[IntArray, FloatArray, float]:
        codes = np.fromiter(found, dtype=np.int64, count=len(found))
        shares = np.clip(np.array(list(found.values())).reshape(-1, 2), 0.0, None)
        places = np.minimum(np.searchsorted(self.codes, codes), len(self.codes) - 1)
        known = self.codes[places] == codes
        places, roots = places[known], np.sqrt(shares[known])
        roots /= max(float(np.sqrt((roots**2).sum())), 1e-9)
        columns = np.concatenate([places, places + len(self.codes)])
        return columns, roots.T.ravel(), float(shares[known].sum() / max(shares.sum(), 1e-9))


@dataclass(frozen=True)
class Correction:
    """All targets over common pseudo-inputs; ``likeness_edges`` part inside, edge and outside."""

    view: View
    points: Bands
    heads: Mapping[str, Head]
    likeness_edges: tuple[float, float]

    def see(self, features: FloatArray, weights: Sequence[Weights]) -> Seen:
        """Bands with what all targets need of them, computed once."""
        bands = self.view.bands(features, weights)
        shared = overlaps(bands, self.points)
        return Seen(bands, covariance(bands, self.points, shared), likeness(bands, shared))

    def value(self, target: str, seen: Seen) -> FloatArray:
        """What has to be added to the computed value, (n,)."""
        head = self.heads[target]
        made: FloatArray = head.middle + seen.covariance @ head.weights
        return made

    def interval(self, target: str, seen: Seen, coverage: float) -> tuple[FloatArray, FloatArray]:
        """Both ends of the central interval relative to the value, (n,) each."""
        return self.heads[target].error.interval(size_features(seen.bands, seen.likeness), coverage)

    def trust(self, seen: Seen) -> list[str]:
        """Inside, edge or outside of what training has seen."""
        inner, outer = self.likeness_edges
        return ["inside" if x >= inner else "edge" if x >= outer else "outside" for x in seen.likeness.tolist()]


@dataclass(frozen=True)
class Seen:
    """Bands, their covariance with the pseudo-inputs (n, points), and their likeness to training (n,), 0 to 1."""

    bands: Bands
    covariance: FloatArray
    likeness: FloatArray


def likeness(bands: Bands, shared: FloatArray) -> FloatArray:
    """Largest overlap of environments (n, points) with a pseudo-input, times the known share, 0 to 1, (n,)."""
    found: FloatArray = bands.known * shared.max(axis=1)
    return found


def size_features(bands: Bands, near: FloatArray) -> FloatArray:
    """What the size of the error is read from: unlikeness, its square, and the physical features, (n, k + 2)."""
    unlike = 1.0 - near
    return np.column_stack([unlike, unlike**2, bands.features])
