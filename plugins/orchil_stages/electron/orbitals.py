"""Natural transition orbitals, and files to look at them: Molden and Gaussian cube.

R. L. Martin, J. Chem. Phys. 118, 4775 (2003): the singular vectors of the amplitudes; the squares of the singular
values are the weights of the pairs.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from orchil_schemas import BadInput, FloatArray, Geometry, Medium

from orchil_stages.excite.model import Opened, open_states, solve_states
from orchil_stages.excite.parameters import trained_parameters
from orchil_stages.excite.response import prepare
from orchil_stages.excite.stage import ExciteSettings
from orchil_stages.ground_state.basis import gaussian_molecule

_LEAST_WEIGHT = 0.05
"""Pairs below this weight are left out of files."""


@dataclass(frozen=True)
class TransitionOrbitals:
    """Pairs of a state by falling weight (pairs,): hole and electron orbitals over the window's own,
    (pairs, o) and (pairs, v).
    """

    weights: FloatArray
    hole: FloatArray
    electron: FloatArray


def transition_orbitals(amplitudes: FloatArray) -> TransitionOrbitals:
    """Natural transition orbitals of one state, amplitudes (o, v)."""
    left, values, right = np.linalg.svd(amplitudes, full_matrices=False)
    return TransitionOrbitals(values**2, left.T, right)


def write_molden(
    geometry: Geometry, medium: Medium, state: int, path: str | Path, settings: ExciteSettings | None = None
) -> None:
    """Write the natural transition orbitals of a state (0 is the lowest) as a Molden file.

    Orbitals "1h", "2h"... are holes and "1e", "2e"... electrons; weights stand as occupations. The ground state is
    converged anew. BadInput when there is no such state.
    """
    from pyscf.tools import molden

    molecule, made, columns = _solved(geometry, medium, state, settings or ExciteSettings())
    kept = np.flatnonzero(made.weights >= _LEAST_WEIGHT)
    names = [f"{pair + 1}{side}" for side in "he" for pair in kept]
    weights = np.tile(made.weights[kept], 2)
    vectors = np.hstack([columns[0][:, kept], columns[1][:, kept]])
    molden.from_mo(molecule, str(path), vectors, symm=names, ene=np.zeros(len(names)), occ=weights)


def write_cube(
    geometry: Geometry,
    medium: Medium,
    state: int,
    folder: str | Path,
    settings: ExciteSettings | None = None,
    *,
    points: int = 60,
) -> tuple[Path, Path]:
    """Write the leading hole and electron orbital of a state as ``hole_N.cube`` and ``electron_N.cube``.

    ``points`` along each edge of the box. BadInput when there is no such state.
    """
    from pyscf.tools import cubegen

    molecule, _, columns = _solved(geometry, medium, state, settings or ExciteSettings())
    paths = Path(folder) / f"hole_{state}.cube", Path(folder) / f"electron_{state}.cube"
    for path, vectors in zip(paths, columns, strict=True):
        cubegen.orbital(molecule, str(path), vectors[:, 0], nx=points, ny=points, nz=points)
    return paths


def _solved(
    geometry: Geometry, medium: Medium, state: int, settings: ExciteSettings
) -> tuple[Any, TransitionOrbitals, tuple[FloatArray, FloatArray]]:
    """PySCF molecule, orbitals of the state, and their coefficients on its functions (functions, pairs)."""
    opened = open_states(geometry, medium, settings.occupied, settings.virtual)
    prepared = prepare(opened.window)
    states, _ = solve_states(prepared, trained_parameters(), medium, opened.wave.dipole, settings.states)
    if not 0 <= state < len(states.energies):
        raise BadInput(f"there is no state {state}: the states are numbered 0 to {len(states.energies) - 1}")
    made = transition_orbitals(states.amplitudes[state])
    occupied, virtual = _window_coefficients(opened)
    molecule = gaussian_molecule(opened.window.numbers, opened.window.positions)
    return molecule, made, (occupied @ made.hole.T, virtual @ made.electron.T)


def _window_coefficients(opened: Opened) -> tuple[FloatArray, FloatArray]:
    """Coefficients of the occupied and virtual orbitals of the window on the atomic functions."""
    filled = int(np.count_nonzero(opened.wave.occupations > 1.0))
    o, v = opened.window.occupied, opened.window.virtual
    c = opened.wave.coefficients
    return c[:, filled - o : filled], c[:, filled : filled + v]
