"""Triplets from the Hamiltonian of the singlets: no exchange repulsion, and three trained numbers.

A_T = A_S(without K) - s_K sum_A q_A^ia eta_A q_A^jb - s_J sum_A q_A^ij eta_A q_A^ab + c. The exchange repulsion 2 K
acts on singlets alone. The trained singlet Hamiltonian has hidden part of it in its other numbers (its attraction
vanishes at short distance, where in singlets 2 K makes up for it); the one-centre terms bring that back. eta is the
hardness of the atom in GFN2-xTB. The numbers are refitted to published triplets with ``tests/bench/fit_triplets.py``
after each training of the singlets.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
import scipy.linalg
from orchil_schemas import FloatArray, Medium

from orchil_stages.excite.dipoles import dipole_change
from orchil_stages.excite.parameters import Parameters, index
from orchil_stages.excite.response import Prepared, States, assemble, hamiltonian
from orchil_stages.excite.solvation import SOLVENT_NAMES, medium_features
from orchil_stages.excite.window import hardness
from orchil_stages.ground_state import HARTREE_EV

KEPT = 4
"""Triplets kept."""
_SPARE = 3


@dataclass(frozen=True)
class TripletNumbers:
    """transition and attraction: strengths of the two one-centre terms; constant in eV; the rest leads from the
    vertical T1 to measured 0-0 energies: slope, offset (eV) and lone_pair (eV), which is what a full n-pi* triplet
    relaxes less; half_width (eV) is half of the 90 % interval of those. gap_lone_pair (eV): by how much the singlets
    of a full n-pi* excitation lie too high over its triplet.
    """

    transition: float
    attraction: float
    constant: float
    slope: float = 1.0
    offset: float = 0.0
    lone_pair: float = 0.0
    half_width: float = 0.5
    gap_lone_pair: float = 0.0

    def gap(self, singlet: float, triplet: float, pi_share: float) -> float:
        """S1 minus T1 in eV from their vertical energies; pi_share of S1."""
        return singlet - triplet - self.gap_lone_pair * float(lone_pair_share(np.array(pi_share)))

    def measured(self, vertical: FloatArray, pi_share: FloatArray) -> FloatArray:
        """Triplet energies (eV) on the measured scale; pi_share is 1 for pi-pi* and a half for n-pi*."""
        scaled: FloatArray = self.slope * vertical + self.offset + self.lone_pair * lone_pair_share(pi_share)
        return scaled


def lone_pair_share(pi_share: FloatArray) -> FloatArray:
    """0 for pi-pi*, where hole and electron are both pi, to 1 for n-pi* and for what has no pi at all."""
    share: FloatArray = np.clip(2.0 * (1.0 - pi_share), 0.0, 1.0)
    return share


@cache
def triplet_numbers() -> TripletNumbers:
    """The numbers shipped with the package."""
    text = files(__package__).joinpath("triplets.json").read_text(encoding="utf-8")
    return TripletNumbers(**json.loads(text)["numbers"])


def triplet_hamiltonian(prepared: Prepared, parameters: Parameters, numbers: TripletNumbers) -> FloatArray:
    """The matrix A_T in eV, shape (o v, o v), symmetric."""
    vector = parameters.vector.copy()
    vector[index()["exchange_strength"]] = 0.0
    window, blocks = prepared.window, prepared.blocks
    o, v = window.occupied, window.virtual
    on_site = np.diag(HARTREE_EV * hardness(window.numbers))
    local = assemble(
        np.zeros((o, o)), np.zeros((v, v)), blocks, numbers.attraction * on_site, -numbers.transition * on_site
    )
    return hamiltonian(prepared, Parameters(vector)) + local + numbers.constant * np.eye(o * v)


def triplet_states(
    prepared: Prepared, parameters: Parameters, numbers: TripletNumbers, medium: Medium, ground_dipole: FloatArray
) -> States:
    """The lowest triplets with the medium terms of the singlets, transition dipoles left at zero (spin-forbidden)."""
    window = prepared.window
    matrix = triplet_hamiltonian(prepared, parameters, numbers)
    count = min(KEPT + _SPARE, len(matrix))
    energies, vectors = scipy.linalg.eigh(matrix, subset_by_index=(0, count - 1), driver="evr", check_finite=False)
    amplitudes = np.ascontiguousarray(vectors.T).reshape(count, window.occupied, window.virtual)
    none = np.zeros((count, 3))
    change = dipole_change(amplitudes, window)
    terms = medium_features(medium, window.numbers, none, ground_dipole, change)
    energies = energies + terms @ parameters.several(SOLVENT_NAMES)
    order = np.argsort(energies, kind="stable")[:KEPT]
    return States(energies[order], amplitudes[order], none[order])
