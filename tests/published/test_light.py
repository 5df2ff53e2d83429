"""What the light stages predict from computed states, against published rates, slopes and directions.

The bars are those this project set itself. Sources stand in the files of facts, one per row or per file.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from orchil_schemas import Band, Context, Geometry, Identity, Inputs, Medium, Orbitals, Record, Stage, Transitions
from orchil_stages.emission import Emit
from orchil_stages.polarisation import Polarise
from orchil_stages.solvatochromism import Solvate

from .directions import axis, find_state
from .facts import rows

Predict = Callable[[str, str], Any]
PredictMany = Callable[[list[tuple[str, str]]], list[Any]]


def after(stage: Stage, prediction: Any, **settings: Any) -> Any:
    """The record of a light stage for a prediction."""
    names = {
        Identity: "identity", Medium: "medium", Geometry: "geometry", Orbitals: "orbitals",
        Transitions: "transitions", Band: "band",
    }  # fmt: skip
    records: list[Record] = [getattr(prediction, names[kind]) for kind in stage.needs]
    (made,) = stage.run(Inputs(records), stage.Settings(**settings), Context(Path(), 1))
    return made


def test_radiative_rates_of_standards(predict_many: PredictMany) -> None:
    """Yield over lifetime of ten standards: median factor below 1.5, none beyond its interval by far."""
    known = rows("radiative_rates")
    published = np.array([row["yield"] / row["lifetime_ns"] * 1e9 for row in known])
    found = [after(Emit(), one) for one in predict_many([(row["smiles"], row["medium"]) for row in known])]
    rates = np.array([one.radiative_rate_per_s.value for one in found])
    factor = np.exp(np.abs(np.log(rates / published)))
    told = dict(zip([row["name"] for row in known], np.round(rates / published, 2).tolist(), strict=True))
    assert np.median(factor) < 1.5, told
    inside = [
        one.radiative_rate_per_s.low < k < one.radiative_rate_per_s.high
        for one, k in zip(found, published, strict=True)
    ]
    assert sum(inside) >= 8, told


@pytest.mark.parametrize("row", rows("solvent_slopes"), ids=lambda row: row["name"])
def test_solvent_slopes_of_four_dyes(row: dict[str, Any], predict: Predict) -> None:
    """Right sign and within a factor of two: Stokes shift against Delta f; absorption to the red in a polar medium."""
    found = after(Solvate(), predict(row["smiles"], "n-hexane"), to_medium="dimethyl sulfoxide")
    assert 0.5 < found.stokes_slope_cm1 / row["stokes_slope_cm1"] < 2.0
    assert np.sign(found.solvent_shift_nm) == np.sign(row["dmso_nm"] - row["hexane_nm"])


def test_orientation_tells_the_directions_of_the_table(predict: Predict) -> None:
    """Rows fixed by symmetry: the angle the stage reports to that axis is below 1 degree."""
    exact = [row for row in rows("transition_directions") if row["tolerance_deg"] <= 1 and row["frame"] != "relative"]
    assert len(exact) >= 5
    for row in exact:
        found = predict(row["smiles"], "gas phase")
        direction = axis(found.geometry, row["frame"], row["axis"])
        made = after(Polarise(), found)
        place = int(np.argmax(np.abs(made.axes @ direction)))
        state = find_state(found.transitions, row, direction)
        assert made.transition_axes_deg[state, place] < 1.0, row["name"]


def test_perylene_emits_along_what_it_absorbs(predict: Predict) -> None:
    """r0 about 0.37 in a glass (from memory, medium), at most 2/5; the stretched film shows the long axis."""
    found = after(Polarise(), predict("c1cc2cccc3c4cccc5cccc(c(c1)c23)c45", "cyclohexane"))
    assert 0.35 < found.fundamental_anisotropy <= 0.4 + 1e-12
    assert found.dichroic_ratio > 1.5


def test_order_of_a_published_rod_from_its_shape(predict: Predict) -> None:
    """1,4-bis(phenylethynyl)benzene in stretched polyethylene, K = 0.95 (Nguyen et al., Chem. Phys. 2012)."""
    found = after(Polarise(), predict("C(#Cc1ccc(C#Cc2ccccc2)cc1)c1ccccc1", "gas phase"))
    assert found.axis_orientation_factors[0] == pytest.approx(0.95, abs=0.1)
    assert found.dichroic_ratio > 8


def test_anthracene_is_polarised_across_in_a_film(predict: Predict) -> None:
    """Its first band lies along the short axis (La): the dichroic ratio is below one."""
    found = after(Polarise(), predict("c1ccc2cc3ccccc3cc2c1", "cyclohexane"))
    assert found.dichroic_ratio < 1
