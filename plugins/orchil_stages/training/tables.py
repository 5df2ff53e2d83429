"""The comparison table: errors of several predictions on the same dyes."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from orchil_schemas import FloatArray
from scipy.stats import spearmanr


@dataclass(frozen=True)
class Errors:
    """Mean absolute error and bias (eV), R2, Spearman rank correlation, number of dyes."""

    mae: float
    bias: float
    r2: float
    spearman: float
    count: int


def errors(predicted: FloatArray, measured: FloatArray) -> Errors:
    """Errors of predicted against measured energies in eV."""
    residual = predicted - measured
    spread = float(((measured - measured.mean()) ** 2).sum())
    return Errors(
        mae=float(np.abs(residual).mean()),
        bias=float(residual.mean()),
        r2=1.0 - float((residual**2).sum()) / spread,
        spearman=float(spearmanr(predicted, measured).statistic),
        count=len(measured),
    )


def linear_fit(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    """Slope and intercept by least absolute deviation-like reweighting (robust to wrong rows)."""
    weight = np.ones(len(x))
    slope, intercept = 1.0, 0.0
    for _ in range(30):
        slope, intercept = np.polyfit(x, y, 1, w=np.sqrt(weight))
        weight = 1.0 / np.maximum(np.abs(y - slope * x - intercept), 0.02)
    return float(slope), float(intercept)


def read_tddft(path: Path) -> dict[str, float]:
    """Vertical energies (eV) of the strongest state, wB97X-D3: Greenman, Green, Gomez-Bombarelli, Chem. Sci.
    13, 1152.
    """
    with path.open(encoding="utf-8", newline="") as lines:
        return {row["smiles"]: float(row["vertical_energy_of_strongest_eV"]) for row in csv.DictReader(lines)}


def render(rows: Mapping[str, Errors] | Sequence[tuple[str, Errors]]) -> str:
    """A plain-text table."""
    pairs = rows.items() if isinstance(rows, Mapping) else rows
    lines = [f"{'prediction':<58}{'dyes':>6}{'MAE/eV':>9}{'bias/eV':>9}{'R2':>8}{'Spearman':>10}"]
    lines += [f"{n:<58}{e.count:>6}{e.mae:>9.3f}{e.bias:>9.3f}{e.r2:>8.3f}{e.spearman:>10.3f}" for n, e in pairs]
    return "\n".join(lines)
