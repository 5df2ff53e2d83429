"""Stage `emission`: what comes back out of the excited dye, how fast, and what a laser could take from it."""

from .stage import EmissionSettings, Emit

__all__ = ["EmissionSettings", "Emit"]
