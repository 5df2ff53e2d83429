"""Stage `redox`: one-electron potentials of ground and excited state."""

from .stage import EstimateRedox, RedoxSettings

__all__ = ["EstimateRedox", "RedoxSettings"]
