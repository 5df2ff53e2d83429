"""The calibrate stage: which state is the absorption maximum, where it is measured, how strongly, how
surely.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np
from orchil_schemas import (
    HC_EV_NM,
    Availability,
    Band,
    Context,
    FloatArray,
    Frozen,
    Geometry,
    Identity,
    Inputs,
    Medium,
    Orbitals,
    Record,
    Transitions,
)
from pydantic import Field, field_validator

from orchil_stages.installed import availability

COVERAGES = (0.5, 0.8, 0.9, 0.95)
"""Probabilities for which intervals are trained."""


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
    version = "1"
    needs: tuple[type[Record], ...] = (Identity, Medium, Geometry, Orbitals, Transitions)
    makes: tuple[type[Record], ...] = (Band,)
    Settings: type[Frozen] = CalibrateSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs nothing beyond NumPy."""
        return availability("numpy")

    def run(self, inputs: Inputs, settings: CalibrateSettings, context: Context) -> Iterable[Record]:
        """One Band."""
        from .features import band_features

        features = band_features(inputs[Identity], inputs[Medium], inputs[Orbitals], inputs[Transitions])
        return (_band(features, inputs, settings.coverage),)


_SHORTEST_EV, _LONGEST_EV = 7.0, 0.3
"""Energies outside are held at the limit: 180 nm to 4 micrometres."""


def _band(features: FloatArray, inputs: Inputs, coverage: float) -> Band:
    from orchil_stages.excite.bright import first_bright, strongest_state

    from .linear import trained_calibration

    models, transitions = trained_calibration(), inputs[Transitions]
    energies, strengths = transitions.energy_ev, transitions.oscillator_strength
    state, strongest = first_bright(energies, strengths), strongest_state(energies, strengths)
    physics = float(energies[state])
    correction = float(models.position.predict(features))
    low, high = (float(edge) for edge in models.position.interval(features, coverage))
    position = _nm(physics + correction)
    stokes = float(models.stokes.predict(features))
    emission_low, emission_high = (float(edge) for edge in models.stokes.interval(features, coverage))
    epsilon_low, epsilon_high = (float(edge) for edge in models.absorptivity.interval(features, coverage))
    trust = models.trust(features)
    return Band(
        state=state,
        first_bright_state=state,
        strongest_state=strongest,
        coverage=coverage,
        absorption_max_nm=position,
        absorption_low_nm=_nm(physics + high),
        absorption_high_nm=_nm(physics + low),
        physics_absorption_max_nm=_nm(physics),
        strongest_absorption_max_nm=_nm(float(energies[strongest]) + correction),
        molar_absorptivity=10.0 ** float(models.absorptivity.predict(features)),
        molar_absorptivity_low=10.0**epsilon_low,
        molar_absorptivity_high=10.0**epsilon_high,
        width_ev=10.0 ** float(models.width.predict(features)),
        oscillator_strength=float(strengths[state]),
        transition_dipole_debye=float(np.linalg.norm(transitions.transition_dipole_debye[state])),
        long_axis_angle_deg=float(transitions.long_axis_angle_deg[state]),
        electron_shift_angstrom=float(transitions.electron_shift_angstrom[state]),
        emission_max_nm=_nm(physics - stokes),
        emission_low_nm=_nm(physics - emission_low),
        emission_high_nm=_nm(physics - emission_high),
        trust=trust,
        cautions=tuple(_cautions(trust, inputs, float(strengths[state]))),
    )


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
