"""Why each state is weak, with the numbers behind it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray

from orchil_stages.excite.bright import DARK_SHARE, REACH_EV
from orchil_stages.excite.response import States
from orchil_stages.excite.window import Window
from orchil_stages.optics.units import BOHR_ANGSTROM, EA0_DEBYE, HARTREE_EV

from .irreps import Irreps, irreps
from .operations import TOLERANCE_ANGSTROM, SymmetryGroup, symmetry_group
from .representation import orbital_matrices, state_shares, vector_shares

WEAK_STRENGTH = 0.02
"""A state below this oscillator strength, or below 5 % of the strongest within 2 eV of the first, is weak."""
FORBIDDEN_SHARE = 0.2
"""A weak state is forbidden when less than this of it belongs to representations that can absorb."""
CANCELLED = 0.2
"""Contributions cancel when the strength is below this share of what the orbital pairs give without interference..."""
LEAST_PAIR_STRENGTH = 0.02
"""... provided that this is no small number itself."""
LITTLE_PI, MUCH_PI = 0.4, 0.6
"""Pi shares of hole or electron below and above which it is said to lie in or across the plane."""


@dataclass(frozen=True)
class Contributions:
    """How a transition dipole is made up, along the axis on which its contributions are largest.

    pair_strength (n,): oscillator strength if the orbital pairs did not interfere, 2/3 E 2 sum v^2 |<i|r|a>|^2;
    positive, negative (n,): sums of the contributions of either sign in e bohr; parts (n, o, v): each contribution.
    """

    pair_strength: FloatArray
    positive: FloatArray
    negative: FloatArray
    parts: FloatArray


@dataclass(frozen=True)
class Symmetry:
    """What the operations of the molecule say of each state; labels and shares by state."""

    group: SymmetryGroup
    found: Irreps
    labels: tuple[str, ...]
    shares: FloatArray
    allowed: FloatArray
    hole: tuple[str, ...]
    electron: tuple[str, ...]


@dataclass(frozen=True)
class Character:
    """What tells an n-pi* and a charge-transfer state from others, by state: shares 0 to 1."""

    overlap: FloatArray
    hole_pi: FloatArray
    electron_pi: FloatArray
    transferred: FloatArray


def contributions(states: States, window: Window) -> Contributions:
    """Contributions sqrt(2) v_ia <i|r|a> of the orbital pairs to each transition dipole."""
    o = window.occupied
    moments = np.sqrt(2.0) * window.dipole[:, :o, o:]
    vectors = np.einsum("nia,xia->nxia", states.amplitudes, moments)
    squares = np.einsum("nxia,nyia->nxy", vectors, vectors, optimize=True)
    axes = np.linalg.eigh(squares)[1][:, :, -1]
    parts = np.einsum("nxia,nx->nia", vectors, axes)
    parts *= np.where(parts.sum(axis=(1, 2)) < 0, -1.0, 1.0)[:, None, None]
    return Contributions(
        pair_strength=2.0 / 3.0 * states.energies / HARTREE_EV * np.trace(squares, axis1=1, axis2=2),
        positive=np.clip(parts, 0.0, None).sum(axis=(1, 2)),
        negative=np.clip(parts, None, 0.0).sum(axis=(1, 2)),
        parts=parts,
    )


def symmetry(states: States, window: Window, tolerance: float = TOLERANCE_ANGSTROM) -> Symmetry:
    """Point group of the geometry within the tolerance (angstrom) and the representation of each state.

    Hole and electron are labelled by their leading natural transition orbitals.
    """
    positions = window.positions * BOHR_ANGSTROM
    group = symmetry_group(window.numbers, positions, tolerance)
    found = irreps(group, window.numbers, positions)
    matrices = orbital_matrices(group, window)
    shares = state_shares(states, matrices, found)
    left, _, right = np.linalg.svd(states.amplitudes)
    hole = vector_shares(left[:, :, 0], matrices[0], found)
    electron = vector_shares(right[:, 0, :], matrices[1], found)
    return Symmetry(
        group,
        found,
        _named(shares, found),
        shares.max(axis=1),
        shares @ found.allowed,
        _named(hole, found),
        _named(electron, found),
    )


def _named(shares: FloatArray, found: Irreps) -> tuple[str, ...]:
    return tuple(found.labels[place] for place in shares.argmax(axis=1))


def reasons(states: States, sym: Symmetry, made: Contributions) -> tuple[str, ...]:
    """By state: "forbidden", "cancelling", "overlap", or "" for a state that is not weak."""
    strengths = states.strengths
    near = states.energies <= states.energies[0] + REACH_EV
    limit = max(WEAK_STRENGTH, DARK_SHARE * float(strengths[near].max()))
    weak = strengths < limit
    forbidden = weak & (sym.allowed < FORBIDDEN_SHARE)
    cancelling = (made.pair_strength > LEAST_PAIR_STRENGTH) & (strengths < CANCELLED * made.pair_strength)
    names = np.select([forbidden, cancelling, weak], ["forbidden", "cancelling", "overlap"], "")
    return tuple(str(name) for name in names)


def explanations(names: Sequence[str], sym: Symmetry, made: Contributions, character: Character) -> tuple[str, ...]:
    """One sentence for each state that is weak, with its numbers; "" for the others."""
    tell = {"forbidden": _forbidden, "cancelling": _cancelling, "overlap": _overlap}
    return tuple(tell[name](state, sym, made, character) if name in tell else "" for state, name in enumerate(names))


def _forbidden(state: int, sym: Symmetry, made: Contributions, character: Character) -> str:
    may = [label for label, allowed in zip(sym.found.labels, sym.found.allowed, strict=True) if allowed]
    return (
        f"forbidden in {sym.found.point_group}: {sym.labels[state]} by {sym.shares[state]:.0%} "
        f"(hole {sym.hole[state]}, electron {sym.electron[state]}); only {', '.join(may)} absorb"
    )


def _cancelling(state: int, sym: Symmetry, made: Contributions, character: Character) -> str:
    part = made.parts[state]
    plus, minus = (np.unravel_index(place, part.shape) for place in (part.argmax(), part.argmin()))
    return (
        f"allowed as {sym.labels[state]}, but contributions cancel: {made.positive[state] * EA0_DEBYE:+.1f} and "
        f"{made.negative[state] * EA0_DEBYE:+.1f} debye, most of them {_pair(part, plus)} and {_pair(part, minus)}"
    )


def _pair(part: FloatArray, place: Sequence[IntArray]) -> str:
    i, a = int(place[0]), int(place[1])
    down = part.shape[0] - 1 - i
    value = part[i, a] * EA0_DEBYE
    return f"HOMO{f'-{down}' if down else ''} to LUMO{f'+{a}' if a else ''} {value:+.1f}"


def _overlap(state: int, sym: Symmetry, made: Contributions, character: Character) -> str:
    return (
        f"allowed as {sym.labels[state]}, but hole and electron hardly overlap ({character.overlap[state]:.2f}): "
        f"{_kind(state, character)}"
    )


def _kind(state: int, character: Character) -> str:
    hole, electron = character.hole_pi[state], character.electron_pi[state]
    if hole < LITTLE_PI and electron > MUCH_PI:
        return f"n or sigma to pi*, {1 - hole:.0%} of the hole and {1 - electron:.0%} of the electron in the plane"
    if electron < LITTLE_PI and hole > MUCH_PI:
        return f"pi to sigma*, {1 - electron:.0%} of the electron in the plane"
    if character.transferred[state] > 0.5:
        return f"charge transfer, {character.transferred[state]:.0%} of an electron changes its atom"
    return "the pair of orbitals has next to no transition dipole"
