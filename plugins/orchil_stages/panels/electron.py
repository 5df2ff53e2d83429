"""Panel: where the electron moves when the dye absorbs."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import Band, Conformers, FloatArray, Geometry, Record, Transitions
from orchil_schemas.panel import Arrow, Fact, Facts, Part, Subject, Words
from orchil_schemas.states import StateAnalysis

from .space import scene

_SEEN = 0.15
"""Shorter shifts (angstrom) are not drawn."""


class ElectronPanel:
    """The shift from hole to electron, drawn and in numbers."""

    name = "electron"
    title = "Where the electron moves"
    place = 50
    needs: tuple[type[Record], ...] = (Band, Transitions)

    def parts(self, subject: Subject) -> Iterable[Part]:
        """A sentence, a scene where there is a shift to draw, the numbers."""
        found, state = subject[Transitions], subject[Band].state
        yield Words(text=(in_words(found, state),))
        gain = _gain(subject.get(StateAnalysis), state)
        if {Geometry, Conformers} <= subject.records.keys() and (
            gain is not None or found.electron_shift_angstrom[state] >= _SEEN
        ):
            yield _scene(subject, found, state, gain)
        yield Facts(facts=_facts(found, state))


def in_words(found: Transitions, state: int) -> str:
    """One sentence on the kind of transition."""
    share, shift = float(found.charge_transfer_share[state]), float(found.electron_shift_angstrom[state])
    lower, upper = _orbital("HOMO", "-", found.leading_from[state]), _orbital("LUMO", "+", found.leading_to[state])
    lead = f"Mostly {lower} to {upper} ({100 * float(found.leading_weight[state]):.0f} %)"
    if shift >= 1.0:
        return f"{lead}: the electron moves {shift:.1f} angstrom across the molecule."
    if share >= 0.4:
        return f"{lead}: charge moves between atoms, but to both sides alike, so its centre stays within 1 angstrom."
    return f"{lead}: the electron stays about where it was."


def _orbital(name: str, sign: str, away: int) -> str:
    return f"{name}{sign}{away}" if away else name


def _gain(analysis: StateAnalysis | None, state: int) -> FloatArray | None:
    """Electron minus hole by atom, the largest set to one, None where it was not computed."""
    if analysis is None:
        return None
    change = analysis.electron_by_atom[state] - analysis.hole_by_atom[state]
    return np.asarray(change / max(float(np.abs(change).max()), 0.02))


def _scene(subject: Subject, found: Transitions, state: int, gain: FloatArray | None) -> Part:
    shift = found.shift_angstrom[state]
    middle = subject[Geometry].positions_angstrom.mean(axis=0)
    length = float(np.linalg.norm(shift))
    arrow = Arrow(label="electron", start=middle - shift / 2, end=middle + shift / 2)
    said = " Blue atoms lose electron density, orange ones gain it." if gain is not None else ""
    drawn = scene(
        subject,
        (arrow,) if length >= _SEEN else (),
        alt=f"The structure with an arrow of {length:.1f} angstrom from the hole to the electron.",
        caption=(
            f"Arrow: from the centre of the hole to that of the electron, {length:.1f} angstrom, true to scale; "
            f"it is drawn through the middle of the molecule.{said}"
        ),
    )
    return drawn.model_copy(update={"shade": gain, "shade_low": "loses", "shade_high": "gains"})


def _facts(found: Transitions, state: int) -> tuple[Fact, ...]:
    change = float(np.linalg.norm(found.dipole_change_debye[state]))
    return (
        Fact(label="hole to electron", value=float(found.electron_shift_angstrom[state]), unit="angstrom"),
        Fact(
            label="charge-transfer share",
            value=float(found.charge_transfer_share[state]),
            meaning="share of an electron that changes its atom",
        ),
        Fact(label="overlap of hole and electron", value=float(found.overlap[state]), meaning="0 to 1"),
        Fact(label="change of the dipole moment", value=change, unit="debye"),
        Fact(label="pi share", value=float(found.pi_share[state]), meaning="1 for a pi-pi* transition"),
    )
