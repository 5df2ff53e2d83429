"""Gaussian-process regression of the error of prediction on the errors of measured dyes.

The error of each prediction is a normal variable with its own standard error; two go together as the kernel says.
Measured values show some of these errors, with noise: the mean of the others given those is the shift, their variance
the new interval (Rasmussen, Williams, Gaussian Processes for Machine Learning, MIT Press, 2006, section 2.2).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray
from scipy.linalg import cho_factor, cho_solve, solve_triangular

DOUBT = 5.0
"""A measured value further from its prediction than this many standard errors counts less."""
CONFIDENCE = 10.0
"""So many measured dyes must speak up before they are believed as much as the intervals are, see ``spread``."""


@dataclass(frozen=True)
class Measured:
    """m measured dyes: standard error of the prediction, measured minus predicted, standard error of the measurement.

    All in eV; ``doubtful`` (m,) says which residuals are wild and have had their noise raised.
    """

    error: FloatArray
    residual: FloatArray
    noise: FloatArray
    doubtful: NDArray[np.bool_]

    @classmethod
    def of(cls, error: FloatArray, residual: FloatArray, noise: FloatArray) -> Measured:
        """With the noise of a wild residual raised until it is just within DOUBT standard errors."""
        variance = np.maximum(noise**2, (residual / DOUBT) ** 2 - error**2)
        return cls(error, residual, np.sqrt(variance), variance > noise**2)

    def some(self, places: NDArray[np.intp]) -> Measured:
        """Those of the dyes."""
        return Measured(self.error[places], self.residual[places], self.noise[places], self.doubtful[places])


@dataclass(frozen=True)
class Posterior:
    """Shift (n,) in eV, share of the variance that is left (n,), weights (n, m): what each residual is taken times."""

    shift: FloatArray
    variance_left: FloatArray
    weights: FloatArray


class Regression:
    """The measured dyes with the correlation (m, m) of their errors, solved once."""

    def __init__(self, measured: Measured, correlation: FloatArray) -> None:
        self._measured = measured
        prior = correlation * measured.error[:, None] * measured.error[None, :]
        self._factor = cho_factor(prior + np.diag(measured.noise**2), lower=True)
        self._explained = cho_solve(self._factor, measured.residual)

    @property
    def spread(self) -> float:
        """Variance of the measured residuals against what the intervals promise, not below 1.

        Where a user's dyes fail more than the intervals say, those of their relatives must not shrink as if they did
        not. The mean of an inverse-gamma law with CONFIDENCE degrees of freedom before the first measurement.
        """
        residual = self._measured.residual
        found = float(residual @ self._explained)
        return max(1.0, (CONFIDENCE + found) / (CONFIDENCE + len(residual)))

    def at(self, error: FloatArray, correlation: FloatArray) -> Posterior:
        """For n dyes with their standard errors (n,) and correlations (n, m) to the measured ones."""
        prior = correlation * error[:, None] * self._measured.error[None, :]
        told = solve_triangular(self._factor[0], prior.T, lower=True)
        left = 1 - (told**2).sum(axis=0) / error**2
        weights = cho_solve(self._factor, prior.T).T
        return Posterior(prior @ self._explained, np.minimum(1.0, self.spread * left), weights)
