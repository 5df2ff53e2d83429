"""Linear models with intervals: ridge regression, and a width that depends on the features.

The interval is conformal (Vovk, Gammerman, Shafer, Algorithmic Learning in a Random World, 2005): residuals
of dyes on scaffolds the model has never seen, divided by the expected size of the error at their features,
give the quantile.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
from orchil_schemas import FloatArray


@dataclass(frozen=True)
class LinearModel:
    """value = intercept + x . slope; expected size of the error = exp(size_intercept + x . size_slope).

    x are the features less ``centre`` over ``scale``; ``low`` and ``high`` are quantiles of (measured -
    value) / size by coverage.
    """

    centre: FloatArray
    scale: FloatArray
    intercept: float
    slope: FloatArray
    size_intercept: float
    size_slope: FloatArray
    low: dict[str, float]
    high: dict[str, float]

    def predict(self, features: FloatArray) -> FloatArray:
        """Values for features (..., k)."""
        value: FloatArray = self.intercept + self._standard(features) @ self.slope
        return value

    def error_size(self, features: FloatArray) -> FloatArray:
        """Expected size of the error, at most about three times either way from the typical one."""
        spread = np.clip(self._standard(features) @ self.size_slope, -1.1, 1.1)
        size: FloatArray = np.exp(self.size_intercept + spread)
        return size

    def interval(self, features: FloatArray, coverage: float) -> tuple[FloatArray, FloatArray]:
        """Central interval of a trained coverage (KeyError otherwise)."""
        value, size = self.predict(features), self.error_size(features)
        key = f"{coverage:g}"
        return value + self.low[key] * size, value + self.high[key] * size

    def _standard(self, features: FloatArray) -> FloatArray:
        # features far outside the training range are held at its edge: a line must not run away
        return np.clip((features - self.centre) / self.scale, -4.0, 4.0)


@dataclass(frozen=True)
class Calibration:
    """The trained models and the spread of the training features."""

    position: LinearModel
    absorptivity: LinearModel
    width: LinearModel
    stokes: LinearModel
    feature_inverse: FloatArray
    distance_edges: tuple[float, float]

    def trust(self, features: FloatArray) -> str:
        """Inside, edge or outside of the training features, by Mahalanobis distance."""
        x = (features - self.position.centre) / self.position.scale
        distance = float(np.sqrt(x @ self.feature_inverse @ x))
        inner, outer = self.distance_edges
        if distance <= inner:
            return "inside"
        return "edge" if distance <= outer else "outside"


def load_calibration(text: str) -> Calibration:
    """Calibration from the JSON of its file."""
    given = json.loads(text)
    models = {name: _model(given[name]) for name in ("position", "absorptivity", "width", "stokes")}
    inner, outer = given["distance_edges"]
    return Calibration(**models, feature_inverse=np.array(given["feature_inverse"]), distance_edges=(inner, outer))


def _model(given: dict[str, Any]) -> LinearModel:
    arrays: dict[str, Any] = {n: np.array(given[n]) for n in ("centre", "scale", "slope", "size_slope")}
    return LinearModel(**{**given, **arrays})


@cache
def trained_calibration() -> Calibration:
    """The calibration shipped with the package."""
    return load_calibration(files(__package__).joinpath("trained.json").read_text(encoding="utf-8"))
