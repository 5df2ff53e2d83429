"""The worked plugins keep the contract, and do what they are for."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from orchil import briefs
from orchil.briefs import tomllib
from orchil.chain import resolve
from orchil.contract import Kit, declared, working
from orchil.errors import RequestError
from orchil_schemas import BadInput, Brief, OutOfScope, Want

WORKED = Path(__file__).parents[2] / "plugins" / "worked"
PLUGINS = {"ppp": "orchil_ppp", "cost": "orchil_cost", "fragments": "orchil_fragments"}
KITS: dict[str, Kit] = {}
CHECKS = (*declared.CHECKS, *working.CHECKS)


@pytest.mark.parametrize("stage", PLUGINS)
@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.__name__)
def test_contract(stage, check):
    if stage not in KITS:
        KITS[stage] = Kit(stage)
    assert KITS[stage].checks == CHECKS
    check(KITS[stage])


@pytest.mark.parametrize("stage", PLUGINS)
def test_each_is_a_package_of_its_own_that_documents_its_settings(stage, worked):
    project = tomllib.loads((WORKED / stage / "pyproject.toml").read_text())["project"]
    assert project["entry-points"]["orchil.stages"] == {stage: PLUGINS[stage]}
    readme = (WORKED / stage / "README.md").read_text()
    for name in worked.stages[stage].Settings.model_fields:
        assert f"\n| `{name}` |" in readme


@pytest.mark.parametrize("stage", PLUGINS)
def test_the_briefs_of_the_readmes_are_right(stage, worked, tmp_path):
    (text,) = re.findall(r"^```toml\n(.*?)^```$", (WORKED / stage / "README.md").read_text(), re.M | re.S)
    want = "" if "[[want]]" in text else '[[want]]\nquantity = "absorption_max_nm"\nat_least = 400\n'
    (tmp_path / "b.toml").write_text(f'title = "t"\n{want}{text}')
    steps = resolve(worked, briefs.load(tmp_path / "b.toml")).steps
    assert [step for step in steps if step.stage.name == stage and step.essential]


def brief(**more):
    return Brief(title="t", want=(Want(quantity="absorption_max_nm", at_least=400),), **more)


def test_another_method_waits_until_it_is_chosen_and_then_replaces_the_default(worked):
    default = {step.stage.name: step.gives for step in resolve(worked, brief()).steps}
    assert {"excite", "calibrate"} <= default.keys()
    assert "ppp" not in default
    chosen = {step.stage.name: step for step in resolve(worked, brief(use={"Transitions": "ppp"})).steps}
    assert "calibrate" not in chosen
    assert [kind.kind for kind in chosen["ppp"].gives] == ["transitions", "band"]
    assert chosen["ppp"].essential


def test_states_of_one_method_and_a_calibration_for_another_are_refused(worked):
    with pytest.raises(RequestError, match='transitions = "ppp" goes with band = "ppp"'):
        resolve(worked, brief(use={"transitions": "ppp", "band": "calibrate"}))


# Cost


def cheapest(smiles, prices, **rates):
    from orchil_cost.prices import prices_per_mol
    from orchil_cost.routes import Rates, cheapest

    text = "smiles,price_per_gram\n" + "".join(f"{name},{price}\n" for name, price in prices.items())
    return cheapest(smiles, prices_per_mol(text), Rates(rates.get("step_yield", 1.0), rates.get("step_cost", 0.0)))


def test_what_is_on_the_list_is_bought():
    """Biphenyl, C12H10, 154.21 g/mol: the price per gram comes back, in no step."""
    answer = cheapest("c1ccc(-c2ccccc2)cc1", {"c1ccc(-c2ccccc2)cc1": 2.0})
    assert answer.route.cost_per_mol / answer.molar_mass == pytest.approx(2.0)
    assert answer.molar_mass == pytest.approx(154.21, abs=0.01)
    assert (answer.route.steps, answer.route.bought) == (0, ("c1ccc(-c2ccccc2)cc1",))


def test_a_coupling_is_one_step_from_handles():
    """4-Phenylpyridine from bromobenzene (157.01 g/mol) and 4-pyridinylboronic acid (122.92 g/mol); yield one half."""
    list_ = {"Brc1ccccc1": 1.0, "OB(O)c1ccncc1": 10.0}
    answer = cheapest("c1ccc(-c2ccncc2)cc1", list_, step_yield=0.5, step_cost=30.0)
    assert answer.route.cost_per_mol == pytest.approx((157.01 + 1229.2 + 30.0) / 0.5, rel=1e-4)
    assert (answer.route.steps, answer.route.bought) == (1, ("c1ccccc1", "c1ccncc1"))


def test_the_cheaper_of_two_ways_is_taken():
    """An intermediate on the list is bought where that is cheaper than making it."""
    parts = {"c1ccccc1": 1.0, "c1ccncc1": 1.0}
    smiles = "c1ccc(-c2ccnc(-c3ccccc3)c2)cc1"
    made = cheapest(smiles, parts, step_yield=0.5)
    bought = cheapest(smiles, parts | {"c1ccc(-c2ccncc2)cc1": 1.0}, step_yield=0.5)
    assert made.route.steps == 2
    assert bought.route.steps == 1
    assert bought.route.cost_per_mol < made.route.cost_per_mol
    dear = cheapest(smiles, parts | {"c1ccc(-c2ccncc2)cc1": 99.0}, step_yield=0.5)
    assert dear.route == made.route


def test_what_is_missing_is_named_and_no_cost_is_invented():
    answer = cheapest("c1ccc(-c2ccncc2)cc1", {"c1ccccc1": 1.0})
    assert (answer.route, answer.missing) == (None, ("c1ccncc1",))


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("smiles;price\n", "needs the columns smiles and price_per_gram"),
        ("smiles,price_per_gram\nC,1\nCC,dear\n", 'line 3 of the price list: "dear" is no price'),
        ("smiles,price_per_gram\nC,-1\n", "line 2"),
        ("smiles,price_per_gram\nC(,1\n", "cannot be read as SMILES"),
    ],
)
def test_a_price_list_with_a_fault_is_refused(text, sentence):
    from orchil_cost.prices import prices_per_mol

    with pytest.raises(BadInput, match=sentence):
        prices_per_mol(text)


def test_a_changed_list_is_other_work(worked, tmp_path):
    """The file enters the settings by its content; a brief that names no file that is there is refused."""
    path = tmp_path / "prices.csv"
    names = []
    for price in (1, 2):
        path.write_text(f"smiles,price_per_gram\nc1ccccc1,{price}\n")
        stage = {"cost": {"price_list": str(path)}}
        (step,) = [step for step in resolve(worked, brief(stage=stage)).steps if step.stage.name == "cost"]
        names.append(step.settings_json)
    assert names[0] != names[1]
    with pytest.raises(RequestError, match="there is no file"):
        resolve(worked, brief(stage={"cost": {"price_list": "nowhere.csv"}}))
    path.write_text("changed")
    with pytest.raises(BadInput, match="has changed since"):
        step.settings.price_list.read_text()


# Fragments


@pytest.mark.parametrize(
    ("smiles", "rings"),
    [
        ("Cn1cccc1", ("c1cc[nH]c1",)),
        ("O=c1cc(C)c2ccc(N(CC)CC)cc2o1", ("O=c1ccc2ccccc2o1",)),
        ("c1ccc(N(c2ccccc2)c2ccc(-c3ccsc3)cc2)cc1", ("c1ccccc1", "c1ccsc1")),
        ("C[n+]1ccccc1", ("c1cc[nH+]cc1",)),
        ("CCO", ()),
    ],
)
def test_ring_systems_are_molecules_of_their_own(smiles, rings):
    from orchil_fragments.rule import ring_systems

    assert ring_systems(smiles) == rings


def test_the_example_list_can_be_read_and_knows_common_dyes():
    from orchil_fragments.rule import common_rings, listed, ring_systems

    known = listed(common_rings())
    assert len(known) == sum(not line.startswith("#") for line in common_rings().splitlines())
    assert set(ring_systems("CN(C)c1ccc(/N=N/c2nc3ccccc3s2)cc1")) <= known
    assert not set(ring_systems("c1ccc2c(c1)ccc1c2ccc2ccc3ccccc3c21")) & known


def test_a_strict_rule_refuses_with_the_name_of_the_ring(worked, tmp_path):
    path = tmp_path / "bought.smi"
    path.write_text("c1ccsc1 thiophene\n")
    kit = Kit("fragments", {"bought": str(path), "refuse": True})
    replies = {name: run.reply for name, run in kit.runs.items()}
    assert replies["hexane, no dye"].ok
    assert replies["5-bromo-2,2'-bithiophene"].ok
    assert (replies["azobenzene"].code, replies["azobenzene"].message) == (
        OutOfScope.code,
        "not on the list of what can be bought: c1ccccc1",
    )
