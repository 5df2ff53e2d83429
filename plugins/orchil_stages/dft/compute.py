"""Tamm-Dancoff TD-DFT by PySCF (Sun et al., J. Chem. Phys. 153, 024109, 2020) in the fast polarisation of the medium.

Density fitting helps the self-consistent field and slows the response (transition densities go through its slow
exchange), so the first has it and the second has not. The ground state feels the static dielectric constant, the
excitation n^2 (linear response without equilibration), which PySCF leaves at the value of water unless it is told.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import numpy as np
from orchil_schemas import BadInput, FloatArray, Geometry, Medium, NotConverged

from orchil_stages.excite.analysis import Populations, bonding_normals
from orchil_stages.optics.units import HARTREE_EV

from .settings import DftSettings

FIELD_TOLERANCE = 1e-7
"""Of the energy of the ground state in hartree; excitation energies then hold to about 1e-3 eV."""
RESPONSE_TOLERANCE = 1e-4
GRID_LEVEL = 2
MEMORY_MB = 2000
"""What PySCF takes for buffers; a worker may hold 4 GiB."""
_VACUUM = 1.0 + 1e-6


@dataclass(frozen=True)
class DftStates:
    """Singlets in order of energy (eV), with transition dipoles (n, 3) in e bohr, populations of hole and electron by
    atom, pi shares, and whether each root converged.
    """

    energies: FloatArray
    strengths: FloatArray
    dipoles: FloatArray
    spread: Populations
    hole_pi: FloatArray
    electron_pi: FloatArray
    converged: tuple[bool, ...]
    basis_functions: int
    optical: float | None


def dft_states(geometry: Geometry, medium: Medium, settings: DftSettings) -> DftStates:
    """Singlets at a geometry in its medium; BadInput for an unknown functional or basis, NotConverged."""
    optical = medium.refractive_index**2 if medium.dielectric_constant > _VACUUM else None
    with _quiet():
        molecule = _molecule(geometry, settings)
        ground = _ground_state(molecule, medium, settings, optical)
        response = ground.TDA()
        if optical is not None:
            response.with_solvent.eps = optical
            response.with_solvent.build()
        response.nstates, response.conv_tol, response.max_cycle = settings.roots, RESPONSE_TOLERANCE, 60
        response.kernel()
    return _collected(molecule, ground, response, optical)


@contextmanager
def _quiet() -> Iterator[None]:
    # what PySCF warns of is looked at here: convergence, names, versions of its parts
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        yield


def _molecule(geometry: Geometry, settings: DftSettings) -> Any:
    from pyscf import gto
    from pyscf.lib.exceptions import BasisNotFoundError

    pairs = zip(geometry.atomic_numbers, geometry.positions_angstrom, strict=True)
    try:
        return gto.M(
            atom=[(int(number), tuple(place)) for number, place in pairs],
            charge=geometry.charge,
            basis=settings.basis,
            ecp=settings.basis if int(np.max(geometry.atomic_numbers)) > 36 else {},
            verbose=0,
            max_memory=MEMORY_MB,
        )
    except (BasisNotFoundError, KeyError) as error:
        raise BadInput(f"basis '{settings.basis}': {error}; a name as PySCF knows it, for example def2-svp") from None


def _ground_state(molecule: Any, medium: Medium, settings: DftSettings, optical: float | None) -> Any:
    """Converged with density fitting, handed over to an object without."""
    fitted = _field(molecule, medium, settings, optical, fit=True)
    fitted.kernel()
    if not fitted.converged:
        raise NotConverged("the self-consistent field of the density functional did not converge")
    plain = _field(molecule, medium, settings, optical, fit=False)
    for name in ("mo_coeff", "mo_energy", "mo_occ", "e_tot", "converged"):
        setattr(plain, name, getattr(fitted, name))
    return plain


def _field(molecule: Any, medium: Medium, settings: DftSettings, optical: float | None, *, fit: bool) -> Any:
    from pyscf import dft

    field = dft.RKS(molecule)
    try:
        field.xc = settings.functional
        field._numint.libxc.parse_xc(settings.functional)
    except (KeyError, ValueError) as error:
        raise BadInput(f"functional '{settings.functional}': {error}; a name as PySCF knows it") from None
    field.grids.level = GRID_LEVEL
    field.conv_tol = FIELD_TOLERANCE
    if fit:
        field = field.density_fit()
    if optical is not None:
        field = field.PCM()
        field.with_solvent.eps = medium.dielectric_constant
    return field


def _collected(molecule: Any, ground: Any, response: Any, optical: float | None) -> DftStates:
    order = np.argsort(response.e)
    occupied = ground.mo_coeff[:, ground.mo_occ > 0]
    virtual = ground.mo_coeff[:, ground.mo_occ == 0]
    # PySCF normalises the amplitudes of closed shells to a half
    amplitudes = np.array([response.xy[root][0] for root in order]) * np.sqrt(2.0)
    dipoles = np.array(response.transition_dipole())[order]
    energies = np.asarray(response.e)[order] * HARTREE_EV
    half = _half_overlap(molecule.intor("int1e_ovlp"))
    hole = np.einsum("nia,nja->nij", amplitudes, amplitudes)
    electron = np.einsum("nia,nib->nab", amplitudes, amplitudes)
    parts = [_populations(molecule, half @ c, density) for c, density in ((occupied, hole), (virtual, electron))]
    return DftStates(
        energies=energies,
        strengths=2.0 / 3.0 * energies / HARTREE_EV * (dipoles**2).sum(axis=1),
        dipoles=dipoles,
        spread=Populations(parts[0][0], parts[1][0]),
        hole_pi=parts[0][1],
        electron_pi=parts[1][1],
        converged=tuple(bool(response.converged[root]) for root in order),
        basis_functions=int(molecule.nao),
        optical=optical,
    )


def _half_overlap(overlap: FloatArray) -> FloatArray:
    values, vectors = np.linalg.eigh(overlap)
    half: FloatArray = (vectors * np.sqrt(values)) @ vectors.T
    return half


def _populations(molecule: Any, loewdin: FloatArray, density: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Loewdin populations by atom (states, atoms) and the share in p functions along the bonding normals (states,)."""
    by_function = ((loewdin @ density) * loewdin).sum(axis=2)
    slices = molecule.aoslice_by_atom()[:, 2:]
    by_atom = np.stack([by_function[:, start:end].sum(axis=1) for start, end in slices], axis=1)
    along = _along_normals(molecule, loewdin)
    return by_atom, ((along @ density) * along).sum(axis=(1, 2))


def _along_normals(molecule: Any, loewdin: FloatArray) -> FloatArray:
    """Coefficients of the p functions turned along the normals, (p shells, orbitals)."""
    numbers = np.array([molecule.atom_charge(atom) + molecule.atom_nelec_core(atom) for atom in range(molecule.natm)])
    normals = bonding_normals(numbers, molecule.atom_coords())
    starts, atoms = [], []
    place = 0
    for shell in range(molecule.nbas):
        momentum = molecule.bas_angular(shell)
        for _ in range(molecule.bas_nctr(shell)):
            if momentum == 1:
                starts.append(place)
                atoms.append(molecule.bas_atom(shell))
            place += 2 * momentum + 1
    blocks = loewdin[np.array(starts)[:, None] + np.arange(3)]
    found: FloatArray = np.einsum("sx,sxm->sm", normals[atoms], blocks)
    return found
