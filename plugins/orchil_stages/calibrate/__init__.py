"""From computed states to the band on the measured scale."""

from .stage import Calibrate

__all__ = ["Calibrate"]
