"""The solvatochromism stage: slopes and shifts of given dipoles, the sphere, the effective change of dipole."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import Brief, Context, Inputs, Solvatochromism, Want
from orchil_stages.medium import lookup
from orchil_stages.optics import solvatochromism as optics
from orchil_stages.solvatochromism import Solvate, SolvatochromismSettings
from orchil_stages.solvatochromism.cavity import onsager_radius, volume
from orchil_stages.solvatochromism.dipoles import Effective, effective
from orchil_stages.training.dataset import Measurement
from orchil_stages.training.solvents import Dye, Slopes, fitted, measured_slopes, report

from tests.light_records import band, identity, orbitals, transitions

EXACT = 1e-10
HCA3 = 5034.117  # one debye^2 over one cubic angstrom in cm^-1, CODATA 2018


def run(ground=(0.0, 0.0, 4.0), change=(0.0, 0.0, 6.0), species=None, **settings) -> Solvatochromism:
    states = transitions([2.48], [1.0], dipole_change_debye=[change])
    inputs = Inputs([species or identity(), lookup("n-hexane"), orbitals(dipole_debye=ground), states, band()])
    (found,) = Solvate().run(inputs, SolvatochromismSettings(**settings), Context(Path(), 1))
    return found


# ---- formulas ----


def test_slopes_of_absorption_and_emission_differ_by_that_of_the_stokes_shift():
    """Lippert 1957, Mataga 1956: -2 mu_g.d, -2 mu_e.d, 2 d^2 over h c a^3."""
    ground, change = [1.0, -2.0, 4.0], [3.0, 1.0, 5.0]
    absorbing, emitting = (f(ground, change, 4.2) for f in (optics.absorption_slope, optics.emission_slope))
    stokes = optics.lippert_mataga_slope(np.sqrt(35.0), 4.2)
    assert absorbing - emitting == pytest.approx(float(stokes), rel=EXACT)
    assert absorbing == pytest.approx(-2 * 21 * HCA3 / 4.2**3, rel=1e-6)


def test_mcrae_without_orientation_is_the_refraction_term():
    """eps = n^2 leaves (mu_g^2 - mu_e^2)(n^2 - 1)/(2 n^2 + 1) (McRae 1957); the gas phase shifts nothing."""
    shift = optics.mcrae_shift([0, 0, 4.0], [0, 0, 6.0], 4.0, 1.5**2, 1.5)
    assert shift == pytest.approx((16 - 100) * HCA3 / 64 * 1.25 / 5.5, rel=1e-6)
    assert optics.mcrae_shift([0, 0, 4.0], [0, 0, 6.0], 4.0, 1.0, 1.0) == pytest.approx(0, abs=EXACT)


def test_mcrae_in_a_polar_medium_of_no_refraction():
    """n = 1 leaves C (eps - 1)/(eps + 2), C = -2 mu_g.d/(h c a^3)."""
    shift = optics.mcrae_shift([0, 0, 4.0], [0, 0, 6.0], 4.0, 37.5, 1.0)
    assert shift == pytest.approx(-48 * HCA3 / 64 * 36.5 / 39.5, rel=1e-6)


def test_betaine_is_the_yardstick_of_the_etn_slope():
    """Ravi and others: 11307.6 cm^-1 for a change of 9 D in a sphere of 6.2 angstrom."""
    assert optics.stokes_slope_etn(9.0, 6.2) == pytest.approx(11307.6, rel=EXACT)
    assert optics.stokes_slope_etn(18.0, 12.4) == pytest.approx(11307.6 / 2, rel=EXACT)


@pytest.mark.parametrize(
    ("dye", "sign"),
    [
        # ground and excited dipole along one axis, D. 4-Nitroaniline 6.2 and 14 (red shift), betaine-30 15 and 6 (blue
        # shift): Reichardt, Solvents and Solvent Effects in Organic Chemistry; from memory, high
        ((6.2, 14.0), -1),
        ((15.0, 6.0), 1),
    ],
)
def test_sign_of_published_dyes(dye, sign):
    ground, excited = dye
    found = run((0, 0, ground), (0, 0, excited - ground), radius_angstrom=5.0)
    assert np.sign(found.solvent_shift_cm1) == sign
    assert np.sign(found.absorption_slope_cm1) == sign
    assert np.sign(found.solvent_shift_nm) == -sign


# ---- sphere ----


@pytest.mark.parametrize(
    ("smiles", "published"),
    # Bondi, J. Phys. Chem. 68, 441 (1964): van der Waals volumes 48.4, 59.5, 74.0 cm^3/mol of benzene, toluene,
    # naphthalene and 21.7 of methanol (from memory, high)
    [("c1ccccc1", 48.4), ("Cc1ccccc1", 59.5), ("c1ccc2ccccc2c1", 74.0), ("CO", 21.7)],
)
def test_volume_against_bondi(smiles, published):
    assert volume(smiles) * 0.602214 == pytest.approx(published, rel=0.05)


def test_volume_against_a_grid():
    """RDKit's numerical volume of an embedded dye (coumarin 153)."""
    from rdkit import Chem
    from rdkit.Chem import AllChem, rdDistGeom

    smiles = "O=c1cc(C(F)(F)F)c2cc3c4c(c2o1)CCCN4CCC3"
    molecule = Chem.AddHs(Chem.MolFromSmiles(smiles))
    assert rdDistGeom.EmbedMolecule(molecule, randomSeed=3) == 0
    assert volume(smiles) == pytest.approx(AllChem.ComputeMolVolume(molecule, gridSpacing=0.2), rel=0.08)


def test_radius_of_the_sphere():
    """Four thirds pi r^3, and half an angstrom (common practice)."""
    assert onsager_radius(4 * np.pi / 3 * 64) == pytest.approx(4.5, rel=EXACT)
    assert run(radius_angstrom=4.0).radius_angstrom == 4.0
    assert run().radius_angstrom == pytest.approx(onsager_radius(volume("c1ccccc1")), rel=EXACT)


# ---- effective change ----


def test_effective_change_keeps_the_direction():
    numbers = Effective(constant=0.0, dipole=1.0, volume=0.0, absorption=1.0)
    change = numbers.change(np.array([0.0, 3.0, 4.0]), 300.0)
    assert change == pytest.approx(np.array([0, 0.6, 0.8]) * np.hypot(5, 1), rel=EXACT)
    assert numbers.change(np.zeros(3), 300.0).tolist() == [0, 0, 0]


def test_shipped_numbers_shrink_large_changes():
    """Unrelaxed densities exaggerate charge transfer: from 20 D on the effective change is smaller."""
    assert effective().length(20.0, 300.0) < 16
    assert 0 < effective().dipole < 1
    assert 0 < effective().absorption <= 1


def test_the_fit_finds_what_was_put_in():
    """Made-up dyes on an exact law come back with its numbers and no error."""
    law = Effective(constant=-2.0, dipole=0.5, volume=0.6, absorption=0.4)
    random = np.random.default_rng(1)
    dyes = []
    for _ in range(40):
        change, ground = random.normal(size=3) * 6, random.normal(size=3) * 5
        size = float(random.uniform(150, 500))
        radius = onsager_radius(size)
        shown = law.change(change, size)
        stokes = float(optics.lippert_mataga_slope(np.linalg.norm(shown), radius))
        absorbing = 0.4 * float(optics.absorption_slope(ground, shown, radius))
        dyes.append(Dye(Slopes("C", stokes, 1.0, absorbing), ground, change, size))
    found = fitted(dyes)
    assert vars(found) == pytest.approx(vars(law), abs=1e-4)
    assert "within a factor of two 100%" in report(dyes, found)


def test_measured_slopes_are_those_of_straight_lines():
    """Four aprotic media on a line of 5000 cm^-1 in Stokes shift and -2000 in absorption; ethanol is left out."""
    from orchil_stages.medium import orientation_polarisability

    def row(medium: str, off: float = 0.0) -> Measurement:
        place = orientation_polarisability(lookup(medium))
        absorbs = 24000 - 2000 * place
        emits = absorbs - 3000 - 5000 * place - off
        return Measurement("C", medium, 1e7 / absorbs, 1e7 / emits, None, None, None, None, "")

    media = ["n-hexane", "toluene", "tetrahydrofuran", "acetonitrile"]
    (found,) = measured_slopes([*(row(name) for name in media), row("ethanol", off=4000)])
    assert (found.stokes, found.absorption) == (pytest.approx(5000, rel=1e-9), pytest.approx(-2000, rel=1e-9))
    assert list(measured_slopes([row(name) for name in media[:3]])) == []


# ---- stage ----


def test_shift_between_two_media_is_the_difference_of_mcrae():
    found = run(from_medium="toluene", to_medium="film(eps=20, n=1.6)", radius_angstrom=4.0)
    change = effective().change(np.array([0, 0, 6.0]), volume("c1ccccc1"))
    media = [lookup("toluene"), lookup("film(eps=20, n=1.6)")]
    one, two = (optics.mcrae_shift([0, 0, 4.0], change, 4.0, m.dielectric_constant, m.refractive_index) for m in media)
    assert found.solvent_shift_cm1 == pytest.approx(effective().absorption * float(two - one), rel=1e-9)
    assert found.solvent_shift_nm == pytest.approx(1e7 / (1e7 / 500 + found.solvent_shift_cm1) - 500, rel=1e-6)
    assert (found.from_medium, found.to_medium) == ("toluene", "film(eps=20, n=1.6)")


def test_emission_slope_is_absorption_slope_less_stokes_slope():
    found = run()
    assert found.absorption_slope_cm1 - found.emission_slope_cm1 == pytest.approx(found.stokes_slope_cm1, rel=EXACT)


def test_cautions():
    assert run().cautions == ()
    assert any("origin" in text for text in run(species=identity(charge=1)).cautions)
    assert any("hydrogen bonds" in text for text in run(to_medium="water").cautions)


def test_an_unknown_medium_stops_the_brief():
    brief = Brief(
        title="t",
        want=(Want(quantity="solvent_shift_nm", at_least=20.0),),
        stage={"solvatochromism": {"to_medium": "watr"}},
    )
    (text,) = Solvate().check_brief(brief)
    assert text.startswith("[stage.solvatochromism] to_medium: unknown medium 'watr'")
    assert Solvate().check_brief(brief.model_copy(update={"stage": {}})) == []


def test_every_quantity_is_offered_with_its_unit():
    made = run().quantities()
    assert {(one.name, one.unit) for one in made} == {(info.name, info.unit) for info in Solvatochromism.offers}
