"""The optional stage: TD-DFT beside the semi-empirical states."""

from __future__ import annotations

import time
from collections.abc import Iterable

from orchil_schemas import (
    Availability,
    Context,
    DftCheck,
    Frozen,
    Geometry,
    Inputs,
    Medium,
    OutOfScope,
    Record,
    StateAnalysis,
    Transitions,
)

from orchil_stages.installed import availability
from orchil_stages.optics.units import EA0_DEBYE

from .settings import DftSettings


class CheckByDft:
    """Singlets by TD-DFT for a candidate whose brief asks for them: tens of minutes each."""

    name = "dft"
    version = "1"
    needs: tuple[type[Record], ...] = (Geometry, Medium, Transitions, StateAnalysis)
    makes: tuple[type[Record], ...] = (DftCheck,)
    Settings: type[Frozen] = DftSettings
    time_limit_seconds = 7200.0
    on_request = True
    """Runs only where a brief names it or wants what it offers."""

    def found(self) -> Availability:
        """Is PySCF here?"""
        return availability("pyscf", "scipy")

    def run(self, inputs: Inputs, settings: DftSettings, context: Context) -> Iterable[Record]:
        """One DftCheck; OutOfScope for a molecule that is too large, NotConverged."""
        atoms = len(inputs[Geometry].atomic_numbers)
        if atoms > settings.largest:
            raise OutOfScope(f"{atoms} atoms, and [stage.dft] largest is {settings.largest}: raise it if time allows")
        yield dft_check(inputs[Geometry], inputs[Medium], inputs[Transitions], inputs[StateAnalysis], settings)


def dft_check(
    geometry: Geometry,
    medium: Medium,
    transitions: Transitions,
    analysis: StateAnalysis,
    settings: DftSettings | None = None,
) -> DftCheck:
    """Recompute one relaxed candidate by TD-DFT and match the states; for use without the engine too."""
    from orchil_stages.excite.analysis import fixed_sign
    from orchil_stages.excite.bright import first_bright

    from .compute import dft_states
    from .match import matched, remarks

    wanted = settings or DftSettings()
    begin = time.perf_counter()
    dft = dft_states(geometry, medium, wanted)
    found = matched(dft, transitions, analysis)
    return DftCheck(
        method=f"Tamm-Dancoff {wanted.functional}/{wanted.basis}, linear-response continuum, PySCF",
        basis_functions=dft.basis_functions,
        seconds=round(time.perf_counter() - begin, 1),
        optical_dielectric_constant=dft.optical,
        energy_ev=dft.energies,
        oscillator_strength=dft.strengths,
        transition_dipole_debye=fixed_sign(dft.dipoles) * EA0_DEBYE,
        converged=dft.converged,
        matched_state=found.state,
        match=found.likeness,
        energy_difference_ev=found.difference,
        dipole_angle_deg=found.angle,
        bright_root=first_bright(dft.energies, dft.strengths),
        remarks=remarks(dft, found, transitions),
    )
