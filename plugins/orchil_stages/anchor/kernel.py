"""How the errors of two predictions go together, as a function of how alike the dyes are."""

from __future__ import annotations

import json
from dataclasses import dataclass, fields
from functools import cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from orchil_schemas import FloatArray

TRAINED_FILE = Path(__file__).with_name("trained.json")


@dataclass(frozen=True)
class Kernel:
    """Correlation of the errors of two predictions, each in units of its own standard error.

    Same medium: ``share`` s^``power`` for a similarity s, and the rest, 1 - ``share``, only for one species with
    itself: that part of an error is shared with no relative. Another medium takes the factor ``other_medium``.
    Whole powers, products and sums of positive-definite kernels are positive definite (Schur): s is a cosine, and so
    are equality of species and equality of medium.

    ``scatter_ev`` is what measured maxima of one dye in one medium differ by between papers, beyond reading.
    """

    share: float
    power: int
    other_medium: float
    scatter_ev: float

    def correlation(
        self, similarity: FloatArray, same_medium: NDArray[np.bool_], same_species: NDArray[np.bool_]
    ) -> FloatArray:
        """From 0 to 1, in the shape of the arguments."""
        own = np.where(same_species, 1.0, self.share * similarity**self.power)
        return np.asarray(np.where(same_medium, own, self.other_medium * own))


@cache
def trained_kernel() -> Kernel:
    """The numbers of ``trained.json``."""
    read = json.loads(TRAINED_FILE.read_text(encoding="utf-8"))
    return Kernel(**{field.name: read[field.name] for field in fields(Kernel)})
