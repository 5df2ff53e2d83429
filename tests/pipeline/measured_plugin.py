"""A made-up prediction, followed by the real library stages; loaded through ORCHIL_EXTRA_PLUGINS."""

from __future__ import annotations

import os
import time
from pathlib import Path

import pluggy
from orchil_schemas import Availability, Band, Identity, LibraryRow, Medium, NoSettings
from orchil_stages.anchor import Anchor
from orchil_stages.score import Score

hookimpl = pluggy.HookimplMarker("orchil")


class Guess:
    """Every dye absorbs at 430 nm and emits at 500 nm, give or take a tenth."""

    name, version, needs, makes = "guess", "1", (LibraryRow,), (Identity, Medium, Band)
    Settings = NoSettings
    time_limit_seconds = 20.0

    def found(self):
        return Availability(True)

    def run(self, inputs, settings, context):
        row = inputs[LibraryRow]
        Path(os.environ["FAKE_RUNS"], f"guess-{time.time_ns()}").touch()
        yield Identity(
            smiles=row.structure,
            inchikey=row.structure,
            fixed_hydrogen_layer="",
            charge=0,
            formula="",
            heavy_atoms=10,
            atoms=20,
            molar_mass_g_mol=100.0,
            zwitterion=False,
        )
        yield Medium(name=row.medium or "", dielectric_constant=2.0, refractive_index=1.4)
        yield band()


def band():
    return Band(
        state=0,
        first_bright_state=0,
        strongest_state=0,
        coverage=0.9,
        absorption_max_nm=430.0,
        absorption_low_nm=390.0,
        absorption_high_nm=480.0,
        physics_absorption_max_nm=430.0,
        strongest_absorption_max_nm=430.0,
        molar_absorptivity=30000.0,
        molar_absorptivity_low=20000.0,
        molar_absorptivity_high=50000.0,
        width_ev=0.4,
        oscillator_strength=0.8,
        transition_dipole_debye=9.0,
        long_axis_angle_deg=5.0,
        electron_shift_angstrom=1.0,
        emission_max_nm=500.0,
        emission_low_nm=450.0,
        emission_high_nm=560.0,
        trust="inside",
    )


@hookimpl
def orchil_stages():
    return [Score(), Guess(), Anchor()]
