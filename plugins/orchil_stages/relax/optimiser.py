"""Quasi-Newton minimisation in redundant internal coordinates.

The Hessian lives in internal coordinates (:mod:`.curvature`); each step is solved in Cartesian space with
one Cholesky factorisation and then bent to follow the internal coordinates, so that a turning group does
not stretch bonds. The gradient is carried to internal coordinates with the inverse weighted by the model,
after Pulay and Fogarasi, J. Chem. Phys. 96, 2856 (1992). The diagonal shift that shrinks with the gradient
keeps soft torsions from answering the noise of stiff bonds in the first steps (Levenberg, Marquardt).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from orchil_schemas import FloatArray, NotConverged
from scipy.linalg import cho_factor, cho_solve

from .curvature import Curvature, cartesian_model
from .internals import Internals

FIRST_LIMIT, LEAST_LIMIT, LAST_LIMIT = 0.35, 0.02, 0.8
"""Largest change of one internal coordinate in one step (bohr or radian): at the start, and its bounds."""
SHIFT_PER_GRADIENT = 3e-3
"""Diagonal shift (hartree/bohr^2) per hartree/bohr of gradient norm; found by trial on 25 dyes."""
RISE_ALLOWED = 1e-5
"""hartree; a step that climbs more is taken back."""
BEND_ITERATIONS, BEND_TOLERANCE = 4, 1e-3

EnergyAndGradient = Callable[[FloatArray], tuple[float, FloatArray]]


@dataclass(frozen=True)
class Goal:
    """When to stop: gradient norm (hartree/bohr, all coordinates) and energy still to be won (hartree)."""

    gradient_norm: float = 8e-4
    energy: float = 2e-6
    max_gradients: int = 150


@dataclass(frozen=True)
class Minimum:
    """The last accepted geometry (atoms, 3; bohr), its energy and gradient, and what it cost."""

    x: FloatArray
    energy: float
    gradient: FloatArray
    gradients_used: int

    @property
    def gradient_norm(self) -> float:
        """Euclidean norm over all coordinates, hartree/bohr."""
        return float(np.linalg.norm(self.gradient))


class Point:
    """One evaluated geometry with what depends on the place alone."""

    def __init__(self, x: FloatArray, energy: float, gradient: FloatArray, internals: Internals, model: FloatArray):
        self.x = x
        self.energy = energy
        self.gradient = gradient.ravel()
        self.norm = float(np.linalg.norm(gradient))
        self.values, self.rows = internals.values_and_rows(x)
        self.cartesian_model = cartesian_model(model, self.rows, x)
        self._model = model

    @cached_property
    def factor(self) -> tuple[FloatArray, bool]:
        """Cholesky factor of the Cartesian model Hessian."""
        lower: tuple[FloatArray, bool] = cho_factor(self.cartesian_model, check_finite=False)
        return lower

    @cached_property
    def internal_gradient(self) -> FloatArray:
        """The gradient in internal coordinates."""
        return self._model * (self.rows @ cho_solve(self.factor, self.gradient, check_finite=False))

    def follow(self, step: FloatArray, internals: Internals) -> FloatArray:
        """Positions after a step that changes the internal coordinates as its first instant would."""
        target = self.values + self.rows @ step
        x = self.x + step.reshape(-1, 3)
        for _ in range(BEND_ITERATIONS):
            missing = internals.difference(target, internals.values(x))
            move = cho_solve(self.factor, self.rows.T @ (self._model * missing), check_finite=False)
            x = x + move.reshape(-1, 3)
            if float(np.abs(move).max()) < BEND_TOLERANCE:
                break
        return x


class Descent:
    """One walk downhill."""

    def __init__(self, evaluate: EnergyAndGradient, internals: Internals, model: FloatArray, goal: Goal) -> None:
        self._evaluate = evaluate
        self._internals = internals
        self._goal = goal
        self._curvature = Curvature(model)
        self._limit = FIRST_LIMIT
        self._used = 0

    def run(self, x: FloatArray) -> Minimum:
        """To the minimum from ``x``; ``NotConverged`` after ``goal.max_gradients`` gradients."""
        point = self._measure(x)
        while True:
            step = self._solve(point)
            to_win = -0.5 * float(step @ point.gradient)
            if point.norm <= self._goal.gradient_norm and to_win <= self._goal.energy:
                return Minimum(point.x, point.energy, point.gradient.reshape(-1, 3), self._used)
            trial = self._try(point, step)
            if trial.energy < point.energy + RISE_ALLOWED:
                point = trial

    def _measure(self, x: FloatArray) -> Point:
        energy, gradient = self._evaluate(x)
        self._used += 1
        return Point(x, energy, gradient, self._internals, self._curvature.model)

    def _solve(self, point: Point) -> FloatArray:
        """The Cartesian quasi-Newton step."""
        hessian = self._curvature.add_updates(point.cartesian_model, point.rows)
        hessian[np.diag_indices_from(hessian)] += SHIFT_PER_GRADIENT * point.norm
        factor = cho_factor(hessian, overwrite_a=True, check_finite=False)
        return -np.asarray(cho_solve(factor, point.gradient, check_finite=False))

    def _try(self, point: Point, step: FloatArray) -> Point:
        """Evaluate the step cut to the limit, learn from it, and set the next limit."""
        if self._used >= self._goal.max_gradients:
            raise NotConverged(
                f"relaxation stopped after {self._used} gradients at a norm of {point.norm:.2g} hartree/bohr"
            )
        largest = float(np.abs(point.rows @ step).max())
        share = min(1.0, self._limit / largest)
        trial = self._measure(point.follow(share * step, self._internals))
        moved = self._internals.difference(trial.values, point.values)
        self._curvature.update(moved, trial.internal_gradient - point.internal_gradient)
        predicted = -float(step @ point.gradient) * share * (1 - 0.5 * share)
        self._set_limit((point.energy - trial.energy) / max(predicted, 1e-9), predicted, share, share * largest)
        return trial

    def _set_limit(self, ratio: float, predicted: float, share: float, taken: float) -> None:
        """Halve after a bad prediction, widen after a good one that was cut; tiny energies are noise."""
        if ratio < 0.25 and predicted > 1e-6:
            self._limit = max(LEAST_LIMIT, 0.5 * taken)
        elif ratio > 0.75 and share < 1:
            self._limit = min(LAST_LIMIT, 1.6 * self._limit)


def minimise(
    evaluate: EnergyAndGradient, x: FloatArray, internals: Internals, model: FloatArray, goal: Goal
) -> Minimum:
    """Relax positions ``x`` (atoms, 3; bohr); ``model`` holds the first force constants."""
    return Descent(evaluate, internals, model, goal).run(x)
