"""Media: constants, polarity, names and stand-ins."""

from __future__ import annotations

import pytest
from orchil_schemas import BadInput
from orchil_stages.ground_state import SOLVATION_SETS
from orchil_stages.medium import (
    PARAMETER_SETS,
    known_media,
    known_smiles,
    lookup,
    orientation_polarisability,
    parameter_set_for,
)

# Dielectric constant, refractive index and Delta f from the Minnesota Solvent Descriptor Database (Delta f by
# the Lippert-Mataga formula); ET(30) from Reichardt, Chem. Rev. 94, 2319 (1994).
PUBLISHED = [
    ("water", 78.355, 1.3328, 0.3200, 63.1),
    ("methanol", 32.613, 1.3288, 0.3084, 55.4),
    ("ethanol", 24.852, 1.3611, 0.2892, 51.9),
    ("2-propanol", 19.264, 1.3776, 0.2748, 48.4),
    ("ethylene glycol", 40.245, 1.4318, 0.2757, 56.3),
    ("acetonitrile", 35.688, 1.3442, 0.3044, 45.6),
    ("DMSO", 46.826, 1.4783, 0.2634, 45.1),
    ("DMF", 37.219, 1.4305, 0.2747, 43.2),
    ("acetone", 20.493, 1.3588, 0.2839, 42.2),
    ("dichloromethane", 8.93, 1.4242, 0.2171, 40.7),
    ("chloroform", 4.7113, 1.4459, 0.1456, 39.1),
    ("THF", 7.4257, 1.4050, 0.2085, 37.4),
    ("ethyl acetate", 5.9867, 1.3723, 0.1991, 38.1),
    ("1,4-dioxane", 2.2099, 1.4224, 0.0205, 36.0),
    ("diethyl ether", 4.24, 1.3526, 0.1637, 34.5),
    ("chlorobenzene", 5.6968, 1.5241, 0.1447, 36.8),
    ("pyridine", 12.978, 1.5095, 0.2143, 40.5),
    ("formamide", 108.94, 1.4472, 0.2822, 55.8),
    ("toluene", 2.3741, 1.4961, 0.0129, 33.9),
    ("benzene", 2.2706, 1.5011, 0.0017, 34.3),
    ("cyclohexane", 2.0165, 1.4266, -0.0022, 30.9),
    ("hexane", 1.8819, 1.3749, -0.0011, 31.0),
]


@pytest.mark.parametrize(("name", "eps", "n", "delta_f", "et30"), PUBLISHED)
def test_published_constants(name, eps, n, delta_f, et30):
    medium = lookup(name)
    assert medium.dielectric_constant == pytest.approx(eps)
    assert medium.refractive_index == pytest.approx(n)
    assert orientation_polarisability(medium) == pytest.approx(delta_f, abs=1e-4)
    assert medium.et30_kcal_mol == pytest.approx(et30)


def test_constants_agree_with_an_independent_copy_of_the_descriptor_database():
    """PySCF carries the Minnesota Solvent Descriptor Database for its SMD model: columns n(293 K) ... eps."""
    table = pytest.importorskip("pyscf.solvent.smd").solvent_db
    other_names = {
        "tert-butanol": "2-methyl-2-propanol",
        "isobutanol": "2-methyl-1-propanol",
        "isooctane": "2,2,4-trimethylpentane",
        "dibutyl ether": "butylether",
        "ethyl acetate": "ethylethanoate",
        "1,2-dichlorobenzene": "o-dichlorobenzene",
        "dimethyl sulfoxide": "dimethylsulfoxide",
        "tetrahydrofuran": "tetrahydrofuran",
    }
    compared = 0
    for medium in known_media():
        row = table.get(other_names.get(medium.name, medium.name))
        if row is not None:
            compared += 1
            assert (medium.refractive_index, medium.dielectric_constant) == pytest.approx((row[0], row[5])), medium.name
            assert medium.hydrogen_bond_donor == (row[2] >= 0.3), medium.name
    assert compared >= 60


def test_table_is_large_and_its_names_and_smiles_are_unique():
    media = known_media()
    assert len(media) >= 45
    assert len({medium.name for medium in media}) == len(media)
    assert {medium.solvation for medium in media if not medium.solvation_stand_in} - {None} == set(SOLVATION_SETS)
    assert set(PARAMETER_SETS) == set(SOLVATION_SETS)


def test_every_smiles_of_the_table_is_a_molecule_and_finds_its_own_line():
    for smiles, medium in known_smiles().items():
        assert lookup(smiles) == medium


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("EtOH", "ethanol"),
        ("DCM", "dichloromethane"),
        ("methylene  chloride", "dichloromethane"),
        ("MeCN", "acetonitrile"),
        ("ACN", "acetonitrile"),
        ("n Hexane", "n-hexane"),
        ("HEXANE", "n-hexane"),
        ("1 4 dioxane", None),
        ("N,N\u2010dimethylformamide", "N,N-dimethylformamide"),
        ("C(Cl)Cl", "dichloromethane"),
        ("OCC", "ethanol"),
        ("[2H]OC", "methanol"),
        ("[2H]O[2H]", "heavy water"),
        ("vacuum", "gas phase"),
        ("none", "gas phase"),
    ],
)
def test_names_aliases_and_smiles(text, name):
    if name is None:
        with pytest.raises(BadInput, match="1,4-dioxane"):
            lookup(text)
    else:
        assert lookup(text).name == name


def test_gas_phase():
    gas = lookup("gas")
    assert (gas.dielectric_constant, gas.refractive_index, gas.solvation) == (1, 1, None)
    assert not gas.solvation_stand_in


@pytest.mark.parametrize(
    ("name", "stand_in"),
    [
        ("ethanol", "methanol"),
        ("1-butanol", "methanol"),
        ("ethylene glycol", "methanol"),
        ("cyclohexane", "nhexane"),
        ("heptane", "nhexane"),
        ("1,4-dioxane", "toluene"),
        ("dibutyl ether", "ether"),
        ("ethyl acetate", "thf"),
        ("chlorobenzene", "chcl3"),
        ("NMP", "acetonitrile"),
        ("heavy water", "h2o"),
    ],
)
def test_stand_ins_are_alike_and_say_so(name, stand_in):
    medium = lookup(name)
    assert (medium.solvation, medium.solvation_stand_in) == (stand_in, True)


def test_a_solvent_with_its_own_set_is_nearest_to_itself_by_the_rule():
    for name in set(PARAMETER_SETS) - {"benzene", "cs2"}:
        assert parameter_set_for(PARAMETER_SETS[name], name in {"h2o", "methanol"}) == name


@pytest.mark.parametrize("text", ["film(eps=3.0, n=1.6)", "Film( n=1.6 , eps=3 )", "host(eps=3,n=1.60)"])
def test_film_by_two_constants(text):
    film = lookup(text)
    assert (film.dielectric_constant, film.refractive_index) == (3.0, 1.6)
    assert film.name == "film(eps=3, n=1.6)"
    assert film.solvation is not None and film.solvation_stand_in


@pytest.mark.parametrize("text", ["film(3, 1.6)", "film(eps=-3, n=1.6)", "film(eps=3, n=0.5)", "film(eps=3)", "film()"])
def test_a_film_written_wrongly_says_how_it_is_written(text):
    with pytest.raises(BadInput, match=r"film\(eps=3.0, n=1.6\)"):
        lookup(text)


@pytest.mark.parametrize(
    ("text", "near"), [("tolune", "toluene"), ("etanol", "ethanol"), ("acetonitril", "acetonitrile")]
)
def test_unknown_names_the_nearest(text, near):
    with pytest.raises(BadInput, match=near):
        lookup(text)


@pytest.mark.parametrize("text", ["", "   ", "???", "CCCCCCCCCCCCCCCCCCCCCCCCO"])
def test_unknown_is_refused(text):
    with pytest.raises(BadInput):
        lookup(text)
