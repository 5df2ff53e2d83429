"""Stage `intake`: from a library row to its species, its medium, and what there is to warn of."""

from .stage import Intake, IntakeSettings

__all__ = ["Intake", "IntakeSettings"]
