"""Stage `score`: how probable it is that each candidate is what the brief wants, ranks, fronts and picks."""

from .stage import Score, ScoreSettings

__all__ = ["Score", "ScoreSettings"]
