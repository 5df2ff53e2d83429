"""The baseline that knows structure and medium but no physics, for the same kind of process."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import cache

import numpy as np
from rdkit import Chem

from orchil_stages.calibrate.correction import Weights
from orchil_stages.calibrate.environments import environment_weights
from orchil_stages.calibrate.features import NAMES

from .samples import Sample

_NO_PHYSICS = ("polarity", "index", "hydrogen_bond_donor", "cation", "anion", "zwitterion", "log_atoms")
"""Features that need no computation of states."""


def plain_samples(samples: Sequence[Sample]) -> list[Sample]:
    """The samples with counts of environments for weights, no physics among the features, and no physical energy."""
    kept = [NAMES.index(name) for name in _NO_PHYSICS]
    return [replace(s, features=s.features[kept], weights=_counts(s.measured.smiles), physics_ev=0.0) for s in samples]


@cache
def _counts(smiles: str) -> Weights:
    heavy = Chem.MolFromSmiles(smiles).GetNumHeavyAtoms()
    atoms = Chem.AddHs(Chem.MolFromSmiles(smiles)).GetNumAtoms()
    ones = (np.arange(atoms) < heavy).astype(float)
    return environment_weights(smiles, ones, ones)
