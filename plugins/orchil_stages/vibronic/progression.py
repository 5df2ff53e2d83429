"""Franck-Condon progression of displaced harmonic oscillators (linear coupling, equal wavenumbers in both states).

Huang, Rhys, Proc. R. Soc. A 204, 406 (1950); the generating function: Lax, J. Chem. Phys. 20, 1752 (1952); Kubo,
Toyozawa, Prog. Theor. Phys. 13, 160 (1955).
"""

from __future__ import annotations

from math import log

import numpy as np
from orchil_schemas import FloatArray

_POINTS = 2**14
_STEP_EV = 5e-4
BOLTZMANN_EV_K = 8.617333262e-5


def huang_rhys(slope_ev: FloatArray, quantum_ev: FloatArray) -> FloatArray:
    """Factors S = (dE/dq)^2/(2 (h nu)^2) of slopes along dimensionless coordinates, (modes,)."""
    return np.asarray(slope_ev**2 / (2 * quantum_ev**2))


def profile(
    factors: FloatArray, quantum_ev: FloatArray, width_ev: float, temperature_kelvin: float
) -> tuple[FloatArray, FloatArray]:
    """Energies (eV) from the 0-0 line and the absorption profile, area one, each line a Gaussian of full width.

    Every combination and hot band is in it: the Fourier transform of exp(sum S [(n+1)(e^-iwt - 1) + n (e^iwt - 1)])
    times that of the line, n being the thermal occupation.
    """
    energy = (np.arange(_POINTS) - _POINTS // 4) * _STEP_EV
    phase = 2 * np.pi * np.fft.fftfreq(_POINTS, _STEP_EV)
    occupied = 1 / np.expm1(np.minimum(quantum_ev / (BOLTZMANN_EV_K * max(temperature_kelvin, 1e-3)), 700.0))
    turning = np.exp(-1j * np.outer(phase, quantum_ev))
    exponent = (turning - 1) @ (factors * (occupied + 1)) + (turning.conj() - 1) @ (factors * occupied)
    sigma = width_ev / np.sqrt(8 * log(2))
    start = np.exp(1j * phase * energy[0])
    whole = np.fft.ifft(np.exp(exponent - (sigma * phase) ** 2 / 2) * start) / _STEP_EV
    return np.asarray(energy), np.asarray(np.maximum(whole.real, 0.0))
