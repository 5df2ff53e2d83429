"""From a relaxed geometry to states: the excitation model as one pure function."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import BadResult, FloatArray, Geometry, Medium

from orchil_stages.ground_state import BOHR_ANGSTROM, Wavefunction, check_result, open_ground_state
from orchil_stages.ground_state.basis import integrals

from .dipoles import dipole_change
from .parameters import Parameters
from .response import Prepared, States, hamiltonian, solve
from .solvation import SOLVENT_NAMES, medium_features
from .window import Assertions, Window, check_integrals, open_window

_SPARE_STATES = 4
"""States solved beyond those asked for: medium terms can change the order."""


_ACCURACY = 10.0
"""Of the self-consistent field: a quarter cheaper than 1, and states move by less than 1e-3 eV (25 dyes)."""


@dataclass(frozen=True)
class Opened:
    """A converged ground state in its medium with the window cut out of it."""

    window: Window
    wave: Wavefunction
    assertions: Assertions
    engine: str


def open_states(geometry: Geometry, medium: Medium, occupied: int, virtual: int) -> Opened:
    """Converge the ground state at a geometry and open the window (NotConverged, BadResult)."""
    positions = np.asarray(geometry.positions_angstrom) / BOHR_ANGSTROM
    numbers = np.asarray(geometry.atomic_numbers)
    ground = open_ground_state(numbers, geometry.charge, medium.solvation, accuracy=_ACCURACY)
    evaluation = ground.evaluate(positions)
    wave = ground.wavefunction()
    check_result(evaluation, wave.charges, geometry.charge)
    if _fractional(wave.occupations):
        raise BadResult("the frontier orbitals are fractionally occupied: GFN2-xTB finds no gap")
    ints = integrals(numbers, positions)
    assertions = check_integrals(numbers, positions, wave, ints)
    window = open_window(numbers, positions, wave, ints, occupied=occupied, virtual=virtual)
    return Opened(window, wave, assertions, ground.engine)


def _fractional(occupations: FloatArray) -> bool:
    return bool(((occupations > 0.2) & (occupations < 1.8)).any())


def solve_states(
    prepared: Prepared, parameters: Parameters, medium: Medium, ground_dipole: FloatArray, states: int
) -> tuple[States, FloatArray]:
    """States in order of energy with the medium terms added, and those terms (states, 3) before scaling."""
    window = prepared.window
    found = solve(hamiltonian(prepared, parameters), window, states + _SPARE_STATES)
    change = dipole_change(found.amplitudes, window)
    terms = medium_features(medium, window.numbers, found.dipoles, ground_dipole, change)
    energies = found.energies + terms @ parameters.several(SOLVENT_NAMES)
    order = np.argsort(energies, kind="stable")[:states]
    return States(energies[order], found.amplitudes[order], found.dipoles[order]), terms[order]


__all__ = ["Opened", "open_states", "solve_states"]
