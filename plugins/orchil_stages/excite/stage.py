"""The excite stage: orbitals of GFN2-xTB, response Hamiltonian, singlet states with their transition
dipoles.
"""

from __future__ import annotations

from collections.abc import Iterable

from orchil_schemas import (
    Availability,
    BadResult,
    Context,
    Frozen,
    Geometry,
    Inputs,
    Medium,
    Orbitals,
    Record,
    StateAnalysis,
    Transitions,
    Triplets,
)
from pydantic import Field

from orchil_stages.installed import availability


class ExciteSettings(Frozen):
    """How many states, and how many orbitals around the gap they are made of."""

    states: int = Field(default=12, ge=1, le=50, description="singlet states kept")
    occupied: int = Field(default=16, ge=2, le=60, description="occupied orbitals of the window")
    virtual: int = Field(default=16, ge=2, le=60, description="virtual orbitals of the window")


class Excite:
    """Singlet excited states of a relaxed geometry in its medium."""

    name = "excite"
    version = "2"
    needs: tuple[type[Record], ...] = (Geometry, Medium)
    makes: tuple[type[Record], ...] = (Orbitals, Transitions, StateAnalysis, Triplets)
    Settings: type[Frozen] = ExciteSettings
    time_limit_seconds = 120.0

    def found(self) -> Availability:
        """Are a ground-state engine and libcint (through PySCF) here?"""
        from orchil_stages.ground_state import engine_names

        engines = engine_names()
        if not engines:
            return Availability(ok=False, hint="pip install xtb (CPython before 3.12) or tblite")
        return availability(engines[0], "pyscf", "scipy")

    def run(self, inputs: Inputs, settings: ExciteSettings, context: Context) -> Iterable[Record]:
        """Orbitals, singlets, their analysis and triplets; NotConverged or BadResult with the reason."""
        from orchil_stages.electron import state_analysis, triplets_record

        from .model import open_states, solve_states
        from .parameters import trained_parameters
        from .report import orbitals_record, transitions_record
        from .response import prepare

        geometry, medium = inputs[Geometry], inputs[Medium]
        opened = open_states(geometry, medium, settings.occupied, settings.virtual)
        prepared = prepare(opened.window)
        dipole, parameters = opened.wave.dipole, trained_parameters()
        states, _ = solve_states(prepared, parameters, medium, dipole, settings.states)
        if states.energies[0] <= _LOWEST_EV:
            raise BadResult(
                f"the first excited state lies at {states.energies[0]:.2f} eV: no sound closed-shell ground state"
            )
        singlets = transitions_record(states, opened.window)
        analysis = state_analysis(states, opened.window)
        triplets = triplets_record(singlets, prepared, parameters, medium, dipole)
        return orbitals_record(opened), singlets, analysis, triplets


_LOWEST_EV = 0.2
"""Below this the closed-shell reference itself is unsound (diradicals, broken structures)."""
