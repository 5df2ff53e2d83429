"""Derivatives of a state's energy with respect to every trained number (Hellmann-Feynman: v^T (dA/dp) v)."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from orchil_schemas import FloatArray, IntArray

from orchil_stages.excite.kernels import coulomb_kernel, exchange_kernel, hardness_names
from orchil_stages.excite.levels import diagonal_names, hopping_names, shape_names
from orchil_stages.excite.parameters import ELEMENTS, Parameters, index
from orchil_stages.excite.response import Prepared
from orchil_stages.excite.solvation import SOLVENT_NAMES
from orchil_stages.excite.window import hardness

_STEP = 1e-4


def energy_gradient(
    prepared: Prepared, parameters: Parameters, amplitude: FloatArray, medium_terms: FloatArray
) -> FloatArray:
    """Gradient over the parameter vector of one state's energy; amplitude (o, v), medium_terms (3,)."""
    gradient = np.zeros(len(index()))
    hole, particle = amplitude @ amplitude.T, amplitude.T @ amplitude
    _one_electron(gradient, prepared, hole, particle)
    _coulomb(gradient, prepared, parameters, amplitude)
    _exchange(gradient, prepared, parameters, amplitude)
    gradient[index()["constant"]] = 1.0
    gradient[_places(SOLVENT_NAMES)] = medium_terms
    return gradient


@cache
def _places(found: tuple[str, ...]) -> FloatArray:
    return np.array([index()[name] for name in found])


def _one_electron(gradient: FloatArray, prepared: Prepared, hole: FloatArray, particle: FloatArray) -> None:
    window, features = prepared.window, prepared.features
    o = window.occupied
    levels = np.concatenate([-np.diag(hole), np.diag(particle)])
    gradient[index()["gap_scale"]] = levels @ window.energies
    c_occ, c_virt = window.loewdin[:, :o], window.loewdin[:, o:]
    hop, shapes = window.hopping, features.shapes
    for side, population, shape in (
        ("occ", -((c_occ @ hole) * c_occ).sum(axis=1), -_traces(shapes[:, :o, :o], hole)),
        ("virt", ((c_virt @ particle) * c_virt).sum(axis=1), _traces(shapes[:, o:, o:], particle)),
    ):
        gradient[_places(diagonal_names(side))] = population @ features.diagonal
        gradient[_places(shape_names(side))] = shape
    gradient[_places(hopping_names())] = _traces(hop[:, o:, o:], particle) - _traces(hop[:, :o, :o], hole)


def _traces(matrices: FloatArray, density: FloatArray) -> FloatArray:
    """Expectation value of each symmetric matrix (k, n, n) in a density (n, n)."""
    values: FloatArray = matrices.reshape(len(matrices), -1) @ density.ravel()
    return values


def _coulomb(gradient: FloatArray, prepared: Prepared, parameters: Parameters, amplitude: FloatArray) -> None:
    blocks, atoms = prepared.blocks, len(prepared.distance)
    folded = np.einsum("ia,Aab,jb->Aij", amplitude, blocks.virtual, amplitude, optimize=True)
    weight = -blocks.occupied.reshape(atoms, -1) @ folded.reshape(atoms, -1).T
    scalars = ("coulomb_near", "coulomb_far", "coulomb_length", "coulomb_exponent")
    _kernel(gradient, prepared, parameters, _Kernel("coulomb", scalars, coulomb_kernel), weight)


def _exchange(gradient: FloatArray, prepared: Prepared, parameters: Parameters, amplitude: FloatArray) -> None:
    charge = np.einsum("Aia,ia->A", prepared.blocks.transition, amplitude)
    scalars = ("exchange_strength", "exchange_exponent")
    _kernel(
        gradient,
        prepared,
        parameters,
        _Kernel("exchange", scalars, exchange_kernel),
        2.0 * np.outer(charge, charge),
    )


@dataclass(frozen=True)
class _Kernel:
    name: str
    scalars: tuple[str, ...]
    make: Callable[[IntArray, FloatArray, Parameters], FloatArray]


def _kernel(
    gradient: FloatArray, prepared: Prepared, parameters: Parameters, kernel: _Kernel, weight: FloatArray
) -> None:
    numbers, distance = prepared.window.numbers, prepared.distance

    def made(at: Parameters) -> FloatArray:
        return kernel.make(numbers, distance, at)

    for name in kernel.scalars:
        up, down = (_moved(parameters, name, step) for step in (_STEP, -_STEP))
        gradient[index()[name]] = float((weight * (made(up) - made(down))).sum()) / (2 * _STEP)
    # the kernel depends on the hardness through its mean over two atoms: one derivative serves all elements
    names = hardness_names(kernel.name)
    changes = parameters.several(names)
    exponent = parameters[f"{kernel.name}_exponent"]
    eta = hardness(numbers)
    for element, change in zip(ELEMENTS, changes, strict=True):
        eta = np.where(numbers == element, eta * np.exp(change), eta)
    mean = 0.5 * (eta[:, None] + eta[None, :])
    by_mean = weight * made(parameters) * mean ** (-exponent - 1) / (distance**exponent + mean**-exponent)
    by_atom = 0.5 * eta * (by_mean.sum(axis=0) + by_mean.sum(axis=1))
    gradient[_places(names)] = [by_atom[numbers == element].sum() for element in ELEMENTS]


def _moved(parameters: Parameters, name: str, step: float) -> Parameters:
    vector = parameters.vector.copy()
    vector[index()[name]] += step
    return Parameters(vector)
