"""The records of the main path, from a library row to a score.

Units are in the field names: angstrom, eV, debye, nm, M^-1 cm^-1 (molar absorptivity), hartree, e.
"""

from __future__ import annotations

from typing import Annotated, ClassVar

import numpy as np
from pydantic import Field

from .anchor import Anchor
from .arrays import FloatArray, IntArray, Shape
from .base import Frozen, Quantity, QuantityInfo, Record
from .light import light_records
from .states import kinds_of_states

HC_EV_NM = 1239.841984
"""Planck constant times speed of light, eV nm (CODATA 2018, exact by definition of the SI)."""


class LibraryRow(Record):
    """What one row of the user's file says about structure and medium (nothing else enters the physics).

    ``structure`` is a SMILES, or a V2000/V3000 mol block when ``format`` is "molblock".
    """

    kind = "library_row"
    structure: str
    format: str = "smiles"
    medium: str | None = None
    charge: int | None = None


class Identity(Record):
    """The species that is computed: one connected molecule or ion, its charge and its name in the InChI system."""

    kind = "identity"
    smiles: str = Field(description="canonical SMILES of the species; for display and for embedding")
    inchikey: str
    fixed_hydrogen_layer: str = Field(description="fixed-H InChI, which tells tautomers and protonation states apart")
    charge: int
    formula: str
    heavy_atoms: int
    atoms: int = Field(description="with hydrogens")
    molar_mass_g_mol: float
    zwitterion: bool = Field(description="holds separated formal charges beyond nitro-like neutral groups")

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="molar_mass_g_mol", unit="g/mol", meaning="molar mass of the species, counter-ions apart"),
        QuantityInfo(name="heavy_atoms", unit="1", meaning="atoms other than hydrogen"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return (
            Quantity(name="molar_mass_g_mol", value=self.molar_mass_g_mol, unit="g/mol"),
            Quantity(name="heavy_atoms", value=self.heavy_atoms, unit="1"),
        )


class IntakeNotes(Record):
    """What intake did and warns of: counter-ions set apart, readings of the row, cautions about hazards."""

    kind = "intake_notes"
    set_apart: tuple[str, ...] = Field(default=(), description="SMILES of counter-ions and solvates set apart")
    notes: tuple[str, ...] = ()
    cautions: tuple[str, ...] = Field(default=(), description="each defers to safety data sheets and local rules")


class Medium(Record):
    """The surroundings: gas phase, a solvent, or a film or host given by two constants."""

    kind = "medium"
    name: str
    dielectric_constant: float = Field(ge=1)
    refractive_index: float = Field(ge=1)
    solvation: str | None = Field(
        default=None,
        description="name of the implicit-solvent parameter set used for the ground state; None is gas phase",
    )
    solvation_stand_in: bool = Field(
        default=False, description="the parameter set is that of a similar solvent, for want of one of its own"
    )
    et30_kcal_mol: float | None = None
    hydrogen_bond_donor: bool = False


class Conformers(Record):
    """Starting structures from distance geometry, best first."""

    kind = "conformers"
    atomic_numbers: Annotated[IntArray, Shape("atoms", number="int")]
    bonds: Annotated[IntArray, Shape("bonds", 2, number="int")] = Field(description="pairs of atom indices")
    positions_angstrom: Annotated[FloatArray, Shape("conformers", "atoms", 3)]
    method: str = Field(description="the rung of the ladder that succeeded")
    force_field: str = Field(description='"MMFF94", "UFF" or "none"')
    stereo_enforced: bool = True


class Geometry(Record):
    """A relaxed GFN2-xTB structure in its medium; the lowest of the conformers that were relaxed."""

    kind = "geometry"
    atomic_numbers: Annotated[IntArray, Shape("atoms", number="int")]
    positions_angstrom: Annotated[FloatArray, Shape("atoms", 3)]
    charge: int
    energy_hartree: float
    gradient_norm: float = Field(description="hartree/bohr, Euclidean norm over all coordinates at the end")
    gradients_used: int = Field(description="energy-and-gradient evaluations spent")
    solvation: str | None = Field(description="implicit-solvent parameter set used; None is gas phase")
    engine: str = Field(description='library and version, for example "libxtb 6.5.1"')
    rescued: str | None = Field(default=None, description="what the self-consistent field needed to converge")


class Orbitals(Record):
    """A summary of the ground state that the excited states were built on."""

    kind = "orbitals"
    homo_ev: float
    lumo_ev: float
    gap_ev: float
    dipole_debye: Annotated[FloatArray, Shape(3)]
    partial_charges_e: Annotated[FloatArray, Shape("atoms")]
    occupied_window: int
    virtual_window: int
    overlap_error: float = Field(description="largest element of C^T S C - 1 with integrals from libcint")
    dipole_error_debye: float = Field(description="GFN2 dipole minus the one from libcint integrals, largest component")

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="orbital_gap_ev", unit="eV", meaning="HOMO-LUMO gap of GFN2-xTB; not an excitation energy"),
        QuantityInfo(name="ground_dipole_debye", unit="debye", meaning="length of the ground-state dipole moment"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return (
            Quantity(name="orbital_gap_ev", value=self.gap_ev, unit="eV"),
            Quantity(name="ground_dipole_debye", value=float(np.linalg.norm(self.dipole_debye)), unit="debye"),
        )


class Transitions(Record):
    """Singlet states above the ground state in order of energy, straight from the response Hamiltonian.

    Vectors are in the frame of the geometry. ``long_axis_angle_deg`` is the angle between the transition dipole and
    the long axis (the axis of least inertia), 0 to 90. ``shift_angstrom`` points from the hole to the electron.
    """

    kind = "transitions"
    method: str
    energy_ev: Annotated[FloatArray, Shape("states")]
    oscillator_strength: Annotated[FloatArray, Shape("states")]
    transition_dipole_debye: Annotated[FloatArray, Shape("states", 3)]
    long_axis_angle_deg: Annotated[FloatArray, Shape("states")]
    electron_shift_angstrom: Annotated[FloatArray, Shape("states")]
    shift_angstrom: Annotated[FloatArray, Shape("states", 3)]
    charge_transfer_share: Annotated[FloatArray, Shape("states")] = Field(
        description="share of an electron that changes its atom, half the sum of |electron - hole|, 0 to 1"
    )
    overlap: Annotated[FloatArray, Shape("states")] = Field(description="overlap of hole and electron by atom, 0 to 1")
    dipole_change_debye: Annotated[FloatArray, Shape("states", 3)]
    leading_from: Annotated[IntArray, Shape("states", number="int")] = Field(
        description="occupied orbital of the largest weight, 0 is the HOMO, 1 the one below"
    )
    leading_to: Annotated[IntArray, Shape("states", number="int")] = Field(description="0 is the LUMO")
    leading_weight: Annotated[FloatArray, Shape("states")]
    pi_share: Annotated[FloatArray, Shape("states")] = Field(
        description="share of hole and electron in orbitals perpendicular to the local bonding plane, 0 to 1"
    )


class Band(Record):
    """The reported absorption band on the measured scale, with a central interval of probability ``coverage``.

    ``physics_*`` is what the response Hamiltonian says without any correction after it.
    """

    kind = "band"
    state: int = Field(ge=0, description="index into Transitions")
    first_bright_state: int = Field(ge=0)
    strongest_state: int = Field(ge=0)
    coverage: float
    absorption_max_nm: float
    absorption_low_nm: float
    absorption_high_nm: float
    physics_absorption_max_nm: float
    strongest_absorption_max_nm: float
    molar_absorptivity: float
    molar_absorptivity_low: float
    molar_absorptivity_high: float
    width_ev: float = Field(description="full width at half maximum")
    oscillator_strength: float
    transition_dipole_debye: float
    long_axis_angle_deg: float
    electron_shift_angstrom: float
    emission_max_nm: float | None = None
    emission_low_nm: float | None = None
    emission_high_nm: float | None = None
    emission_strength: float | None = Field(
        default=None, description="oscillator strength that gives the radiative rate at the emission maximum"
    )
    emission_strength_low: float | None = None
    emission_strength_high: float | None = None
    trust: str = Field(description='"inside", "edge" or "outside" of what the model was trained on')
    cautions: tuple[str, ...] = ()

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="absorption_max_nm", unit="nm", meaning="position of the reported absorption maximum"),
        QuantityInfo(name="strongest_absorption_max_nm", unit="nm", meaning="position of the strongest computed band"),
        QuantityInfo(name="molar_absorptivity", unit="M^-1 cm^-1", meaning="molar absorptivity at the maximum"),
        QuantityInfo(name="oscillator_strength", unit="1", meaning="oscillator strength of the reported transition"),
        QuantityInfo(name="transition_dipole_debye", unit="debye", meaning="length of the transition dipole moment"),
        QuantityInfo(
            name="long_axis_angle_deg", unit="degree", meaning="angle between transition dipole and long axis"
        ),
        QuantityInfo(
            name="electron_shift_angstrom", unit="angstrom", meaning="distance from hole to electron centroid"
        ),
        QuantityInfo(name="emission_max_nm", unit="nm", meaning="position of the fluorescence maximum"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        made = [
            Quantity(
                name="absorption_max_nm",
                value=self.absorption_max_nm,
                unit="nm",
                low=self.absorption_low_nm,
                high=self.absorption_high_nm,
                coverage=self.coverage,
            ),
            Quantity(name="strongest_absorption_max_nm", value=self.strongest_absorption_max_nm, unit="nm"),
            Quantity(
                name="molar_absorptivity",
                value=self.molar_absorptivity,
                unit="M^-1 cm^-1",
                low=self.molar_absorptivity_low,
                high=self.molar_absorptivity_high,
                coverage=self.coverage,
            ),
            Quantity(name="oscillator_strength", value=self.oscillator_strength, unit="1"),
            Quantity(name="transition_dipole_debye", value=self.transition_dipole_debye, unit="debye"),
            Quantity(name="long_axis_angle_deg", value=self.long_axis_angle_deg, unit="degree"),
            Quantity(name="electron_shift_angstrom", value=self.electron_shift_angstrom, unit="angstrom"),
        ]
        if self.emission_max_nm is not None:
            made.append(
                Quantity(
                    name="emission_max_nm",
                    value=self.emission_max_nm,
                    unit="nm",
                    low=self.emission_low_nm,
                    high=self.emission_high_nm,
                    coverage=self.coverage,
                )
            )
        return tuple(made)


class WantResult(Frozen):
    """How one candidate does on one want of the brief."""

    quantity: str
    value: float | None
    probability: float
    weight: float
    contribution: float = Field(description="share of the log score this want costs, 0 when fully met")


class Score(Record):
    """Where one candidate stands against one brief; ``rank`` 1 is best, ``pick`` counts the diverse choice."""

    kind = "score"
    rank: int
    score: float = Field(ge=0, le=1, description="weighted geometric mean of the probabilities of the wants")
    hit_probability: float = Field(ge=0, le=1, description="probability that every want is met")
    pareto_front: int = Field(description="1 is not beaten on every want by any candidate")
    pick: int | None = None
    wants: tuple[WantResult, ...]


def all_records() -> tuple[type[Record], ...]:
    """The record kinds of the first-party stages, in the order they come into being."""
    return (
        LibraryRow,
        Identity,
        IntakeNotes,
        Medium,
        Conformers,
        Geometry,
        Orbitals,
        Transitions,
        *kinds_of_states(),
        Band,
        *light_records(),
        Anchor,
        Score,
    )
