"""Checks of what a stage says of itself; they run nothing."""

from __future__ import annotations

import pickle
from typing import TYPE_CHECKING, Any

from orchil_schemas import LibraryStage
from pydantic import ValidationError

from orchil import fitness
from orchil.digests import work_digest

if TYPE_CHECKING:
    from .kit import Kit


def declares_what_it_needs_and_makes(kit: Kit) -> None:
    """Name, version, record types, settings, time limit; every quantity has a unit and a meaning."""
    fault = fitness.misfit(kit.stage)
    assert fault is None, fault
    for kind in kit.stage.makes:
        assert kind.__doc__, f"{kind.__name__} has no docstring: say what the record is"
        for info in kind.offers:
            assert info.unit, f'{info.name} has no unit: write "1" for a plain number'
            assert info.meaning, f"{info.name} has no meaning: `orchil stages --quantities` shows it"


def says_whether_it_can_run(kit: Kit) -> None:
    """``found`` answers, with versions as texts, or with a hint where something is missing."""
    found = kit.stage.found()
    assert found.ok or found.hint, "found() is not ok and gives no hint: say what to install"
    assert all(isinstance(text, str) for text in found.versions.values()), "versions must be texts"


def documents_its_settings(kit: Kit) -> None:
    """Every setting has a default and a description; an unknown one is refused."""
    for name, field in kit.stage.Settings.model_fields.items():
        assert field.description, f"setting {name} has no description: write Field(default=..., description=...)"
    assert _refuses_unknown(kit.stage.Settings), "Settings takes unknown keys: leave extra = forbid as it is"
    again = kit.stage.Settings.model_validate_json(kit.settings_json)
    assert again == kit.settings, "the settings do not come back the same from JSON"


def can_be_pickled(kit: Kit) -> None:
    """The stage survives pickle, so that it can go to another machine."""
    again = pickle.loads(pickle.dumps(kit.stage))
    assert (again.name, again.version) == (kit.stage.name, kit.stage.version)


def version_and_settings_name_the_work(kit: Kit) -> None:
    """Another version is other work; the same version is the same work in every process."""
    fresh = type(kit.stage).version
    assert isinstance(fresh, str), "write version as a text in the class"
    assert fresh == kit.stage.version, "version changes while running: write it as a text in the class"
    names = {work_digest(kit.stage.name, text, kit.settings_json, ()) for text in (fresh, fresh + "+")}
    assert len(names) == 2


def has_a_time_limit(kit: Kit) -> None:
    """The hard limit is between a second and a day; library stages have none."""
    if isinstance(kit.stage, LibraryStage) and not hasattr(kit.stage, "time_limit_seconds"):
        return
    assert 1 <= kit.stage.time_limit_seconds <= 86_400, "time_limit_seconds must lie between 1 and 86400"


def _refuses_unknown(settings: type[Any]) -> bool:
    try:
        settings(surely_no_setting_of_this_name=1)
    except ValidationError:
        return True
    return False


CHECKS = (
    declares_what_it_needs_and_makes,
    says_whether_it_can_run,
    documents_its_settings,
    can_be_pickled,
    version_and_settings_name_the_work,
    has_a_time_limit,
)
