"""From a species and its geometry to singlet states: what the stage and :func:`predict` share."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from orchil_schemas import HC_EV_NM, FloatArray, IntArray

from .hamiltonian import REPULSION, Singlets, self_consistent_field, singlets
from .parameters import array_of, resonance_ev
from .pi_system import PiSystem, pi_system

HARTREE_EV, BOHR_ANGSTROM = 27.211386, 0.529177211
"""CODATA 2018."""
DARK = 0.01
DARK_SHARE = 0.05
REACH_EV = 1.5
"""A band counts as the absorption maximum when it has oscillator strength 0.01 and a twentieth of the strongest
state within 1.5 eV of the first, as in the default chain."""
STATES = 12
WINDOW = 16


@dataclass(frozen=True)
class States:
    """The lowest singlet states of one pi system, as ``hamiltonian`` gives them, and the system itself."""

    system: PiSystem
    singlets: Singlets

    @cached_property
    def energies_ev(self) -> FloatArray:
        """Excitation energies in eV, lowest first."""
        return self.singlets.energies

    @cached_property
    def strengths(self) -> FloatArray:
        """Oscillator strengths, f = 2/3 E |mu|^2 in atomic units."""
        squared = np.sum((self.singlets.dipoles / BOHR_ANGSTROM) ** 2, axis=1)
        strengths: FloatArray = 2 / 3 * self.energies_ev / HARTREE_EV * squared
        return strengths

    @cached_property
    def bright(self) -> int:
        """Index of the first state that is not dark; of the strongest one near the first when all are."""
        near = self.energies_ev <= self.energies_ev[0] + REACH_EV
        strongest = int(np.argmax(np.where(near, self.strengths, -1.0)))
        seen = (self.strengths >= DARK) & (self.strengths >= DARK_SHARE * self.strengths[strongest])
        return int(np.argmax(seen)) if seen.any() else strongest

    @property
    def absorption_max_nm(self) -> float:
        """Position of the first band that is not dark, straight from the Hamiltonian."""
        return HC_EV_NM / float(self.energies_ev[self.bright])


def solve(
    smiles: str,
    positions: FloatArray,
    numbers: IntArray | None = None,
    *,
    integrals: str = "mataga-nishimoto",
    states: int = STATES,
    window: int = WINDOW,
) -> States:
    """States of the largest pi system; OutOfScope, BadInput or NotConverged with a sentence."""
    system = pi_system(smiles, numbers, positions)
    distances = np.linalg.norm(system.positions[:, None] - system.positions[None, :], axis=2)
    repulsion = REPULSION[integrals](array_of(system.kinds, "repulsion_ev"), distances)
    levels = -array_of(system.kinds, "ionisation_ev")
    field = self_consistent_field(levels, _hopping(system), repulsion, system.charges, system.electrons)
    found = singlets(field, repulsion, system.positions, window)
    kept = Singlets(
        found.energies[:states], found.amplitudes[:states], found.dipoles[:states], found.occupied, found.virtual
    )
    return States(system, kept)


def predict(smiles: str, positions: FloatArray | None = None, **settings: object) -> States:
    """States for a SMILES, a few milliseconds; without ``positions`` a force field makes a geometry.

    ``positions`` (atoms, 3) in angstrom: the atoms in the order of ``smiles``, hydrogens after all of them, as in the
    record ``geometry`` beside ``identity.smiles``. Other settings as in :func:`solve`.
    """
    made = _embedded(smiles) if positions is None else np.asarray(positions, dtype=float)
    return solve(smiles, made, **settings)  # type: ignore[arg-type]


def _hopping(system: PiSystem) -> FloatArray:
    """Resonance integrals times the cosine of the twist."""
    matrix = np.zeros((len(system.kinds), len(system.kinds)))
    for (i, j), cosine in zip(system.bonds, system.cosines, strict=True):
        matrix[i, j] = matrix[j, i] = cosine * resonance_ev(system.kinds[i], system.kinds[j])
    return matrix


def _embedded(smiles: str) -> FloatArray:
    from orchil_schemas import BadInput, NotConverged
    from rdkit import Chem, rdBase
    from rdkit.Chem import rdDistGeom, rdForceFieldHelpers

    with rdBase.BlockLogs():
        molecule = Chem.MolFromSmiles(smiles)
        if molecule is None:
            raise BadInput(f'"{smiles}" cannot be read as SMILES')
        molecule = Chem.AddHs(molecule)
        if rdDistGeom.EmbedMolecule(molecule, randomSeed=1) != 0:
            raise NotConverged(f"no three-dimensional structure was found for {smiles}")
        if rdForceFieldHelpers.MMFFHasAllMoleculeParams(molecule):
            rdForceFieldHelpers.MMFFOptimizeMolecule(molecule)
    return np.array(molecule.GetConformer().GetPositions())
