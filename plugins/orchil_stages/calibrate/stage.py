"""The calibrate stage: which state is the absorption maximum, where it is measured, how strongly, how
surely.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import TYPE_CHECKING

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    Frozen,
    Geometry,
    Identity,
    Inputs,
    Medium,
    Orbitals,
    Record,
    StateAnalysis,
    Transitions,
)
from pydantic import Field, field_validator

from orchil_stages.installed import availability

from .coverages import COVERAGES

if TYPE_CHECKING:
    from .reading import Reading


class CalibrateSettings(Frozen):
    """How wide the reported intervals are."""

    coverage: float = Field(default=0.9, description="probability of the central intervals")

    @field_validator("coverage")
    @classmethod
    def _trained(cls, coverage: float) -> float:
        if coverage not in COVERAGES:
            known = ", ".join(f"{c:g}" for c in COVERAGES)
            raise ValueError(f"coverage = {coverage:g} is not calibrated; choose one of {known}")
        return coverage


class Calibrate:
    """Band on the measured scale from the computed states."""

    name = "calibrate"
    version = "2"
    needs: tuple[type[Record], ...] = (Identity, Medium, Geometry, Orbitals, Transitions, StateAnalysis)
    makes: tuple[type[Record], ...] = (Band,)
    Settings: type[Frozen] = CalibrateSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Are RDKit (for environments) and SciPy installed?"""
        return availability("rdkit", "scipy")

    def run(self, inputs: Inputs, settings: CalibrateSettings, context: Context) -> Iterable[Record]:
        """One Band; BadResult when structure and states do not belong together."""
        return (_band(inputs, settings.coverage),)


_SHORTEST_EV, _LONGEST_EV = 7.0, 0.3
"""Energies outside are held at the limit: 180 nm to 4 micrometres."""


def _band(inputs: Inputs, coverage: float) -> Band:
    from orchil_stages.excite.bright import first_bright, strongest_state

    from .reading import read_band

    transitions = inputs[Transitions]
    energies, strengths = transitions.energy_ev, transitions.oscillator_strength
    state, strongest = first_bright(energies, strengths), strongest_state(energies, strengths)
    physics = float(energies[state])
    read = read_band(inputs, state, coverage)
    position, absorptivity, width = read["position"], read["absorptivity"], read["width"]
    return Band(
        state=state,
        first_bright_state=state,
        strongest_state=strongest,
        coverage=coverage,
        absorption_max_nm=_nm(physics + position.value),
        absorption_low_nm=_nm(physics + position.high),
        absorption_high_nm=_nm(physics + position.low),
        physics_absorption_max_nm=_nm(physics),
        strongest_absorption_max_nm=_nm(float(energies[strongest]) + position.value),
        molar_absorptivity=10.0**absorptivity.value,
        molar_absorptivity_low=10.0**absorptivity.low,
        molar_absorptivity_high=10.0**absorptivity.high,
        width_ev=10.0**width.value,
        oscillator_strength=float(strengths[state]),
        transition_dipole_debye=float(np.linalg.norm(transitions.transition_dipole_debye[state])),
        long_axis_angle_deg=float(transitions.long_axis_angle_deg[state]),
        electron_shift_angstrom=float(transitions.electron_shift_angstrom[state]),
        trust=read.trust,
        cautions=(*read.cautions, *_cautions(read.trust, inputs, float(strengths[state]))),
        **_emission(read, physics),
    )


def _emission(read: Reading, physics: float) -> dict[str, float]:
    """The fields of the emission, where the reading tells of it."""
    if "stokes" not in read.values:
        return {}
    stokes, strength = read["stokes"], read["emission_strength"]
    return {
        "emission_max_nm": _nm(physics - stokes.value),
        "emission_low_nm": _nm(physics - stokes.low),
        "emission_high_nm": _nm(physics - stokes.high),
        "emission_strength": 10.0**strength.value,
        "emission_strength_low": 10.0**strength.low,
        "emission_strength_high": 10.0**strength.high,
    }


def _nm(energy_ev: float) -> float:
    return HC_EV_NM / min(max(energy_ev, _LONGEST_EV), _SHORTEST_EV)


def _cautions(trust: str, inputs: Inputs, strength: float) -> Iterator[str]:
    identity, rescued = inputs[Identity], inputs[Geometry].rescued
    if trust == "outside":
        yield "unlike the dyes the calibration was trained on: take the numbers as a rough guide"
    if (identity.charge or identity.zwitterion) and inputs[Medium].solvation is None:
        yield "ion or zwitterion in the gas phase: give a medium for a meaningful position"
    if strength < 0.01:
        yield "no bright state found: the band is weak and its position uncertain"
    if rescued is not None:
        yield f"the relaxation needed help ({rescued}): the form may not be the stable one in this medium"
