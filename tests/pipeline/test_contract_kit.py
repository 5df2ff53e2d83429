"""The contract kit finds each breach of the contract, and nothing wrong with stages that keep it."""

from __future__ import annotations

from pathlib import Path

import pytest
from orchil import registry as registry_module
from orchil.contract import Kit
from orchil.errors import RequestError
from orchil.registry import EXTRA_PLUGINS

PLUGIN = Path(__file__).with_name("contract_plugin.py")
BREACHES = {
    "moody": "is_deterministic",
    "unpicklable": "can_be_pickled",
    "terse": "documents_its_settings",
    "rude": "works_on_the_molecules_of_the_kit",
    "careless": "fails_typed",
    "picky": "works_on_the_molecules_of_the_kit",
    "untidy": "writes_nothing_outside_scratch",
    "outside": "gives_sound_quantities",
    "slow": "keeps_its_time_limit",
    "scarred": "can_be_cut_off",
    "mute": "declares_what_it_needs_and_makes",
    "hasty": "has_a_time_limit",
    "twice": "makes_only_what_it_promised",
    "empty": "takes_an_empty_library",
    "dreaming": "reads_what_is_offered",
    "dicing": "is_deterministic",
}


@pytest.fixture(autouse=True)
def plugin(monkeypatch):
    monkeypatch.setenv(EXTRA_PLUGINS, str(PLUGIN))
    monkeypatch.setattr(registry_module, "_installed", lambda: iter(()))


def checked(stage, name):
    kit = Kit(stage)
    (check,) = [check for check in kit.checks if check.__name__ == name]
    check(kit)


@pytest.mark.parametrize(("stage", "name"), BREACHES.items())
def test_a_breach_is_found(stage, name):
    with pytest.raises((AssertionError, AttributeError, TypeError, ValueError)) as caught:
        checked(stage, name)
    assert str(caught.value) or stage == "empty"


@pytest.mark.parametrize("stage", ["good", "goodofall"])
def test_a_sound_stage_passes(stage):
    kit = Kit(stage)
    assert len(kit.checks) >= 11
    for check in kit.checks:
        check(kit)


def test_a_dear_stage_is_run_on_fewer_molecules():
    kit = Kit("good", molecules=("azobenzene",))
    checks = [check for check in kit.checks if check.__name__ != "fails_typed"]
    for check in checks:
        check(kit)
    assert list(kit.runs) == ["azobenzene"]


def test_a_stage_that_cannot_be_found_or_run_is_named():
    with pytest.raises(RequestError, match='no stage "goood", did you mean "good"'):
        Kit("goood")
    with pytest.raises(RequestError, match=r'"helpless" .* cannot run here'):
        _ = Kit("helpless").runs
    with pytest.raises(AssertionError, match="no hint"):
        checked("helpless", "says_whether_it_can_run")


def test_a_stage_with_a_moving_version_is_refused():
    with pytest.raises(AssertionError, match="write version as a text"):
        checked("drifting", "version_and_settings_name_the_work")


def test_settings_without_a_default_are_refused():
    with pytest.raises(RequestError, match="setting scale has no default"):
        Kit("demanding")
