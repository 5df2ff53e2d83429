"""Polarised light: a rigid dye in a crystal or host, a stretched film, photoselection in a glass.

A dye absorbs the share cos^2 of the angle between its transition dipole and the electric field. Definitions
of linear dichroism and orientation factors: IUPAC Gold Book LT07415 and MT07422; anisotropy: ET07370. The
reduced linear dichroism of Norden, Appl. Spectrosc. Rev. 14, 157 (1978), is three times the IUPAC one.
"""

from __future__ import annotations

from math import acos, degrees, sqrt

import numpy as np
from numpy.typing import ArrayLike
from orchil_schemas import FloatArray

MAGIC_ANGLE_DEG = degrees(acos(1 / sqrt(3)))
"""Angle at which orientation drops out, 54.7356 degrees."""

ISOTROPIC_SHARE = 1 / 3
"""Mean of cos^2 over all orientations."""


def share_absorbed(dipole: ArrayLike, field: ArrayLike) -> FloatArray:
    """cos^2 between dipoles and fields, vectors on the last axis; ``ValueError`` for a zero vector."""
    cosine = np.sum(_unit(dipole) * _unit(field), axis=-1)
    return np.asarray(cosine**2)


def polariser_fields(propagation: ArrayLike, reference: ArrayLike, angle_deg: ArrayLike) -> FloatArray:
    """Field vectors (n, 3) of light along ``propagation`` for polariser angles counted from ``reference``.

    The reference is projected on the plane of the wave; angles turn right-handed about ``propagation``.
    """
    along = _unit(propagation)
    zero = np.asarray(reference, dtype=float)
    zero = zero - (zero @ along) * along
    if np.linalg.norm(zero) < 1e-9:
        raise ValueError("reference must not be parallel to propagation")
    first = _unit(zero)
    angle = np.radians(np.atleast_1d(np.asarray(angle_deg, dtype=float)))[:, None]
    return np.asarray(np.cos(angle) * first + np.sin(angle) * np.cross(along, first))


def rigid_absorption(
    dipole: ArrayLike, rotation: ArrayLike, propagation: ArrayLike, reference: ArrayLike, angle_deg: ArrayLike
) -> FloatArray:
    """Share absorbed against polariser angle; ``rotation`` (3, 3) turns the dye into the host."""
    turned = np.asarray(rotation, dtype=float) @ np.asarray(dipole, dtype=float)
    return share_absorbed(turned, polariser_fields(propagation, reference, angle_deg))


def second_legendre(angle_deg: ArrayLike) -> FloatArray:
    """(3 cos^2 - 1)/2 of an angle: 1 at 0, zero at the magic angle, -1/2 at 90 degrees."""
    return np.asarray((3 * np.cos(np.radians(np.asarray(angle_deg, dtype=float))) ** 2 - 1) / 2)


def saupe(orientation_factor: ArrayLike) -> FloatArray:
    """Saupe order parameter S = (3K - 1)/2 of an orientation factor K = <cos^2>."""
    return np.asarray((3 * np.asarray(orientation_factor, dtype=float) - 1) / 2)


def orientation_factor(saupe_s: ArrayLike) -> FloatArray:
    """Orientation factor K = (2S + 1)/3 of a Saupe order parameter."""
    return np.asarray((2 * np.asarray(saupe_s, dtype=float) + 1) / 3)


def transition_orientation_factor(dipole: ArrayLike, axis_factors: ArrayLike) -> FloatArray:
    """K of a transition whose dipole (..., 3) is given in the molecular orientation axes with factors (3,).

    ``ValueError`` unless the three factors lie in 0 to 1 and sum to one (IUPAC Gold Book MT07422).
    """
    factors = np.asarray(axis_factors, dtype=float)
    if factors.shape != (3,) or np.any(factors < 0) or abs(factors.sum() - 1) > 1e-9:
        raise ValueError("axis_factors must be three numbers of 0 to 1 that sum to 1")
    return np.asarray(_unit(dipole) ** 2 @ factors)


def rod_orientation_factor(saupe_s: ArrayLike, angle_deg: ArrayLike) -> FloatArray:
    """K of a transition at an angle to the long axis of a dye that orders as a rod of order parameter S."""
    return orientation_factor(np.asarray(saupe_s, dtype=float) * second_legendre(angle_deg))


def film_absorption(factor: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Absorbance parallel and perpendicular to the stretch over the isotropic one: 3K and 3(1 - K)/2."""
    k = np.asarray(factor, dtype=float)
    return np.asarray(3 * k), np.asarray(3 * (1 - k) / 2)


def dichroic_ratio(factor: ArrayLike) -> FloatArray:
    """A_parallel/A_perpendicular = 2K/(1 - K) of a uniaxial film; infinite for K = 1."""
    parallel, perpendicular = film_absorption(factor)
    endless = np.full(parallel.shape, np.inf)
    return np.asarray(np.divide(parallel, perpendicular, out=endless, where=perpendicular > 0))


def factor_from_dichroic_ratio(ratio: ArrayLike) -> FloatArray:
    """K = d/(d + 2) of a measured dichroic ratio d of a uniaxial film."""
    d = np.asarray(ratio, dtype=float)
    return np.asarray(d / (d + 2))


def reduced_dichroism(parallel: ArrayLike, perpendicular: ArrayLike) -> FloatArray:
    """IUPAC reduced linear dichroism (A_Z - A_Y)/(A_Z + 2 A_Y): -1/2 to 1, equal to (3K - 1)/2."""
    z, y = np.asarray(parallel, dtype=float), np.asarray(perpendicular, dtype=float)
    return np.asarray((z - y) / (z + 2 * y))


def reduced_dichroism_norden(saupe_s: ArrayLike, angle_deg: ArrayLike) -> FloatArray:
    """LD/A_iso = 3 S (3 cos^2 - 1)/2, Norden's convention: -3/2 to 3."""
    return 3 * np.asarray(saupe_s, dtype=float) * second_legendre(angle_deg)


def fundamental_anisotropy(angle_deg: ArrayLike) -> FloatArray:
    """r0 = (3 cos^2 - 1)/5 of the angle between absorbing and emitting dipole: -1/5 to 2/5."""
    return 2 * second_legendre(angle_deg) / 5


def anisotropy(parallel: ArrayLike, perpendicular: ArrayLike) -> FloatArray:
    """Emission anisotropy r = (I_par - I_perp)/(I_par + 2 I_perp)."""
    return reduced_dichroism(parallel, perpendicular)


def polarisation(parallel: ArrayLike, perpendicular: ArrayLike) -> FloatArray:
    """Degree of polarisation p = (I_par - I_perp)/(I_par + I_perp)."""
    par, perp = np.asarray(parallel, dtype=float), np.asarray(perpendicular, dtype=float)
    return np.asarray((par - perp) / (par + perp))


def anisotropy_from_polarisation(degree: ArrayLike) -> FloatArray:
    """Anisotropy r = 2p/(3 - p) of a degree of polarisation."""
    p = np.asarray(degree, dtype=float)
    return np.asarray(2 * p / (3 - p))


def absorption_tensor(dipoles: ArrayLike, weights: ArrayLike) -> FloatArray:
    """Sum of w u u^T (3, 3) over directions u of dipoles (states, 3), scaled to trace 1.

    ``ValueError`` when nothing absorbs. A field along e is absorbed in proportion to e^T T e.
    """
    weight = np.asarray(weights, dtype=float)
    vectors = np.asarray(dipoles, dtype=float)
    seen = (weight > 0) & (np.linalg.norm(vectors, axis=-1) > 0)
    if not seen.any():
        raise ValueError("no transition absorbs: weights must not all be zero")
    units = _unit(vectors[seen])
    share = weight[seen] / weight[seen].sum()
    return np.asarray(np.einsum("s,sx,sy->xy", share, units, units))


def polariser_curve(
    tensor: ArrayLike, rotation: ArrayLike, propagation: ArrayLike, reference: ArrayLike, angle_deg: ArrayLike
) -> FloatArray:
    """Absorption over the isotropic one against polariser angle, 3 e^T R T R^T e, of a rigid molecule."""
    turn = np.asarray(rotation, dtype=float)
    turned = turn @ np.asarray(tensor, dtype=float) @ turn.T
    fields = polariser_fields(propagation, reference, angle_deg)
    return np.asarray(3 * np.einsum("nx,xy,ny->n", fields, turned, fields))


def malus_extremes(
    tensor: ArrayLike, rotation: ArrayLike, propagation: ArrayLike, reference: ArrayLike
) -> tuple[float, float]:
    """Polariser angle of most absorption (0 to 180) and contrast (max - min)/(max + min) of the curve.

    Three angles fix the curve: it is a + b cos 2x + c sin 2x (Malus). Without contrast the angle is 0.
    """
    at_0, at_45, at_90 = polariser_curve(tensor, rotation, propagation, reference, [0.0, 45.0, 90.0])
    mean, cosine = (at_0 + at_90) / 2, (at_0 - at_90) / 2
    sine = at_45 - mean
    swing = float(np.hypot(cosine, sine))
    if swing < 1e-12:
        return 0.0, 0.0
    return float(np.degrees(np.arctan2(sine, cosine)) / 2 % 180), min(swing / float(mean), 1.0)


def frame_from_axes(first: ArrayLike, second: ArrayLike) -> FloatArray:
    """Rotation (3, 3) that turns x onto ``first`` and z as near as possible to ``second``.

    ``ValueError`` when the two are parallel.
    """
    x = _unit(first)
    z = np.asarray(second, dtype=float)
    z = z - (z @ x) * x
    if np.linalg.norm(z) < 1e-6 * np.linalg.norm(np.asarray(second, dtype=float)):
        raise ValueError("the two axes must not be parallel")
    z = _unit(z)
    return np.column_stack([x, np.cross(z, x), z])


def overlapping_anisotropy(tensor: ArrayLike, emission: ArrayLike) -> float:
    """Fundamental anisotropy (3 e^T T e - 1)/5 when several transitions absorb and the dipole ``emission`` emits.

    Additivity of anisotropies: Weber, Biochem. J. 51, 145 (1952).
    """
    e = _unit(emission)
    return float((3 * e @ np.asarray(tensor, dtype=float) @ e - 1) / 5)


def _unit(vector: ArrayLike) -> FloatArray:
    array = np.asarray(vector, dtype=float)
    length = np.linalg.norm(array, axis=-1, keepdims=True)
    if not np.all(length > 0):
        raise ValueError("a vector of length zero has no direction")
    return np.asarray(array / length)
