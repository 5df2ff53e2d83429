"""Distance geometry with a ladder of ever fewer assumptions.

ETKDGv3 (Wang, Witek, Landrum, Riniker, J. Chem. Inf. Model. 60, 2044, 2020) first. Its knowledge terms
hold fused aromatic rings flat, which crowded ones (helicenes) cannot be, and some drawn stereo cannot
exist at all; each rung gives up one assumption and the record says which rung succeeded.
"""

from __future__ import annotations

import time
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from orchil_schemas import BadInput, Conformers, NotConverged
from rdkit import Chem
from rdkit.Chem import rdDistGeom

from .force_field import rank_by_force_field
from .settings import EmbedSettings

CANDIDATES_FOR_UNDRAWN = 6
SEEDS_PER_RUNG = 3
SEED_STEP = 7919
LARGEST_SEED = 2**31 - 1


@dataclass(frozen=True)
class Rung:
    """One set of assumptions for the embedding; ``trials`` bounds the work by count (0: ten per atom).

    A count gives the same answer on a busy machine, which the time limit does not.
    """

    label: str
    trials: int = 0
    random_start: bool = False
    knowledge: bool = True
    chirality: bool = True
    keep_stereo: bool = True

    @property
    def stereo_enforced(self) -> bool:
        """Whether a structure from this rung has the stereo that was asked for."""
        return self.chirality and self.keep_stereo

    def parameters(self, seed: int, seconds: int) -> Any:
        """RDKit embedding parameters; one thread, stereo failures counted."""
        made: Any = rdDistGeom.ETKDGv3()
        made.randomSeed = seed
        made.numThreads = 1
        made.timeout = seconds
        made.trackFailures = True
        made.maxIterations = self.trials
        made.useRandomCoords = self.random_start
        made.useBasicKnowledge = self.knowledge
        made.useExpTorsionAnglePrefs = self.knowledge
        made.enforceChirality = self.chirality
        return made


LADDER = (
    Rung("ETKDGv3", 60),
    Rung("ETKDGv3, random start", 60, random_start=True),
    Rung("distance geometry without knowledge terms", random_start=True, knowledge=False),
    Rung("distance geometry, stereo not enforced", random_start=True, knowledge=False, chirality=False),
    Rung("distance geometry, stereo removed", 0, True, knowledge=False, chirality=False, keep_stereo=False),
)


def embed_structures(smiles: str, settings: EmbedSettings, *, seed: int, deadline: float = np.inf) -> Conformers:
    """Embed, clean with a force field and rank; the atom order is that of the SMILES, hydrogens last.

    ``deadline`` is a ``time.monotonic`` value. Raises ``BadInput`` for a SMILES that does not parse and
    ``NotConverged`` with code "no_3d" and the causes when no rung gives a structure.
    """
    molecule = read_with_hydrogens(smiles)
    candidates = settings.candidates or max(settings.conformers, _least_candidates(molecule))
    failures: list[str] = []
    for rung in LADDER:
        for rung_seed in _seeds(seed):
            seconds = int(min(settings.rung_seconds, deadline - time.monotonic() - 1.0))
            if seconds < 1:
                raise NotConverged("no time left to embed; tried " + "; ".join(failures), code="no_3d")
            embedded = _embed(molecule, rung, candidates, rung_seed, seconds)
            if isinstance(embedded, Chem.Mol):
                return _conformers(embedded, rung, settings)
            failures.append(f"{rung.label}: {embedded.reason}")
            if not embedded.by_chance:
                break
    raise NotConverged("no three-dimensional structure found: " + "; ".join(failures), code="no_3d")


def read_with_hydrogens(smiles: str) -> Chem.Mol:
    """The molecule with explicit hydrogens; ``BadInput`` when the SMILES does not parse."""
    molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise BadInput(f"'{smiles}' is not a valid SMILES")
    return Chem.AddHs(molecule)


def _least_candidates(molecule: Chem.Mol) -> int:
    """More than one where the embedding would throw a coin between E and Z: the force field then chooses."""
    open_bonds = (
        element
        for element in Chem.FindPotentialStereo(molecule)
        if element.type == Chem.StereoType.Bond_Double and element.specified == Chem.StereoSpecified.Unspecified
    )
    return CANDIDATES_FOR_UNDRAWN if any(True for _ in open_bonds) else 1


@dataclass(frozen=True)
class Failure:
    """Why a rung gave nothing; ``by_chance`` when another seed may do better."""

    reason: str
    by_chance: bool


def _embed(molecule: Chem.Mol, rung: Rung, candidates: int, seed: int, seconds: int) -> Chem.Mol | Failure:
    """A copy with conformers, or the reasons why there are none."""
    trial = Chem.Mol(molecule)
    if not rung.keep_stereo:
        Chem.RemoveStereochemistry(trial)
    parameters = rung.parameters(seed, seconds)
    try:
        rdDistGeom.EmbedMultipleConfs(trial, candidates, parameters)
    except RuntimeError as error:  # an invariant of the minimiser in some ring systems
        return Failure(str(error).strip().splitlines()[0], by_chance=True)
    # the returned ids are no guide: after a timeout they name conformers that are not there
    return trial if trial.GetNumConformers() else Failure(_count_failures(parameters), by_chance=False)


def _seeds(seed: int) -> Iterator[int]:
    """Seeds between 1 and 2^31 - 1, the first one as given when it fits."""
    for step in range(SEEDS_PER_RUNG):
        yield (seed - 1 + step * SEED_STEP) % LARGEST_SEED + 1


def _count_failures(parameters: Any) -> str:
    """Failure causes with counts, most frequent first, for example "chirality 12, timeout 1"."""
    counts = list(parameters.GetFailureCounts())
    causes = sorted(rdDistGeom.EmbedFailureCauses.values.items())
    named = [(counts[i], str(cause).lower().replace("_", " ")) for i, cause in causes if i < len(counts)]
    return ", ".join(f"{name} {count}" for count, name in sorted(named, reverse=True) if count) or "no reason given"


def _conformers(molecule: Chem.Mol, rung: Rung, settings: EmbedSettings) -> Conformers:
    """Force-field cleaning, then the record with the best structures first."""
    force_field, order = rank_by_force_field(molecule, settings.force_field_steps)
    positions = np.array([molecule.GetConformer(i).GetPositions() for i in order[: settings.conformers]])
    return Conformers(
        atomic_numbers=np.array([atom.GetAtomicNum() for atom in molecule.GetAtoms()]),
        bonds=np.array([(b.GetBeginAtomIdx(), b.GetEndAtomIdx()) for b in molecule.GetBonds()]),
        positions_angstrom=positions,
        method=rung.label,
        force_field=force_field,
        stereo_enforced=rung.stereo_enforced,
    )
