"""Records about the states themselves: why they are weak, where the electron goes, triplets, a check by TD-DFT."""

from __future__ import annotations

from typing import Annotated, ClassVar

from pydantic import Field

from .arrays import FloatArray, IntArray, Shape
from .base import Quantity, QuantityInfo, Record


class StateAnalysis(Record):
    """What each state of ``Transitions`` is, in the same order.

    ``reason`` is "forbidden" (by the point group), "overlap" (allowed, but hole and electron hardly meet), "cancelling"
    (contributions of orbital pairs cancel) or "" for a state that is not weak; ``explanation`` is a sentence with the
    numbers. Representations carry Mulliken symbols; x stands on the plane of a flat molecule. Fragments are ring
    systems and what hangs on them or between them.
    """

    kind = "state_analysis"
    point_group: str = Field(description="Schoenflies symbol of the geometry within the tolerance")
    symmetry_operations: int
    symmetry_tolerance_angstrom: float
    symmetry_error_angstrom: float = Field(description="largest distance of an atom from its image")
    reported_state: int = Field(ge=0, description="index of the first state that is not dark")
    irrep: tuple[str, ...]
    irrep_share: Annotated[FloatArray, Shape("states")] = Field(description="how purely it transforms so, 0 to 1")
    hole_irrep: tuple[str, ...] = Field(description="of the leading natural transition orbital")
    electron_irrep: tuple[str, ...]
    allowed_share: Annotated[FloatArray, Shape("states")] = Field(
        description="share of the state in representations that can absorb, 0 to 1"
    )
    reason: tuple[str, ...]
    explanation: tuple[str, ...]
    pair_strength: Annotated[FloatArray, Shape("states")] = Field(
        description="oscillator strength if contributions of orbital pairs did not interfere"
    )
    positive_debye: Annotated[FloatArray, Shape("states")] = Field(
        description="sum of the contributions of one sign to the transition dipole"
    )
    negative_debye: Annotated[FloatArray, Shape("states")]
    hole_electron_overlap: Annotated[FloatArray, Shape("states")] = Field(
        description="overlap of hole and electron by atom, pi and the rest counted apart, 0 to 1"
    )
    hole_pi_share: Annotated[FloatArray, Shape("states")]
    electron_pi_share: Annotated[FloatArray, Shape("states")]
    charge_transfer_share: Annotated[FloatArray, Shape("states")] = Field(
        description="share of an electron that changes its atom, 0 to 1"
    )
    fragment_transfer_share: Annotated[FloatArray, Shape("states")] = Field(
        description="share of an electron that changes its fragment, 0 to 1"
    )
    dipole_change_debye: Annotated[FloatArray, Shape("states")]
    hole_by_atom: Annotated[FloatArray, Shape("states", "atoms")] = Field(description="rounded to 4 digits")
    electron_by_atom: Annotated[FloatArray, Shape("states", "atoms")]
    fragment_of_atom: Annotated[IntArray, Shape("atoms", number="int")]
    fragment_names: tuple[str, ...] = Field(description="formula of each fragment")
    hole_by_fragment: Annotated[FloatArray, Shape("states", "fragments")]
    electron_by_fragment: Annotated[FloatArray, Shape("states", "fragments")]

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(
            name="charge_transfer_share", unit="1", meaning="share of an electron that changes its atom, reported band"
        ),
        QuantityInfo(
            name="fragment_transfer_share", unit="1", meaning="share of an electron that changes its fragment"
        ),
        QuantityInfo(
            name="hole_electron_overlap", unit="1", meaning="overlap of hole and electron of the reported band, 0 to 1"
        ),
        QuantityInfo(
            name="dipole_change_debye", unit="debye", meaning="change of the dipole moment on absorption, unrelaxed"
        ),
        QuantityInfo(name="dark_states_below", unit="1", meaning="dark singlets below the reported band"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``, all for the first state that is not dark."""
        state = self.reported_state
        return (
            Quantity(name="charge_transfer_share", value=float(self.charge_transfer_share[state]), unit="1"),
            Quantity(name="fragment_transfer_share", value=float(self.fragment_transfer_share[state]), unit="1"),
            Quantity(name="hole_electron_overlap", value=float(self.hole_electron_overlap[state]), unit="1"),
            Quantity(name="dipole_change_debye", value=float(self.dipole_change_debye[state]), unit="debye"),
            Quantity(name="dark_states_below", value=float(state), unit="1"),
        )


class Triplets(Record):
    """Triplet states from the same Hamiltonian, vertical at the ground-state geometry, in order of energy.

    ``triplet_ev`` is the lowest on the scale of measured triplet energies (0-0), with a central interval of
    probability ``coverage``; ``singlet_triplet_gap_ev`` is the vertical S1 minus the vertical T1, with a correction
    for n-pi* singlets, which the model puts too high.
    """

    kind = "triplets"
    method: str
    energy_ev: Annotated[FloatArray, Shape("states")]
    pi_share: Annotated[FloatArray, Shape("states")]
    singlet_triplet_gap_ev: float
    triplet_ev: float
    triplet_low_ev: float
    triplet_high_ev: float
    coverage: float

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="triplet_ev", unit="eV", meaning="energy of the lowest triplet, measured scale (0-0)"),
        QuantityInfo(name="singlet_triplet_gap_ev", unit="eV", meaning="vertical S1 minus vertical T1"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        return (
            Quantity(
                name="triplet_ev",
                value=self.triplet_ev,
                unit="eV",
                low=self.triplet_low_ev,
                high=self.triplet_high_ev,
                coverage=self.coverage,
            ),
            Quantity(name="singlet_triplet_gap_ev", value=self.singlet_triplet_gap_ev, unit="eV"),
        )


class DftCheck(Record):
    """The lowest singlets by TD-DFT at the same geometry, beside the semi-empirical ones.

    ``matched_state`` is the index into ``Transitions`` of the state that a TD-DFT state is most like, -1 for none;
    ``match`` says how much (overlap of the transition densities of hole and electron by atom, and the angle between the
    transition dipoles where both are bright), 0 to 1.
    """

    kind = "dft_check"
    method: str
    basis_functions: int
    seconds: float = Field(description="wall time of the whole stage on this machine")
    optical_dielectric_constant: float | None = Field(description="None: gas phase")
    energy_ev: Annotated[FloatArray, Shape("roots")]
    oscillator_strength: Annotated[FloatArray, Shape("roots")]
    transition_dipole_debye: Annotated[FloatArray, Shape("roots", 3)]
    converged: tuple[bool, ...]
    matched_state: Annotated[IntArray, Shape("roots", number="int")]
    match: Annotated[FloatArray, Shape("roots")]
    energy_difference_ev: Annotated[FloatArray, Shape("roots")] = Field(
        description="TD-DFT minus the matched semi-empirical state, 0 where none is matched"
    )
    dipole_angle_deg: Annotated[FloatArray, Shape("roots")] = Field(
        description="between the transition dipoles of a matched pair, 0 where either is dark or none is matched"
    )
    bright_root: int = Field(ge=0, description="first root that is not dark")
    remarks: tuple[str, ...] = Field(default=(), description="where the two disagree, one sentence each")

    offers: ClassVar[tuple[QuantityInfo, ...]] = (
        QuantityInfo(name="dft_vertical_ev", unit="eV", meaning="vertical energy of the first bright state by TD-DFT"),
        QuantityInfo(name="dft_oscillator_strength", unit="1", meaning="its oscillator strength by TD-DFT"),
    )

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers listed in ``offers``."""
        root = self.bright_root
        return (
            Quantity(name="dft_vertical_ev", value=float(self.energy_ev[root]), unit="eV"),
            Quantity(name="dft_oscillator_strength", value=float(self.oscillator_strength[root]), unit="1"),
        )


def kinds_of_states() -> tuple[type[Record], ...]:
    """The records of this module in the order they come into being."""
    return StateAnalysis, Triplets, DftCheck
