"""Finds plugins and keeps what they offer; a broken plugin is reported and left out, never in the way."""

from __future__ import annotations

import importlib
import importlib.util
import os
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from importlib.metadata import entry_points
from pathlib import Path
from typing import Any

import pluggy
from orchil_schemas import Availability, Check, LibraryStage, Stage

from . import hookspecs

EXTRA_PLUGINS = "ORCHIL_EXTRA_PLUGINS"
"""Environment variable: ``module``, ``module:object`` or ``path/to/file.py``, separated by commas. Loaded
beside the installed plugins, for trying a stage that is not installed."""


@dataclass(frozen=True)
class Problem:
    """A plugin, or a part of one, that was left out."""

    source: str
    message: str

    def __str__(self) -> str:
        return f"plugin {self.source} left out: {self.message}"


@dataclass
class Registry:
    """Stages, library stages and checks by plugin, in the order of plugin names."""

    stages: dict[str, Stage] = field(default_factory=dict)
    library_stages: dict[str, LibraryStage] = field(default_factory=dict)
    checks: list[Check] = field(default_factory=list)
    sources: dict[str, str] = field(default_factory=dict)
    problems: list[Problem] = field(default_factory=list)

    @classmethod
    def load(cls) -> Registry:
        """Everything installed under the entry point group, then what ``ORCHIL_EXTRA_PLUGINS`` names."""
        registry = cls()
        for source, load in _installed():
            registry._try(source, load)
        for text in filter(None, (part.strip() for part in os.environ.get(EXTRA_PLUGINS, "").split(","))):
            registry._try(text, lambda text=text: load_by_name(text))  # type: ignore[misc]
        return registry

    def register(self, plugin: object, source: str) -> None:
        """Take the stages and checks of one plugin object; a part that does not fit becomes a problem."""
        manager = pluggy.PluginManager(hookspecs.PROJECT)
        manager.add_hookspecs(hookspecs)
        manager.register(plugin, name=source)
        manager.check_pending()
        found = manager.hook.orchil_stages.get_hookimpls() + manager.hook.orchil_checks.get_hookimpls()
        if not found:
            raise ValueError("it fills no hook: mark a function orchil_stages with pluggy.HookimplMarker('orchil')")
        for call in manager.hook.orchil_stages.get_hookimpls():
            stages: Any = call.function()
            for stage in stages:
                self.add(stage, source)
        for call in manager.hook.orchil_checks.get_hookimpls():
            checks: Any = call.function()
            self.checks.extend(checks)

    def add(self, stage: Stage | LibraryStage, source: str) -> None:
        """Take one stage, or note why not."""
        problem = self._misfit(stage)
        if problem:
            self.problems.append(Problem(source, problem))
            return
        self.sources[stage.name] = source
        if isinstance(stage, Stage):
            self.stages[stage.name] = stage
        else:
            self.library_stages[stage.name] = stage

    def _misfit(self, stage: object) -> str | None:
        if not isinstance(stage, (Stage, LibraryStage)):
            return f"{type(stage).__name__} is no stage: it lacks {', '.join(_lacking(stage))}"
        if stage.name in self.sources:
            return f'stage "{stage.name}" is there already, from {self.sources[stage.name]}: rename one'
        return None

    def _try(self, source: str, load: Callable[[], object]) -> None:
        try:
            self.register(load(), source)
        except (Exception, SystemExit) as error:
            self.problems.append(Problem(source, f"{type(error).__name__}: {error}"))


def availability(stage: Stage | LibraryStage) -> Availability:
    """What a stage says of itself; one that raises is not usable."""
    try:
        return stage.found()
    except Exception as error:
        return Availability(False, hint=f"its found() raised {type(error).__name__}: {error}")


def load_by_name(text: str) -> object:
    """The module or object that ``module``, ``module:object`` or ``path.py`` names."""
    if text.endswith(".py"):
        return _load_file(Path(text))
    module, _, attribute = text.partition(":")
    loaded: Any = importlib.import_module(module)
    return getattr(loaded, attribute) if attribute else loaded


def _load_file(path: Path) -> object:
    spec = importlib.util.spec_from_file_location(path.stem, path)
    if spec is None or spec.loader is None or not path.is_file():
        raise FileNotFoundError(f"no Python file {path}")
    module = importlib.util.module_from_spec(spec)
    sys.modules[path.stem] = module
    spec.loader.exec_module(module)
    return module


def _installed() -> Iterator[tuple[str, Callable[[], object]]]:
    points = sorted(entry_points(group=hookspecs.ENTRY_POINT_GROUP), key=lambda point: (point.name, point.value))
    for point in points:
        distribution = point.dist.name if point.dist else "unknown distribution"
        yield f"{point.name} ({distribution})", point.load


def _lacking(stage: object) -> list[str]:
    wanted = ("name", "version", "needs", "makes", "Settings", "time_limit_seconds", "found", "run")
    return [name for name in wanted if not hasattr(stage, name)]
