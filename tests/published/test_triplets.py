"""Triplets against published energies that were not used to fit their three numbers (``facts/triplets.csv``, "check").

Vertical energies: QUEST database; measured 0-0 energies: Handbook of Photochemistry. Sources in the table, row by row.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from scipy.stats import spearmanr

from .facts import rows

Predict = Callable[[str, str], Any]

SMALL = 35  # letters of a SMILES: large ones are in tests/bench/fit_triplets.py
LONE_PAIRS = ("O=C(c1ccccc1)c1ccccc1", "O=C1C=CC(=O)c2ccccc21")
ARENES = ("c1ccc2ccccc2c1", "c1ccc2cc3ccccc3cc2c1")
HELD_OUT = [row for row in rows("triplets") if row["use"] == "check" and len(row["smiles"]) <= SMALL]


def test_vertical_triplets(predict: Predict) -> None:
    some = [row for row in HELD_OUT if row["kind"] == "vertical"]
    found = [float(predict(row["smiles"], "gas phase").triplets.energy_ev[0]) for row in some]
    known = np.array([row["energy_ev"] for row in some])
    assert len(some) >= 8
    assert np.abs(found - known).mean() < 0.25
    assert spearmanr(found, known).statistic > 0.9


def test_measured_triplets(predict: Predict) -> None:
    some = [row for row in HELD_OUT if row["kind"] == "measured" and "ion" not in row["name"]]
    found = [predict(row["smiles"], "gas phase").triplets for row in some]
    known = np.array([row["energy_ev"] for row in some])
    values = np.array([one.triplet_ev for one in found])
    assert len(some) >= 14
    assert np.abs(values - known).mean() < 0.25
    assert spearmanr(values, known).statistic > 0.8
    inside = [one.triplet_low_ev <= value <= one.triplet_high_ev for one, value in zip(found, known, strict=True)]
    assert np.mean(inside) > 0.7


def test_gaps_between_singlet_and_triplet(predict: Predict) -> None:
    some = [row for row in HELD_OUT if row["kind"] == "gap"]
    found = [predict(row["smiles"], "gas phase").triplets.singlet_triplet_gap_ev for row in some]
    known = np.array([row["energy_ev"] for row in some])
    assert np.abs(found - known).mean() < 0.3
    assert spearmanr(found, known).statistic > 0.6


def test_n_to_pi_star_gaps_are_small_beside_pi_to_pi_star_gaps(predict: Predict) -> None:
    """Turro, Modern Molecular Photochemistry (from memory): about 0.3 eV for n-pi*, 1 eV and more for pi-pi*."""
    small = [predict(smiles, "gas phase").triplets.singlet_triplet_gap_ev for smiles in LONE_PAIRS]
    large = [predict(smiles, "gas phase").triplets.singlet_triplet_gap_ev for smiles in ARENES]
    assert min(large) > max(small) + 0.2
