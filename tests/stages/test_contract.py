"""Every stage of ours keeps the contract that others are held to."""

from __future__ import annotations

import pytest
from orchil.contract import Kit, declared
from orchil.registry import Registry

REGISTRY = Registry.load()
STAGES = {**REGISTRY.stages, **REGISTRY.library_stages}
KITS = {name: Kit(name) for name in STAGES}


def checks(name):
    """All checks; of stages on request, which take minutes for a dye, those that run nothing."""
    return declared.CHECKS if getattr(STAGES[name], "on_request", False) else KITS[name].checks


CASES = [(name, check) for name in STAGES for check in checks(name)]


@pytest.mark.parametrize(("stage", "check"), CASES, ids=lambda part: getattr(part, "__name__", part))
def test_contract(stage, check):
    check(KITS[stage])
