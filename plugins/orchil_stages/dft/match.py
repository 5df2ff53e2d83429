"""Which semi-empirical state a TD-DFT state is, and where the two disagree."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from orchil_schemas import FloatArray, IntArray, StateAnalysis, Transitions
from scipy.optimize import linear_sum_assignment

from orchil_stages.excite.bright import DARK_STRENGTH, first_bright
from orchil_stages.optics.units import EA0_DEBYE

from .compute import DftStates

LEAST_MATCH = 0.5
LARGE_SHIFT_EV = 0.5
LARGE_ANGLE_DEG = 20.0


@dataclass(frozen=True)
class Matches:
    """For each TD-DFT root: index of the semi-empirical state or -1, likeness 0 to 1, energy difference (eV) and angle
    between the transition dipoles (degrees), both 0 where they have no meaning.
    """

    state: IntArray
    likeness: FloatArray
    difference: FloatArray
    angle: FloatArray


def matched(dft: DftStates, transitions: Transitions, analysis: StateAnalysis) -> Matches:
    """One-to-one assignment with the largest sum of likeness (Hungarian method)."""
    like = likeness(dft, transitions, analysis)
    roots, states = linear_sum_assignment(-like)
    count = len(dft.energies)
    state, best = np.full(count, -1), np.zeros(count)
    state[roots] = np.where(like[roots, states] >= LEAST_MATCH, states, -1)
    best[roots] = like[roots, states]
    is_matched = state >= 0
    difference = np.where(is_matched, dft.energies - np.asarray(transitions.energy_ev)[state], 0.0)
    both = is_matched & (dft.strengths >= DARK_STRENGTH)
    both &= np.asarray(transitions.oscillator_strength)[state] >= DARK_STRENGTH
    cosine = np.abs(_cosines(dft, transitions)[np.arange(count), state])
    return Matches(state, best, difference, np.where(both, np.degrees(np.arccos(np.minimum(cosine, 1.0))), 0.0))


def likeness(dft: DftStates, transitions: Transitions, analysis: StateAnalysis) -> FloatArray:
    """How alike each pair is, (roots, states).

    Overlap of the holes by atom times overlap of the electrons (Bhattacharyya), times the agreement of their pi shares,
    times the cosine between the transition dipoles as far as both states are bright.
    """
    alike = _shared(dft.spread.hole, analysis.hole_by_atom) * _shared(dft.spread.electron, analysis.electron_by_atom)
    for one, other in ((dft.hole_pi, analysis.hole_pi_share), (dft.electron_pi, analysis.electron_pi_share)):
        alike = alike * (1.0 - np.minimum(np.abs(one[:, None] - other), 1.0))
    strengths = np.minimum(dft.strengths[:, None], transitions.oscillator_strength)
    bright = np.clip(strengths / DARK_STRENGTH, 0.0, 1.0)
    found: FloatArray = alike * (1.0 - bright * (1.0 - np.abs(_cosines(dft, transitions))))
    return found


def _shared(one: FloatArray, other: FloatArray) -> FloatArray:
    left, right = np.sqrt(np.clip(one, 0.0, None)), np.sqrt(np.clip(other, 0.0, None))
    shared: FloatArray = np.minimum(left @ right.T, 1.0)
    return shared


def _cosines(dft: DftStates, transitions: Transitions) -> FloatArray:
    cosines: FloatArray = _unit(dft.dipoles) @ _unit(transitions.transition_dipole_debye / EA0_DEBYE).T
    return cosines


def _unit(vectors: FloatArray) -> FloatArray:
    unit: FloatArray = vectors / np.maximum(np.linalg.norm(vectors, axis=1, keepdims=True), 1e-12)
    return unit


def remarks(dft: DftStates, found: Matches, transitions: Transitions) -> tuple[str, ...]:
    """Sentences about large disagreement, most important first."""
    lines = [*_order(dft, found, transitions), *_large(found)]
    if not all(dft.converged):
        lines.append(f"{dft.converged.count(False)} of {len(dft.converged)} roots did not converge")
    return tuple(lines)


def _order(dft: DftStates, found: Matches, transitions: Transitions) -> list[str]:
    root = first_bright(dft.energies, dft.strengths)
    state = first_bright(transitions.energy_ev, transitions.oscillator_strength)
    if found.state[root] in {state, -1}:
        return []
    return [f"the first bright state by TD-DFT (root {root + 1}) is semi-empirical state {found.state[root] + 1}"]


def _large(found: Matches) -> list[str]:
    lines = []
    pairs = zip(found.state, found.difference, found.angle, strict=True)
    for root, (state, difference, angle) in enumerate(pairs, 1):
        if state < 0:
            lines.append(f"root {root} has no counterpart among the semi-empirical states")
        elif abs(difference) > LARGE_SHIFT_EV:
            lines.append(f"root {root} lies {difference:+.2f} eV from semi-empirical state {state + 1}")
        if angle > LARGE_ANGLE_DEG:
            lines.append(f"the dipole of root {root} is turned by {angle:.0f} degrees")
    return lines
