"""One small door to GFN2-xTB (Bannwarth, Ehlert, Grimme, J. Chem. Theory Comput. 15, 1652, 2019).

Behind it is ``xtb`` on CPython before 3.12 and ``tblite`` from there on; both use GBSA solvation so that the
two give the same numbers to about 1e-6 hartree.
"""

from __future__ import annotations

import sys
from collections.abc import Callable

import numpy as np
from orchil_schemas import BadResult, FloatArray, IntArray, OutOfScope

from orchil_stages.optics.units import BOHR_ANGSTROM, HARTREE_EV

from .types import KELVIN_HARTREE, Evaluation, GroundState, Request, Wavefunction

__all__ = [
    "BOHR_ANGSTROM",
    "HARTREE_EV",
    "KELVIN_HARTREE",
    "SOLVATION_SETS",
    "Evaluation",
    "GroundState",
    "Wavefunction",
    "check_result",
    "engine_names",
    "open_ground_state",
]

SOLVATION_SETS = (
    "acetone",
    "acetonitrile",
    "benzene",
    "ch2cl2",
    "chcl3",
    "cs2",
    "dmf",
    "dmso",
    "ether",
    "h2o",
    "methanol",
    "nhexane",
    "thf",
    "toluene",
)
"""Names of the GBSA parameter sets that both engines carry."""


def open_ground_state(
    numbers: IntArray,
    charge: int,
    solvation: str | None,
    *,
    accuracy: float = 1.0,
    temperature_kelvin: float = 300.0,
    max_iterations: int = 250,
    engine: str | None = None,
) -> GroundState:
    """A calculator for one closed-shell species; ``engine`` forces "xtb" or "tblite".

    Raises OutOfScope for an odd number of electrons or an unknown solvation set: the engines themselves would
    silently go on.
    """
    if (int(np.sum(numbers)) - charge) % 2:
        raise OutOfScope("odd number of electrons: only closed-shell species are handled")
    if solvation is not None and solvation not in SOLVATION_SETS:
        raise OutOfScope(f"no solvation parameters named '{solvation}'; known: {', '.join(SOLVATION_SETS)}")
    request = Request(np.asarray(numbers), charge, solvation, accuracy, temperature_kelvin, max_iterations)
    return _calculator(engine)(request)


def engine_names() -> tuple[str, ...]:
    """Engines that can be imported here, the preferred one first."""
    import importlib.util

    preferred = ("xtb", "tblite") if sys.version_info < (3, 12) else ("tblite", "xtb")
    return tuple(name for name in preferred if importlib.util.find_spec(name) is not None)


def check_result(evaluation: Evaluation, charges: FloatArray, charge: int) -> None:
    """Refuse numbers that cannot be right although the library reported success (BadResult)."""
    if not (np.isfinite(evaluation.energy) and np.isfinite(evaluation.gradient).all()):
        raise BadResult("GFN2-xTB returned an energy or gradient that is not a number")
    if abs(float(charges.sum()) - charge) > 1e-3 or float(np.abs(charges).max()) > 3.5:
        raise BadResult(f"GFN2-xTB returned impossible atomic charges (sum {charges.sum():.3f}, expected {charge})")


def _calculator(engine: str | None) -> Callable[[Request], GroundState]:
    name = engine or next(iter(engine_names()), None)
    if name == "xtb":
        from .libxtb import LibxtbGroundState

        return LibxtbGroundState
    if name == "tblite":
        from .libtblite import TbliteGroundState

        return TbliteGroundState
    raise OutOfScope("neither xtb nor tblite is installed: pip install xtb (CPython < 3.12) or tblite")
