"""The hooks a plugin can fill; this file is the whole door.

A plugin is a module named in an entry point of the group ``orchil.stages``. It marks its functions with
``hookimpl = pluggy.HookimplMarker("orchil")`` and needs nothing from this package. First-party stages come in
the same way.
"""

from __future__ import annotations

import pluggy
from orchil_schemas import Check, LibraryStage, Stage
from orchil_schemas.panel import Panel, SqlFunction, StructureKit, TableFormat

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


@hookspec
def orchil_panels() -> list[Panel]:  # type: ignore[empty-body]
    """Return sections for the page of a candidate, in the report and in `orchil serve`."""


@hookspec
def orchil_structures() -> list[StructureKit]:  # type: ignore[empty-body]
    """Return what draws structures and finds the most alike; the first one that is found is used."""


@hookspec
def orchil_sql_functions() -> list[SqlFunction]:  # type: ignore[empty-body]
    """Return functions for the SQL of `orchil query`."""


@hookspec
def orchil_formats() -> list[TableFormat]:  # type: ignore[empty-body]
    """Return file formats for the rows of `orchil query --format NAME --output FILE`."""
