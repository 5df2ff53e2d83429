"""Records as rows of the tables people query."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np
from orchil_schemas import HC_EV_NM, Band, Score, Transitions

Row = dict[str, Any]

_STATES = ("state", "first_bright_state", "strongest_state")
_BAND_COLUMNS = tuple(name for name in Band.model_fields if name not in {*_STATES, "cautions"})
_SAME_NAME = (
    "energy_ev",
    "oscillator_strength",
    "long_axis_angle_deg",
    "electron_shift_angstrom",
    "charge_transfer_share",
    "overlap",
    "pi_share",
)


def joined(texts: Sequence[str]) -> str | None:
    """Several cautions in one cell; None for none."""
    return "; ".join(texts) or None


def band_row(owner: int, found: Band) -> Row:
    """A row of ``band``; states are counted from 1 there."""
    states = {name: getattr(found, name) + 1 for name in _STATES}
    values = {name: getattr(found, name) for name in _BAND_COLUMNS}
    return {"candidate_id": owner, **states, **values, "cautions": joined(found.cautions)}


def state_rows(owner: int, found: Transitions) -> list[Row]:
    """Rows of ``transition``, one per state, counted from 1."""
    columns = {name: getattr(found, name).tolist() for name in _SAME_NAME}
    columns["wavelength_nm"] = [HC_EV_NM / energy if energy > 0 else None for energy in columns["energy_ev"]]
    for axis, values in zip("xyz", found.transition_dipole_debye.T, strict=True):
        columns[f"dipole_{axis}_debye"] = values.tolist()
    columns["leading"] = list(_leading(found))
    columns["state"] = np.arange(1, len(found.energy_ev) + 1).tolist()
    return [
        {"candidate_id": owner, **dict(zip(columns, row, strict=True))} for row in zip(*columns.values(), strict=True)
    ]


def _leading(found: Transitions) -> Iterator[str]:
    pairs = zip(found.leading_from.tolist(), found.leading_to.tolist(), found.leading_weight.tolist(), strict=True)
    for below, above, weight in pairs:
        yield f"{_orbital('HOMO', -below)} -> {_orbital('LUMO', above)} ({weight:.2f})"


def _orbital(name: str, offset: int) -> str:
    return f"{name}{offset:+d}" if offset else name


def score_row(screen_id: int, owner: int, found: Score) -> Row:
    """A row of ``score``."""
    return {
        "screen_id": screen_id,
        "candidate_id": owner,
        "rank": found.rank,
        "score": found.score,
        "hit_probability": found.hit_probability,
        "pareto_front": found.pareto_front,
        "pick": found.pick,
    }


def want_rows(screen_id: int, owner: int, found: Score) -> Iterator[Row]:
    """Rows of ``want_result``; wants are counted from 1."""
    for position, want in enumerate(found.wants, start=1):
        yield {"screen_id": screen_id, "candidate_id": owner, "position": position, **vars(want)}
