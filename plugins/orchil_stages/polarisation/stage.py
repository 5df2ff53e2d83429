"""The polarisation stage: Geometry, Transitions and Band to an Orientation."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np
from orchil_schemas import (
    Availability,
    Band,
    Context,
    FloatArray,
    Frozen,
    Geometry,
    Inputs,
    Orientation,
    Record,
    Transitions,
)

from orchil_stages.installed import availability

from .settings import PolarisationSettings

_ANGLES_DEG = np.arange(0.0, 180.1, 15.0)


class Polarise:
    """Polarised light on a rigid molecule, a uniaxial film and a glass."""

    name = "polarisation"
    version = "1"
    needs: tuple[type[Record], ...] = (Geometry, Transitions, Band)
    makes: tuple[type[Record], ...] = (Orientation,)
    Settings: type[Frozen] = PolarisationSettings
    time_limit_seconds = 30.0

    def found(self) -> Availability:
        """Needs NumPy, SciPy and RDKit (masses and radii)."""
        return availability("numpy", "scipy", "rdkit")

    def run(self, inputs: Inputs, settings: PolarisationSettings, context: Context) -> Iterable[Record]:
        """One Orientation."""
        yield orientation(inputs[Geometry], inputs[Transitions], inputs[Band], settings)


def orientation(
    geometry: Geometry, transitions: Transitions, band: Band, settings: PolarisationSettings
) -> Orientation:
    """Everything about polarised light that follows from the transition dipoles."""
    from orchil_stages.excite.masses import atomic_masses
    from orchil_stages.optics import polarised
    from orchil_stages.spectrum.lines import band_lines

    from .frame import half_lengths, inertial_axes
    from .settings import light, rotation

    numbers, positions = geometry.atomic_numbers, geometry.positions_angstrom
    axes, moments = inertial_axes(atomic_masses(numbers), positions)
    dipoles, lines = transitions.transition_dipole_debye @ axes.T, band_lines(band, transitions)
    half = half_lengths(numbers, positions, axes)
    factors = _factors(half, settings)
    at, excitation = (nm or band.absorption_max_nm for nm in (settings.at_nm, settings.excitation_nm))
    tensor = _tensor(dipoles, lines.by_state(at)[:, 0], band.state)
    turn, (along, zero) = rotation(settings), light(settings)
    angle, contrast = polarised.malus_extremes(tensor, turn, along, zero)
    film = float(np.diag(tensor) @ factors)
    parallel, perpendicular = polarised.film_absorption(film)
    reduced = float(polarised.reduced_dichroism(parallel, perpendicular))
    to_axes = _angles(dipoles, np.eye(3))
    emitting = dipoles[band.state]
    return Orientation(
        axes=axes,
        half_lengths_angstrom=half,
        transition_axes_deg=to_axes,
        to_reported_deg=_angles(dipoles, emitting[None, :])[:, 0],
        plane_angle_deg=float(90 - to_axes[band.state, 2]),
        at_nm=at,
        absorption_tensor=tensor,
        axis_orientation_factors=factors,
        order_parameter=float(polarised.saupe(factors[0])),
        order_from="shape" if settings.order_parameter is None else "settings",
        orientation_factor=film,
        dichroic_ratio=float(polarised.dichroic_ratio(film)),
        reduced_linear_dichroism=reduced,
        reduced_linear_dichroism_norden=3 * reduced,
        state_dichroic_ratio=polarised.dichroic_ratio(_state_factors(dipoles, factors)),
        rotation=turn,
        polariser_deg=_ANGLES_DEG,
        polariser_absorption=polarised.polariser_curve(tensor, turn, along, zero, _ANGLES_DEG),
        polariser_max_deg=angle,
        polariser_contrast=contrast,
        excitation_nm=excitation,
        fundamental_anisotropy=_anisotropy(dipoles, lines.by_state(excitation)[:, 0], band.state),
        cautions=tuple(_cautions(moments, settings, dipoles, band.state)),
    )


def _factors(half: FloatArray, settings: PolarisationSettings) -> FloatArray:
    from .frame import factors_from_order, factors_from_shape

    if settings.order_parameter is None:
        return factors_from_shape(half)
    return factors_from_order(settings.order_parameter, settings.order_parameter_short)


def _tensor(dipoles: FloatArray, weights: FloatArray, reported: int) -> FloatArray:
    """Absorption tensor where something absorbs; far from every band the one of the reported state."""
    from orchil_stages.optics.polarised import absorption_tensor

    if weights.sum() < _NOTHING or not np.linalg.norm(dipoles[weights > _NOTHING], axis=1).any():
        weights = np.arange(len(weights)) == reported
    if not np.linalg.norm(dipoles[weights > 0], axis=1).any():
        return np.eye(3) / 3
    return absorption_tensor(dipoles, weights)


_NOTHING = 1e-6
"""Molar absorptivity below which a light sees no band."""


def _state_factors(dipoles: FloatArray, factors: FloatArray) -> FloatArray:
    """K of every transition in the film; 1/3 for one without direction."""
    squared = dipoles**2
    length = squared.sum(axis=1)
    return np.where(length > _DARK_DEBYE**2, squared @ factors / np.maximum(length, 1e-300), 1 / 3)


def _anisotropy(dipoles: FloatArray, weights: FloatArray, emitting: int) -> float:
    """r0 with all states absorbing by their weights; 0 where the emitting dipole has no direction."""
    from orchil_stages.optics.polarised import overlapping_anisotropy

    if np.linalg.norm(dipoles[emitting]) < _DARK_DEBYE:
        return 0.0
    return overlapping_anisotropy(_tensor(dipoles, weights, emitting), dipoles[emitting])


_DARK_DEBYE = 1e-3
"""A transition dipole shorter than this has no direction worth telling."""


def _angles(dipoles: FloatArray, directions: FloatArray) -> FloatArray:
    """Angles (states, directions), 0 to 90 degrees; 90 for a dipole without length."""
    lengths = np.linalg.norm(dipoles, axis=1)[:, None] * np.linalg.norm(directions, axis=1)
    cosine = np.abs(dipoles @ directions.T) / np.where(lengths > 1e-12, lengths, np.inf)
    return np.degrees(np.arccos(np.clip(cosine, 0, 1)))


def _cautions(moments: FloatArray, settings: PolarisationSettings, dipoles: FloatArray, reported: int) -> Iterator[str]:
    from .frame import undefined_axes

    if (open_axes := undefined_axes(moments)) is not None:
        yield f"the moments of inertia leave {open_axes} of this molecule open: angles to them mean little"
    if settings.order_parameter is None:
        yield "order in the film estimated from the shape alone: measure it, or set order_parameter"
    if np.linalg.norm(dipoles[reported]) < _DARK_DEBYE:
        yield "the reported transition has no dipole: its direction is not defined"
