"""Stage `spectrum`: absorption spectrum of all states, and what a layer takes out of a lamp, a laser or the sun."""

from .stage import MakeSpectrum, SpectrumSettings

__all__ = ["MakeSpectrum", "SpectrumSettings"]
