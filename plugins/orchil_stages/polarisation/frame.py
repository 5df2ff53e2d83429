"""The axes of a molecule, how far it reaches along them, and how it may order in a film."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, IntArray

_TOP = 0.02
"""Axes are undefined where two moments of inertia differ by less than this share."""


def inertial_axes(masses: FloatArray, positions: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Axes as rows (3, 3) of a right-handed frame: least, middle, most inertia; and the moments (3,), rising."""
    centred = positions - masses @ positions / masses.sum()
    spread, columns = np.linalg.eigh((centred * masses[:, None]).T @ centred)
    axes = columns.T[::-1].copy()
    axes[:2] *= np.where(np.take_along_axis(axes[:2], np.abs(axes[:2]).argmax(axis=1)[:, None], axis=1) < 0, -1, 1)
    axes[2] = np.cross(axes[0], axes[1])
    return axes, spread.sum() - spread[::-1]


def undefined_axes(moments: FloatArray) -> str | None:
    """Which axes the moments of inertia (rising) leave open, if any."""
    near = np.diff(moments) < _TOP * moments[-1]
    if near.all():
        return "long, short and normal axis"
    if near[0]:
        return "long and short axis"
    return "short axis and normal" if near[1] else None


def half_lengths(numbers: IntArray, positions: FloatArray, axes: FloatArray) -> FloatArray:
    """Half the extent (3,) along each axis in angstrom, with van der Waals radii."""
    from rdkit import Chem

    table = Chem.GetPeriodicTable()
    radii = np.array([table.GetRvdw(int(number)) for number in numbers])[:, None]
    along = positions @ axes.T
    return np.asarray((along + radii).max(axis=0) - (along - radii).min(axis=0)) / 2


def factors_from_shape(half: FloatArray) -> FloatArray:
    """Orientation factors (3,) of the axes in a well stretched film, in proportion to squared half-lengths.

    An estimate of this project: the longer axis follows the stretch better. On seven aromatic hydrocarbons in stretched
    polyethylene (K of Thulstrup and Michl, from memory; Nguyen and others 2012) it is within 0.15.
    """
    return np.asarray(half**2 / (half**2).sum())


def factors_from_order(long: float, short: float | None) -> FloatArray:
    """Orientation factors (3,) of Saupe order parameters of the long and, if given, the short axis.

    Without the second one the molecule is a rod. ValueError when they leave less than nothing for the normal.
    """
    first = (2 * long + 1) / 3
    second = (1 - first) / 2 if short is None else (2 * short + 1) / 3
    factors = np.array([first, second, 1 - first - second])
    if factors.min() < -1e-12:
        raise ValueError("the order parameters of long and short axis must not sum to more than 1/2")
    return np.asarray(np.clip(factors, 0, None))
