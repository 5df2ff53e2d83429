"""The hooks a plugin can fill; this file is the whole door.

A plugin is a module named in an entry point of the group ``orchil.stages``. It marks its functions with
``hookimpl = pluggy.HookimplMarker("orchil")`` and needs nothing from this package. First-party stages come in
the same way.
"""

from __future__ import annotations

import pluggy
from orchil_schemas import Check, LibraryStage, Stage

PROJECT = "orchil"
ENTRY_POINT_GROUP = "orchil.stages"

hookspec = pluggy.HookspecMarker(PROJECT)
hookimpl = pluggy.HookimplMarker(PROJECT)


@hookspec
def orchil_stages() -> list[Stage | LibraryStage]:  # type: ignore[empty-body]
    """Return the stages of this plugin; the chain finds their order from ``needs`` and ``makes``."""


@hookspec
def orchil_checks() -> list[Check]:  # type: ignore[empty-body]
    """Return checks for `orchil check`, each a few seconds at most."""
