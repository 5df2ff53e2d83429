"""Plugins come in through the door, and a broken one stays out without harm."""

from __future__ import annotations

import pytest
from orchil.registry import EXTRA_PLUGINS, Registry

HEAD = "import pluggy\nhookimpl = pluggy.HookimplMarker('orchil')\n"


@pytest.mark.parametrize(
    ("text", "part"),
    [
        ("import nothing_of_this_name\n", "ModuleNotFoundError"),
        ("1 / 0\n", "ZeroDivisionError"),
        ("def orchil_stages():\n    return []\n", "fills no hook"),
        (HEAD + "@hookimpl\ndef orchil_stagse():\n    return []\n", "orchil_stagse"),
        (HEAD + "@hookimpl\ndef orchil_stages(unknown):\n    return []\n", "unknown"),
        (HEAD + "@hookimpl\ndef orchil_stages():\n    raise OSError('no disk')\n", "no disk"),
        (HEAD + "@hookimpl\ndef orchil_stages():\n    return None\n", "TypeError"),
        (
            HEAD + "@hookimpl\ndef orchil_stages():\n    return [object()]\n",
            "object is no stage: it lacks name, version",
        ),
    ],
)
def test_a_broken_plugin_is_named_and_left_out(tmp_path, monkeypatch, fakes, text, part):
    path = tmp_path / "broken_plugin.py"
    path.write_text(text)
    good = __file__.replace("test_registry", "fake_plugin")
    monkeypatch.setenv(EXTRA_PLUGINS, f"{path}, {good}")
    registry = Registry.load()
    (problem,) = registry.problems
    assert problem.source == str(path)
    assert part in problem.message
    assert list(registry.stages) == ["read", "brew", "label"]


def test_two_stages_of_one_name(monkeypatch, fakes):
    good = __file__.replace("test_registry", "fake_plugin")
    monkeypatch.setenv(EXTRA_PLUGINS, f"{good},{good}")
    registry = Registry.load()
    assert 'stage "read" is there already' in str(registry.problems[0])
    assert len(registry.stages) == 3


def test_the_first_party_stages_come_through_the_entry_point():
    registry = Registry.load()
    assert not registry.problems
    assert set(registry.sources.values()) == {"core (orchil)"}
    assert "intake" in registry.stages
