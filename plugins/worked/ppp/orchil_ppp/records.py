"""States of a pi system as the records that the rest of the chain knows."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
from orchil_schemas import HC_EV_NM, Band, FloatArray, IntArray, Transitions

from .states import States

DEBYE = 4.80320471
"""One elementary charge times one angstrom."""
COVERAGE = 0.9
POSITION_ERRORS_EV = (-0.67, 0.92)
"""Computed minus measured, quantiles of 5 and 95 % over 1,313 measured dyes of as many scaffolds (Joung and others,
Sci. Data 7, 295, 2020) with GFN2-xTB geometries; none of the scaffolds on which accuracy is reported was among them."""
WIDTH_EV = 0.45
"""Usual full width at half maximum of a dye in solution (common practice)."""
ABSORPTIVITY_FACTOR = 3.0
METHOD = "Pariser-Parr-Pople, single excitations, parameters of Beveridge and Hinze (1971) and Van-Catledge (1980)"


def transitions_record(states: States, masses: FloatArray, positions: FloatArray) -> Transitions:
    """All states; ``masses`` and ``positions`` are those of the whole species, for its long axis."""
    holes, electrons = _distributions(states)
    system = states.system.positions
    shift = (electrons - holes) @ system
    dipoles = states.singlets.dipoles
    lead = [np.unravel_index(int(np.argmax(one**2)), one.shape) for one in states.singlets.amplitudes]
    occupied = states.singlets.occupied.shape[1]
    return Transitions(
        method=METHOD,
        energy_ev=states.energies_ev,
        oscillator_strength=states.strengths,
        transition_dipole_debye=dipoles * DEBYE,
        long_axis_angle_deg=_angles(dipoles, _long_axis(masses, positions)),
        electron_shift_angstrom=np.linalg.norm(shift, axis=1),
        shift_angstrom=shift,
        charge_transfer_share=0.5 * np.abs(electrons - holes).sum(axis=1),
        overlap=np.sqrt(np.clip(holes * electrons, 0, None)).sum(axis=1).clip(0, 1),
        dipole_change_debye=-shift * DEBYE,
        leading_from=[occupied - 1 - int(i) for i, _ in lead],
        leading_to=[int(a) for _, a in lead],
        leading_weight=[float((one**2).max()) for one in states.singlets.amplitudes],
        pi_share=np.ones(len(states.energies_ev)),
    )


def band_record(states: States, transitions: Transitions) -> Band:
    """The first band that is not dark, as it comes from the Hamiltonian; intervals from its errors on measured dyes."""
    at = states.bright
    energy, strength = float(states.energies_ev[at]), float(states.strengths[at])
    strongest = int(np.argmax(states.strengths))
    least, most = (HC_EV_NM / max(energy - error, 0.3) for error in POSITION_ERRORS_EV)
    absorptivity = peak_absorptivity(strength)
    return Band(
        state=at,
        first_bright_state=at,
        strongest_state=strongest,
        coverage=COVERAGE,
        absorption_max_nm=HC_EV_NM / energy,
        absorption_low_nm=least,
        absorption_high_nm=most,
        physics_absorption_max_nm=HC_EV_NM / energy,
        strongest_absorption_max_nm=HC_EV_NM / float(states.energies_ev[strongest]),
        molar_absorptivity=absorptivity,
        molar_absorptivity_low=absorptivity / ABSORPTIVITY_FACTOR,
        molar_absorptivity_high=absorptivity * ABSORPTIVITY_FACTOR,
        width_ev=WIDTH_EV,
        oscillator_strength=strength,
        transition_dipole_debye=float(np.linalg.norm(transitions.transition_dipole_debye[at])),
        long_axis_angle_deg=float(transitions.long_axis_angle_deg[at]),
        electron_shift_angstrom=float(transitions.electron_shift_angstrom[at]),
        trust="edge",
        cautions=tuple(_cautions(states)),
    )


def peak_absorptivity(strength: float) -> float:
    """M^-1 cm^-1 at the top of a Gaussian band of the usual width: f = 4.319e-9 times the area over wavenumber."""
    width_cm1 = WIDTH_EV * 8065.544
    return strength / (4.319e-9 * width_cm1 * math.sqrt(math.pi / (4 * math.log(2))))


def _cautions(states: States) -> Iterator[str]:
    yield "pi electrons only, without a solvent and without a correction to measured bands"
    if states.system.stand_ins:
        yield f"{' and '.join(states.system.stand_ins)} taken for Cl, for want of published parameters"


def _distributions(states: States) -> tuple[FloatArray, FloatArray]:
    """Where the hole and the electron are, (states, atoms), each row summing to one."""
    found = states.singlets
    holes = np.einsum("kia,pi->kap", found.amplitudes, found.occupied)
    electrons = np.einsum("kia,pa->kip", found.amplitudes, found.virtual)
    return (holes**2).sum(axis=1), (electrons**2).sum(axis=1)


def _long_axis(masses: FloatArray, positions: FloatArray) -> FloatArray:
    """Axis of least inertia."""
    centred = positions - np.average(positions, axis=0, weights=masses)
    spread = (centred * masses[:, None]).T @ centred
    axis: FloatArray = np.linalg.eigh(spread)[1][:, -1]
    return axis


def _angles(vectors: FloatArray, axis: FloatArray) -> FloatArray:
    lengths = np.linalg.norm(vectors, axis=1)
    cosines = np.abs(vectors @ axis) / np.where(lengths > 1e-9, lengths, 1.0)
    angles: FloatArray = np.degrees(np.arccos(np.clip(np.where(lengths > 1e-9, cosines, 1.0), 0, 1)))
    return angles


def masses_of(numbers: IntArray) -> FloatArray:
    """Standard atomic masses, g/mol."""
    from rdkit.Chem import GetPeriodicTable

    table = GetPeriodicTable()
    return np.array([table.GetAtomicWeight(int(number)) for number in numbers])
