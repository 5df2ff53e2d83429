"""The analysis of the states and the triplets as records."""

from __future__ import annotations

import numpy as np
from orchil_schemas import FloatArray, Medium, Transitions
from orchil_schemas.states import StateAnalysis, Triplets

from orchil_stages.darkness.operations import TOLERANCE_ANGSTROM
from orchil_stages.darkness.reason import contributions, explanations, reasons, symmetry
from orchil_stages.excite.analysis import pi_share, populations
from orchil_stages.excite.bright import first_bright
from orchil_stages.excite.dipoles import dipole_change
from orchil_stages.excite.parameters import Parameters
from orchil_stages.excite.response import Prepared, States
from orchil_stages.excite.window import Window
from orchil_stages.optics.units import EA0_DEBYE

from .character import character, pi_populations
from .fragments import fragments
from .triplets import triplet_numbers, triplet_states

TRIPLET_METHOD = "singlet Hamiltonian without exchange repulsion, one-centre terms and constant fitted to triplets"
_DIGITS = 4
_COVERAGE = 0.9


def state_analysis(states: States, window: Window) -> StateAnalysis:
    """Symmetry, reason for weakness, and whereabouts of hole and electron for each state."""
    sym = symmetry(states, window)
    made = contributions(states, window)
    spread = populations(states, window)
    is_like = character(spread, pi_populations(states, window))
    names = reasons(states, sym, made)
    parts = fragments(window.numbers, window.positions)
    hole, electron = parts.summed(spread.hole), parts.summed(spread.electron)
    return StateAnalysis(
        point_group=sym.found.point_group,
        symmetry_operations=sym.group.order,
        symmetry_tolerance_angstrom=TOLERANCE_ANGSTROM,
        symmetry_error_angstrom=round(sym.group.miss, _DIGITS),
        reported_state=first_bright(states.energies, states.strengths),
        irrep=sym.labels,
        irrep_share=_rounded(sym.shares),
        hole_irrep=sym.hole,
        electron_irrep=sym.electron,
        allowed_share=_rounded(sym.allowed),
        reason=names,
        explanation=explanations(names, sym, made, is_like),
        pair_strength=_rounded(made.pair_strength),
        positive_debye=_rounded(made.positive * EA0_DEBYE),
        negative_debye=_rounded(made.negative * EA0_DEBYE),
        hole_electron_overlap=_rounded(is_like.overlap),
        hole_pi_share=_rounded(is_like.hole_pi),
        electron_pi_share=_rounded(is_like.electron_pi),
        charge_transfer_share=_rounded(spread.transferred),
        fragment_transfer_share=_rounded(0.5 * np.abs(electron - hole).sum(axis=1)),
        dipole_change_debye=_rounded(np.linalg.norm(dipole_change(states.amplitudes, window), axis=1) * EA0_DEBYE),
        hole_by_atom=_rounded(spread.hole),
        electron_by_atom=_rounded(spread.electron),
        fragment_of_atom=parts.of_atom,
        fragment_names=parts.names,
        hole_by_fragment=_rounded(hole),
        electron_by_fragment=_rounded(electron),
    )


def triplets_record(
    singlets: Transitions, prepared: Prepared, parameters: Parameters, medium: Medium, ground_dipole: FloatArray
) -> Triplets:
    """Lowest triplets, beside the singlets of the same window."""
    numbers = triplet_numbers()
    found = triplet_states(prepared, parameters, numbers, medium, ground_dipole)
    shares = pi_share(found, prepared.window)
    measured = float(numbers.measured(found.energies, shares)[0])
    gap = numbers.gap(float(singlets.energy_ev[0]), float(found.energies[0]), float(singlets.pi_share[0]))
    return Triplets(
        method=TRIPLET_METHOD,
        energy_ev=found.energies,
        pi_share=_rounded(shares),
        singlet_triplet_gap_ev=gap,
        triplet_ev=measured,
        triplet_low_ev=measured - numbers.half_width,
        triplet_high_ev=measured + numbers.half_width,
        coverage=_COVERAGE,
    )


def _rounded(values: FloatArray) -> FloatArray:
    """Few digits: these numbers fill the store, and none is good to more. Never minus zero."""
    few: FloatArray = np.round(values, _DIGITS) + 0.0
    return few
