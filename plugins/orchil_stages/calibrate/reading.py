"""All learned numbers of one band with their intervals; a plain estimate where another method made the states."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from orchil_schemas import Identity, Inputs, Medium, Orbitals, StateAnalysis, Transitions
from scipy.special import ndtri

from orchil_stages.excite.report import METHOD
from orchil_stages.optics.strength import absorptivity_max
from orchil_stages.optics.units import ev_to_cm1

from .correction import TARGETS
from .environments import environment_weights
from .features import band_features
from .files import trained_correction


@dataclass(frozen=True)
class Value:
    """A number with its central interval."""

    value: float
    low: float
    high: float


@dataclass(frozen=True)
class Reading:
    """Values by target, how familiar the dye is, and what to know about the numbers."""

    values: Mapping[str, Value]
    trust: str
    cautions: tuple[str, ...] = ()

    def __getitem__(self, target: str) -> Value:
        return self.values[target]


def read_band(inputs: Inputs, state: int, coverage: float) -> Reading:
    """The reading of one state; BadResult when structure and states do not belong together."""
    if inputs[Transitions].method != METHOD:
        return _plain(float(inputs[Transitions].oscillator_strength[state]), coverage)
    return _learned(inputs, state, coverage)


def _learned(inputs: Inputs, state: int, coverage: float) -> Reading:
    identity, transitions, analysis = inputs[Identity], inputs[Transitions], inputs[StateAnalysis]
    features = band_features(identity, inputs[Medium], inputs[Orbitals], transitions)
    weights = environment_weights(identity.smiles, analysis.hole_by_atom[state], analysis.electron_by_atom[state])
    correction = trained_correction()
    seen = correction.see(features[None, :], [weights])
    values = {}
    for target in TARGETS:
        value = float(correction.value(target, seen)[0])
        low, high = (float(edge[0]) for edge in correction.interval(target, seen, coverage))
        values[target] = Value(value, value + low, value + high)
    return Reading(values, correction.trust(seen)[0])


_ERROR_EV, _ERROR_LOG, _WIDTH_EV = 0.3, 0.3, 0.4
_LEAST_STRENGTH = 1e-4
_PLAIN = (
    "the states come from a method for which no correction was learned: the numbers are as computed, and their "
    "intervals are a guess"
)


def _plain(strength: float, coverage: float) -> Reading:
    """What the states say by themselves: no shift, a band of usual width, intervals as wide as computed states err."""
    half = float(ndtri((1.0 + coverage) / 2.0))
    height = float(np.log10(absorptivity_max(max(strength, _LEAST_STRENGTH), ev_to_cm1(_WIDTH_EV))))
    width = float(np.log10(_WIDTH_EV))
    values = {
        "position": Value(0.0, -half * _ERROR_EV, half * _ERROR_EV),
        "absorptivity": Value(height, height - half * _ERROR_LOG, height + half * _ERROR_LOG),
        "width": Value(width, width, width),
    }
    return Reading(values, "outside", (_PLAIN,))
