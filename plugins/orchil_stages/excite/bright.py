"""Which state is the absorption maximum: the first one that is not dark, and beside it the strongest."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray

DARK_SHARE = 0.05
"""A state is dark when its oscillator strength is below this share of the strongest within reach..."""
DARK_STRENGTH = 0.01
"""... or below this value."""
REACH_EV = 2.0
"""States more than this above the first one are not compared with it: the far ultraviolet is always
strong.
"""


def first_bright(energies: FloatArray, strengths: FloatArray) -> int:
    """Index of the first state that is not dark; the strongest when all are weak."""
    strongest = strongest_state(energies, strengths)
    bright = (strengths >= DARK_SHARE * strengths[strongest]) & (strengths >= DARK_STRENGTH)
    return int(np.argmax(bright)) if bright.any() else strongest


def strongest_state(energies: FloatArray, strengths: FloatArray) -> int:
    """Index of the strongest state within reach of the first."""
    near = energies <= energies[0] + REACH_EV
    return int(np.argmax(np.where(near, strengths, -1.0)))
