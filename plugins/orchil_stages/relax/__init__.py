"""Stage `relax`: the GFN2-xTB minimum of a starting structure in its medium."""

from .settings import RelaxSettings
from .stage import Relax

__all__ = ["Relax", "RelaxSettings"]
