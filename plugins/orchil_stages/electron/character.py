"""Populations of hole and electron by atom, split into the pi system and the rest."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray

from orchil_stages.darkness.reason import Character
from orchil_stages.excite.analysis import Populations, bonding_normals
from orchil_stages.excite.dipoles import hole_and_particle
from orchil_stages.excite.response import States
from orchil_stages.excite.window import Window


def pi_populations(states: States, window: Window) -> Populations:
    """Share of hole and electron on each atom in p functions along the normal of its bonding plane."""
    normals = bonding_normals(window.numbers, window.positions)
    starts = np.flatnonzero((window.where.momentum == 1) & (np.diff(window.where.shell, prepend=-1) != 0))
    atoms = window.where.atom[starts]
    along = np.einsum("sx,sxm->sm", normals[atoms], window.loewdin[starts[:, None] + np.arange(3)])
    o = window.occupied
    hole, electron = hole_and_particle(states.amplitudes)
    found = [np.zeros((len(states.energies), len(window.numbers))) for _ in range(2)]
    for place, c, density in ((0, along[:, :o], hole), (1, along[:, o:], electron)):
        found[place][:, atoms] = ((c @ density) * c).sum(axis=2)
    return Populations(*found)


def character(total: Populations, pi: Populations) -> Character:
    """Overlap, pi shares and transferred charge by state.

    The overlap is the Bhattacharyya overlap over atoms with pi and the rest counted apart, so that a lone pair and the
    pi orbital on the same atom do not overlap: 1 for equal distributions, near 0 for n-pi* and for charge transfer.
    """
    rest = Populations(np.clip(total.hole - pi.hole, 0.0, None), np.clip(total.electron - pi.electron, 0.0, None))
    return Character(
        overlap=np.minimum(_shared(pi) + _shared(rest), 1.0),
        hole_pi=np.clip(pi.hole.sum(axis=1), 0.0, 1.0),
        electron_pi=np.clip(pi.electron.sum(axis=1), 0.0, 1.0),
        transferred=total.transferred,
    )


def _shared(part: Populations) -> FloatArray:
    shared: FloatArray = np.sqrt(np.clip(part.hole * part.electron, 0.0, None)).sum(axis=1)
    return shared
