"""States and orbitals as records."""

from __future__ import annotations

import numpy as np
from orchil_schemas import Orbitals, Transitions

from orchil_stages.optics.units import BOHR_ANGSTROM, EA0_DEBYE

from .analysis import angle_to_axis, fixed_sign, leading_pairs, long_axis, pi_share, populations
from .dipoles import centroid_shift
from .masses import atomic_masses
from .model import Opened
from .response import States
from .window import Window

METHOD = "singles in a window of GFN2-xTB orbitals, trained one-electron levels and damped Coulomb kernels"


def orbitals_record(opened: Opened) -> Orbitals:
    """The summary of the ground state."""
    window = opened.window
    homo, lumo = window.energies[window.occupied - 1], window.energies[window.occupied]
    return Orbitals(
        homo_ev=float(homo),
        lumo_ev=float(lumo),
        gap_ev=float(lumo - homo),
        dipole_debye=opened.wave.dipole * EA0_DEBYE,
        partial_charges_e=opened.wave.charges,
        occupied_window=window.occupied,
        virtual_window=window.virtual,
        overlap_error=opened.assertions.overlap_error,
        dipole_error_debye=opened.assertions.dipole_error * EA0_DEBYE,
    )


def transitions_record(states: States, window: Window) -> Transitions:
    """All states with what they are."""
    dipoles = fixed_sign(states.dipoles)
    shift = centroid_shift(states.amplitudes, window)
    spread = populations(states, window)
    leading = leading_pairs(states)
    axis = long_axis(atomic_masses(window.numbers), window.positions)
    return Transitions(
        method=METHOD,
        energy_ev=states.energies,
        oscillator_strength=states.strengths,
        transition_dipole_debye=dipoles * EA0_DEBYE,
        long_axis_angle_deg=angle_to_axis(dipoles, axis),
        electron_shift_angstrom=np.linalg.norm(shift, axis=1) * BOHR_ANGSTROM,
        shift_angstrom=shift * BOHR_ANGSTROM,
        charge_transfer_share=spread.transferred,
        overlap=spread.overlap,
        dipole_change_debye=-shift * EA0_DEBYE,
        leading_from=leading.start,
        leading_to=leading.end,
        leading_weight=leading.weight,
        pi_share=pi_share(states, window),
    )
