"""Probabilities for which intervals are trained."""

COVERAGES = (0.5, 0.8, 0.9, 0.95)
