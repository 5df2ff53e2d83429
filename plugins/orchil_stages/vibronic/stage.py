"""The vibronic stage: Geometry, Medium, Transitions and Band to a Progression."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    FloatArray,
    Frozen,
    Geometry,
    Inputs,
    Medium,
    OutOfScope,
    Progression,
    Record,
    Transitions,
)
from pydantic import Field

from orchil_stages.optics.units import HC_EV_CM

from .modes import Modes


class VibronicSettings(Frozen):
    """Which modes count and how sharp a line is."""

    from_cm1: float = Field(default=150.0, ge=0, description="modes below are left out: floppy, not harmonic")
    to_cm1: float = Field(default=1900.0, gt=0, description="modes above are left out: C-H stretches hardly move")
    line_width_cm1: float = Field(default=700.0, ge=20, le=5000, description="full width of one line in the medium")
    temperature_kelvin: float = Field(default=298.15, ge=0, le=1000, description="of the hot bands")
    largest: int = Field(default=80, ge=2, description="atoms; larger molecules are refused for their cost")


class AddVibrations:
    """Huang-Rhys factors and the progression of the reported band: a minute for 40 atoms, many for 80."""

    name = "vibronic"
    version = "1"
    needs: tuple[type[Record], ...] = (Geometry, Medium, Transitions, Band)
    makes: tuple[type[Record], ...] = (Progression,)
    Settings: type[Frozen] = VibronicSettings
    time_limit_seconds = 3600.0
    on_request = True
    """Runs only where a brief names it or wants what it offers."""

    def found(self) -> Availability:
        """As the excite stage."""
        from orchil_stages.excite import Excite

        return Excite().found()

    def run(self, inputs: Inputs, settings: VibronicSettings, context: Context) -> Iterable[Record]:
        """One Progression; OutOfScope for a molecule that is too large, NotConverged and BadResult on the way."""
        atoms = len(inputs[Geometry].atomic_numbers)
        if atoms > settings.largest:
            raise OutOfScope(f"{atoms} atoms, [stage.vibronic] largest is {settings.largest}: raise it if time allows")
        yield progression(inputs, settings, context)


def progression(inputs: Inputs, settings: VibronicSettings, context: Context) -> Progression:
    """Modes, slopes along them, and the spectrum with its maximum where the calibrated band has it."""
    from .displacements import slopes
    from .progression import huang_rhys

    geometry, band, here = inputs[Geometry], inputs[Band], inputs[Transitions]
    modes = _modes(geometry, inputs[Medium])
    kept = (modes.wavenumber_cm1 >= settings.from_cm1) & (modes.wavenumber_cm1 <= settings.to_cm1)
    quantum = modes.wavenumber_cm1[kept] * _EV_PER_CM1
    reader = _states_reader(inputs, context, band.state + 4)
    factors = huang_rhys(slopes(reader, here, band.state, modes.path_bohr[kept]), quantum)
    zero_zero, wavelength, absorptivity = _spectrum(band, factors, quantum, settings)
    order = np.argsort(-factors, kind="stable")
    return Progression(
        wavenumber_cm1=modes.wavenumber_cm1[kept][order],
        huang_rhys=factors[order],
        total_huang_rhys=float(factors.sum()),
        reorganisation_ev=float(factors @ quantum),
        zero_zero_nm=HC_EV_NM / zero_zero,
        wavelength_nm=wavelength,
        molar_absorptivity=absorptivity,
        cautions=tuple(_cautions(modes, factors)),
    )


_EV_PER_CM1 = HC_EV_CM
_TOO_FAR = 3.0


def _cautions(modes: Modes, factors: FloatArray) -> Iterator[str]:
    imaginary = int((modes.wavenumber_cm1 < -50).sum())
    if imaginary:
        yield f"{imaginary} imaginary modes: the structure is not a minimum, tighten the relaxation"
    if (factors > _TOO_FAR).any():
        yield "a mode with a large displacement: the straight line of the excited state is doubtful along it"


def _modes(geometry: Geometry, medium: Medium) -> Modes:
    from orchil_stages.excite.masses import atomic_masses
    from orchil_stages.ground_state import BOHR_ANGSTROM, open_ground_state

    from .modes import normal_modes

    ground = open_ground_state(geometry.atomic_numbers, geometry.charge, medium.solvation)
    positions = geometry.positions_angstrom / BOHR_ANGSTROM
    return normal_modes(lambda at: ground.evaluate(at).gradient, positions, atomic_masses(geometry.atomic_numbers))


def _states_reader(inputs: Inputs, context: Context, states: int) -> Callable[[FloatArray], Transitions]:
    """A function from a displacement (bohr) to the states there."""
    from orchil_stages.excite.stage import Excite, ExciteSettings
    from orchil_stages.ground_state import BOHR_ANGSTROM

    geometry, medium = inputs[Geometry], inputs[Medium]

    def read(displacement: FloatArray) -> Transitions:
        moved = geometry.positions_angstrom + displacement * BOHR_ANGSTROM
        there = geometry.model_copy(update={"positions_angstrom": moved})
        return Inputs(Excite().run(Inputs([there, medium]), ExciteSettings(states=states), context))[Transitions]

    return read


def _spectrum(
    band: Band, factors: FloatArray, quantum_ev: FloatArray, settings: VibronicSettings
) -> tuple[float, FloatArray, FloatArray]:
    """0-0 energy (eV), wavelengths (nm, rising) and molar absorptivity with the area of the calibrated band."""
    from orchil_stages.optics.strength import gaussian_area
    from orchil_stages.spectrum.rounding import rounded

    from .progression import profile

    energy, shape = profile(factors, quantum_ev, settings.line_width_cm1 * _EV_PER_CM1, settings.temperature_kelvin)
    zero_zero = HC_EV_NM / band.absorption_max_nm - energy[int(np.argmax(shape))]
    area = float(gaussian_area(band.molar_absorptivity, band.width_ev))
    grid = np.linspace(zero_zero - 0.4, zero_zero + 1.4, 181)
    absorptivity = area * np.interp(grid, zero_zero + energy, shape)
    sound = grid > 0.2
    return float(zero_zero), np.round(HC_EV_NM / grid[sound][::-1], 2), rounded(absorptivity[sound][::-1])
