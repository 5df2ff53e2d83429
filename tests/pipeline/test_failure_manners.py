"""Every way in which a plugin can be wrong: one clear line with the distribution and the remedy, the rest works.

Distributions are made as installers leave them (a module and a ``dist-info`` folder on the path), so that the
plugin comes in through its entry point.
"""

from __future__ import annotations

import sys
from importlib.metadata import version

import pytest
from orchil import briefs
from orchil.chain import resolve
from orchil.registry import Registry
from orchil_schemas.api import API_VERSION

HEAD = """
import pluggy
from orchil_schemas import Availability, Frozen, Identity, LibraryRow, NoSettings, Quantity, QuantityInfo, Record

hookimpl = pluggy.HookimplMarker("orchil")


class Weight(Record):
    kind = "weight"
    value: float = 1.0
    offers = (QuantityInfo(name="weight", unit="g", meaning="a weight"),)

    def quantities(self):
        return (Quantity(name="weight", value=self.value, unit="g"),)


class Weigh:
    name, version, needs, makes, Settings = "weigh", "1", (LibraryRow,), (Weight,), NoSettings
    time_limit_seconds = 5.0

    def found(self):
        return Availability(True)

    def run(self, inputs, settings, context):
        return [Weight()]


class Again(Weigh):
    name = "weigh-again"
"""
HOOK = """

@hookimpl
def orchil_stages():
    return [{}]
"""
BRIEF = 'title = "t"\n[[want]]\nquantity = "absorption_max_nm"\nat_least = 400\n'
OURS = sorted(Registry.load().stages)


@pytest.fixture
def install(tmp_path, monkeypatch):
    """Installs a module ``<name>_plugin`` as the distribution ``<name>``; its modules are gone afterwards."""
    monkeypatch.syspath_prepend(str(tmp_path))
    before = set(sys.modules)

    def make(name, text, requires=()):
        (tmp_path / f"{name}_plugin.py").write_text(text)
        info = tmp_path / f"{name}-1.0.dist-info"
        info.mkdir()
        lines = ["Metadata-Version: 2.1", f"Name: {name}", "Version: 1.0", *(f"Requires-Dist: {r}" for r in requires)]
        (info / "METADATA").write_text("\n".join(lines) + "\n")
        (info / "entry_points.txt").write_text(f"[orchil.stages]\n{name} = {name}_plugin\n")

    yield make
    for module in set(sys.modules) - before:
        if module.endswith("_plugin"):
            del sys.modules[module]


def resolved(folder, text=BRIEF):
    (folder / "b.toml").write_text(text)
    return resolve(Registry.load(), briefs.load(folder / "b.toml"))


def names(chain):
    return sorted(step.stage.name for step in chain.steps)


@pytest.fixture
def core(tmp_path):
    """The stages of the chain when nothing is installed beside ours."""
    return names(resolved(tmp_path))


FAULTS = {
    "broken entry point": ("import nothing_of_this_name\n", (), "install the distribution that holds nothing_of_this"),
    "fault while loading": ("1 / 0\n", (), "ZeroDivisionError: division by zero: update or uninstall faulty"),
    "name that is gone": ("from orchil_schemas import Gone\n", (), "another version; update faulty or orchil"),
    "exit while loading": ("raise SystemExit('bye')\n", (), "SystemExit: bye: update or uninstall faulty"),
    "hook typo": (HEAD + HOOK.format("Weigh()").replace("orchil_stages()", "orchil_stage()"), (), "orchil_stage"),
    "wrong record type": (
        HEAD + "Weigh.makes = (int,)" + HOOK.format("Weigh()"),
        (),
        "makes holds <class 'int'>, which is no record: make it from orchil_schemas.Record",
    ),
    "record without a kind": (
        HEAD + "class Nameless(Record):\n    pass\n\nWeigh.makes = (Nameless,)" + HOOK.format("Weigh()"),
        (),
        'Nameless has no kind: write kind = "..." in it',
    ),
    "kind of another record": (
        HEAD + "Weight.kind = 'band'" + HOOK.format("Weigh()"),
        (),
        'stage "weigh" uses the name "band" for another record than stage "calibrate" from core (orchil): rename one',
    ),
    "quantity of another record": (
        HEAD
        + "Weight.offers = (QuantityInfo(name='absorption_max_nm', unit='nm', meaning='m'),)"
        + HOOK.format("Weigh()"),
        (),
        'offers the quantity "absorption_max_nm" as does stage "calibrate"',
    ),
    "settings of no model": (
        HEAD + "Weigh.Settings = dict" + HOOK.format("Weigh()"),
        (),
        "Settings must be a class made from orchil_schemas.Frozen",
    ),
    "setting without a default": (
        HEAD + "class Must(Frozen):\n    scale: float\n\n\nWeigh.Settings = Must" + HOOK.format("Weigh()"),
        (),
        "setting scale has no default, which every brief would have to give: write one",
    ),
    "stage name that is taken": (
        HEAD + "Weigh.name = 'relax'" + HOOK.format("Weigh()"),
        (),
        'stage "relax" is there already, from core (orchil): rename one',
    ),
    "missing dependency": (HEAD + HOOK.format("Weigh()"), ("nothing-of-this-name>=2",), "pip install 'nothing-of-this"),
    "version conflict": (
        HEAD + HOOK.format("Weigh()"),
        ("pydantic<1",),
        f"it needs pydantic<1, and {version('pydantic')} is installed: pip install 'pydantic<1'",
    ),
    "newer API": ("ORCHIL_API = '1.999'\n", (), f"written for plugin API 1.999, this is {API_VERSION}: update orchil"),
    "other API": ("ORCHIL_API = '2.0'\n", (), f"written for plugin API 2.0, this is {API_VERSION}: update orchil"),
    "older API": ("ORCHIL_API = '0.9'\n", (), f"written for plugin API 0.9, this is {API_VERSION}: update the plugin"),
    "no API version": ("ORCHIL_API = 'new'\n", (), "ORCHIL_API = 'new' is no version"),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_a_faulty_plugin_costs_one_line_and_nothing_else(fault, install, tmp_path):
    text, requires, sentence = FAULTS[fault]
    install("faulty", text, requires)
    install("sound", HEAD.replace("weigh", "sound").replace('"weight"', '"sound"') + HOOK.format("Weigh()"))
    registry = Registry.load()
    (problem,) = registry.problems
    assert str(problem).startswith("plugin faulty (faulty) left out: ")
    assert sentence in problem.message
    assert "\n" not in problem.message
    assert sorted(registry.stages) == sorted([*OURS, "sound"])
    chain = resolved(tmp_path)
    assert not chain.skipped
    assert "calibrate" in names(chain)


def test_the_sound_half_of_a_plugin_stays(install):
    install("half", HEAD + "class Bad(Weigh):\n    name, makes = 'bad', (int,)\n" + HOOK.format("Bad(), Weigh()"))
    registry = Registry.load()
    assert len(registry.problems) == 1
    assert "weigh" in registry.stages
    assert registry.distribution("weigh") == "half"


def test_two_makers_without_a_choice_cost_only_their_record(install, tmp_path, core):
    install("one", HEAD + HOOK.format("Weigh(), Again()"))
    chain = resolved(tmp_path)
    sentence = 'weigh (one) and weigh-again (one) both make weight: choose with [use] weight = "weigh" or "weigh-again"'
    assert chain.skipped == (sentence,)
    assert names(chain) == core
    chosen = resolved(tmp_path, BRIEF + '[use]\nWeight = "weigh-again"\n')
    assert "weigh-again" in names(chosen)


def test_a_part_that_is_not_installed_is_named_with_the_hint_and_the_distribution(install, tmp_path, core):
    install(
        "one",
        HEAD + "Weigh.found = lambda self: Availability(False, hint='pip install scales')" + HOOK.format("Weigh()"),
    )
    chain = resolved(tmp_path)
    assert chain.skipped == ("stage weigh (one) is not usable here: pip install scales",)
    assert names(chain) == core


def test_another_maker_of_a_record_of_ours_waits_until_it_is_chosen(install, tmp_path, core):
    text = HEAD + "from orchil_schemas import Transitions\nWeigh.makes = (Transitions,)" + HOOK.format("Weigh()")
    install("method", text)
    assert names(resolved(tmp_path)) == core
    chosen = resolved(tmp_path, BRIEF + '[use]\nTransitions = "weigh"\n')
    gives = {step.stage.name: [kind.kind for kind in step.gives] for step in chosen.steps}
    assert gives["weigh"] == ["transitions"]
    assert "orbitals" in gives["excite"], "calibrate needs the orbitals of excite"
    assert "transitions" not in gives["excite"]


def test_requirements_for_other_systems_do_not_count(install):
    install("one", HEAD + HOOK.format("Weigh()"), ("nothing-of-this-name; sys_platform == 'plan9'",))
    assert not Registry.load().problems


def test_an_older_minor_version_is_welcome(install):
    install("one", f"ORCHIL_API = '{API_VERSION}'\n" + HEAD + HOOK.format("Weigh()"))
    assert "weigh" in Registry.load().stages
