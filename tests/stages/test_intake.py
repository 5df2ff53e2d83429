"""Intake: what is read, what is refused and why, what is warned of."""

from __future__ import annotations

import pytest
from orchil_schemas import (
    BadInput,
    Brief,
    Context,
    Identity,
    Inputs,
    IntakeNotes,
    LibraryRow,
    Medium,
    OutOfScope,
    Stage,
)
from orchil_stages.intake import Intake
from orchil_stages.intake.azo import LISTED_AMINES
from rdkit import Chem
from rdkit.Chem import AllChem

RHODAMINE_101 = "C1CC2=CC3=C(C4=C2N(C1)CCC4)OC5=C6CCC[N+]7=C6C(=CC5=C3C8=CC=CC=C8C(=O)[O-])CCC7"  # drawn inner salt
BODIPY_493 = "CC1=CC(C)=[N+]2C1=C(C)c1c(C)cc(C)n1[B-]2(F)F"


@pytest.fixture
def take(tmp_path):
    stage = Intake()

    def run(structure, **row):
        settings = stage.Settings(**row.pop("settings", {}))
        made = list(stage.run(Inputs([LibraryRow(structure=structure, **row)]), settings, Context(tmp_path, 1)))
        assert [type(record) for record in made] == [Identity, IntakeNotes, Medium]
        return made

    return run


def test_is_a_stage():
    assert isinstance(Intake(), Stage)
    assert Intake().found().ok


# InChIKeys from memory (widely printed): ethanol, benzene, anthracene, caffeine.
@pytest.mark.parametrize(
    ("smiles", "key"),
    [
        ("CCO", "LFQSCWFLJHTTHZ-UHFFFAOYSA-N"),
        ("C1=CC=CC=C1", "UHOVQNZJYSORNB-UHFFFAOYSA-N"),
        ("c1ccc2cc3ccccc3cc2c1", "MWPLVEDNUUSJAV-UHFFFAOYSA-N"),
        ("Cn1cnc2c1c(=O)n(C)c(=O)n2C", "RYYVLZVUVIJVGH-UHFFFAOYSA-N"),
    ],
)
def test_names_by_inchikey(take, smiles, key):
    assert take(smiles)[0].inchikey == key


def test_numbers_of_methanol(take):
    identity = take("CO")[0]
    assert (identity.formula, identity.atoms, identity.heavy_atoms, identity.charge) == ("CH4O", 6, 2, 0)
    assert identity.molar_mass_g_mol == pytest.approx(32.042, abs=0.002)  # IUPAC 2021 abridged atomic weights


@pytest.mark.parametrize(
    "drawings",
    [
        ("C1=CC=CC=C1", "c1ccccc1", "[CH]1=[CH][CH]=[CH][CH]=[CH]1", "[cH:1]1ccccc1"),
        ("CS(=O)C", "C[S+]([O-])C"),
        ("CN(=O)=O", "C[N+](=O)[O-]"),
        ("c1ccccc1N=[N+]=[N-]", "c1ccccc1[N-][N+]#N"),
        ("C[P+](C)(C)[O-]", "CP(C)(C)=O"),
        ("[O-]c1ccccc1.[Na+]", "c1ccccc1O[Na]"),
        ("CC(=O)O.O", "OC(C)=O"),
        (BODIPY_493, "CC1=CC(C)=N2C1=C(C)c1c(C)cc(C)n1B2(F)F", "CC1=CC(C)=N2->B(F)(F)n3c(C)cc(C)c3C(C)=C12"),
    ],
)
def test_one_species_has_one_identity_however_drawn(take, drawings):
    identities = {take(drawing)[0] for drawing in drawings}
    assert len(identities) == 1


def test_a_molblock_and_its_smiles_are_one_species(take):
    molecule = Chem.MolFromSmiles("C/C=C/c1ccc(cc1)[C@@H](N)C")
    AllChem.Compute2DCoords(molecule)
    for force_v3000 in (False, True):
        block = Chem.MolToMolBlock(molecule, forceV3000=force_v3000)
        assert take(block, format="molblock")[0] == take("C/C=C/c1ccc(cc1)[C@@H](N)C")[0]


# Standard InChI merges these by its mobile-hydrogen layer; the fixed-H layer must tell them apart (InChI
# technical manual).
@pytest.mark.parametrize(
    ("one", "other"),
    [("O=c1cccc[nH]1", "Oc1ccccn1"), ("Oc1ccccc1-c1nc2ccccc2o1", "[O-]c1ccccc1-c1[nH+]c2ccccc2o1")],
)
def test_tautomers_are_kept_apart(take, one, other):
    first, second = take(one)[0], take(other)[0]
    assert first.inchikey == second.inchikey
    assert first.fixed_hydrogen_layer != second.fixed_hydrogen_layer
    assert first != second


def test_azo_and_hydrazone_forms_are_two_species(take):
    assert take("Oc1ccccc1N=Nc1ccccc1")[0] != take("O=C1C=CC=CC1=NNc1ccccc1")[0]


@pytest.mark.parametrize("smiles", ["C[NH3+]", "CC(=O)[O-]", "Cc1ccc(S(=O)(=O)[O-])cc1", "Oc1cccc[nH+]1"])
def test_no_proton_is_moved(take, smiles):
    assert take(smiles)[0].smiles == Chem.CanonSmiles(smiles)


@pytest.mark.parametrize(
    ("salt", "dye", "apart"),
    [
        # Methylene blue chloride; a sodium sulfonate; tetraphenylborate and BArF are larger than the dye.
        ("CN(C)c1ccc2nc3ccc(N(C)C)cc3[s+]c2c1.[Cl-]", "CN(C)c1ccc2nc3ccc(N(C)C)cc3[s+]c2c1", "[Cl-]"),
        ("[Na+].O=S(=O)([O-])c1ccc(/N=N/c2ccccc2)cc1", "O=S(=O)([O-])c1ccc(/N=N/c2ccccc2)cc1", "[Na+]"),
        (
            "c1ccc(cc1)[B-](c1ccccc1)(c1ccccc1)c1ccccc1.CN(C)C=CC=[N+](C)C=CC=O",
            "CN(C)C=CC=[N+](C)C=CC=O",
            "c1ccc([B-](c2ccccc2)(c2ccccc2)c2ccccc2)cc1",
        ),
        ("CCCCCCCCCCCCCCCCCCOS(=O)(=O)[O-].C[n+]1ccccc1", "C[n+]1ccccc1", None),
        ("C[n+]1ccccc1.[O-][Cl+3]([O-])([O-])[O-]", "C[n+]1ccccc1", "[O-][Cl+3]([O-])([O-])[O-]"),
    ],
)
def test_the_dye_is_the_most_conjugated_part(take, salt, dye, apart):
    identity, notes, _ = take(salt)
    assert identity.smiles == Chem.CanonSmiles(dye)
    assert len(notes.set_apart) == 1
    assert apart is None or notes.set_apart == (apart,)
    assert any(note.startswith("set apart") for note in notes.notes)


def test_two_equally_conjugated_parts_are_told(take):
    _, notes, _ = take("c1ccc2ccccc2c1.c1ccc2c(c1)CCCC2.c1ccc2ncccc2c1")
    assert any("also conjugated" in note for note in notes.notes)


def test_twice_the_same_cation_is_one_species(take):
    identity, notes, _ = take("C[n+]1ccccc1.C[n+]1ccccc1.[O-]S(=O)(=O)[O-]")
    assert identity.charge == 1
    assert len(notes.set_apart) == 2
    assert any("2 times" in note for note in notes.notes)


def test_zinc_chloride_double_salt_is_read_but_a_naked_zinc_is_not(take):
    assert take("C[n+]1ccccc1.Cl[Zn-2](Cl)(Cl)Cl.C[n+]1ccccc1")[0].charge == 1
    with pytest.raises(OutOfScope, match="Zn"):
        take("C[n+]1ccccc1.[Zn+2]")


@pytest.mark.parametrize(
    ("smiles", "zwitterion"),
    [
        ("C[N+](=O)[O-]", False),
        ("c1cc[n+]([O-])cc1", False),
        ("CN=[N+]=[N-]", False),
        (BODIPY_493, False),
        ("C[P+](C)(C)[CH-]C", False),
        ("C[n+]1ccccc1", False),
        ("O=C([O-])C[NH3+]", True),
        (RHODAMINE_101, True),
        ("[O-]c1ccc(C=Cc2cc[n+](C)cc2)cc1", True),
        ("C[n+]1ccc(cc1)[N+](=O)[O-]", False),
    ],
)
def test_zwitterions(take, smiles, zwitterion):
    assert take(smiles)[0].zwitterion is zwitterion


@pytest.mark.parametrize(
    ("structure", "said"),
    [
        ("", "empty"),
        ("  \n", "empty"),
        ("[H][H]", "hydrogen"),
        ("c1ccc", "unclosed ring"),
        ("not a molecule", "cannot be read"),
        ("CC(C)(C)(C)C", r"atom 2 \(C\).*valence"),
        ("CN(C)(C)C", r"atom 2 \(N\).*\[N\+\]"),
        ("c1cccc1", "alternating"),
    ],
)
def test_what_cannot_be_read_says_why(take, structure, said):
    with pytest.raises(BadInput, match=said):
        take(structure)


def test_a_reason_is_the_same_every_time(take):
    texts = set()
    for _ in range(2):
        with pytest.raises(BadInput) as caught:
            take("C1CC")
        texts.add(str(caught.value))
    assert len(texts) == 1
    assert "[" not in texts.pop().split("input")[0]


def test_a_broken_molblock_and_an_unknown_format(take):
    with pytest.raises(BadInput, match="cannot be read"):
        take("name\n\n\nnot a counts line\n", format="molblock")
    with pytest.raises(BadInput, match="molblock"):
        take("C", format="xyz")


@pytest.mark.parametrize(
    ("smiles", "said"),
    [
        ("CC1(C)CCCC(C)(C)N1[O]", "unpaired"),  # TEMPO
        ("[CH3]", "unpaired"),
        ("C[Sn](C)(C)C", "Sn"),
        ("[Mg+2].c1cc2cc3ccc([n-]3)cc3ccc(n3)cc3ccc(n3)cc1[n-]2", "complex"),
        ("*c1ccccc1", "placeholder"),
        ("[Ru+2].c1ccnc(c1)-c1ccccn1", "Ru"),
    ],
)
def test_out_of_scope_says_what_is_handled(take, smiles, said):
    with pytest.raises(OutOfScope, match=said):
        take(smiles)


def test_size_limit_says_how_to_raise_it(take):
    with pytest.raises(OutOfScope, match=r"300 heavy atoms.*120.*max_heavy_atoms"):
        take("C" * 300)
    assert take("C" * 300, settings={"max_heavy_atoms": 300})[0].heavy_atoms == 300


@pytest.mark.parametrize("smiles", ["c1cc[te]c1", "C[Ge](C)(C)C", "c1cc[se]c1", "CB(O)O", "C[Si](C)(C)C", "Ic1ccccc1"])
def test_main_group_elements_are_handled(take, smiles):
    assert take(smiles)[0].charge == 0


def test_charge_column(take):
    assert take("C[n+]1ccccc1.[I-]", charge=1)[0].charge == 1
    with pytest.raises(BadInput, match=r"\+0.*\+1"):
        take("C[n+]1ccccc1.[I-]", charge=0)


def test_isotopes_are_dropped_and_told(take):
    identity, notes, _ = take("[2H]c1ccccc1")
    assert identity == take("c1ccccc1")[0]
    assert any("isotope" in note for note in notes.notes)


def test_open_stereo_is_told(take):
    assert any("double bond" in note for note in take("CC=CC=NC")[1].notes)
    assert any("centre" in note for note in take("CC(O)c1ccccc1")[1].notes)
    assert take("C/C=C/C")[1].notes == ()


def test_medium_of_the_row_goes_before_the_setting(take):
    assert take("C")[2].name == "gas phase"
    assert take("C")[2].name == "gas phase"
    assert take("C", medium="EtOH")[2].name == "ethanol"
    with pytest.raises(BadInput, match="toluene"):
        take("C", medium="tolune")


def test_check_brief():
    want = [{"quantity": "absorption_max_nm", "at_least": 500}]
    assert Intake().check_brief(Brief(title="x", medium="toluene", want=want)) == []
    (problem,) = Intake().check_brief(Brief(title="x", medium="tolune", want=want))
    assert "toluene" in problem


# Group names as in Bretherick's Handbook of Reactive Chemical Hazards (common practice, from memory).
@pytest.mark.parametrize(
    ("smiles", "group"),
    [
        ("c1ccccc1N=[N+]=[N-]", "azide"),
        ("c1ccccc1C(=O)N=[N+]=[N-]", "acyl"),
        ("C[n+]1ccccc1.[N-]=[N+]=[N-]", "azide"),
        ("CCOC(=O)C=[N+]=[N-]", "diazo"),
        ("c1ccccc1[N+]#N", "diazonium"),
        ("CC(C)(C)OOC(C)(C)C", "peroxide"),
        ("C1OOCO1", "peroxide"),
        ("Cc1c([N+](=O)[O-])cc([N+](=O)[O-])cc1[N+](=O)[O-]", "polynitro"),
        ("C(CO[N+](=O)[O-])O[N+](=O)[O-]", "nitrate ester"),
        ("c1nnn[nH]1", "tetrazole"),
        ("C[n+]1ccccc1.[O-]Cl(=O)(=O)=O", "perchlorate"),
        ("C[n+]1ccccc1.[O-][Cl+3]([O-])([O-])[O-]", "perchlorate"),
        ("O=C1CCC(=O)N1Br", "N-halogen"),
        ("[C-]#[N+][O-].C[n+]1ccccc1", "fulminate"),
        ("C[N+](C)(C)C.[O-]c1c([N+](=O)[O-])cc([N+](=O)[O-])cc1[N+](=O)[O-]", "polynitro"),
    ],
)
def test_energetic_groups_are_cautioned(take, smiles, group):
    cautions = take(smiles)[1].cautions
    assert any(group in caution for caution in cautions)
    assert all("safety data sheet" in caution and "never a clearance" in caution for caution in cautions)


@pytest.mark.parametrize(
    "smiles",
    [
        "c1ccccc1",
        "CN(C)c1ccc(cc1)N=Nc1ccncc1",
        "O=[N+]([O-])c1ccccc1",
        "c1cnn[nH]1",
        "Clc1ccccc1",
        "CC(=O)OCC",
        BODIPY_493,
    ],
)
def test_plain_structures_carry_no_caution(take, smiles):
    assert take(smiles)[1].cautions == ()


# EU REACH Annex XVII entry 43, Appendix 8 (22 amines). Dyes known to give them (common practice, memory):
# Congo red (benzidine), Sudan IV (o-toluidine, o-aminoazotoluene), Disperse yellow 23 (4-aminoazobenzene).
@pytest.mark.parametrize(
    ("smiles", "amine"),
    [
        (
            "Nc1c(N=Nc2ccc(cc2)-c2ccc(cc2)N=Nc2cc(S(=O)(=O)[O-])c3ccccc3c2N)cc(S(=O)(=O)[O-])c2ccccc12.[Na+].[Na+]",
            "benzidine",
        ),
        ("Cc1ccccc1/N=N/c1ccc(/N=N/c2c(O)ccc3ccccc23)c(C)c1", "o-toluidine"),
        ("Cc1ccccc1/N=N/c1ccc(/N=N/c2c(O)ccc3ccccc23)c(C)c1", "o-aminoazotoluene"),
        ("Oc1ccc(N=Nc2ccc(N=Nc3ccccc3)cc2)cc1", "4-aminoazobenzene"),
        ("O=C1C=Cc2ccccc2C1=NNc1ccc(Cl)cc1", "4-chloroaniline"),
        ("COc1ccccc1N=Nc1c(O)ccc2ccccc12", "o-anisidine"),
        ("Nc1ccc(-c2ccc(N)cc2)cc1", "this is benzidine"),
    ],
)
def test_listed_amines_are_cautioned(take, smiles, amine):
    cautions = take(smiles)[1].cautions
    assert any(amine in caution and "entry 43" in caution for caution in cautions)


def test_unlisted_amines_are_not(take):
    assert take("Oc1ccc(/N=N/c2ccccc2)cc1")[1].cautions == ()
    assert take("CN(C)c1ccc(N=Nc2ccc(S(=O)(=O)[O-])cc2)cc1")[1].cautions == ()


def test_the_list_has_22_different_amines():
    keys = {Chem.MolToInchiKey(Chem.MolFromSmiles(smiles)) for smiles in LISTED_AMINES.values()}
    assert len(keys) == 22


# CAS formulas of some of them (from memory of the entry's table): benzidine C12H12N2, o-tolidine C14H16N2,
# o-dianisidine C14H16N2O2, MOCA C13H12Cl2N2, o-aminoazotoluene C14H15N3, 5-nitro-o-toluidine C7H8N2O2.
@pytest.mark.parametrize(
    ("name", "formula"),
    [
        ("benzidine", "C12H12N2"),
        ("3,3'-dimethylbenzidine", "C14H16N2"),
        ("3,3'-dimethoxybenzidine", "C14H16N2O2"),
        ("4,4'-methylenebis(2-chloroaniline)", "C13H12Cl2N2"),
        ("o-aminoazotoluene", "C14H15N3"),
        ("5-nitro-o-toluidine", "C7H8N2O2"),
        ("4-methoxy-m-phenylenediamine", "C7H10N2O"),
    ],
)
def test_formulas_of_listed_amines(take, name, formula):
    assert take(LISTED_AMINES[name])[0].formula == formula


def test_identity_is_stable_when_taken_again(take):
    for smiles in (
        RHODAMINE_101,
        BODIPY_493,
        "CN1/C(=C/C=C/C=C/C=C/C2=[N+](C)c3ccccc3C2(C)C)C(C)(C)c2ccccc12",
    ):
        identity = take(smiles)[0]
        assert take(identity.smiles)[0] == identity
