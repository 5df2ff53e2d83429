"""Training of the calibration: position, molar absorptivity, width and Stokes shift on physical features."""

from __future__ import annotations

import argparse
import json
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import partial
from multiprocessing import get_context
from pathlib import Path
from typing import Any

import numpy as np
from orchil_schemas import HC_EV_NM, FloatArray, Identity, LibraryRow

from orchil_stages.by_hand import run_stages
from orchil_stages.calibrate import linear
from orchil_stages.calibrate.features import NAMES, band_features
from orchil_stages.calibrate.stage import COVERAGES
from orchil_stages.excite.model import solve_states
from orchil_stages.excite.parameters import trained_parameters
from orchil_stages.excite.stage import ExciteSettings

from .dataset import Measurement, fold, is_test
from .fit import Job
from .hamiltonian import make_jobs, window_size
from .windows import load_row

CALIBRATION_FILE = Path(linear.__file__).with_name("trained.json")
_RIDGES = (0.3, 1.0, 3.0, 10.0, 30.0, 100.0, 300.0)
_CM1_EV = 1.239841984e-4
_SMALLEST_ERROR = 0.02


@dataclass(frozen=True)
class Sample:
    """One row: its measurement, scaffold, features and the energy of the first bright state (eV)."""

    measured: Measurement
    scaffold: str
    features: FloatArray
    physics_ev: float


def calibrate(chosen: argparse.Namespace) -> None:
    """Fit on the training scaffolds, take the intervals from the test scaffolds, write the calibration
    file.
    """
    samples = load_samples(make_jobs(chosen.data, chosen.cache, chosen.limit), chosen.cache, chosen.workers)
    fitted = {name: fit_target(samples, values) for name, values in targets(samples).items()}
    text = json.dumps({"about": {"features": NAMES}, **fitted, **feature_spread(samples)}, indent=1)
    CALIBRATION_FILE.write_text(text + "\n", encoding="utf-8")


def load_samples(jobs: Sequence[Job], cache: Path, workers: int) -> list[Sample]:
    """Features of every usable row with the trained Hamiltonian."""
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        found = pool.map(partial(sample, cache=cache), jobs, chunksize=32)
        return [made for made in found if made is not None]


def sample(job: Job, cache: Path) -> Sample | None:
    """One row, or None when its ground state fails."""
    from orchil_stages.excite.model import Opened
    from orchil_stages.excite.report import orbitals_record, transitions_record
    from orchil_stages.excite.window import Assertions
    from orchil_stages.ground_state import Wavefunction

    row = load_row(job.measured, job.geometry, cache, window_size())
    if row is None:
        return None
    window = row.prepared.window
    settings = ExciteSettings()
    states, _ = solve_states(row.prepared, trained_parameters(), row.medium, row.ground_dipole, settings.states)
    if states.energies[0] <= 0.2:
        return None
    empty = np.zeros(0)
    wave = Wavefunction(empty, empty, empty, window.charges, row.ground_dipole)
    orbitals = orbitals_record(Opened(window, wave, Assertions(0.0, 0.0), ""))
    transitions = transitions_record(states, window)
    features = band_features(_identity(job.measured), row.medium, orbitals, transitions)
    return Sample(job.measured, row.scaffold, features, float(features[NAMES.index("energy")]))


def _identity(measured: Measurement) -> Identity:
    from orchil_stages.intake import Intake

    return run_stages(LibraryRow(structure=measured.smiles, medium=measured.medium), (Intake(),))[Identity]


def targets(samples: Sequence[Sample]) -> dict[str, FloatArray]:
    """What each model predicts, NaN where not measured.

    position: measured minus physics (eV); absorptivity: log10; width: log10 of the width in eV; stokes:
    physics minus measured emission (eV).
    """

    def column(read: Any) -> FloatArray:
        return np.array([np.nan if (value := read(s)) is None else value for s in samples], dtype=np.float64)

    return {
        "position": column(lambda s: s.measured.energy_ev - s.physics_ev),
        "absorptivity": column(lambda s: s.measured.log10_absorptivity),
        "width": column(lambda s: s.measured.width_cm1 and np.log10(s.measured.width_cm1 * _CM1_EV)),
        "stokes": column(lambda s: s.measured.emission_nm and s.physics_ev - HC_EV_NM / s.measured.emission_nm),
    }


def fit_target(samples: Sequence[Sample], values: FloatArray) -> dict[str, Any]:
    """Ridge on the training scaffolds; its strength and the intervals by cross-validation over scaffolds.

    The scaffolds kept for testing only tell how it went: error and coverage are printed.
    """
    known = np.isfinite(values)
    test = np.array([is_test(s.scaffold) for s in samples])
    features = np.array([s.features for s in samples])
    centre, scale = features[~test].mean(axis=0), features[~test].std(axis=0) + 1e-9
    x = np.clip((features - centre) / scale, -4.0, 4.0)
    train = known & ~test
    folds = np.array([fold(s.scaffold, 5) for s in samples])
    ridge, residual = _best_ridge(x[train], values[train], folds[train])
    intercept, slope = ridge_fit(x[train], values[train], ridge)
    size = np.log(np.abs(residual) + _SMALLEST_ERROR)
    size_intercept, size_slope = ridge_fit(x[train], size, 100.0)
    expected = np.exp(size_intercept + np.clip(x @ size_slope, -1.1, 1.1))
    ratio = residual / expected[train]
    low, high = ({f"{c:g}": conformal(ratio, (1 + side * c) / 2) for c in COVERAGES} for side in (-1, 1))
    held = known & test
    error = (values - intercept - x @ slope)[held]
    inside = (error >= low["0.9"] * expected[held]) & (error <= high["0.9"] * expected[held])
    guess = np.abs(values[held] - np.median(values[train])).mean()
    width = np.median(expected[held]) * (high["0.9"] - low["0.9"])
    print(f"{int(train.sum())} rows to fit, ridge {ridge:g}; {int(held.sum())} held out:", end=" ")
    print(f"mean absolute error {np.abs(error).mean():.3f} (by the median of training {guess:.3f}),", end=" ")
    print(f"{inside.mean():.1%} in the 90 % interval of median width {width:.3f}")
    return {
        "centre": centre.tolist(),
        "scale": scale.tolist(),
        "intercept": intercept,
        "slope": slope.tolist(),
        "size_intercept": size_intercept,
        "size_slope": size_slope.tolist(),
        "low": low,
        "high": high,
    }


def _best_ridge(x: FloatArray, y: FloatArray, folds: FloatArray) -> tuple[float, FloatArray]:
    """The ridge of the least absolute error over unseen scaffolds, and its out-of-fold residuals."""
    tried = [(ridge, _out_of_fold(x, y, folds, ridge)) for ridge in _RIDGES]
    return min(tried, key=lambda pair: float(np.abs(pair[1]).mean()))


def _out_of_fold(x: FloatArray, y: FloatArray, folds: FloatArray, ridge: float) -> FloatArray:
    residual = np.zeros(len(y))
    for held in np.unique(folds):
        out = folds == held
        intercept, slope = ridge_fit(x[~out], y[~out], ridge)
        residual[out] = y[out] - intercept - x[out] @ slope
    return residual


def ridge_fit(x: FloatArray, y: FloatArray, ridge: float) -> tuple[float, FloatArray]:
    """Intercept and slope, the squared loss softened beyond twice the median residual (Huber)."""
    weight = np.ones(len(y))
    intercept, slope = 0.0, np.zeros(x.shape[1])
    for _ in range(10):
        middle = weight @ y / weight.sum()
        normal = (x.T * weight) @ x + ridge * np.eye(x.shape[1])
        slope = np.linalg.solve(normal, (x.T * weight) @ (y - middle))
        intercept = float(weight @ (y - x @ slope) / weight.sum())
        residual = np.abs(y - intercept - x @ slope)
        weight = 1.0 / np.maximum(1.0, residual / (2.0 * np.median(residual)))
    return intercept, slope


def conformal(ratio: FloatArray, level: float) -> float:
    """Quantile with the finite-sample correction outwards."""
    corrected = level - (0.5 - level) / len(ratio)
    return float(np.quantile(ratio, min(max(corrected, 0.0), 1.0)))


def feature_spread(samples: Sequence[Sample]) -> dict[str, Any]:
    """Inverse covariance of the standardised features and the 95 and 99.5 % distances of the training
    rows.
    """
    x = np.array([s.features for s in samples if not is_test(s.scaffold)])
    x = (x - x.mean(axis=0)) / (x.std(axis=0) + 1e-9)
    inverse = np.linalg.inv(np.cov(x.T) + 0.05 * np.eye(x.shape[1]))
    distance = np.sqrt(np.einsum("ni,ij,nj->n", x, inverse, x))
    return {
        "feature_inverse": inverse.tolist(),
        "distance_edges": np.quantile(distance, (0.95, 0.995)).tolist(),
    }
