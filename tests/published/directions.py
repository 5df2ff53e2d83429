"""Axes of a molecule for checks of transition dipoles: inertia frame, twofold axes through named elements."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
from orchil_schemas import FloatArray, Geometry, Transitions
from rdkit.Chem import GetPeriodicTable

PI_TO_PI_STAR = 0.7  # n-pi* states have one half; triple bonds and slight twists take a little from pi-pi*
DARK_DEBYE, BRIGHT_STRENGTH, STRONG = 0.05, 0.01, 0.05


def inertia_axes(geometry: Geometry) -> FloatArray:
    """Rows: long (least inertia), short, and the normal of a flat molecule."""
    masses = np.array([GetPeriodicTable().GetAtomicWeight(int(z)) for z in geometry.atomic_numbers])
    centred = geometry.positions_angstrom - masses @ geometry.positions_angstrom / masses.sum()
    spread = np.einsum("a,ax,ay->xy", masses, centred, centred)
    return np.linalg.eigh(spread)[1].T[::-1]


def axis(geometry: Geometry, frame: str, name: str) -> FloatArray:
    """The unit vector that a row of ``transition_directions.csv`` means."""
    axes = inertia_axes(geometry)
    if frame == "inertia":
        return axes[("long", "short").index(name)]
    reference = _reference(geometry, frame)
    overlap = np.abs(axes @ reference)
    order = [int(i) for i in np.argsort(overlap)[::-1]]
    in_plane = [i for i in order if i != 2]
    return axes[in_plane[0 if name == "along" else 1]]


def angle_deg(vector: FloatArray, direction: FloatArray) -> float:
    """Angle between two axes, 0 to 90 degrees."""
    cosine = abs(vector @ direction) / (np.linalg.norm(vector) * np.linalg.norm(direction))
    return float(np.degrees(np.arccos(min(1.0, cosine))))


def find_state(transitions: Transitions, row: dict[str, Any], direction: FloatArray) -> int:
    """The state a row means, by energy, character and polarisation; never by its number alone."""
    inside = (transitions.energy_ev >= row["energy_low_ev"]) & (transitions.energy_ev <= row["energy_high_ev"])
    states = np.flatnonzero(inside & (transitions.pi_share >= PI_TO_PI_STAR))
    assert states.size, f"no pi-pi* state of {row['name']} within the window: {transitions.energy_ev}"
    if row["how_to_find"].startswith("strongest"):
        best = int(states[np.argmax(transitions.oscillator_strength[states])])
        strength = transitions.oscillator_strength[best]
        assert strength > STRONG, f"no strong state of {row['name']} among those kept; keep more states"
        return best
    if "bright" in row["how_to_find"]:
        states = states[transitions.oscillator_strength[states] >= BRIGHT_STRENGTH]
        assert states.size, f"no bright pi-pi* state of {row['name']} within the window"
    if not row["how_to_find"].endswith("along the axis"):
        return int(states[0])
    return next((int(s) for s in states if _mostly_along(transitions, s, direction)), int(states[0]))


def n_to_pi_star(transitions: Transitions) -> int:
    """The lowest state that leaves the molecular plane on one side only: half of it is in pi orbitals."""
    states = np.flatnonzero((transitions.pi_share > 0.2) & (transitions.pi_share < 0.8))
    assert states.size, f"no n-pi* state: pi shares {transitions.pi_share}"
    return int(states[0])


def _mostly_along(transitions: Transitions, state: int, direction: FloatArray) -> bool:
    dipole = transitions.transition_dipole_debye[state]
    return bool(np.linalg.norm(dipole) > DARK_DEBYE and angle_deg(dipole, direction) < 45)


def _reference(geometry: Geometry, frame: str) -> FloatArray:
    """From the centre of the heavy atoms, or of the second element, to the first; between ends for chains."""
    if frame == "nitrogen to nitrogen":
        ends = geometry.positions_angstrom[geometry.atomic_numbers == 7]
        return ends[1] - ends[0]
    symbols = re.findall(r"\b[A-Z][a-z]?\b", frame)
    heavy = geometry.positions_angstrom[geometry.atomic_numbers > 1].mean(axis=0)
    centres = [_centre(geometry, symbol) for symbol in symbols]
    return centres[0] - (centres[1] if len(centres) > 1 else heavy)


def _centre(geometry: Geometry, symbol: str) -> FloatArray:
    number = GetPeriodicTable().GetAtomicNumber(symbol)
    centre: FloatArray = geometry.positions_angstrom[geometry.atomic_numbers == number].mean(axis=0)
    return centre
