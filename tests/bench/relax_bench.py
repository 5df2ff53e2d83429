"""Cost and accuracy of the relaxation on a fixed random sample of measured dyes.

``python tests/bench/relax_bench.py DATA_FOLDER [--dyes 40] [--plain 10] [--tight]`` prints gradients and
CPU seconds for each dye; ``--plain N`` also relaxes the first N with ASE's L-BFGS in Cartesian coordinates
to the same gradient norm, and ``--tight`` compares energy and orbital gap with a minimum at a tenth of the
norm in the same basin.
"""

from __future__ import annotations

import argparse
import csv
import random
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from orchil_schemas import Conformers, FloatArray, StageError
from orchil_stages.embed import EmbedSettings
from orchil_stages.embed.ladder import embed_structures
from orchil_stages.ground_state import BOHR_ANGSTROM, HARTREE_EV, GroundState, open_ground_state
from orchil_stages.relax.internals import build_internals
from orchil_stages.relax.model_hessian import force_constants
from orchil_stages.relax.optimiser import EnergyAndGradient, Goal, minimise
from rdkit import Chem, RDLogger

SOLVATION = "toluene"
MOST_ATOMS = 110
TIGHT = Goal(gradient_norm=1e-4, energy=1e-7, max_gradients=400)


@dataclass(frozen=True)
class Row:
    """What one relaxation cost and how far it stopped from the tight minimum (hartree, eV)."""

    atoms: int
    gradients: int
    seconds: float
    own_share: float
    energy_left: float = float("nan")
    gap_error: float = float("nan")
    plain_gradients: int = 0
    plain_seconds: float = float("nan")


class Clocked:
    """Calls the ground state and counts its CPU seconds."""

    def __init__(self, state: GroundState) -> None:
        self.state = state
        self.seconds = 0.0

    def __call__(self, x: FloatArray) -> tuple[float, FloatArray]:
        started = time.process_time()
        found = self.state.evaluate(x)
        self.seconds += time.process_time() - started
        return found.energy, found.gradient


def sample(table: Path, count: int) -> Iterator[tuple[str, int, Conformers]]:
    """Dyes that embed and have an even number of electrons, in a fixed random order."""
    with table.open(encoding="utf-8", newline="") as handle:
        smiles = sorted({row["smiles"] for row in csv.DictReader(handle) if "." not in row["smiles"]})
    random.Random(7).shuffle(smiles)
    found = 0
    for text in smiles:
        molecule = Chem.AddHs(Chem.MolFromSmiles(text))
        charge = Chem.GetFormalCharge(molecule)
        electrons = sum(atom.GetAtomicNum() for atom in molecule.GetAtoms()) - charge
        if molecule.GetNumAtoms() > MOST_ATOMS or electrons % 2:
            continue
        yield text, charge, embed_structures(text, EmbedSettings(), seed=42)
        found += 1
        if found == count:
            return


def gap_ev(state: GroundState) -> float:
    """HOMO-LUMO gap of the last evaluation."""
    orbitals = state.wavefunction()
    occupied = int(np.sum(orbitals.occupations > 1))
    return float(orbitals.energies[occupied] - orbitals.energies[occupied - 1]) * HARTREE_EV


def measure(conformers: Conformers, charge: int, *, tight: bool, plain: bool) -> Row:
    """Relax one dye and compare."""
    numbers, bonds = conformers.atomic_numbers, conformers.bonds
    x = conformers.positions_angstrom[0] / BOHR_ANGSTROM
    clocked = Clocked(open_ground_state(numbers, charge, SOLVATION))
    started = time.process_time()
    internals = build_internals(x, bonds)
    model = force_constants(internals, numbers, bonds, x)
    minimum = minimise(clocked, x, internals, model, Goal())
    seconds = time.process_time() - started
    row = Row(len(numbers), minimum.gradients_used, seconds, 1 - clocked.seconds / seconds)
    if tight:
        gap = gap_ev(clocked.state)
        state = open_ground_state(numbers, charge, SOLVATION, accuracy=0.1)
        best = minimise(Clocked(state), minimum.x, internals, model, TIGHT)
        row = replace(row, energy_left=minimum.energy - best.energy, gap_error=gap - gap_ev(state))
    if plain:
        clocked = Clocked(open_ground_state(numbers, charge, SOLVATION))
        steps = plain_lbfgs(clocked, numbers, x)
        row = replace(row, plain_gradients=steps, plain_seconds=clocked.seconds)
    return row


def plain_lbfgs(evaluate: EnergyAndGradient, numbers: FloatArray, x: FloatArray) -> int:
    """Gradients that ASE's L-BFGS needs to the same Euclidean gradient norm (500 at most)."""
    from ase import Atoms
    from ase.calculators.calculator import Calculator, all_changes
    from ase.optimize import LBFGS

    class Bridge(Calculator):
        implemented_properties = ("energy", "forces")
        norm = np.inf
        calls = 0

        def calculate(self, atoms=None, properties=("energy",), system_changes=all_changes):
            super().calculate(atoms, properties, system_changes)
            energy, gradient = evaluate(atoms.positions / BOHR_ANGSTROM)
            self.norm, self.calls = float(np.linalg.norm(gradient)), self.calls + 1
            self.results = {"energy": energy * HARTREE_EV, "forces": -gradient * HARTREE_EV / BOHR_ANGSTROM}

    atoms = Atoms(numbers=numbers, positions=x * BOHR_ANGSTROM, calculator=(bridge := Bridge()))
    for _ in LBFGS(atoms, logfile=None).irun(fmax=0.0, steps=500):
        if bridge.norm <= Goal().gradient_norm:
            break
    return bridge.calls


def report(rows: list[Row]) -> None:
    """The figures, one a line."""
    gradients = np.array([row.gradients for row in rows])
    print(f"dyes {len(rows)}, mean atoms {np.mean([row.atoms for row in rows]):.1f}")
    print(
        f"gradients: mean {gradients.mean():.2f}, median {np.median(gradients):.0f}, "
        f"90th percentile {np.percentile(gradients, 90):.0f}, most {gradients.max()}"
    )
    seconds = sum(row.seconds for row in rows)
    own = sum(row.seconds * row.own_share for row in rows) / seconds
    print(f"CPU seconds a dye {seconds / len(rows):.2f}, outside GFN2-xTB {100 * own:.1f} %")
    left = np.array([row.energy_left for row in rows])
    gap = np.abs([row.gap_error for row in rows])
    if np.isfinite(left).any():
        print(f"energy left below 2e-4 hartree: {np.mean(left < 2e-4):.3f}, median {np.median(left):.1e}")
        print(f"gap within 0.01 eV: {np.mean(gap < 0.01):.3f}, median {np.median(gap):.4f}, most {max(gap):.3f}")
    both = [row for row in rows if row.plain_gradients]
    if both:
        ratio = sum(row.seconds for row in both) / sum(row.plain_seconds for row in both)
        plain = np.mean([row.plain_gradients for row in both])
        print(f"ASE L-BFGS on {len(both)} dyes: {plain:.1f} gradients; our CPU seconds are {ratio:.2f} of its")


def main() -> int:
    """Run from the command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("data", type=Path, help="folder that holds measured_dyes.csv")
    parser.add_argument("--dyes", type=int, default=40)
    parser.add_argument("--plain", type=int, default=0)
    parser.add_argument("--tight", action="store_true")
    arguments = parser.parse_args()
    table = arguments.data / "measured_dyes.csv"
    if not table.exists():
        print(f"skipped: no {table}", file=sys.stderr)
        return 0
    RDLogger.DisableLog("rdApp.*")
    rows = []
    for index, (smiles, charge, conformers) in enumerate(sample(table, arguments.dyes)):
        try:
            row = measure(conformers, charge, tight=arguments.tight, plain=index < arguments.plain)
        except StageError as error:
            print(f"{smiles}: {error}", flush=True)
            continue
        rows.append(row)
        print(
            f"{row.gradients:4d} {row.atoms:4d} {row.energy_left:9.1e} {row.gap_error:8.4f} "
            f"{row.plain_gradients:4d} {smiles}",
            flush=True,
        )
    report(rows)
    return 0


if __name__ == "__main__":
    sys.exit(main())
