"""Settings of the polarisation stage."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, Frozen
from pydantic import Field, model_validator
from typing_extensions import Self

from orchil_stages.optics.polarised import frame_from_axes, polariser_fields

from .frame import factors_from_order

Vector = tuple[float, float, float]


class PolarisationSettings(Frozen):
    """A film by its order, a crystal or host by how the molecule sits in it, and the light.

    Host axes: light comes along ``propagation`` and the polariser angle counts from ``polariser_zero``.
    """

    order_parameter: float | None = Field(
        default=None, ge=-0.5, le=0.999, description="Saupe S of the long axis in the film; left out: from the shape"
    )
    order_parameter_short: float | None = Field(
        default=None, ge=-0.5, le=0.999, description="of the short axis; left out: a rod"
    )
    at_nm: float | None = Field(default=None, ge=150, le=5000, description="left out: the reported maximum")
    excitation_nm: float | None = Field(default=None, ge=150, le=5000, description="left out: the reported maximum")
    euler_deg: Vector | None = Field(
        default=None, description="rotation of the molecule: about its normal, its short axis, its long axis"
    )
    long_axis: Vector | None = Field(default=None, description="direction of the long axis in the host")
    normal: Vector | None = Field(default=None, description="direction of the normal in the host")
    propagation: Vector | None = Field(default=None, description="left out: 0 0 1")
    polariser_zero: Vector | None = Field(default=None, description="left out: 1 0 0")

    @model_validator(mode="after")
    def _sound(self) -> Self:
        if self.order_parameter_short is not None and self.order_parameter is None:
            raise ValueError("order_parameter_short needs order_parameter beside it")
        if self.order_parameter is not None:
            factors_from_order(self.order_parameter, self.order_parameter_short)
        if self.euler_deg is not None and self.long_axis is not None:
            raise ValueError("give euler_deg or long_axis and normal, not both")
        if (self.long_axis is None) != (self.normal is None):
            raise ValueError("long_axis and normal belong together: give both")
        polariser_fields(*light(self), 0.0)
        rotation(self)
        return self


def rotation(settings: PolarisationSettings) -> FloatArray:
    """Rotation (3, 3) from the molecular axes (x long, y short, z normal) into the host; ValueError if not sound.

    Euler angles turn about the fixed host axes x, y, z in this order by the third, second and first angle, which is
    z-y'-x'' about the molecule's own axes.
    """
    from scipy.spatial.transform import Rotation

    if settings.euler_deg is not None:
        return np.asarray(Rotation.from_euler("ZYX", settings.euler_deg, degrees=True).as_matrix())
    if settings.long_axis is not None and settings.normal is not None:
        return frame_from_axes(settings.long_axis, settings.normal)
    return np.eye(3)


def light(settings: PolarisationSettings) -> tuple[FloatArray, FloatArray]:
    """Direction of the light and of the polariser's zero in the host."""
    return np.array(settings.propagation or (0.0, 0.0, 1.0)), np.array(settings.polariser_zero or (1.0, 0.0, 0.0))
