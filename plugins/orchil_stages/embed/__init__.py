"""Stage `embed`: starting structures in three dimensions by distance geometry and a force field."""

from .settings import EmbedSettings
from .stage import Embed

__all__ = ["Embed", "EmbedSettings"]
