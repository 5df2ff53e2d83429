"""Made-up records with round numbers for the stages that say what light does with a dye."""

from __future__ import annotations

from typing import Any

import numpy as np
from orchil_schemas import HC_EV_NM, Band, Geometry, Identity, Medium, Orbitals, Transitions

CYCLOHEXANE = Medium(name="cyclohexane", dielectric_constant=2.0165, refractive_index=1.4266, solvation="nhexane")


def band(**changed: Any) -> Band:
    """A band at 500 nm that is exactly known unless intervals are given."""
    whole = {
        "state": 0, "first_bright_state": 0, "strongest_state": 0, "coverage": 0.9, "absorption_max_nm": 500.0,
        "absorption_low_nm": 500.0, "absorption_high_nm": 500.0, "physics_absorption_max_nm": 500.0,
        "strongest_absorption_max_nm": 500.0, "molar_absorptivity": 50000.0, "molar_absorptivity_low": 50000.0,
        "molar_absorptivity_high": 50000.0, "width_ev": 0.3, "oscillator_strength": 1.0,
        "transition_dipole_debye": 8.0, "long_axis_angle_deg": 0.0, "electron_shift_angstrom": 1.0,
        "emission_max_nm": 550.0, "emission_low_nm": 550.0, "emission_high_nm": 550.0, "trust": "inside",
    }  # fmt: skip
    return Band(**(whole | changed))


def transitions(energies_ev: list[float], strengths: list[float], dipoles: Any = None, **changed: Any) -> Transitions:
    """States with the given strengths; dipoles (states, 3) along x unless given."""
    count = len(energies_ev)
    ones, zeros, vectors = np.ones(count), np.zeros(count), np.zeros((count, 3))
    whole = {
        "method": "made up", "energy_ev": energies_ev, "oscillator_strength": strengths,
        "transition_dipole_debye": np.outer(8 * ones, [1, 0, 0]) if dipoles is None else dipoles,
        "long_axis_angle_deg": zeros, "electron_shift_angstrom": zeros, "shift_angstrom": vectors,
        "charge_transfer_share": zeros, "overlap": ones, "dipole_change_debye": vectors, "leading_from": zeros,
        "leading_to": zeros, "leading_weight": ones, "pi_share": ones,
    }  # fmt: skip
    return Transitions(**(whole | changed))


ONE_STATE = transitions([HC_EV_NM / 500], [1.0])


def rod(length: int = 5) -> Geometry:
    """A flat row of carbon pairs along x with the short axis along y."""
    positions = [[1.4 * i, y, 0.0] for i in range(length) for y in (-0.7, 0.7)]
    return Geometry(
        atomic_numbers=[6] * (2 * length), positions_angstrom=positions, charge=0, energy_hartree=0.0,
        gradient_norm=0.0, gradients_used=1, solvation=None, engine="made up",
    )  # fmt: skip


def identity(smiles: str = "c1ccccc1", charge: int = 0, heavy_atoms: int = 20) -> Identity:
    """A species with little else than its structure."""
    return Identity(
        smiles=smiles, inchikey="", fixed_hydrogen_layer="", charge=charge, formula="", heavy_atoms=heavy_atoms,
        atoms=30, molar_mass_g_mol=250.0, zwitterion=False,
    )  # fmt: skip


def orbitals(homo_ev: float = -10.0, lumo_ev: float = -8.0, dipole_debye: Any = (0.0, 0.0, 0.0)) -> Orbitals:
    """Frontier levels and a dipole."""
    return Orbitals(
        homo_ev=homo_ev, lumo_ev=lumo_ev, gap_ev=lumo_ev - homo_ev, dipole_debye=dipole_debye,
        partial_charges_e=np.zeros(2), occupied_window=16, virtual_window=16, overlap_error=0.0,
        dipole_error_debye=0.0,
    )  # fmt: skip
