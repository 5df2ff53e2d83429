"""Stage `polarisation`: transition dipoles in the axes of the molecule; crystal, stretched film, photoselection."""

from .settings import PolarisationSettings
from .stage import Polarise

__all__ = ["PolarisationSettings", "Polarise"]
