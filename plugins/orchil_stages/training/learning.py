"""Training of the learned correction: which environments, which pseudo-inputs, weights, sizes of errors."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import HC_EV_NM, FloatArray

from orchil_stages.calibrate.correction import (
    TARGETS,
    Correction,
    ErrorSize,
    Head,
    View,
    likeness,
    size_features,
)
from orchil_stages.calibrate.coverages import COVERAGES
from orchil_stages.calibrate.kernel import Bands, covariance, overlaps
from orchil_stages.medium import lookup
from orchil_stages.optics.strength import einstein_a, radiative_rate

from .dataset import Measurement, fold
from .gaussian import pseudo_inputs, robust_weights
from .hamiltonian import FOLDS
from .samples import Sample

POINTS = 4000
"""Pseudo-inputs: half of them cost 5 % of the error; the exact process (every row) gains 2 %."""

LEAST_YIELD = 0.1
"""Smaller quantum yields, and so the radiative rates, are too uncertain."""

_DYES_PER_ENVIRONMENT = 3
_CM1_EV = 1.239841984e-4
_SMALLEST_ERROR = 0.02
_SIZE_RIDGE = 100.0

NOISE: Mapping[str, float] = {
    "position": 0.05,
    "absorptivity": 0.5,
    "width": 0.5,
    "stokes": 0.15,
    "emission_strength": 0.3,
}
"""Variance of the noise over that of the process, by cross-validation."""


def targets(samples: Sequence[Sample]) -> dict[str, FloatArray]:
    """What each process predicts, NaN where not measured.

    position: measured minus physics (eV); absorptivity: log10; width: log10 of the width in eV; stokes: physics minus
    measured emission (eV); emission_strength: log10 of the strength that gives quantum yield over lifetime.
    """
    made: dict[str, FloatArray] = {name: np.full(len(samples), np.nan) for name in TARGETS}
    for row, sample in enumerate(samples):
        measured = sample.measured
        made["position"][row] = measured.energy_ev - sample.physics_ev
        if measured.log10_absorptivity is not None:
            made["absorptivity"][row] = measured.log10_absorptivity
        if measured.width_cm1:
            made["width"][row] = np.log10(measured.width_cm1 * _CM1_EV)
        if measured.emission_nm:
            made["stokes"][row] = sample.physics_ev - HC_EV_NM / measured.emission_nm
        made["emission_strength"][row] = _emission_strength(measured)
    return made


def _emission_strength(measured: Measurement) -> float:
    """log10 of the oscillator strength behind a measured radiative rate, NaN where it is not known well."""
    quantum_yield, lifetime, emission = measured.quantum_yield, measured.lifetime_ns, measured.emission_nm
    if not quantum_yield or not lifetime or not emission or not LEAST_YIELD < quantum_yield <= 1.0:
        return np.nan
    unit = einstein_a(HC_EV_NM / emission, 1.0, lookup(measured.medium).refractive_index)
    return float(np.log10(radiative_rate(quantum_yield, lifetime) / unit))


def make_view(samples: Sequence[Sample]) -> View:
    """Environments of at least three dyes, and the spread of the features, each dye with one vote."""
    dyes: dict[int, set[str]] = defaultdict(set)
    for sample in samples:
        for code in sample.weights:
            dyes[code].add(sample.measured.smiles)
    codes = sorted(code for code, found in dyes.items() if len(found) >= _DYES_PER_ENVIRONMENT)
    first = {sample.measured.smiles: sample for sample in reversed(samples)}
    features = np.array([sample.features for sample in first.values()])
    return View(np.array(codes, dtype=np.int64), features.mean(axis=0), features.std(axis=0) + 1e-9)


@dataclass(frozen=True)
class Learned:
    """View, pseudo-inputs, and (middle, weights) of each target."""

    view: View
    points: Bands
    solutions: Mapping[str, tuple[float, FloatArray]]

    def values(self, bands: Bands) -> dict[str, FloatArray]:
        """All targets for bands of the view."""
        cross = covariance(bands, self.points)
        return {name: middle + cross @ weights for name, (middle, weights) in self.solutions.items()}


def learn(samples: Sequence[Sample]) -> Learned:
    """All processes on these samples."""
    view = make_view(samples)
    bands = view.bands(np.array([s.features for s in samples]), [s.weights for s in samples])
    points = pseudo_inputs(bands, POINTS, seed=1)
    prior, cross = covariance(points, points), covariance(bands, points)
    solutions = {}
    for name, values in targets(samples).items():
        known = np.isfinite(values)
        middle = float(np.median(values[known]))
        solutions[name] = (middle, robust_weights(cross[known], prior, NOISE[name], values[known] - middle))
    return Learned(view, points, solutions)


@dataclass(frozen=True)
class Unseen:
    """What models say that had not seen a sample's scaffold: values by target, and what the size of error needs."""

    values: Mapping[str, FloatArray]
    likeness: FloatArray
    size_features: FloatArray
    folds: NDArray[np.int64]


def cross_validate(by_fold: Sequence[Sequence[Sample]]) -> Unseen:
    """Out-of-fold values; ``by_fold[k]`` are the same rows, computed with physics that had not seen fold k."""
    folds = np.array([fold(s.scaffold, FOLDS) for s in by_fold[0]])
    count = len(folds)
    values = {name: np.full(count, np.nan) for name in TARGETS}
    near, sized = np.zeros(count), np.zeros((count, len(by_fold[0][0].features) + 2))
    for held, samples in enumerate(by_fold):
        out = folds == held
        learned = learn([s for s, is_out in zip(samples, out, strict=True) if not is_out])
        test = [s for s, is_out in zip(samples, out, strict=True) if is_out]
        bands = learned.view.bands(np.array([s.features for s in test]), [s.weights for s in test])
        for name, found in learned.values(bands).items():
            values[name][out] = found
        near[out] = likeness(bands, overlaps(bands, learned.points))
        sized[out] = size_features(bands, near[out])
    return Unseen(values, near, sized, folds)


def held_out(by_fold: Sequence[Sequence[Sample]], unseen: Unseen) -> list[Sample]:
    """Each row as computed by the physics that had not seen it."""
    return [by_fold[held][row] for row, held in enumerate(unseen.folds)]


def error_size(residual: FloatArray, features: FloatArray) -> ErrorSize:
    """Expected size of the error by ridge regression on its logarithm, and the conformal quantiles of the ratio."""
    logarithm = np.log(np.abs(residual) + _SMALLEST_ERROR)
    middle = float(logarithm.mean())
    offset = features.mean(axis=0)
    x = features - offset
    slope = np.linalg.solve(x.T @ x + _SIZE_RIDGE * np.eye(x.shape[1]), x.T @ (logarithm - middle))
    shape = ErrorSize(middle, offset, slope, {}, {})
    ratio = residual / shape.size(features)
    low, high = ({f"{c:g}": conformal(ratio, (1 + side * c) / 2) for c in COVERAGES} for side in (-1, 1))
    return replace(shape, low=low, high=high)


def unseen_intervals(residual: FloatArray, unseen: Unseen, coverage: float) -> tuple[FloatArray, FloatArray]:
    """Both ends of the interval of each row relative to its value, sizes of errors fitted outside of its fold."""
    known = np.isfinite(residual)
    low, high = np.zeros(len(residual)), np.zeros(len(residual))
    for held in range(FOLDS):
        out = unseen.folds == held
        fitted = error_size(residual[known & ~out], unseen.size_features[known & ~out])
        low[out], high[out] = fitted.interval(unseen.size_features[out], coverage)
    return low, high


def conformal(ratio: FloatArray, level: float) -> float:
    """Quantile with the finite-sample correction outwards."""
    corrected = level - (0.5 - level) / len(ratio)
    return float(np.quantile(ratio, min(max(corrected, 0.0), 1.0)))


def assemble(learned: Learned, unseen: Unseen, measured: Mapping[str, FloatArray]) -> Correction:
    """The correction of all dyes, with sizes of errors and edges of trust from unseen scaffolds."""
    heads = {}
    for name, (middle, weights) in learned.solutions.items():
        known = np.isfinite(measured[name])
        residual = (measured[name] - unseen.values[name])[known]
        heads[name] = Head(middle, weights, error_size(residual, unseen.size_features[known]))
    inner, outer = (float(edge) for edge in np.quantile(unseen.likeness, (0.1, 0.01)))
    return Correction(learned.view, learned.points, heads, (inner, outer))
