"""Fit of the effective change of dipole to measured solvent shifts.

The measured slopes are those of Stokes shift and absorption maximum against Lippert-Mataga's Delta f, for dyes with
both maxima in four or more media that donate no hydrogen bond and span a Delta f of 0.2.
"""

from __future__ import annotations

import argparse
import json
from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from orchil_schemas import Context, FloatArray, Geometry, Inputs, Orbitals, StageError, Transitions
from scipy.optimize import least_squares

import orchil_stages.solvatochromism
from orchil_stages.excite.bright import first_bright
from orchil_stages.excite.stage import Excite, ExciteSettings
from orchil_stages.medium import lookup, orientation_polarisability
from orchil_stages.optics.solvatochromism import absorption_slope, lippert_mataga_slope
from orchil_stages.solvatochromism.cavity import onsager_radius, volume
from orchil_stages.solvatochromism.dipoles import LEAST_DEBYE, Effective

from .dataset import Measurement, is_test, read_measured, scaffold
from .geometries import read_cache

LEAST_MEDIA, LEAST_SPAN = 4, 0.2
LEAST_SLOPE_CM1, LARGEST_ERROR = 300.0, 0.5
"""Slopes below, or with a larger share of standard error, tell no change of dipole."""


@dataclass(frozen=True)
class Slopes:
    """Measured slopes (cm^-1) of one dye with the standard error of the first."""

    smiles: str
    stokes: float
    error: float
    absorption: float


@dataclass(frozen=True)
class Dye:
    """Measured slopes beside what the stages compute for the dye."""

    slopes: Slopes
    ground: FloatArray
    change: FloatArray
    volume: float

    @property
    def measured_debye(self) -> float:
        """Change of dipole that the measured Stokes slope means in the sphere of the dye."""
        unit = float(lippert_mataga_slope(1.0, onsager_radius(self.volume)))
        return float(np.sqrt(self.slopes.stokes / unit))

    @property
    def tells(self) -> bool:
        """Is the measured Stokes slope known well enough?"""
        return self.slopes.stokes > LEAST_SLOPE_CM1 and self.slopes.error < LARGEST_ERROR * self.slopes.stokes


def measured_slopes(rows: Iterable[Measurement]) -> Iterator[Slopes]:
    """Slopes of every dye with enough media."""
    by_dye: dict[str, list[tuple[float, float, float]]] = defaultdict(list)
    for row in rows:
        medium = None if row.fault or not row.emission_nm or not row.absorption_nm else lookup(row.medium)
        if medium is not None and row.emission_nm and row.absorption_nm and not medium.hydrogen_bond_donor:
            place = orientation_polarisability(medium)
            by_dye[row.smiles].append((place, 1e7 / row.absorption_nm, 1e7 / row.emission_nm))
    for smiles, points in by_dye.items():
        polarity, absorbs, emits = np.array(points).T
        if len(points) >= LEAST_MEDIA and np.ptp(polarity) >= LEAST_SPAN:
            stokes, error = _line(polarity, absorbs - emits)
            yield Slopes(smiles, stokes, error, _line(polarity, absorbs)[0])


def _line(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    """Slope of a straight line and its standard error."""
    centred = x - x.mean()
    slope = float(centred @ y / (centred @ centred))
    rest = y - y.mean() - slope * centred
    return slope, float(np.sqrt(rest @ rest / max(len(x) - 2, 1) / (centred @ centred)))


def computed(slopes: Sequence[Slopes], cache: Path) -> Iterator[Dye]:
    """The neutral dyes among them whose geometry is in the cache and whose states come out."""
    wanted = {one.smiles: one for one in slopes}
    for done in read_cache(cache):
        if done.geometry is None or done.smiles not in wanted:
            continue
        geometry = Geometry.model_validate_json(done.geometry)
        inputs = Inputs([geometry, lookup(done.medium)])
        one = wanted.pop(done.smiles)
        try:
            made = Excite().run(inputs, ExciteSettings(states=6), Context(Path(), 1)) if not geometry.charge else ()
        except StageError:
            continue
        found = Inputs(made)
        if geometry.charge == 0:
            states = found[Transitions]
            bright = first_bright(states.energy_ev, states.oscillator_strength)
            change = states.dipole_change_debye[bright]
            yield Dye(one, found[Orbitals].dipole_debye, change, volume(done.smiles))


def fit(chosen: argparse.Namespace) -> None:
    """Fit on the training scaffolds, print the errors on the others, write ``solvatochromism/trained.json``."""
    slopes = list(measured_slopes(read_measured(chosen.data / "measured_dyes.csv")))[: chosen.limit]
    dyes = list(computed(slopes, chosen.cache))
    held = np.array([is_test(scaffold(dye.slopes.smiles)) for dye in dyes])
    made = fitted([dye for dye, out in zip(dyes, held, strict=True) if not out])
    print(report([dye for dye, out in zip(dyes, held, strict=True) if out], made))
    path = Path(orchil_stages.solvatochromism.__file__).with_name("trained.json")
    numbers = {name: round(value, 4) for name, value in vars(made).items()}
    path.write_text(json.dumps(numbers, indent=1) + "\n", encoding="utf-8")


def fitted(dyes: Sequence[Dye]) -> Effective:
    """Robust fit of the logarithm of the change of dipole, then of the share of the absorption slope."""
    sure = [dye for dye in dyes if dye.tells]
    lengths = np.array([float(np.linalg.norm(dye.change)) for dye in sure])
    terms = np.stack(
        [np.ones(len(sure)), np.log(np.hypot(lengths, LEAST_DEBYE)), np.log([dye.volume for dye in sure])], axis=1
    )
    target = np.log([dye.measured_debye for dye in sure])
    constant, dipole, size = _robust(terms / _USUAL, np.asarray(target) / _USUAL)
    whole = Effective(constant, dipole, size, absorption=1.0)
    theirs = np.array([dye.slopes.absorption for dye in dyes])
    ours = np.array([_absorption(dye, whole) for dye in dyes])
    (share,) = _robust(ours[:, None] / 1000, theirs / 1000)
    return Effective(constant, dipole, size, share)


_USUAL = 0.3
"""Usual error of the logarithm; far larger ones count less than their square."""


def _robust(terms: FloatArray, target: FloatArray) -> list[float]:
    """Coefficients of a linear fit with the soft L1 loss, residuals in units of their usual size."""

    def rest(numbers: FloatArray) -> FloatArray:
        return np.asarray(terms @ numbers - target)

    found: list[float] = least_squares(rest, np.zeros(terms.shape[1]), loss="soft_l1").x.tolist()
    return found


def _absorption(dye: Dye, numbers: Effective) -> float:
    change = numbers.change(dye.change, dye.volume)
    return numbers.absorption * float(absorption_slope(dye.ground, change, onsager_radius(dye.volume)))


def report(dyes: Sequence[Dye], numbers: Effective) -> str:
    """Errors on dyes, in one line for each slope."""
    sure = [dye for dye in dyes if dye.tells]
    ratio = np.array(
        [numbers.length(float(np.linalg.norm(dye.change)), dye.volume) / dye.measured_debye for dye in sure]
    )
    off = np.abs(2 * np.log(ratio))
    theirs, ours = np.array([(dye.slopes.absorption, _absorption(dye, numbers)) for dye in dyes]).T
    clear = np.abs(theirs) > 1000
    return (
        f"Stokes slope, {len(sure)} held-out dyes: median factor {np.exp(np.median(off)):.2f}, within a factor of two "
        f"{np.mean(off < np.log(2)):.0%}\nabsorption slope, {len(dyes)} held-out dyes: mean absolute error "
        f"{np.abs(ours - theirs).mean():.0f} cm^-1 (no shift at all: {np.abs(theirs).mean():.0f}), sign right for "
        f"{np.mean(np.sign(ours[clear]) == np.sign(theirs[clear])):.0%} of the {clear.sum()} above 1000 cm^-1"
    )
