"""A second excitation method for Orchil: Pariser-Parr-Pople pi electrons with single excitations.

Choose it in a brief with ``[use] Transitions = "ppp"``.
"""

from __future__ import annotations

from collections.abc import Iterable
from importlib.util import find_spec

import pluggy
from orchil_schemas import (
    Availability,
    Band,
    Brief,
    Check,
    CheckResult,
    Context,
    Frozen,
    Geometry,
    Identity,
    Inputs,
    Record,
    Transitions,
)
from pydantic import Field, field_validator

ORCHIL_API = "1.0"
hookimpl = pluggy.HookimplMarker("orchil")
INTEGRALS = ("mataga-nishimoto", "ohno")


class PppSettings(Frozen):
    """Which repulsion between atoms, and how many orbitals and states."""

    integrals: str = Field(default=INTEGRALS[0], description="repulsion of two atoms: mataga-nishimoto or ohno")
    states: int = Field(default=12, ge=1, le=50, description="singlet states kept")
    window: int = Field(default=16, ge=1, le=40, description="orbitals on either side of the gap")

    @field_validator("integrals")
    @classmethod
    def _known(cls, integrals: str) -> str:
        if integrals not in INTEGRALS:
            raise ValueError(f'integrals = "{integrals}" is not known: write {" or ".join(INTEGRALS)}')
        return integrals


class Ppp:
    """Singlet states and band of planar pi systems of C, N, O, S and halogens, in milliseconds."""

    name = "ppp"
    version = "1"
    needs: tuple[type[Record], ...] = (Identity, Geometry)
    makes: tuple[type[Record], ...] = (Transitions, Band)
    Settings: type[Frozen] = PppSettings
    time_limit_seconds = 60.0

    def found(self) -> Availability:
        """Needs RDKit to read species."""
        return Availability(find_spec("rdkit") is not None, hint="pip install rdkit")

    def check_brief(self, brief: Brief) -> list[str]:
        """States of this method with a calibration made for another would be wrong, and look right."""
        makers = {word.lower(): name for word, name in brief.use.items()}
        if makers.get("transitions") == self.name and makers.get("band", self.name) != self.name:
            return [f'use: transitions = "{self.name}" goes with band = "{self.name}": leave band out']
        return []

    def run(self, inputs: Inputs, settings: PppSettings, context: Context) -> Iterable[Record]:
        """Transitions and Band; OutOfScope for what is no closed-shell planar pi system of known atoms."""
        from .records import band_record, masses_of, transitions_record
        from .states import solve

        geometry = inputs[Geometry]
        states = solve(
            inputs[Identity].smiles,
            geometry.positions_angstrom,
            geometry.atomic_numbers,
            integrals=settings.integrals,
            states=settings.states,
            window=settings.window,
        )
        transitions = transitions_record(states, masses_of(geometry.atomic_numbers), geometry.positions_angstrom)
        return transitions, band_record(states, transitions)


def anthracene_absorbs_near_375_nm() -> CheckResult:
    """First bright band of anthracene; measured 375 nm in solution."""
    from .states import predict

    position = predict("c1ccc2cc3ccccc3cc2c1").absorption_max_nm
    return CheckResult(330 < position < 400, f"{position:.0f} nm")


@hookimpl
def orchil_stages() -> list[Ppp]:
    """The stage of this plugin."""
    return [Ppp()]


@hookimpl
def orchil_checks() -> list[Check]:
    """One published band."""
    return [Check("Pariser-Parr-Pople: first band of anthracene", anthracene_absorbs_near_375_nm)]
