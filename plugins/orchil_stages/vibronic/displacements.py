"""Slope of an excitation energy along normal modes, by central differences with the state followed."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from orchil_schemas import FloatArray, Transitions

STEP = 0.2
"""Of the dimensionless coordinate: a fifth of the width of the vibrational ground state."""
_REACH_EV = 0.5
"""The followed state is sought within this distance in energy."""


def slopes(
    states_at: Callable[[FloatArray], Transitions], here: Transitions, state: int, paths: FloatArray
) -> FloatArray:
    """dE/dq (modes,) in eV; ``states_at`` takes a displacement (atoms, 3) and gives the states there."""
    return np.array([_slope(states_at, here, state, path) for path in paths])


def _slope(states_at: Callable[[FloatArray], Transitions], here: Transitions, state: int, path: FloatArray) -> float:
    ahead, behind = (followed(here, state, states_at(sign * STEP * path)) for sign in (1, -1))
    return (ahead - behind) / (2 * STEP)


def followed(here: Transitions, state: int, there: Transitions) -> float:
    """Energy of the state at a neighbouring geometry that is most like ``state``: transition dipole, then energy."""
    dipole, energy = here.transition_dipole_debye[state], here.energy_ev[state]
    lengths = np.linalg.norm(there.transition_dipole_debye, axis=1) * np.linalg.norm(dipole)
    alike = np.abs(there.transition_dipole_debye @ dipole) / np.maximum(lengths, 1e-9)
    ratio = np.abs(there.oscillator_strength - here.oscillator_strength[state])
    away = np.abs(there.energy_ev - energy) / _REACH_EV
    unlike = (1 - alike) + ratio / (here.oscillator_strength[state] + 0.05) + away
    return float(there.energy_ev[int(np.argmin(unlike))])
