"""Panel: how the absorption of the fixed molecule follows the polariser, and of a stretched film."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import Band, FloatArray, Geometry, Orientation, Record, Transitions
from orchil_schemas.panel import Chart, Fact, Facts, Part, Subject

from .spectrum import BLUE

_ANGLES = np.arange(0.0, 181.0, 3.0)


class PolarisedPanel:
    """Absorption against the angle of the polariser."""

    name = "polarised"
    title = "Polarised absorption"
    place = 40
    needs: tuple[type[Record], ...] = (Band, Transitions, Geometry)

    def parts(self, subject: Subject) -> Iterable[Part]:
        """The curve; the film where it was computed."""
        found = subject.get(Orientation)
        if found is not None:
            yield _chart(smooth(found.polariser_deg, found.polariser_absorption), "reference axis of the host")
            yield Facts(facts=_film(found))
            return
        yield _chart(from_long_axis(subject), "long axis of the molecule")
        angle = Fact(label="dipole to the long axis", value=subject[Band].long_axis_angle_deg, unit="degree")
        yield Facts(facts=(angle,))


def from_long_axis(subject: Subject) -> FloatArray:
    """Absorption of the reported band over the isotropic one, light along the normal of the molecule, (angles,)."""
    from orchil_stages.excite.masses import atomic_masses
    from orchil_stages.optics.polarised import absorption_tensor, polariser_curve
    from orchil_stages.polarisation.frame import inertial_axes

    geometry = subject[Geometry]
    axes, _ = inertial_axes(atomic_masses(geometry.atomic_numbers), geometry.positions_angstrom)
    dipole = subject[Transitions].transition_dipole_debye[subject[Band].state]
    if not np.linalg.norm(dipole) > 0:
        return np.zeros(len(_ANGLES))
    tensor = absorption_tensor(dipole[None], np.ones(1))
    return polariser_curve(tensor, np.eye(3), axes[2], axes[0], _ANGLES)


def smooth(angle_deg: FloatArray, absorption: FloatArray) -> FloatArray:
    """The curve at finer angles (angles,): that of fixed dipoles is a + b cos 2x + c sin 2x (Malus), fitted exactly."""

    def basis(angles: FloatArray) -> FloatArray:
        double = np.radians(2 * angles)
        return np.stack([np.ones_like(double), np.cos(double), np.sin(double)], axis=1)

    parts, *_ = np.linalg.lstsq(basis(angle_deg), absorption, rcond=None)
    return np.asarray(np.clip(basis(_ANGLES) @ parts, 0, None))


def _film(found: Orientation) -> tuple[Fact, ...]:
    return (
        Fact(label="polariser angle of most absorption", value=found.polariser_max_deg, unit="degree"),
        Fact(label="contrast (max - min)/(max + min)", value=found.polariser_contrast),
        Fact(label="dichroic ratio in the film", value=found.dichroic_ratio),
        Fact(label="order parameter of the long axis", value=found.order_parameter, meaning=f"from {found.order_from}"),
        Fact(label="reduced linear dichroism", value=found.reduced_linear_dichroism),
    )


def _chart(absorption: FloatArray, reference: str) -> Chart:
    rows = [{"deg": float(a), "a": round(float(y), 4)} for a, y in zip(_ANGLES, absorption, strict=True)]
    most = float(_ANGLES[int(np.argmax(absorption))])
    x = {
        "field": "deg",
        "type": "quantitative",
        "title": "polariser angle / degree",
        "scale": {"domain": [0, 180], "nice": False},
        "axis": {"values": list(range(0, 181, 30))},
    }
    title = "absorption / isotropic solution = 1"
    y = {"field": "a", "type": "quantitative", "title": title, "scale": {"domainMin": 0}}
    level = {
        "data": {"values": [{"a": 1}]},
        "mark": {"type": "rule", "color": "#666", "strokeDash": [2, 3]},
        "encoding": {"y": {"field": "a", "type": "quantitative"}},
    }
    curve = {"mark": {"type": "line", "color": BLUE, "strokeWidth": 2}, "encoding": {"x": x, "y": y}}
    return Chart(
        spec={"data": {"values": rows}, "layer": [level, curve]},
        alt=(
            f"Absorption against polariser angle: most, {absorption.max():.2f}, at {most:.0f} degrees, "
            f"least, {absorption.min():.2f}; the isotropic solution is 1."
        ),
        caption=f"Molecule held fixed; 0 degrees is along the {reference}. Dotted: the same dye in solution.",
    )
