"""What `orchil check` tries: published values that this machine must reproduce."""

from __future__ import annotations

import numpy as np
from orchil_schemas import HC_EV_NM, Check, CheckResult, LibraryRow, Transitions

_WATER_HARTREE = -5.070451
"""GFN2-xTB energy of water at _WATER_BOHR: documentation of xtb-python, interface of the single point."""
_WATER_BOHR = ((0.0, 0.0, -0.73578586), (1.44183152, 0.0, 0.36789293), (-1.44183152, 0.0, 0.36789293))


def checks() -> list[Check]:
    """The checks of the first-party stages, quick ones first."""
    return [
        Check("GFN2-xTB energy of water", _water),
        Check("anthracene: first band near 375 nm, short-axis polarised (Grimme, Parac 2003)", _anthracene),
        Check("trans-azobenzene: n-pi* band forbidden by symmetry", _azobenzene),
    ]


def _water() -> CheckResult:
    from .ground_state import open_ground_state

    ground = open_ground_state(np.array([8, 1, 1]), 0, None)
    energy = ground.evaluate(np.array(_WATER_BOHR)).energy
    return CheckResult(abs(energy - _WATER_HARTREE) < 1e-5, f"{energy:.6f} hartree with {ground.engine}")


def _transitions(smiles: str) -> Transitions:
    from .by_hand import run_stages
    from .embed import Embed
    from .excite import Excite
    from .intake import Intake
    from .relax import Relax

    row = LibraryRow(structure=smiles, medium="cyclohexane")
    return run_stages(row, (Intake(), Embed(), Relax(), Excite()))[Transitions]


def _anthracene() -> CheckResult:
    from .excite.bright import first_bright

    found = _transitions("c1ccc2cc3ccccc3cc2c1")
    state = first_bright(found.energy_ev, found.oscillator_strength)
    position = HC_EV_NM / float(found.energy_ev[state])
    angle = float(found.long_axis_angle_deg[state])
    return CheckResult(
        330 < position < 420 and angle > 88, f"{position:.0f} nm, {angle:.0f} degrees from the long axis"
    )


def _azobenzene() -> CheckResult:
    found = _transitions("c1ccc(/N=N/c2ccccc2)cc1")
    lowest = float(found.oscillator_strength[0])
    return CheckResult(lowest < 1e-3, f"oscillator strength {lowest:.5f} at {HC_EV_NM / found.energy_ev[0]:.0f} nm")
