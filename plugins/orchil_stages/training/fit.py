"""Regularised robust Gauss-Newton over the trained numbers of the response Hamiltonian."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from multiprocessing import get_context
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray, Geometry

from orchil_stages.excite.bright import first_bright
from orchil_stages.excite.model import solve_states
from orchil_stages.excite.parameters import Parameters, names, start_parameters

from .dataset import Measurement
from .derivatives import energy_gradient
from .windows import Row, load_row

HUBER_EV = 0.3
"""Residuals beyond this count linearly: a wrong assignment or a wrong form must not steer the fit."""

STATES = 12
_PRIOR = (
    ("gap_scale", 0.3),
    ("constant", 1.0),
    ("occ:", 0.7),
    ("virt:", 0.7),
    ("occ_charge:", 1.0),
    ("virt_charge:", 1.0),
    ("occ_", 0.5),
    ("virt_", 0.5),
    ("hop:", 0.15),
    ("coulomb_hardness:", 0.3),
    ("exchange_hardness:", 0.3),
    ("coulomb_length", 3.0),
    ("coulomb_exponent", 0.7),
    ("exchange_exponent", 0.7),
    ("coulomb_", 0.2),
    ("exchange_strength", 0.4),
    ("solvent_", 1.0),
)
"""Widths within which the numbers are expected around their start; the first matching beginning counts."""

_PRIOR_WEIGHT = 0.5
"""Weight of one prior width, in units of one squared residual of HUBER_EV."""

_BOUNDS = {
    "coulomb_length": (0.5, 40.0),
    "coulomb_exponent": (0.7, 4.0),
    "exchange_exponent": (0.7, 4.0),
    "coulomb_near": (0.0, 1.2),
    "coulomb_far": (0.0, 1.2),
    "exchange_strength": (0.05, 2.5),
    "gap_scale": (0.3, 2.5),
}


@dataclass(frozen=True)
class Evaluated:
    """One row under one parameter vector: energy (eV) of the first bright state, its gradient, f, index; GFN2
    gap.
    """

    row: int
    energy: float
    gradient: FloatArray
    strength: float
    state: int
    gap: float


@dataclass(frozen=True)
class Job:
    """A measurement and the geometry it is computed at."""

    measured: Measurement
    geometry: Geometry


_shard: list[tuple[int, Row]] = []


def _load_shard(jobs: Sequence[tuple[int, Job]], cache: Path, window: tuple[int, int]) -> list[int]:
    _shard.clear()
    for place, job in jobs:
        row = load_row(job.measured, job.geometry, cache, window)
        if row is not None:
            _shard.append((place, row))
    return [place for place, _ in _shard]


def _evaluate_shard(vector: FloatArray) -> list[Evaluated]:
    return [evaluate_row(place, row, Parameters(vector)) for place, row in _shard]


def evaluate_row(place: int, row: Row, parameters: Parameters) -> Evaluated:
    """Energy of the first bright state and its gradient over all trained numbers."""
    states, terms = solve_states(row.prepared, parameters, row.medium, row.ground_dipole, STATES)
    strengths = states.strengths
    bright = first_bright(states.energies, strengths)
    gradient = energy_gradient(row.prepared, parameters, states.amplitudes[bright], terms[bright])
    window = row.prepared.window
    gap = float(window.energies[window.occupied] - window.energies[window.occupied - 1])
    return Evaluated(place, float(states.energies[bright]), gradient, float(strengths[bright]), bright, gap)


class Shards:
    """The rows spread over worker processes that stay warm between iterations."""

    def __init__(self, jobs: Sequence[Job], cache: Path, window: tuple[int, int], workers: int) -> None:
        numbered = list(enumerate(jobs))
        self._pools = [ProcessPoolExecutor(1, mp_context=get_context("spawn")) for _ in range(workers)]
        loading = [pool.submit(_load_shard, numbered[w::workers], cache, window) for w, pool in enumerate(self._pools)]
        self.usable = np.zeros(len(jobs), dtype=bool)
        for future in loading:
            self.usable[future.result()] = True

    def evaluate(self, vector: FloatArray) -> list[Evaluated]:
        """Every usable row under one parameter vector, in row order."""
        futures = [pool.submit(_evaluate_shard, vector) for pool in self._pools]
        return sorted((row for future in futures for row in future.result()), key=lambda row: row.row)

    def close(self) -> None:
        """End the workers."""
        for pool in self._pools:
            pool.shutdown()


@dataclass(frozen=True)
class Problem:
    """Targets in eV, weights (0 for rows kept for testing) and the prior."""

    targets: FloatArray
    weights: FloatArray
    widths: FloatArray
    start: FloatArray

    def objective(self, energies: FloatArray, vector: FloatArray) -> float:
        """Weighted Huber loss plus the prior."""
        residual = np.abs(energies - self.targets)
        loss = np.where(residual < HUBER_EV, 0.5 * residual**2, HUBER_EV * (residual - 0.5 * HUBER_EV))
        return float(self.weights @ loss) + 0.5 * self._prior_scale() * float(
            (((vector - self.start) / self.widths) ** 2).sum()
        )

    def step(self, energies: FloatArray, jacobian: FloatArray, vector: FloatArray, damping: float) -> FloatArray:
        """The damped Gauss-Newton step."""
        residual = energies - self.targets
        robust = self.weights * np.minimum(1.0, HUBER_EV / np.maximum(np.abs(residual), 1e-9))
        prior = self._prior_scale() / self.widths**2
        normal = (jacobian.T * robust) @ jacobian + np.diag(prior * (1.0 + damping))
        normal[np.diag_indices_from(normal)] += damping * 1e-3 * np.diag(normal)
        gradient = jacobian.T @ (robust * residual) + prior * (vector - self.start)
        return np.asarray(np.linalg.solve(normal, -gradient), dtype=np.float64)

    def _prior_scale(self) -> float:
        return _PRIOR_WEIGHT * HUBER_EV**2


def make_problem(targets: FloatArray, weights: FloatArray) -> Problem:
    """A problem with the standard prior around the untrained numbers."""
    return Problem(targets, weights, prior_widths(), start_parameters().vector)


def prior_widths() -> FloatArray:
    """Prior width of each number, in the order of the vector."""
    return np.array([next(width for start, width in _PRIOR if name.startswith(start)) for name in names()])


def train(
    evaluate: Callable[[FloatArray], list[Evaluated]],
    problem: Problem,
    start: FloatArray,
    iterations: int,
    report: Callable[[int, float, FloatArray, FloatArray], None],
    *,
    at_start: list[Evaluated] | None = None,
) -> FloatArray:
    """Damped Gauss-Newton; ``report(iteration, objective, energies, vector)`` after each accepted step.

    ``at_start`` spares the evaluation at ``start`` where it is known.
    """
    vector = start
    energies, jacobian = _stacked(at_start if at_start is not None else evaluate(vector))
    best = problem.objective(energies, vector)
    report(0, best, energies, vector)
    damping = 1.0
    for iteration in range(1, iterations + 1):
        trial = _bounded(vector + problem.step(energies, jacobian, vector, damping))
        found, slopes = _stacked(evaluate(trial))
        value = problem.objective(found, trial)
        if value < best:
            gain = (best - value) / best
            vector, energies, jacobian, best = trial, found, slopes, value
            damping = max(damping / 4.0, 1e-3)
            report(iteration, best, energies, vector)
            if gain < 1e-4:
                break
        else:
            damping *= 6.0
            if damping > 1e5:
                break
    return vector


def _stacked(done: Sequence[Evaluated]) -> tuple[FloatArray, FloatArray]:
    return np.array([row.energy for row in done]), np.array([row.gradient for row in done])


def _bounded(vector: FloatArray) -> FloatArray:
    place = {name: i for i, name in enumerate(names())}
    bounded = vector.copy()
    for name, (low, high) in _BOUNDS.items():
        bounded[place[name]] = np.clip(bounded[place[name]], low, high)
    return bounded
