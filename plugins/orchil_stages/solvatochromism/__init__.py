"""Stage `solvatochromism`: how the band moves with the polarity of the medium."""

from .stage import Solvate, SolvatochromismSettings

__all__ = ["Solvate", "SolvatochromismSettings"]
