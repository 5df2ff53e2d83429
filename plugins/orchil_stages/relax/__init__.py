"""Stage `relax`: the GFN2-xTB minimum of a starting structure in its medium."""

from .stage import Relax, RelaxSettings

__all__ = ["Relax", "RelaxSettings"]
