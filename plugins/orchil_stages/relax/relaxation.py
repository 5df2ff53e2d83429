"""Relax the conformers of one species, rescue what fails, and keep the lowest.

First try: each conformer in its medium. When the self-consistent field fails, the electronic temperature
is raised (300, 1000, 5000 K) and the record says so. On the second try (``attempt`` 2) a changed topology
is answered: a zwitterion in the gas phase is relaxed in water parameters instead, and distances that
changed are held by walls; the record says which.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from orchil_schemas import (
    BadResult,
    Conformers,
    FloatArray,
    Geometry,
    Identity,
    IntArray,
    NotConverged,
    StageError,
)

from orchil_stages.ground_state import BOHR_ANGSTROM, Evaluation, GroundState, check_result, open_ground_state

from .hold import Walls
from .internals import build_internals
from .model_hessian import force_constants
from .optimiser import EnergyAndGradient, Goal, Minimum, minimise
from .settings import RelaxSettings
from .topology import Change, check_topology, find_changes

KELVIN_LADDER = (300.0, 1000.0, 5000.0)
STAND_IN = "h2o"
HOLD_ROUNDS = 3


@dataclass(frozen=True)
class Species:
    """What is relaxed: elements, charge, bonds, solvation, and whether it holds separated charges."""

    numbers: IntArray
    charge: int
    bonds: IntArray
    solvation: str | None
    zwitterion: bool


def relax_lowest(
    conformers: Conformers,
    identity: Identity,
    solvation: str | None,
    settings: RelaxSettings,
    *,
    attempt: int = 1,
) -> Geometry:
    """The lowest relaxed conformer; the first failure is raised when none survives."""
    species = Species(conformers.atomic_numbers, identity.charge, conformers.bonds, solvation, identity.zwitterion)
    outcomes = [
        _outcome(species, positions / BOHR_ANGSTROM, settings, attempt) for positions in conformers.positions_angstrom
    ]
    relaxed = [outcome for outcome in outcomes if isinstance(outcome, Geometry)]
    if not relaxed:
        raise next(outcome for outcome in outcomes if isinstance(outcome, StageError))
    return min(relaxed, key=lambda geometry: geometry.energy_hartree)


def _outcome(species: Species, x: FloatArray, settings: RelaxSettings, attempt: int) -> Geometry | StageError:
    relax = relax_one if attempt == 1 else relax_harder
    try:
        return relax(species, x, settings)
    except StageError as error:
        return error


def relax_one(species: Species, x: FloatArray, settings: RelaxSettings, held: tuple[Change, ...] = ()) -> Geometry:
    """One structure (bohr) to its minimum, with walls on the ``held`` distances, checked but for topology."""
    geometry = _relax_unchecked(species, x, settings, held)
    check_topology(species.numbers, species.bonds, geometry.positions_angstrom)
    return geometry


def relax_harder(species: Species, x: FloatArray, settings: RelaxSettings) -> Geometry:
    """The second try: twice the gradients, water for a zwitterion in the gas phase, then walls."""
    patient = settings.model_copy(update={"max_gradients": 2 * settings.max_gradients})
    geometry = _relax_unchecked(species, x, patient)
    changes = _changes(species, geometry)
    if not changes:
        return geometry
    if species.solvation is not None or not species.zwitterion:
        return _relax_held(species, x, patient, changes)
    geometry = _relax_held(replace(species, solvation=STAND_IN), x, patient, ())
    return _noted(geometry, f"relaxed in {STAND_IN}: the drawn form does not hold in the gas phase")


def _relax_held(species: Species, x: FloatArray, settings: RelaxSettings, held: tuple[Change, ...]) -> Geometry:
    """Hold each distance that changes, for a few rounds; the last changes are raised."""
    for _ in range(HOLD_ROUNDS):
        geometry = _relax_unchecked(species, x, settings, held)
        changes = _changes(species, geometry)
        if not changes:
            return geometry
        held += changes
    return relax_one(species, x, settings, held)


def _changes(species: Species, geometry: Geometry) -> tuple[Change, ...]:
    return tuple(find_changes(species.numbers, species.bonds, geometry.positions_angstrom))


def _relax_unchecked(
    species: Species, x: FloatArray, settings: RelaxSettings, held: tuple[Change, ...] = ()
) -> Geometry:
    walls = Walls(held) if held else None
    minimum, state, kelvin = _climb(species, x, settings, walls.around if walls else lambda plain: plain)
    extra, slope = walls.energy_and_gradient(minimum.x) if walls else (0.0, np.zeros_like(minimum.x))
    _check_numbers(Evaluation(minimum.energy - extra, minimum.gradient - slope), state, species.charge)
    geometry = Geometry(
        atomic_numbers=species.numbers,
        positions_angstrom=minimum.x * BOHR_ANGSTROM,
        charge=species.charge,
        energy_hartree=minimum.energy - extra,
        gradient_norm=minimum.gradient_norm,
        gradients_used=minimum.gradients_used,
        solvation=species.solvation,
        engine=state.engine,
    )
    if kelvin != KELVIN_LADDER[0]:
        geometry = _noted(geometry, f"electronic temperature {kelvin:g} K")
    if extra > 0:
        geometry = _noted(geometry, "held as drawn: " + ", ".join(change.label for change in held))
    return geometry


def _noted(geometry: Geometry, note: str) -> Geometry:
    notes = "; ".join(part for part in (geometry.rescued, note) if part)
    return geometry.model_copy(update={"rescued": notes})


def _climb(
    species: Species,
    x: FloatArray,
    settings: RelaxSettings,
    wrap: Callable[[EnergyAndGradient], EnergyAndGradient],
) -> tuple[Minimum, GroundState, float]:
    """Minimise at ever higher electronic temperature until the self-consistent field holds."""
    internals = build_internals(x, species.bonds)
    model = force_constants(internals, species.numbers, species.bonds, x)
    goal = Goal(settings.gradient_norm, settings.energy_left_hartree, settings.max_gradients)
    for kelvin in KELVIN_LADDER:
        state = open_ground_state(
            species.numbers,
            species.charge,
            species.solvation,
            accuracy=settings.accuracy,
            temperature_kelvin=kelvin,
        )
        surface = Surface(state)
        try:
            return minimise(wrap(surface), x, internals, model, goal), state, kelvin
        except NotConverged:
            if not surface.failed or kelvin == KELVIN_LADDER[-1]:
                raise
    raise AssertionError("unreachable: the last rung returns or raises")


class Surface:
    """The energy surface of one ground state; remembers whether its self-consistent field failed."""

    def __init__(self, state: GroundState) -> None:
        self._state = state
        self.failed = False

    def __call__(self, x: FloatArray) -> tuple[float, FloatArray]:
        """Energy and gradient at ``x`` (bohr)."""
        try:
            found = self._state.evaluate(x)
        except NotConverged:
            self.failed = True
            raise
        return found.energy, found.gradient


def _check_numbers(evaluation: Evaluation, state: GroundState, charge: int) -> None:
    """Refuse impossible energies, charges and gaps (``BadResult``)."""
    orbitals = state.wavefunction()
    check_result(evaluation, orbitals.charges, charge)
    occupied = int(np.sum(orbitals.occupations > 1))
    if orbitals.energies[occupied] <= orbitals.energies[occupied - 1]:
        raise BadResult("GFN2-xTB left no gap between occupied and empty orbitals")
