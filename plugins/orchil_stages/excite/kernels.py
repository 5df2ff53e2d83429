"""Damped Coulomb kernels between atom-centred charges (Mataga-Nishimoto-Ohno-Klopman form), in eV."""

from __future__ import annotations

from functools import cache

import numpy as np
from orchil_schemas import FloatArray, IntArray

from orchil_stages.ground_state import HARTREE_EV

from .parameters import ELEMENTS, Parameters
from .window import hardness


def coulomb_kernel(numbers: IntArray, distance: FloatArray, parameters: Parameters) -> FloatArray:
    """Electron-hole attraction: strength passes from ``near`` to ``far`` over ``length`` (bohr)."""
    near, far, length = (parameters[f"coulomb_{name}"] for name in ("near", "far", "length"))
    strength = far + (near - far) * np.exp(-distance / length)
    kernel: FloatArray = strength * _ohno("coulomb", numbers, distance, parameters)
    return kernel


def exchange_kernel(numbers: IntArray, distance: FloatArray, parameters: Parameters) -> FloatArray:
    """Electron-hole exchange repulsion between transition charges."""
    kernel: FloatArray = parameters["exchange_strength"] * _ohno("exchange", numbers, distance, parameters)
    return kernel


def _ohno(which: str, numbers: IntArray, distance: FloatArray, parameters: Parameters) -> FloatArray:
    """(R^p + eta^-p)^(-1/p) with the mean hardness of the two atoms, hartree turned to eV."""
    exponent = parameters[f"{which}_exponent"]
    eta = hardness(numbers) * np.exp(_hardness_change(which, numbers, parameters))
    mean = 0.5 * (eta[:, None] + eta[None, :])
    kernel: FloatArray = HARTREE_EV * (distance**exponent + mean**-exponent) ** (-1.0 / exponent)
    return kernel


def _hardness_change(which: str, numbers: IntArray, parameters: Parameters) -> FloatArray:
    trained = parameters.several(hardness_names(which))
    change = np.zeros(len(numbers))
    for element, value in zip(ELEMENTS, trained, strict=True):
        change[numbers == element] = value
    return change


@cache
def hardness_names(which: str) -> tuple[str, ...]:
    """Parameter names of the hardness changes (logarithmic) of one kernel."""
    return tuple(f"{which}_hardness:{number}" for number in ELEMENTS)
