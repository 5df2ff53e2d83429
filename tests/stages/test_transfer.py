"""Energy transfer: the closed form of the overlap, the stage with its partners, pairs of a library."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from orchil_schemas import HC_EV_NM, Brief, Column, Context, Inputs, LibraryTable, OutOfScope, Want
from orchil_stages.optics import transfer, units
from orchil_stages.transfer import FindPartners, HandOver, PartnersSettings, TransferSettings
from pydantic import ValidationError

from tests.light_records import CYCLOHEXANE, band

BRIEF = Brief(title="pairs", want=(Want(quantity="absorption_max_nm", at_least=400.0),))


def run(made, **settings):
    (found,) = HandOver().run(Inputs([CYCLOHEXANE, made]), TransferSettings(**settings), Context(Path(), 1))
    return found


@pytest.mark.parametrize(
    ("donor", "donor_width", "acceptor", "acceptor_width"),
    [(2.3, 0.3, 2.3, 0.3), (2.5, 0.25, 2.1, 0.4), (1.6, 0.2, 1.9, 0.3), (3.0, 0.45, 2.4, 0.2)],
)
def test_closed_form_of_the_overlap(donor, donor_width, acceptor, acceptor_width):
    """The integral of IUPAC Gold Book FT07381 over sampled bands."""
    energy = np.linspace(0.7, 4.5, 20001)
    emission = np.exp(-4 * np.log(2) * ((energy - donor) / donor_width) ** 2)
    absorbing = np.exp(-4 * np.log(2) * ((energy - acceptor) / acceptor_width) ** 2)
    wavelength = (HC_EV_NM / energy)[::-1]
    per_nm = (emission * energy**2)[::-1]
    sampled = transfer.spectral_overlap(wavelength, per_nm, absorbing[::-1])
    closed = transfer.gaussian_overlap(donor, donor_width, acceptor, acceptor_width)
    assert closed == pytest.approx(float(sampled), rel=2e-3)


def test_migration_among_red_bodipys():
    """R0 of 67 +/- 1 angstrom between like molecules (doi 10.1016/j.saa.2005.09.035). A band of eps 1e5, half-width
    1000 cm^-1 and a Stokes shift of 250 cm^-1 near 590 nm, usual for such dyes (from memory), gives it within a tenth.
    """
    width = float(units.cm1_to_ev(1000))
    emission = 1e7 / (1e7 / 590 - 250)
    made = band(
        absorption_max_nm=590.0, absorption_low_nm=590.0, absorption_high_nm=590.0, molar_absorptivity=1e5,
        molar_absorptivity_low=1e5, molar_absorptivity_high=1e5, width_ev=width, emission_max_nm=emission,
        emission_low_nm=emission, emission_high_nm=emission,
    )  # fmt: skip
    assert run(made, refractive_index=1.4).foerster_radius_angstrom.value == pytest.approx(67, rel=0.1)


def test_given_acceptor_given_donor_and_itself():
    """One emission at 550 nm, one absorption at 500 nm, both known: three ways to name them, one radius."""
    itself = run(band())
    acceptor = run(band(), acceptor_max_nm=500.0, acceptor_absorptivity=50000.0)
    donor = run(band(), donor_max_nm=550.0)
    values = [found.foerster_radius_angstrom.value for found in (itself, acceptor, donor)]
    assert values == pytest.approx([values[0]] * 3, rel=1e-9)
    assert (itself.donor, itself.acceptor) == ("the dye", "the dye")
    assert (acceptor.donor, donor.donor) == ("the dye", "550 nm")
    overlap = itself.overlap_m_cm_nm4.value
    assert values[0] == pytest.approx(210.84e-3 * (2 / 3 / 1.4266**4 * overlap) ** (1 / 6), rel=1e-3)


def test_radius_follows_the_sixth_root():
    """Foerster 1948: half the yield is a factor 2^(-1/6), four times kappa^2 one of 4^(1/6)."""
    whole = run(band()).foerster_radius_angstrom.value
    assert run(band(), quantum_yield=0.5).foerster_radius_angstrom.value == pytest.approx(whole / 2 ** (1 / 6))
    assert run(band(), kappa2=4 * 0.6667).foerster_radius_angstrom.value == pytest.approx(whole * 4 ** (1 / 6))


def test_doubt_about_positions_widens_the_radius():
    made = band(absorption_low_nm=480.0, absorption_high_nm=520.0, emission_low_nm=530.0, emission_high_nm=575.0)
    spread = run(made).foerster_radius_angstrom
    assert spread.low < 0.95 * spread.value < 1.02 * spread.value < spread.high


def test_a_dye_without_emission_can_only_accept():
    with pytest.raises(OutOfScope, match="the donor"):
        run(band(emission_max_nm=None))
    assert run(band(emission_max_nm=None), donor_max_nm=480.0).foerster_radius_angstrom.value > 0


@pytest.mark.parametrize(
    ("wrong", "says"),
    [
        ({"acceptor_max_nm": 500.0}, "give both"),
        ({"acceptor_max_nm": 500.0, "acceptor_absorptivity": 1e4, "donor_max_nm": 500.0}, "not both"),
        ({"quantum_yield": 1.2}, "less than or equal to 1"),
    ],
)
def test_settings_are_checked(wrong, says):
    with pytest.raises(ValidationError, match=says):
        TransferSettings(**wrong)


# ---- pairs ----


def column(*values: float) -> Column:
    nothing = np.full(len(values), np.nan)
    return Column(np.array(values), nothing, nothing, nothing)


TABLE = LibraryTable(
    candidate=[11, 12, 13, 14],
    smiles=["C"] * 4,
    columns={
        "absorption_max_nm": column(400, 470, 700, np.nan),
        "molar_absorptivity": column(3e4, 5e4, 1e5, np.nan),
        "band_width_ev": column(0.35, 0.3, 0.25, np.nan),
        "emission_max_nm": column(460, np.nan, 760, np.nan),
    },
)


def test_best_acceptors_of_each_donor():
    """The blue emitter hands over to the dye at 470 nm first; a dye that does not emit has no partners."""
    found = dict(FindPartners().run(TABLE, BRIEF, PartnersSettings(partners=2)))
    assert set(found) == {11, 13}
    assert found[11].acceptor.tolist() == [12, 13]
    single = transfer.gaussian_overlap(HC_EV_NM / 460, 0.35, HC_EV_NM / 470, 0.3)
    radius = 10 * transfer.forster_radius_nm(5e4 * single, 1.0, 1.4, 0.6667)
    assert found[11].foerster_radius_angstrom[0] == pytest.approx(float(radius), abs=0.01)
    assert found[11].foerster_radius_angstrom[0] > found[11].foerster_radius_angstrom[1]


def test_pairs_are_made_on_request_only():
    """By default the stage reads nothing, so that no other stage becomes essential through it."""
    assert FindPartners().reads(BRIEF, PartnersSettings()) == ()
    assert list(FindPartners().run(TABLE, BRIEF, PartnersSettings())) == []
    assert "band_width_ev" in FindPartners().reads(BRIEF, PartnersSettings(partners=1))


def test_a_dye_never_is_its_own_partner():
    alone = LibraryTable([7], ["C"], {name: column(500 if "nm" in name else 1) for name in TABLE.columns})
    assert list(FindPartners().run(alone, BRIEF, PartnersSettings(partners=3))) == []


def test_a_narrow_donor_sees_the_acceptor_at_one_wavelength():
    """Exact: J is eps lambda^4 there."""
    narrow = transfer.gaussian_overlap(2.5, 1e-4, 2.5, 0.3)
    assert narrow == pytest.approx((HC_EV_NM / 2.5) ** 4, rel=1e-6)
