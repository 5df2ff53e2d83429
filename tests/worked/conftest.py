from __future__ import annotations

from pathlib import Path

import pytest
from orchil.registry import EXTRA_PLUGINS, Registry

WORKED = Path(__file__).parents[2] / "plugins" / "worked"
PLUGINS = {"ppp": "orchil_ppp", "cost": "orchil_cost", "fragments": "orchil_fragments"}


@pytest.fixture(autouse=True)
def worked(monkeypatch):
    """The worked plugins beside ours, as if they were installed; workers find them the same way."""
    for folder in PLUGINS:
        monkeypatch.syspath_prepend(str(WORKED / folder))
    monkeypatch.setenv(EXTRA_PLUGINS, ",".join(PLUGINS.values()))
    registry = Registry.load()
    assert registry.problems == []
    return registry
