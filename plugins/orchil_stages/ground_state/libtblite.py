"""GFN2-xTB through tblite."""

from __future__ import annotations

from importlib.metadata import version
from typing import Any

import numpy as np
from orchil_schemas import FloatArray, NotConverged
from tblite.interface import Calculator

from .order import libcint_order
from .types import KELVIN_HARTREE, Evaluation, Request, Wavefunction

_SOLVENT_NAMES = {"h2o": "water", "nhexane": "n-hexane"}


class TbliteGroundState:
    """Keeps one tblite calculator and its last results; see :class:`.types.GroundState`."""

    engine = f"tblite {version('tblite')}"

    def __init__(self, request: Request) -> None:
        self._request = request
        self._settings: dict[str, Any] = {
            "accuracy": request.accuracy,
            "max-iter": request.max_iterations,
            "temperature": request.temperature_kelvin * KELVIN_HARTREE,
            "verbosity": 0,
        }
        self._calculator: Any = None
        self._results: Any = None

    def evaluate(self, positions_bohr: FloatArray) -> Evaluation:
        """Energy and gradient; the calculator is made at the first call."""
        try:
            if self._calculator is None:
                self._calculator = self._open(positions_bohr)
            else:
                self._calculator.update(positions_bohr)
            self._results = self._calculator.singlepoint(self._results)
        except RuntimeError as error:
            self._results = None
            raise NotConverged(f"GFN2-xTB self-consistent field failed: {' '.join(str(error).split())}") from None
        return Evaluation(float(self._results.get("energy")), np.asarray(self._results.get("gradient")))

    def _open(self, positions_bohr: FloatArray) -> Any:
        calculator = Calculator("GFN2-xTB", self._request.numbers, positions_bohr, float(self._request.charge), 0)
        for name, value in self._settings.items():
            calculator.set(name, value)
        if self._request.solvation is not None:
            calculator.add("gbsa-solvation", _SOLVENT_NAMES.get(self._request.solvation, self._request.solvation))
        return calculator

    def wavefunction(self) -> Wavefunction:
        """Orbitals of the last evaluation, p and d functions brought to the order of libcint."""
        get = self._evaluated().get
        order, sign = libcint_order(self._request.numbers, "tblite")
        coefficients = np.asarray(get("orbital-coefficients"))
        return Wavefunction(
            energies=np.asarray(get("orbital-energies")),
            occupations=np.asarray(get("orbital-occupations")),
            coefficients=np.ascontiguousarray(coefficients[order] * sign[:, None]),
            charges=np.asarray(get("charges")),
            dipole=np.asarray(get("dipole")),
        )

    def _evaluated(self) -> Any:
        if self._results is None:
            raise RuntimeError("evaluate a geometry first")
        return self._results
