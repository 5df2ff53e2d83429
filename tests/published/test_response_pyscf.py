"""The response Hamiltonian against PySCF's configuration interaction of singles, given the same integrals.

With the two-electron integrals factorised exactly, (pq|rs) = sum_L B_L,pq B_L,rs, the auxiliary index takes
the place of the atoms, both kernels become the unit matrix, and the matrix must be that of CIS (Foresman,
Head-Gordon, Pople, Frisch, J. Phys. Chem. 96, 135, 1992). PySCF: Sun et al., J. Chem. Phys. 153, 024109
(2020).
"""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
import pytest
from orchil_schemas import FloatArray
from orchil_stages.excite.dipoles import dipole_change
from orchil_stages.excite.response import ChargeBlocks, States, assemble, solve
from orchil_stages.excite.window import Window
from orchil_stages.ground_state import HARTREE_EV
from orchil_stages.ground_state.basis import BasisMap
from pyscf import gto, scf

# angstrom; made up but sensible: any geometry serves to compare two programs
MOLECULES = {
    "formaldehyde": "O 0 0 1.21; C 0 0 0; H 0 0.94 -0.59; H 0 -0.94 -0.59",
    "butadiene": """C -0.61 -0.40 0; C 0.61 0.40 0; C -1.85 0.12 0; C 1.85 -0.12 0; H -0.49 -1.48 0;
        H 0.49 1.48 0; H -2.72 -0.53 0; H 2.72 0.53 0; H -2.00 1.20 0; H 2.00 -1.20 0""",
    "formamide": """C 0 0.42 0; O 1.20 0.24 0; N -0.94 -0.56 0; H -0.45 1.43 0; H -0.64 -1.52 0;
        H -1.92 -0.33 0""",
}
STATES = 8
ENERGY_HARTREE, DIPOLE_E_BOHR, STRENGTH = 1e-6, 1e-4, 1e-5


@cache
def _field(name: str) -> Any:
    molecule = gto.M(atom=MOLECULES[name], basis="sto-3g", verbose=0)
    field = scf.RHF(molecule)
    field.conv_tol = 1e-12
    field.kernel()
    assert field.converged
    return field


@cache
def _singles(name: str) -> Any:
    """PySCF's singles, its whole matrix diagonalised: the iterative search leaves close roots out."""
    tda = _field(name).TDA()
    matrix = tda.get_ab()[0]
    occupied, virtual = matrix.shape[:2]
    energies, vectors = np.linalg.eigh(matrix.reshape(occupied * virtual, -1))
    tda.e = energies[:STATES]
    # PySCF normalises closed-shell amplitudes to one half
    tda.xy = [(x.reshape(occupied, virtual) * np.sqrt(0.5), 0) for x in vectors.T[:STATES]]
    return tda


def _factors(field: Any) -> FloatArray:
    """B (auxiliary, orbitals, orbitals) by eigendecomposition of the integrals over atomic orbitals."""
    count = field.mol.nao
    values, vectors = np.linalg.eigh(field.mol.intor("int2e").reshape(count**2, count**2))
    kept = values > 1e-12
    factors = (vectors[:, kept] * np.sqrt(values[kept])).T.reshape(-1, count, count)
    return np.einsum("pm,Lpq,qn->Lmn", field.mo_coeff, factors, field.mo_coeff, optimize=True)


def _window(field: Any) -> Window:
    """Only what states and dipoles are made from; there are no atoms in this comparison."""
    dipole = np.einsum("pm,xpq,qn->xmn", field.mo_coeff, field.mol.intor("int1e_r"), field.mo_coeff)
    nothing, none = np.zeros(0), np.zeros(0, dtype=np.int64)
    return Window(
        occupied=int(field.mol.nelectron // 2),
        energies=field.mo_energy * HARTREE_EV,
        loewdin=nothing,
        hopping=nothing,
        dipole=dipole,
        numbers=none,
        positions=nothing,
        charges=nothing,
        where=BasisMap(none, none, none),
    )


@cache
def _ours(name: str) -> tuple[States, Window]:
    field = _field(name)
    window, factors = _window(field), _factors(field)
    o = window.occupied
    blocks = ChargeBlocks(factors[:, :o, :o], factors[:, o:, o:], factors[:, :o, o:])
    unit = np.eye(len(factors))
    levels = field.mo_energy
    matrix = assemble(np.diag(levels[:o]), np.diag(levels[o:]), blocks, unit, 2.0 * unit)
    return solve(matrix * HARTREE_EV, window, STATES), window


@pytest.mark.parametrize("name", MOLECULES)
def test_energies_are_those_of_singles(name: str) -> None:
    assert _ours(name)[0].energies / HARTREE_EV == pytest.approx(_singles(name).e, abs=ENERGY_HARTREE)


def test_energies_are_those_of_the_iterative_search() -> None:
    tda = _field("formaldehyde").TDA()
    tda.nstates = 4
    tda.kernel()
    assert all(tda.converged)
    assert _ours("formaldehyde")[0].energies[:4] / HARTREE_EV == pytest.approx(tda.e, abs=ENERGY_HARTREE)


@pytest.mark.parametrize("name", MOLECULES)
def test_oscillator_strengths_are_those_of_singles(name: str) -> None:
    published = _singles(name).oscillator_strength(gauge="length")
    assert published.max() > 0.1
    assert _ours(name)[0].strengths == pytest.approx(published, abs=STRENGTH)


@pytest.mark.parametrize("name", MOLECULES)
def test_transition_dipoles_are_those_of_singles(name: str) -> None:
    """Up to the sign, which has no meaning."""
    ours, theirs = _ours(name)[0].dipoles, np.array(_singles(name).transition_dipole())
    signs = np.where((ours * theirs).sum(axis=1) < 0, -1.0, 1.0)
    assert ours * signs[:, None] == pytest.approx(theirs, abs=DIPOLE_E_BOHR)


@pytest.mark.parametrize("name", MOLECULES)
def test_change_of_dipole_is_that_of_the_densities(name: str) -> None:
    """Difference density over atomic orbitals, made here from PySCF's amplitudes (normalised to one half)."""
    field, (states, window) = _field(name), _ours(name)
    o, c = window.occupied, field.mo_coeff
    for state, (amplitudes, _) in enumerate(_singles(name).xy):
        x = np.sqrt(2.0) * amplitudes
        gained, lost = (c[:, o:] @ x.T @ x @ c[:, o:].T), (c[:, :o] @ x @ x.T @ c[:, :o].T)
        expected = -np.einsum("xpq,pq->x", field.mol.intor("int1e_r"), gained - lost)
        found = dipole_change(states.amplitudes[state][None], window)[0]
        assert found == pytest.approx(expected, abs=1e-4)


@pytest.mark.parametrize("name", MOLECULES)
def test_a_one_electron_matrix_may_have_any_basis(name: str) -> None:
    """Rotating the occupied and the virtual orbitals among themselves changes no energy."""
    field = _field(name)
    o = field.mol.nelectron // 2
    rng = np.random.default_rng(3)
    factors, levels = _factors(field), np.diag(field.mo_energy)
    turn = np.zeros_like(levels)
    for part in (slice(None, o), slice(o, None)):
        turn[part, part] = np.linalg.qr(rng.standard_normal(levels[part, part].shape))[0]
    factors, levels = turn.T @ factors @ turn, turn.T @ levels @ turn
    blocks = ChargeBlocks(factors[:, :o, :o], factors[:, o:, o:], factors[:, :o, o:])
    unit = np.eye(len(factors))
    matrix = assemble(levels[:o, :o], levels[o:, o:], blocks, unit, 2.0 * unit)
    assert np.abs(matrix - matrix.T).max() < 1e-10
    assert np.linalg.eigvalsh(matrix)[:STATES] == pytest.approx(_singles(name).e, abs=ENERGY_HARTREE)
