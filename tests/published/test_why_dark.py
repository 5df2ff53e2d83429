"""Why states are dark, against the published cases of ``facts/dark_states.csv``: all from computed orbitals.

A state is found by its character and its representation, the reason is what is tested. Energies and labels: QUEST
database, doi 10.1021/acs.jctc.5c00975, and Knysh et al. 2024, doi 10.1021/acs.jctc.4c00906.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from orchil_schemas import StateAnalysis

from .facts import rows

Predict = Callable[[str, str], Any]

CASES = rows("dark_states")
MOLECULES = {row["smiles"]: row["name"] for row in CASES}
# groups that the published labels belong to. GFN2-xTB gives s-indacene bonds of equal length, so that it is D2h, where
# Ag of the C2h structure becomes B3g; and it turns the rings of azobenzene by 25 degrees (a quarter of a kcal/mol below
# the flat structure), which leaves the centre alone: Ci, where Bg becomes Ag (character and correlation tables: Cotton,
# Chemical Applications of Group Theory, from memory)
GROUPS = {
    "benzene": "D6h", "naphthalene": "D2h", "anthracene": "D2h", "pyrene": "D2h", "formaldehyde": "C2v",
    "acetone": "C2v", "thioformaldehyde": "C2v", "acetaldehyde": "Cs", "acrolein": "Cs", "glyoxal": "C2h",
    "1,4-benzoquinone": "D2h", "anthraquinone": "D2h", "1,4-naphthoquinone": "C2v", "trans-azobenzene": "Ci",
    "1,2,4,5-tetrazine": "D2h", "pyrazine": "D2h", "butadiene": "C2h", "hexatriene": "C2h", "octatetraene": "C2h",
    "cyclazine": "D3h", "heptazine": "D3h", "diketopyrrolopyrrole": "C2h", "nitrobenzene": "C2v",
    "4-nitroaniline": "C2v", "pentalene": "C2h", "s-indacene, C2h": "D2h",
}  # fmt: skip
OTHER_LABELS = {"s-indacene, C2h": "B3g", "trans-azobenzene": "Ag"}
PURE = 0.9


@pytest.mark.parametrize("smiles", MOLECULES, ids=MOLECULES.values())
def test_point_group_of_the_relaxed_structure(smiles: str, predict: Predict) -> None:
    found = predict(smiles, "gas phase").analysis
    assert found.point_group == GROUPS[MOLECULES[smiles]]
    assert found.symmetry_error_angstrom < found.symmetry_tolerance_angstrom
    assert (found.irrep_share[:6] > PURE).all()


@pytest.mark.parametrize("row", CASES, ids=lambda row: f"{row['name']} {row['state']}")
def test_reason_of_a_published_dark_state(row: dict[str, Any], predict: Predict) -> None:
    predicted = predict(row["smiles"], "gas phase")
    found = predicted.analysis
    state = cancelled(found) if row["reason"] == "cancelling" else named(found, row)
    assert found.reason[state] == row["reason"], found.explanation[state]
    assert found.explanation[state]
    strength = predicted.transitions.oscillator_strength[state]
    if row["reason"] == "forbidden":
        assert found.allowed_share[state] < 1 - PURE
        assert strength < 1e-3
    else:
        assert found.allowed_share[state] > PURE
    if row["reason"] == "cancelling":
        assert strength < 0.2 * found.pair_strength[state]
        assert found.negative_debye[state] < -0.4 * found.positive_debye[state]


def named(found: StateAnalysis, row: dict[str, Any]) -> int:
    """The lowest state of the character and representation of a row."""
    label = OTHER_LABELS.get(row["name"], row["state"].split()[-1].lstrip("1"))
    hole_in_pi = found.hole_pi_share > 0.6
    right = (hole_in_pi == (row["character"] == "pi-pi*")) & (found.electron_pi_share > 0.6)
    states = [state for state in np.flatnonzero(right) if found.irrep[state] == label]
    assert states, f"no {row['character']} state {label}: {found.irrep}"
    return int(states[0])


def cancelled(found: StateAnalysis) -> int:
    """Lb of an alternant hydrocarbon: the lowest pi-pi* state of HOMO-1 to LUMO and HOMO to LUMO+1 with opposite
    sign.
    """
    pi = (found.hole_pi_share > 0.9) & (found.electron_pi_share > 0.9)
    text = [state for state in np.flatnonzero(pi) if "HOMO-1 to LUMO " in found.explanation[state]]
    assert text, found.explanation
    assert "HOMO to LUMO+1 " in found.explanation[text[0]]
    return int(text[0])


@pytest.mark.parametrize(
    ("smiles", "bright"),
    [("c1ccc2ccccc2c1", 0.067), ("C=C/C=C/C=C", 1.115), ("O=C1c2ccccc2C(=O)c2ccccc21", 0.056), ("c1ccccc1", 1.216)],
    ids=["naphthalene La", "hexatriene Bu", "anthraquinone B2u", "benzene E1u"],
)
def test_bright_states_are_given_no_reason(smiles: str, bright: float, predict: Predict) -> None:
    """QUEST: these states have oscillator strengths between 0.056 and 1.2."""
    predicted = predict(smiles, "gas phase")
    strengths = predicted.transitions.oscillator_strength
    state = int(np.argmax(strengths > min(0.05, bright)))
    while predicted.analysis.reason[state] == "cancelling":
        state += 1
    assert strengths[state] > 0.05
    assert predicted.analysis.reason[state] == ""
