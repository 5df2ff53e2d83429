"""The redox stage: the line through known compounds, scales, excited-state potentials."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Context, Inputs, OutOfScope, Redox
from orchil_stages.medium import lookup
from orchil_stages.redox import EstimateRedox, RedoxSettings
from orchil_stages.redox.levels import compounds, features, line

from tests.light_records import band, identity, orbitals

ZERO_ZERO = HC_EV_NM * (1 / 500 + 1 / 550) / 2


def run(made=None, species=None, levels=None, medium="acetonitrile", **settings) -> Redox:
    inputs = Inputs([species or identity(), lookup(medium), levels or orbitals(), made or band()])
    (found,) = EstimateRedox().run(inputs, RedoxSettings(**settings), Context(Path(), 1))
    return found


def known(name: str) -> dict[str, str]:
    return next(row for row in compounds() if row["name"] == name)


def estimate(name: str) -> Redox:
    row = known(name)
    return run(
        species=identity(row["smiles"], int(row["charge"]), int(row["heavy_atoms"])),
        levels=orbitals(float(row["homo_ev"]), float(row["lumo_ev"])),
    )


@pytest.mark.parametrize("process", ["oxidation", "reduction"])
def test_compounds_left_out_are_met_within_a_quarter_of_a_volt(process):
    """Handbook potentials (see ``potentials.csv``): mean error below 0.15 V, the interval holds nine in ten."""
    off = np.abs(line(process).left_out)
    assert len(off) >= 35
    assert off.mean() < 0.15
    assert np.mean(off <= line(process).error) >= 0.9
    assert 0.15 < line(process).error < 0.5


def test_leaving_out_is_the_same_as_fitting_anew():
    """Exact for a linear fit: the residual over 1 - leverage is that of a fit without the compound."""
    rows = [row for row in compounds() if row["oxidation_v"]]
    x = np.array(
        [
            features(
                float(r["homo_ev"]), float(r["lumo_ev"]) - float(r["homo_ev"]), int(r["charge"]), int(r["heavy_atoms"])
            )
            for r in rows
        ]
    )
    y = np.array([float(r["oxidation_v"]) for r in rows])
    slope = np.linalg.lstsq(x[1:], y[1:], rcond=None)[0]
    assert y[0] - x[0] @ slope == pytest.approx(line("oxidation").left_out[0], abs=1e-9)


def test_a_deeper_level_is_harder_to_oxidise():
    """Koopmans: about one volt for an electronvolt, never the other way (Parker 1976)."""
    assert 0.5 < line("oxidation").slope[1] < 1.3
    assert 0.5 < line("reduction").slope[1] < 1.3


@pytest.mark.parametrize(
    ("name", "excited_oxidation", "excited_reduction", "zero_zero"),
    [
        # 9,10-dicyanoanthracene 2.88 eV: E(*/-) = +1.97 V against SCE (Handbook of Photochemistry; from memory, high)
        ("9,10-dicyanoanthracene", None, 1.97, 2.88),
        # perylene 2.85 eV: E(+/*) about -1.9 V (from memory, medium)
        ("perylene", -1.9, None, 2.85),
        # 4CzIPN 2.64 eV: E(*/-) +1.35 to +1.59, E(+/*) -0.96 to -1.04 (Chem. Sci. 2018, PMC6050529, table 1)
        ("4CzIPN", -1.0, 1.43, 2.64),
    ],
)
def test_excited_states_of_known_sensitisers(name, excited_oxidation, excited_reduction, zero_zero):
    """Within the stated interval, from computed levels and the measured 0-0 energy."""
    row = known(name)
    position = HC_EV_NM / zero_zero
    made = band(
        absorption_max_nm=position, absorption_low_nm=position, absorption_high_nm=position, emission_max_nm=position
    )
    found = run(
        made,
        identity(row["smiles"], int(row["charge"]), int(row["heavy_atoms"])),
        orbitals(float(row["homo_ev"]), float(row["lumo_ev"])),
    )
    for published, spread in (
        (excited_oxidation, found.excited_oxidation_potential_v),
        (excited_reduction, found.excited_reduction_potential_v),
    ):
        assert published is None or spread.low < published < spread.high


def test_excited_potentials_are_those_of_the_ground_state_moved_by_the_zero_zero_energy():
    """Rehm and Weller, Isr. J. Chem. 8, 259 (1970)."""
    found = estimate("anthracene")
    assert found.excited_oxidation_potential_v.value == pytest.approx(found.oxidation_potential_v.value - ZERO_ZERO)
    assert found.excited_reduction_potential_v.value == pytest.approx(found.reduction_potential_v.value + ZERO_ZERO)
    assert found.oxidation_potential_v.low < 1.16 < found.oxidation_potential_v.high


def test_scales_are_shifted():
    """Ferrocene +0.380 V against SCE in acetonitrile (Pavlishchuk, Addison 2000); SCE +0.241 V against NHE (CRC)."""
    sce, fc, nhe = (run(reference=name).oxidation_potential_v.value for name in ("SCE", "Fc", "NHE"))
    assert (fc - sce, nhe - sce) == (pytest.approx(-0.38), pytest.approx(0.241))


def test_doubt_about_the_band_widens_the_excited_potentials():
    sure, doubtful = run(), run(band(absorption_low_nm=450.0, absorption_high_nm=560.0))
    assert doubtful.oxidation_potential_v == sure.oxidation_potential_v
    width = [
        found.excited_oxidation_potential_v.high - found.excited_oxidation_potential_v.low for found in (sure, doubtful)
    ]
    assert width[1] > 1.2 * width[0]


def test_cautions_and_refusals():
    assert any("low permittivity" in text for text in run(species=identity(charge=1), medium="toluene").cautions)
    assert any("no compound of this charge" in text for text in run(species=identity(charge=-2)).cautions)
    assert len(run().cautions) == 1
    with pytest.raises(OutOfScope, match="no emission maximum"):
        run(band(emission_max_nm=None))


def test_every_quantity_is_offered_with_its_unit():
    made = run().quantities()
    assert {(one.name, one.unit) for one in made} == {(info.name, info.unit) for info in Redox.offers}
