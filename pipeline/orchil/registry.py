"""Finds plugins and keeps what they offer; a broken plugin is reported and left out, never in the way."""

from __future__ import annotations

import importlib
import importlib.util
import os
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from importlib.metadata import EntryPoint, entry_points
from pathlib import Path
from typing import Any

import pluggy
from orchil_schemas import Availability, Check, LibraryStage, Record, Stage

from . import fitness, hookspecs
from .offers import Offers

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
    distributions: dict[str, str] = field(default_factory=dict)
    offers: Offers = field(default_factory=Offers)

    @classmethod
    def load(cls) -> Registry:
        """Everything installed under the entry point group, then what ``ORCHIL_EXTRA_PLUGINS`` names."""
        registry = cls()
        for source, load, distribution in _installed():
            registry._try(source, load, distribution)
        for text in filter(None, (part.strip() for part in os.environ.get(EXTRA_PLUGINS, "").split(","))):
            registry._try(text, lambda text=text: load_by_name(text), text)  # type: ignore[misc]
        return registry

    def register(self, plugin: object, source: str, distribution: str | None = None) -> None:
        """Take the stages and checks of one plugin object; a part that does not fit becomes a problem."""
        fitness.shake_hands(plugin)
        manager = pluggy.PluginManager(hookspecs.PROJECT)
        manager.add_hookspecs(hookspecs)
        manager.register(plugin, name=source)
        manager.check_pending()
        if not manager.get_hookcallers(plugin):
            raise ValueError("it fills no hook: mark a function orchil_stages with pluggy.HookimplMarker('orchil')")
        for call in manager.hook.orchil_stages.get_hookimpls():
            stages: Any = call.function()
            for stage in stages:
                self.add(stage, source, distribution)
        for call in manager.hook.orchil_checks.get_hookimpls():
            checks: Any = call.function()
            self.checks.extend(checks)
        self.problems.extend(Problem(source, fault) for fault in self.offers.take(manager.hook))

    def add(self, stage: Stage | LibraryStage, source: str, distribution: str | None = None) -> None:
        """Take one stage, or note why not."""
        problem = fitness.misfit(stage) or self._clash(stage)
        if problem:
            self.problems.append(Problem(source, problem))
            return
        self.sources[stage.name] = source
        self.distributions[stage.name] = distribution or source
        if isinstance(stage, Stage):
            self.stages[stage.name] = stage
        else:
            self.library_stages[stage.name] = stage

    def distribution(self, stage: str) -> str:
        """What to install, update or uninstall for the stage of this name."""
        return self.distributions[stage]

    def described(self, stage: Stage | LibraryStage) -> str:
        """``stage excite (orchil)``: a stage as a sentence about it begins."""
        return f"stage {stage.name} ({self.distribution(stage.name)})"

    def home(self, kind: type[Record]) -> str | None:
        """The distribution that defines a record kind, None when no stage of that distribution is here."""
        package = _package(kind)
        if package == _package(Record):
            return hookspecs.PROJECT
        return next((self.distribution(one.name) for one in self._all() if _package(type(one)) == package), None)

    def _all(self) -> list[Stage | LibraryStage]:
        return [*self.stages.values(), *self.library_stages.values()]

    def _clash(self, stage: Stage | LibraryStage) -> str | None:
        """What ``stage`` has in common with one that is there already and must not have."""
        if stage.name in self.sources:
            return f'stage "{stage.name}" is there already, from {self.sources[stage.name]}: rename one'
        for other in self._all():
            fault = fitness.clash(stage.makes, other.makes)
            if fault:
                return f'stage "{stage.name}" {fault} "{other.name}" from {self.sources[other.name]}: rename one'
        return None

    def _try(self, source: str, load: Callable[[], object], distribution: str) -> None:
        try:
            self.register(load(), source, distribution)
        except (Exception, SystemExit) as error:
            self.problems.append(Problem(source, fitness.diagnosis(error, distribution)))


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


def _installed() -> Iterator[tuple[str, Callable[[], object], str]]:
    points = sorted(entry_points(group=hookspecs.ENTRY_POINT_GROUP), key=lambda point: (point.name, point.value))
    for point in points:
        distribution = point.dist.name if point.dist else "unknown distribution"
        yield f"{point.name} ({distribution})", lambda point=point: _load(point), distribution  # type: ignore[misc]


def _load(point: EntryPoint) -> object:
    """The module of an entry point, once the versions fit that its distribution asks for."""
    if point.dist is not None and point.dist.name != hookspecs.PROJECT:
        fitness.check_requirements(point.dist.requires or [])
    return point.load()


def _package(kind: type) -> str:
    return kind.__module__.partition(".")[0]
