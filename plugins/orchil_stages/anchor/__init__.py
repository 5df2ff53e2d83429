"""Library stage `anchor`: measured maxima of the library correct the predictions of their relatives."""

from .stage import Anchor, AnchorSettings

__all__ = ["Anchor", "AnchorSettings"]
