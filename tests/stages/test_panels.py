"""What our stages lend to pages and questions: structures, SQL functions, SDF, panels."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from orchil_schemas import Band, Brief, Conformers, Geometry, Transitions, Want
from orchil_schemas.panel import Chart, Scene, Subject
from orchil_stages.panels import (
    SDF,
    ElectronPanel,
    PolarisedPanel,
    RdkitStructures,
    SpacePanel,
    SpectrumPanel,
    StatesPanel,
)
from orchil_stages.panels.polarised import from_long_axis, smooth
from orchil_stages.panels.spectrum import curves
from orchil_stages.panels.sql import count_substructure, has_substructure, scaffold, similarity
from rdkit import Chem

# Structures

NITROBENZENE, BENZENE, TOLUENE = "O=[N+]([O-])c1ccccc1", "c1ccccc1", "Cc1ccccc1"


@pytest.mark.parametrize(
    ("smiles", "smarts", "found", "times"),
    [
        (NITROBENZENE, "[N+](=O)[O-]", 1, 1),
        (BENZENE, "[N+](=O)[O-]", 0, 0),
        ("O=[N+]([O-])c1ccc([N+](=O)[O-])cc1", "[N+](=O)[O-]", 1, 2),
        (BENZENE, "c", 1, 6),
    ],
)
def test_substructures(smiles, smarts, found, times):
    assert has_substructure(smiles, smarts) == found
    assert count_substructure(smiles, smarts) == times


@pytest.mark.parametrize("smiles", [None, "", "not a molecule", 7])
def test_what_cannot_be_read_has_no_answer(smiles):
    assert has_substructure(smiles, "c") is None
    assert count_substructure(smiles, "c") is None
    assert similarity(smiles, BENZENE) is None
    assert scaffold(smiles) is None


@pytest.mark.parametrize("smarts", ["[[", "", "C("])
def test_a_bad_pattern_is_named(smarts):
    with pytest.raises(ValueError, match="is no SMARTS pattern"):
        has_substructure(BENZENE, smarts)


def test_a_bad_structure_to_compare_with_is_named():
    with pytest.raises(ValueError, match="is no SMILES"):
        similarity(BENZENE, "nonsense")


def test_similarity_is_one_for_another_drawing_of_the_same():
    assert similarity("OCC", "CCO") == 1.0
    assert 0 < similarity(BENZENE, TOLUENE) < 1
    assert similarity(BENZENE, TOLUENE) == similarity(TOLUENE, BENZENE)


# Bemis and Murcko, J. Med. Chem. 39, 2887 (1996): side chains go, rings and the linkers between them stay.
@pytest.mark.parametrize(
    ("smiles", "framework"),
    [(TOLUENE, BENZENE), ("Cc1ccc(CCc2ccccn2)cc1", "c1ccc(CCc2ccccn2)cc1"), ("CCCC", "")],
)
def test_scaffolds(smiles, framework):
    expected = Chem.CanonSmiles(framework) if framework else ""
    assert scaffold(smiles) == expected


def test_the_nearest_leave_out_the_structure_itself():
    found = RdkitStructures().nearest(TOLUENE, [BENZENE, TOLUENE, "CCCC", "Cc1ccccc1C", "nonsense"], 2)
    assert [one.at for one in found] == [3, 0]
    assert found[0].similarity > found[1].similarity


def test_a_drawing_shows_the_atoms_that_are_not_carbon():
    kit = RdkitStructures()
    drawn = kit.drawing("CN(C)c1ccccc1")
    assert drawn is not None
    assert drawn.svg.count("<path") > 8
    assert kit.drawing("nonsense") is None


# SDF


def test_sdf_reads_back_with_its_properties(tmp_path):
    rows = pd.DataFrame(
        {
            "candidate": ["a", "two\nlines", "bad"],
            "smiles": [NITROBENZENE, BENZENE, "nonsense"],
            "absorption_max_nm": [260.5, np.nan, 1.0],
            "note": ["ends\n\n$$$$\n> <x>", "", ""],
        }
    )
    path = tmp_path / "out.sdf"
    assert SDF.write(rows, path) == 1
    read = list(Chem.SDMolSupplier(str(path)))
    assert [Chem.MolToSmiles(one) for one in read] == [Chem.CanonSmiles(NITROBENZENE), BENZENE]
    assert [one.GetProp("_Name") for one in read] == ["a", "two lines"]
    assert read[0].GetDoubleProp("absorption_max_nm") == 260.5
    assert not read[1].HasProp("absorption_max_nm")
    assert read[0].GetNumConformers() == 1


def test_sdf_needs_structures(tmp_path):
    with pytest.raises(ValueError, match="needs a column named smiles"):
        SDF.write(pd.DataFrame({"candidate": ["a"]}), tmp_path / "out.sdf")


# Panels


def make_band(**changes):
    values = {
        "state": 0,
        "first_bright_state": 0,
        "strongest_state": 0,
        "coverage": 0.9,
        "absorption_max_nm": 500.0,
        "absorption_low_nm": 470.0,
        "absorption_high_nm": 540.0,
        "physics_absorption_max_nm": 495.0,
        "strongest_absorption_max_nm": 500.0,
        "molar_absorptivity": 40000.0,
        "molar_absorptivity_low": 20000.0,
        "molar_absorptivity_high": 70000.0,
        "width_ev": 0.35,
        "oscillator_strength": 0.9,
        "transition_dipole_debye": 10.0,
        "long_axis_angle_deg": 0.0,
        "electron_shift_angstrom": 2.0,
        "trust": "inside",
    }
    return Band(**(values | changes))


def make_transitions(dipole=(10.0, 0.0, 0.0)):
    two = np.ones(2)
    return Transitions(
        method="response",
        energy_ev=np.array([2.5, 4.0]),
        oscillator_strength=np.array([0.9, 0.1]),
        transition_dipole_debye=np.array([dipole, (0.0, 1.0, 0.0)]),
        long_axis_angle_deg=np.array([0.0, 90.0]),
        electron_shift_angstrom=np.array([2.0, 0.0]),
        shift_angstrom=np.array([(2.0, 0.0, 0.0), (0.0, 0.0, 0.0)]),
        charge_transfer_share=0.5 * two,
        overlap=0.6 * two,
        dipole_change_debye=np.zeros((2, 3)),
        leading_from=np.zeros(2),
        leading_to=np.zeros(2),
        leading_weight=0.9 * two,
        pi_share=0.95 * two,
    )


POSITIONS = np.array([(-2.4, 0.0, 0.0), (-1.2, 0.6, 0.0), (0.0, 0.0, 0.0), (1.2, 0.6, 0.0), (2.4, 0.0, 0.0)])
BONDS = np.array([(0, 1), (1, 2), (2, 3), (3, 4)])


def make_subject(*, transitions=None, band=None, wants=()):
    geometry = Geometry(
        atomic_numbers=[6, 6, 6, 6, 8],
        positions_angstrom=POSITIONS,
        charge=0,
        energy_hartree=-1.0,
        gradient_norm=0.0,
        gradients_used=1,
        solvation=None,
        engine="none",
    )
    conformers = Conformers(
        atomic_numbers=[6, 6, 6, 6, 8],
        bonds=BONDS,
        positions_angstrom=POSITIONS[None],
        method="none",
        force_field="none",
    )
    records = [geometry, conformers, transitions or make_transitions(), band or make_band()]
    want = wants or (Want(quantity="absorption_max_nm", between=(480, 520)),)
    return Subject("x", "CCCCO", "water", Brief(title="t", want=want), {type(one): one for one in records})


def parts_of(panel, subject, kind):
    return [part for part in panel.parts(subject) if isinstance(part, kind)]


def test_the_spectrum_peaks_where_the_band_does_and_inside_its_interval():
    band, nm = make_band(), np.linspace(400, 650, 251)
    middle, low, high = curves(band, make_transitions(), nm)
    assert nm[int(np.argmax(middle))] == pytest.approx(500, abs=1)
    assert middle.max() == pytest.approx(40000, rel=0.01)
    assert (low <= middle + 1e-6).all()
    assert (middle <= high + 1e-6).all()
    assert high[nm == 540] > 5 * middle[nm == 540] / 3  # a shifted band reaches there


def test_a_wanted_window_is_drawn_and_said():
    (chart,) = parts_of(SpectrumPanel(), make_subject(), Chart)
    assert "between 480 and 520 nm" in chart.alt
    bar = chart.spec["layer"][0]
    assert bar["data"]["values"] == [{"from": 480.0, "to": 520.0}]
    (open_side,) = parts_of(
        SpectrumPanel(), make_subject(wants=(Want(quantity="absorption_max_nm", at_least=480),)), Chart
    )
    assert "at least 480 nm" in open_side.alt
    (without,) = parts_of(SpectrumPanel(), make_subject(wants=(Want(quantity="heavy_atoms", at_most=5),)), Chart)
    assert len(without.spec["layer"]) == 2


def test_every_axis_has_a_title_with_a_unit():
    for panel in (SpectrumPanel(), PolarisedPanel(), StatesPanel()):
        (chart,) = parts_of(panel, make_subject(), Chart)
        titles = {
            axis["title"]
            for layer in chart.spec["layer"]
            for axis in layer["encoding"].values()
            if isinstance(axis, dict) and "title" in axis
        }
        assert len(titles) == 2, panel.name
        assert all(" / " in title for title in titles), titles


def test_light_along_the_dipole_is_absorbed_three_times_as_much_as_in_solution():
    """A fixed dipole absorbs in proportion to cos^2, whose mean over all directions is 1/3."""
    curve = from_long_axis(make_subject())
    assert curve[0] == pytest.approx(3, abs=0.01)  # the oxygen turns the long axis a little
    assert curve.min() == pytest.approx(0, abs=0.01)
    assert curve[-1] == pytest.approx(curve[0])
    across = from_long_axis(make_subject(transitions=make_transitions((0.0, 10.0, 0.0))))
    assert across[0] == pytest.approx(0, abs=0.01)


def test_a_polariser_curve_is_filled_in_exactly():
    coarse = np.arange(0.0, 181.0, 15.0)
    fine = smooth(coarse, 1.2 + 0.7 * np.cos(2 * np.radians(coarse - 20)))
    assert fine[7] == pytest.approx(1.2 + 0.7 * np.cos(2 * np.radians(21 - 20)))


def test_the_dipole_passes_through_the_molecule_and_has_no_sign():
    subject = make_subject()
    (scene,) = parts_of(SpacePanel(), subject, Scene)
    (arrow,) = scene.arrows
    assert arrow.both_ends
    assert arrow.start == pytest.approx(-arrow.end, abs=1e-6)
    assert np.linalg.norm(arrow.end) > np.abs(scene.positions_angstrom).max()
    # Turning moves atoms and arrow alike: distances between atoms stay.
    before = np.linalg.norm(POSITIONS[:, None] - POSITIONS[None], axis=-1)
    after = np.linalg.norm(scene.positions_angstrom[:, None] - scene.positions_angstrom[None], axis=-1)
    assert after == pytest.approx(before, abs=2e-3)
    assert scene.bonds.tolist() == BONDS.tolist()


def test_a_dark_state_has_no_arrow():
    (scene,) = parts_of(SpacePanel(), make_subject(transitions=make_transitions((0.0, 0.0, 0.0))), Scene)
    assert scene.arrows == ()


def test_the_electron_arrow_is_as_long_as_the_shift():
    (scene,) = parts_of(ElectronPanel(), make_subject(), Scene)
    (arrow,) = scene.arrows
    assert not arrow.both_ends
    assert np.linalg.norm(arrow.end - arrow.start) == pytest.approx(2.0)
