"""Stage `vibronic`: the vibrational progression of the reported band, on request."""

from .stage import AddVibrations, VibronicSettings

__all__ = ["AddVibrations", "VibronicSettings"]
