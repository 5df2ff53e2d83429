"""Physical features of the reported state that the calibration uses; no structure patterns, no
fingerprints.
"""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, Identity, Medium, Orbitals, Transitions

from orchil_stages.excite.bright import first_bright, strongest_state
from orchil_stages.medium import orientation_polarisability

NAMES = (
    "energy",
    "energy_squared",
    "log_strength",
    "gap",
    "transferred",
    "overlap",
    "pi_share",
    "shift",
    "dipole_change",
    "dipole_change_polarity",
    "polarity",
    "index",
    "hydrogen_bond_donor",
    "cation",
    "anion",
    "zwitterion",
    "log_atoms",
    "dark_below",
    "next_above",
    "log_strongest_ratio",
    "leading_weight",
)
"""Names of the features in their order."""


def band_features(identity: Identity, medium: Medium, orbitals: Orbitals, transitions: Transitions) -> FloatArray:
    """Feature vector (len(NAMES),) of the first bright state."""
    energies, strengths = transitions.energy_ev, transitions.oscillator_strength
    state = first_bright(energies, strengths)
    strongest = strongest_state(energies, strengths)
    energy = float(energies[state])
    change = float(np.linalg.norm(transitions.dipole_change_debye[state])) / 10.0
    polarity = orientation_polarisability(medium)
    values = (
        energy,
        energy**2,
        _log(strengths[state]),
        orbitals.gap_ev,
        transitions.charge_transfer_share[state],
        transitions.overlap[state],
        transitions.pi_share[state],
        transitions.electron_shift_angstrom[state],
        change,
        change * polarity,
        polarity,
        medium.refractive_index,
        float(medium.hydrogen_bond_donor),
        float(identity.charge > 0),
        float(identity.charge < 0),
        float(identity.zwitterion),
        np.log(identity.heavy_atoms),
        min(energy - float(energies[0]), 1.5),
        min(float(energies[min(state + 1, len(energies) - 1)]) - energy, 1.5),
        min(_log(strengths[strongest]) - _log(strengths[state]), 1.5),
        transitions.leading_weight[state],
    )
    return np.array(values, dtype=np.float64)


def _log(strength: float) -> float:
    return float(np.log10(max(strength, 1e-4)))
