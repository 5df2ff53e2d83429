"""Solution of the Gaussian processes behind the calibration.

Pseudo-inputs carry the process (subset of regressors: Rasmussen, Williams, Gaussian Processes for Machine Learning,
MIT Press, 2006, chapter 8.3), so that no training row is shipped.
"""

from __future__ import annotations

import numpy as np
import scipy.linalg
from orchil_schemas import FloatArray, IntArray
from scipy.sparse import csr_array

from orchil_stages.calibrate.files import rounded
from orchil_stages.calibrate.kernel import ENVIRONMENT_LENGTH, FEATURE_LENGTH, Bands, unit_rows

_CLIP = 1.5
"""Residuals beyond so many median residuals lose weight: wrong rows and wrong bands must not steer."""

_ROUNDS = 2
_SKETCH = 100
_SMALLEST_SHARE = 0.02
"""Environments of a centre below this root of a share are left out: they make the file large and change nothing."""


def robust_weights(cross: FloatArray, prior: FloatArray, noise: float, target: FloatArray) -> FloatArray:
    """Weights of the pseudo-inputs (points,) for covariances with them (rows, points) and between them.

    ``noise`` is the variance of the noise over that of the process; ``target`` (rows,) is centred.
    """
    trust = np.ones(len(target))
    solution = np.zeros(len(prior))
    for _ in range(_ROUNDS):
        normal = (cross.T * (trust / noise)) @ cross + prior
        normal[np.diag_indices_from(normal)] += 1e-6
        factor = scipy.linalg.cho_factor(normal, overwrite_a=True, check_finite=False)
        solution = scipy.linalg.cho_solve(factor, cross.T @ (trust / noise * target), check_finite=False)
        residual = np.abs(target - cross @ solution)
        trust = np.minimum(1.0, _CLIP * np.median(residual) / np.maximum(residual, 1e-12))
    return solution


def pseudo_inputs(bands: Bands, count: int, seed: int) -> Bands:
    """Centres of at most ``count`` clusters of the rows, in the metric of the covariance, as they will be stored."""
    groups = _clusters(bands, count, seed)
    number = int(groups.max()) + 1
    sizes = np.bincount(groups, minlength=number)
    gather = csr_array((1.0 / sizes[groups], (groups, np.arange(len(groups)))), shape=(number, len(groups)))
    environments = unit_rows(csr_array(gather @ bands.environments))
    environments.data[environments.data < _SMALLEST_SHARE] = 0.0
    environments.eliminate_zeros()
    return rounded(Bands(environments, np.asarray(gather @ bands.features), np.ones(number)))


def _clusters(bands: Bands, count: int, seed: int) -> IntArray:
    """Cluster of each row; empty clusters are left out of the numbering."""
    from sklearn.cluster import MiniBatchKMeans

    sketch = _sketch(bands.environments, seed) / ENVIRONMENT_LENGTH
    features = bands.features / (FEATURE_LENGTH * bands.features.shape[1] ** 0.5)
    stacked = np.hstack([sketch, features])
    distinct = min(count, len(np.unique(np.round(stacked, 6), axis=0)))
    found = MiniBatchKMeans(distinct, random_state=seed, batch_size=4096, n_init=1, max_iter=30).fit_predict(stacked)
    numbered: IntArray = np.unique(found, return_inverse=True)[1]
    return numbered


def _sketch(environments: csr_array, seed: int) -> FloatArray:
    """The environments on so few axes that clusters are found quickly."""
    from sklearn.decomposition import TruncatedSVD

    if environments.shape[1] <= _SKETCH:
        return np.asarray(environments.toarray())
    return np.asarray(TruncatedSVD(_SKETCH, random_state=seed).fit_transform(environments))
