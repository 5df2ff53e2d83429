"""Panel: the relaxed structure in space with the transition dipole on it."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import Band, Conformers, FloatArray, Geometry, Record, Transitions
from orchil_schemas.panel import Arrow, Part, Scene, Subject

_REACH = 1.15
"""The arrow of a transition dipole reaches this much beyond the molecule along its direction."""


class SpacePanel:
    """Atoms, bonds and the transition dipole; the reader can turn it."""

    name = "space"
    title = "Structure in space"
    place = 30
    needs: tuple[type[Record], ...] = (Geometry, Conformers, Transitions, Band)

    def parts(self, subject: Subject) -> Iterable[Part]:
        """One scene."""
        band = subject[Band]
        dipole = subject[Transitions].transition_dipole_debye[band.state]
        angle = f"{band.long_axis_angle_deg:.0f} degrees to the long axis"
        yield scene(
            subject,
            tuple(transition_arrow(subject[Geometry].positions_angstrom, dipole)),
            alt=(
                f"{len(subject[Geometry].atomic_numbers)} atoms in space; the transition dipole moment, "
                f"{np.linalg.norm(dipole):.1f} debye, lies at {angle}."
            ),
            caption=(
                f"Double arrow: direction of the transition dipole moment, {np.linalg.norm(dipole):.1f} debye, "
                f"{angle}. Its sign has no meaning."
            ),
        )


def scene(subject: Subject, arrows: tuple[Arrow, ...], *, alt: str, caption: str) -> Scene:
    """The relaxed structure turned so that its longest extent lies across and its shortest towards the reader."""
    geometry = subject[Geometry]
    turn, middle = viewing_frame(geometry.positions_angstrom)
    turned = [
        Arrow(
            label=arrow.label,
            start=turn @ (arrow.start - middle),
            end=turn @ (arrow.end - middle),
            both_ends=arrow.both_ends,
        )
        for arrow in arrows
    ]
    return Scene(
        atomic_numbers=geometry.atomic_numbers,
        positions_angstrom=np.round((geometry.positions_angstrom - middle) @ turn.T, 3),
        bonds=subject[Conformers].bonds,
        arrows=tuple(turned),
        alt=alt,
        caption=caption,
    )


def viewing_frame(positions: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Rotation (3, 3) to the principal extents, x the longest and z the shortest, and the middle (3,)."""
    middle = positions.mean(axis=0)
    _, columns = np.linalg.eigh(np.cov((positions - middle).T)) if len(positions) > 1 else (None, np.eye(3))
    turn = columns.T[::-1].copy()
    turn[2] = np.cross(turn[0], turn[1])
    return turn, middle


def transition_arrow(positions: FloatArray, dipole: FloatArray) -> Iterable[Arrow]:
    """A double arrow through the middle of the molecule; none for a dipole of no length."""
    length = float(np.linalg.norm(dipole))
    if length < 1e-3:
        return
    along = dipole / length
    middle = positions.mean(axis=0)
    reach = _REACH * float(np.abs((positions - middle) @ along).max()) + 0.8
    yield Arrow(label="transition dipole", start=middle - reach * along, end=middle + reach * along, both_ends=True)
