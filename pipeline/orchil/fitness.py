"""Does a plugin fit this engine? Each fault is one sentence with its remedy.

Nothing of a plugin is run here beyond what loading it runs anyway.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from importlib.metadata import PackageNotFoundError, version
from typing import Any

from orchil_schemas import Frozen, LibraryStage, Record, Stage
from orchil_schemas.api import API_VERSION

DECLARATION = "ORCHIL_API"
"""Name of the variable in which a plugin says which version of the contract it was written for."""


class UnfitError(Exception):
    """A plugin that was written for another engine or other libraries; the message ends with the remedy."""


def shake_hands(plugin: object) -> None:
    """:class:`UnfitError` when the plugin declares a version of the contract that this engine does not speak."""
    declared = getattr(plugin, DECLARATION, None)
    if declared is None:
        return
    try:
        major, minor = (int(part) for part in str(declared).split("."))
    except ValueError:
        raise UnfitError(f'{DECLARATION} = {declared!r} is no version: write it like "{API_VERSION}"') from None
    ours_major, ours_minor = (int(part) for part in API_VERSION.split("."))
    if major < ours_major:
        raise UnfitError(f"it was written for plugin API {declared}, this is {API_VERSION}: update the plugin")
    if (major, minor) > (ours_major, ours_minor):
        raise UnfitError(f"it was written for plugin API {declared}, this is {API_VERSION}: update orchil")


def check_requirements(requirements: Iterable[str]) -> None:
    """:class:`UnfitError` naming the first requirement that the installed distributions do not meet."""
    from packaging.requirements import Requirement

    for text in requirements:
        wanted = Requirement(text)
        if wanted.marker is not None and not wanted.marker.evaluate({"extra": ""}):
            continue
        try:
            found = version(wanted.name)
        except PackageNotFoundError:
            raise UnfitError(f"{wanted.name} is not installed: pip install '{_plain(wanted)}'") from None
        if not wanted.specifier.contains(found, prereleases=True):
            raise UnfitError(f"it needs {_plain(wanted)}, and {found} is installed: pip install '{_plain(wanted)}'")


def diagnosis(error: BaseException, distribution: str) -> str:
    """One line about what kept a plugin from loading, with what to do about it."""
    if isinstance(error, UnfitError):
        return str(error)
    said = " ".join(f"{type(error).__name__}: {error}".split())
    if isinstance(error, ModuleNotFoundError) and error.name:
        missing = error.name.partition(".")[0]
        return f"{said}: install the distribution that holds {missing}, or uninstall {distribution}"
    if isinstance(error, ImportError) and (error.name or "").startswith("orchil"):
        return f"{said}: it was written for another version; update {distribution} or orchil"
    return f"{said}: update or uninstall {distribution}"


def misfit(stage: object) -> str | None:
    """What is wrong with an object that was handed in as a stage; None when it is one."""
    if not isinstance(stage, (Stage, LibraryStage)):
        return f"{type(stage).__name__} is no stage: it lacks {', '.join(_lacking(stage))}"
    return next((f'stage "{stage.name}": {fault}' for fault in _faults(stage)), None)


def clash(kinds: Sequence[type[Record]], others: Sequence[type[Record]]) -> str | None:
    """What two different records have in common that must tell them apart."""
    for kind in kinds:
        for other in others:
            if kind is other:
                continue
            if kind.kind == other.kind:
                return f'uses the name "{kind.kind}" for another record than stage'
            if shared := {info.name for info in kind.offers} & {info.name for info in other.offers}:
                return f'offers the quantity "{min(shared)}" as does stage'
    return None


def _faults(stage: Any) -> Iterable[str]:
    for name in ("name", "version"):
        if not isinstance(getattr(stage, name), str) or not getattr(stage, name):
            yield f"{name} must be a text that is not empty"
    for name in ("needs", "makes"):
        yield from _kind_faults(name, getattr(stage, name, ()))
    if not (isinstance(stage.Settings, type) and issubclass(stage.Settings, Frozen)):
        yield "Settings must be a class made from orchil_schemas.Frozen"
        return
    for name, field in stage.Settings.model_fields.items():
        if field.is_required():
            yield f"setting {name} has no default, which every brief would have to give: write one"
    limit = getattr(stage, "time_limit_seconds", 1.0)
    if not isinstance(limit, (int, float)) or not limit > 0:
        yield "time_limit_seconds must be a number above 0"


def _kind_faults(name: str, kinds: Any) -> Iterable[str]:
    if not isinstance(kinds, tuple):
        yield f"{name} must be a tuple of record types"
        return
    for kind in kinds:
        if not (isinstance(kind, type) and issubclass(kind, Record)):
            yield f"{name} holds {kind!r}, which is no record: make it from orchil_schemas.Record"
        elif not isinstance(getattr(kind, "kind", None), str):
            yield f'{kind.__name__} has no kind: write kind = "..." in it'
        elif name == "makes" and kind.kind == "library_row":
            yield "it makes library_row, which only the library does: choose another kind"
    if name == "makes" and not kinds:
        yield "makes is empty: name the record it makes"


def _lacking(stage: object) -> list[str]:
    wanted = ("name", "version", "needs", "makes", "Settings", "time_limit_seconds", "found", "run")
    return [name for name in wanted if not hasattr(stage, name)]


def _plain(requirement: Any) -> str:
    """The requirement without its marker, as pip takes it."""
    return f"{requirement.name}{requirement.specifier}"
