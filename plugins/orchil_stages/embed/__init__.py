"""Stage `embed`: starting structures in three dimensions by distance geometry and a force field."""

from .stage import Embed, EmbedSettings

__all__ = ["Embed", "EmbedSettings"]
