"""GFN2-xTB through xtb-python (libxtb)."""

from __future__ import annotations

from functools import cached_property
from importlib.metadata import version

import numpy as np
from orchil_schemas import FloatArray, NotConverged
from xtb.interface import Calculator, Param, Results, XTBException
from xtb.libxtb import VERBOSITY_MUTED
from xtb.utils import get_solvent

from .order import libcint_order
from .types import Evaluation, Request, Wavefunction


class LibxtbGroundState:
    """Keeps one libxtb calculator and its last results; see :class:`.types.GroundState`."""

    engine = f"xtb-python {version('xtb')}"

    def __init__(self, request: Request) -> None:
        self._request = request
        self._results: Results | None = None

    def evaluate(self, positions_bohr: FloatArray) -> Evaluation:
        """Energy and gradient; the calculator is made at the first call."""
        try:
            if "_calculator" in self.__dict__:
                self._calculator.update(positions_bohr)
            else:
                self._first_positions = positions_bohr
            self._results = self._calculator.singlepoint(self._results)
        except XTBException as error:
            self._results = None
            raise NotConverged(f"GFN2-xTB self-consistent field failed: {' '.join(str(error).split())}") from None
        return Evaluation(self._results.get_energy(), self._results.get_gradient())

    @cached_property
    def _calculator(self) -> Calculator:
        calculator = Calculator(Param.GFN2xTB, self._request.numbers, self._first_positions, self._request.charge, 0)
        calculator.set_verbosity(VERBOSITY_MUTED)
        calculator.set_accuracy(self._request.accuracy)
        calculator.set_max_iterations(self._request.max_iterations)
        calculator.set_electronic_temperature(round(self._request.temperature_kelvin))
        if self._request.solvation is not None:
            calculator.set_solvent(get_solvent(self._request.solvation))
        return calculator

    def wavefunction(self) -> Wavefunction:
        """Orbitals of the last evaluation, d functions brought to the order of libcint."""
        results = self._evaluated()
        order, sign = libcint_order(self._request.numbers, "libxtb")
        coefficients = np.asarray(results.get_orbital_coefficients())
        return Wavefunction(
            energies=results.get_orbital_eigenvalues(),
            occupations=results.get_orbital_occupations(),
            coefficients=np.ascontiguousarray(coefficients[order] * sign[:, None]),
            charges=results.get_charges(),
            dipole=results.get_dipole(),
        )

    def _evaluated(self) -> Results:
        if self._results is None:
            raise RuntimeError("evaluate a geometry first")
        return self._results
