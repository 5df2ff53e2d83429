"""Fit the numbers of the triplet Hamiltonian to published triplet energies, and print what they are worth.

``python tests/bench/fit_triplets.py CACHE`` relaxes some 60 molecules (in CACHE, once), fits on the rows marked "fit"
of ``tests/published/facts/triplets.csv``, prints errors on both halves and writes
``plugins/orchil_stages/electron/triplets.json``. Run it after each training of the singlet Hamiltonian.
"""

from __future__ import annotations

import json
import sys
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))
from orchil_schemas import FloatArray, Medium
from orchil_stages.electron.triplets import TripletNumbers, lone_pair_share, triplet_states
from orchil_stages.excite.analysis import pi_share
from orchil_stages.excite.model import open_states, solve_states
from orchil_stages.excite.parameters import trained_parameters
from orchil_stages.excite.response import Prepared, prepare
from scipy.optimize import least_squares

from tests.prediction import Predictor
from tests.published.facts import rows

NUMBERS = Path(__file__).parents[2] / "plugins/orchil_stages/electron/triplets.json"
START = (0.3, 0.1, 0.0)
PRIOR = 0.1
"""Residual (eV) that a strength of 1 costs: without it twenty energies would not hold three numbers."""
WINDOW = 16
COVERAGE = 0.9


@dataclass(frozen=True)
class Molecule:
    """One opened window with what the states need."""

    prepared: Prepared
    medium: Medium
    dipole: FloatArray

    def lowest(self, numbers: TripletNumbers) -> tuple[float, float]:
        """Vertical T1 in eV and its pi share."""
        states = triplet_states(self.prepared, trained_parameters(), numbers, self.medium, self.dipole)
        return float(states.energies[0]), float(pi_share(states, self.prepared.window)[0])

    def singlet(self) -> tuple[float, float]:
        """Vertical S1 in eV and its pi share."""
        states, _ = solve_states(self.prepared, trained_parameters(), self.medium, self.dipole, 1)
        return float(states.energies[0]), float(pi_share(states, self.prepared.window)[0])

    def value(self, kind: str, numbers: TripletNumbers) -> float:
        """The model's number for a row of a kind."""
        vertical, share = self.lowest(numbers)
        if kind == "gap":
            singlet, first = self.singlet()
            return numbers.gap(singlet, vertical, first)
        return vertical if kind == "vertical" else float(numbers.measured(np.array(vertical), np.array(share)))


def open_all(facts: list[dict[str, Any]], folder: Path) -> dict[str, Molecule]:
    """Relaxed molecules with their windows, by SMILES."""
    predictor = Predictor(folder)
    made = {}
    for row in facts:
        if row["smiles"] not in made:
            found = predictor(row["smiles"], "water" if "ion" in row["name"] or "blue" in row["name"] else "gas phase")
            opened = open_states(found.geometry, found.medium, WINDOW, WINDOW)
            made[row["smiles"]] = Molecule(prepare(opened.window), found.medium, opened.wave.dipole)
            print(row["name"], file=sys.stderr)
    return made


def fit(facts: list[dict[str, Any]], molecules: dict[str, Molecule]) -> TripletNumbers:
    """Three numbers from the vertical energies, then the line to measured ones."""
    vertical = _chosen(facts, "vertical")

    def residuals(values: FloatArray) -> FloatArray:
        numbers = TripletNumbers(*(float(value) for value in values))
        errors = [molecules[row["smiles"]].lowest(numbers)[0] - row["energy_ev"] for row in vertical]
        return np.array([*errors, *(PRIOR * values[:2])])

    solved = least_squares(residuals, START, loss="soft_l1", f_scale=0.3, diff_step=0.02)
    numbers = TripletNumbers(*(round(float(value), 4) for value in solved.x))
    numbers = _measured_scale(_chosen(facts, "measured"), molecules, numbers)
    return replace(numbers, gap_lone_pair=_lone_pair_of_gaps(_chosen(facts, "gap"), molecules, numbers))


def _chosen(facts: list[dict[str, Any]], kind: str) -> list[dict[str, Any]]:
    return [row for row in facts if row["kind"] == kind and row["use"] == "fit"]


def _lone_pair_of_gaps(facts: list[dict[str, Any]], molecules: dict[str, Molecule], numbers: TripletNumbers) -> float:
    """Least-squares excess of the gaps of n-pi* singlets."""
    errors, weights = [], []
    for row in facts:
        molecule = molecules[row["smiles"]]
        singlet, share = molecule.singlet()
        errors.append(singlet - molecule.lowest(numbers)[0] - row["energy_ev"])
        weights.append(float(lone_pair_share(np.array(share))))
    return round(float(np.dot(weights, errors) / np.dot(weights, weights)), 4)


def _measured_scale(
    facts: list[dict[str, Any]], molecules: dict[str, Molecule], numbers: TripletNumbers
) -> TripletNumbers:
    """The line to measured energies; the interval from errors of rows left out one by one (jackknife)."""
    found = np.array([molecules[row["smiles"]].lowest(numbers) for row in facts])
    columns = np.stack([found[:, 0], np.ones(len(found)), lone_pair_share(found[:, 1])], axis=1)
    known = np.array([row["energy_ev"] for row in facts])
    hat = columns @ np.linalg.pinv(columns)
    line = np.linalg.pinv(columns) @ known
    left_out = np.abs((known - columns @ line) / (1.0 - np.diag(hat)))
    level = min(1.0, COVERAGE * (1.0 + 1.0 / len(known)))
    slope, offset, lone_pair, half = (
        round(float(value), 4) for value in (*line, np.quantile(left_out, level, method="higher"))
    )
    return replace(numbers, slope=slope, offset=offset, lone_pair=lone_pair, half_width=half)


def report(facts: list[dict[str, Any]], molecules: dict[str, Molecule], numbers: TripletNumbers) -> None:
    """Every row, then errors by kind and use."""
    errors: dict[tuple[str, str], list[float]] = {}
    for row in facts:
        value = molecules[row["smiles"]].value(row["kind"], numbers)
        errors.setdefault((row["kind"], row["use"]), []).append(value - row["energy_ev"])
        print(f"{row['kind']:9}{row['use']:6}{row['name']:24}{row['energy_ev']:7.2f}{value:7.2f}")
    for key, found in sorted(errors.items()):
        inside = (np.abs(found) <= numbers.half_width).mean()
        text = f"mean absolute error {np.abs(found).mean():.2f}, bias {np.mean(found):+.2f} eV, inside {inside:.0%}"
        print(*key, f"{len(found)} rows: {text}")


def main() -> None:
    """Fit, print, write."""
    facts = rows("triplets")
    molecules = open_all(facts, Path(sys.argv[1]))
    numbers = fit(facts, molecules)
    report(facts, molecules, numbers)
    source = "tests/bench/fit_triplets.py on tests/published/facts/triplets.csv"
    NUMBERS.write_text(json.dumps({"source": source, "numbers": asdict(numbers)}, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
