"""The valence basis of GFN2-xTB as a PySCF molecule, so that libcint gives its integrals.

Slater exponents: Bannwarth, Ehlert, Grimme, J. Chem. Theory Comput. 15, 1652 (2019); Gaussian expansions of
Slater functions: Stewart, J. Chem. Phys. 52, 431 (1970). Both tables lie in this folder as CSV.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
from orchil_schemas import FloatArray, IntArray, OutOfScope

ANGULAR = {"s": 0, "p": 1, "d": 2}


@dataclass(frozen=True)
class Shell:
    """One valence shell: "3d", Slater exponent (1/bohr), Gaussians in its expansion, atom hardness
    (hartree).
    """

    label: str
    exponent: float
    gaussians: int
    hardness: float

    @property
    def momentum(self) -> int:
        """Angular momentum: 0 s, 1 p, 2 d."""
        return ANGULAR[self.label[-1]]


@cache
def shells(number: int) -> tuple[Shell, ...]:
    """Valence shells of an element by atomic number, in the order s, p, d; OutOfScope when it is not in the
    table.
    """
    table = _shell_table()
    if number not in table:
        raise OutOfScope(f"no basis for the element with atomic number {number}")
    return table[number]


@dataclass(frozen=True)
class BasisMap:
    """For each basis function: its atom, angular momentum and position of its shell in the molecule."""

    atom: IntArray
    momentum: IntArray
    shell: IntArray


def basis_map(numbers: IntArray) -> BasisMap:
    """Atom by atom, shell by shell, 2 l + 1 functions each."""
    rows = [(atom, shell.momentum) for atom, number in enumerate(numbers) for shell in shells(int(number))]
    counts = np.array([2 * momentum + 1 for _, momentum in rows])
    table = np.array(rows)
    return BasisMap(
        np.repeat(table[:, 0], counts),
        np.repeat(table[:, 1], counts),
        np.repeat(np.arange(len(rows)), counts),
    )


@dataclass(frozen=True)
class Integrals:
    """Overlap (n, n) and position integrals (3, n, n) in bohr, origin at the coordinate origin."""

    overlap: FloatArray
    position: FloatArray


def integrals(numbers: IntArray, positions_bohr: FloatArray) -> Integrals:
    """Overlap and dipole integrals from libcint, functions in its order."""
    molecule = gaussian_molecule(numbers, positions_bohr)
    # hermi=1: only one triangle is computed, the matrices are symmetric
    return Integrals(molecule.intor("int1e_ovlp", hermi=1), molecule.intor("int1e_r", hermi=1))


def gaussian_molecule(numbers: IntArray, positions_bohr: FloatArray) -> Any:
    """The valence basis on the atoms as a PySCF molecule, functions in the order of libcint."""
    from pyscf import gto

    molecule = gto.Mole()
    molecule.atom = [(int(number), tuple(place)) for number, place in zip(numbers, positions_bohr, strict=True)]
    molecule.unit = "Bohr"
    molecule.basis = {_symbol(number): _gaussians(number) for number in {int(n) for n in numbers}}
    molecule.cart = False
    molecule.verbose = 0
    # spin None lets PySCF take any electron count: only integrals are asked of it
    molecule.spin = None
    molecule.build(dump_input=False, parse_arg=False)
    return molecule


def _symbol(number: int) -> str:
    from pyscf.data.elements import ELEMENTS

    symbol: str = ELEMENTS[number]
    return symbol


def _gaussians(number: int) -> list[list[Any]]:
    expansions = _expansion_table()
    basis = []
    for shell in shells(number):
        pairs = expansions[(shell.label, shell.gaussians)]
        basis.append([shell.momentum, *([a * shell.exponent**2, c] for a, c in pairs)])
    return basis


def _rows(name: str) -> list[dict[str, str]]:
    text = files(__package__).joinpath(name).read_text(encoding="utf-8")
    return list(csv.DictReader(line for line in text.splitlines() if not line.startswith("#")))


@cache
def _shell_table() -> dict[int, tuple[Shell, ...]]:
    table: dict[int, list[Shell]] = {}
    for row in _rows("gfn2_shells.csv"):
        shell = Shell(row["shell"], float(row["slater_exponent"]), int(row["gaussians"]), float(row["hardness"]))
        table.setdefault(int(row["atomic_number"]), []).append(shell)
    return {number: tuple(found) for number, found in table.items()}


@cache
def _expansion_table() -> dict[tuple[str, int], list[tuple[float, float]]]:
    table: dict[tuple[str, int], list[tuple[float, float]]] = {}
    for row in _rows("slater_expansions.csv"):
        pair = (float(row["exponent"]), float(row["coefficient"]))
        table.setdefault((row["shell"], int(row["gaussians"])), []).append(pair)
    return table
