"""Resolves the chain: which stages run, in which order, with which settings; faults show before any run."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from orchil_schemas import (
    Brief,
    Frozen,
    LibraryRow,
    LibraryStage,
    QuantityInfo,
    Record,
    Stage,
    canonical_json,
    content_digest,
)
from pydantic import ValidationError

from .briefs import sentences, suggestion
from .errors import RequestError
from .registry import Registry, availability

Kind = type[Record]


@dataclass(frozen=True)
class Step:
    """One per-candidate stage with its checked settings; ``position`` counts along the chain.

    An ``essential`` step leads to a quantity that the brief or a library stage wants: where it fails, the
    candidate has failed.
    """

    stage: Stage
    settings: Frozen
    settings_json: str
    position: int
    essential: bool


@dataclass(frozen=True)
class LibraryStep:
    """One library stage with its checked settings and the quantities it reads under this brief."""

    stage: LibraryStage
    settings: Frozen
    settings_json: str
    reads: tuple[str, ...]


@dataclass(frozen=True)
class Chain:
    """The resolved chain; ``skipped`` says which stages stay out and why, one sentence each."""

    steps: tuple[Step, ...]
    library_steps: tuple[LibraryStep, ...]
    skipped: tuple[str, ...] = ()

    @cached_property
    def kinds(self) -> dict[str, Kind]:
        """Record types by kind, those of library stages included."""
        made: list[Kind] = [LibraryRow, *(kind for stage in self._stages for kind in stage.makes)]
        return {kind.kind: kind for kind in made}

    @property
    def _stages(self) -> list[Stage | LibraryStage]:
        return [*(step.stage for step in self.steps), *(step.stage for step in self.library_steps)]

    @cached_property
    def entry_steps(self) -> tuple[Step, ...]:
        """The steps that read nothing but the library row."""
        return tuple(step for step in self.steps if set(step.stage.needs) <= {LibraryRow})

    @cached_property
    def species_kinds(self) -> tuple[Kind, ...]:
        """What later steps take from the entry steps: candidates with equal ones are duplicates."""
        entry = {kind for step in self.entry_steps for kind in step.stage.makes} | {LibraryRow}
        needed = {kind for step in self.steps if step not in self.entry_steps for kind in step.stage.needs}
        return tuple(sorted(entry & needed, key=lambda kind: kind.kind))

    def versions(self) -> dict[str, str]:
        """Versions of the stages, and of what they stand on."""
        found = {name: text for stage in self._stages for name, text in availability(stage).versions.items()}
        return found | {f"stage {stage.name}": stage.version for stage in self._stages}

    def computation(self, medium: str) -> str:
        """Names what is computed: stages, versions, settings and the medium of rows that name none."""
        steps = [f"{step.stage.name} {step.stage.version} {step.settings_json}" for step in self.steps]
        return content_digest("computation", medium, *sorted(steps))


def resolve(registry: Registry, brief: Brief) -> Chain:
    """The chain for one brief; :class:`RequestError` lists every fault that can be seen beforehand."""
    skipped: list[str] = []
    stages = _usable(registry.stages.values(), skipped)
    library_stages = _usable(registry.library_stages.values(), skipped)
    problems = _unknown_choices([*stages, *library_stages], brief)
    stages, library_stages = _chosen(stages, brief), _chosen(library_stages, brief)
    problems += _two_makers([*stages, *library_stages])
    problems += _unknown_settings(registry, brief)
    ordered, order_problems = _ordered(stages, skipped)
    problems += order_problems
    settings, setting_problems = _settings([*ordered, *library_stages], brief)
    problems += setting_problems
    offers = _offers([*ordered])
    problems += want_problems(brief, offers) if not order_problems else []
    problems += _brief_problems([*ordered, *library_stages], brief)
    if problems:
        raise RequestError(*problems)
    library_steps = tuple(_library_step(stage, settings[stage.name], brief) for stage in library_stages)
    wanted = {want.quantity for want in brief.want} | {name for step in library_steps for name in step.reads}
    essential = _essential(ordered, wanted)
    steps = tuple(
        Step(stage, settings[stage.name], _json(settings[stage.name]), position, stage.name in essential)
        for position, stage in enumerate(ordered)
    )
    return Chain(steps, library_steps, tuple(skipped))


def offered(registry: Registry) -> dict[str, QuantityInfo]:
    """Every quantity that the registered per-candidate stages can offer, by name."""
    return _offers(list(registry.stages.values()))


def want_problems(brief: Brief, offers: dict[str, QuantityInfo]) -> list[str]:
    """What is wrong with the wants: unknown quantities and units that do not fit."""
    problems = []
    for number, want in enumerate(brief.want, 1):
        info = offers.get(want.quantity)
        if info is None:
            near = suggestion(want.quantity, offers)
            hint = near or "`orchil stages --quantities` lists what can be wanted"
            problems.append(f'want {number}: unknown quantity "{want.quantity}", {hint}')
        elif want.unit not in (None, info.unit):
            problems.append(
                f'want {number}: {want.quantity} is in {info.unit}, not "{want.unit}": give the limits in {info.unit}'
            )
    return problems


def _usable(stages: Iterable[Any], skipped: list[str]) -> list[Any]:
    usable = []
    for stage in stages:
        found = availability(stage)
        if found.ok:
            usable.append(stage)
        else:
            skipped.append(f"stage {stage.name} is not usable here: {found.hint or 'no hint given'}")
    return usable


def _chosen(stages: list[Any], brief: Brief) -> list[Any]:
    """The stages without those makers that ``use`` decides against."""
    return [
        stage for stage in stages if all(brief.use.get(kind.kind, stage.name) == stage.name for kind in stage.makes)
    ]


def _unknown_choices(stages: list[Any], brief: Brief) -> list[str]:
    problems = []
    for kind, name in brief.use.items():
        makers = [stage.name for stage in stages if any(made.kind == kind for made in stage.makes)]
        if name not in makers:
            known = ", ".join(makers) or "no stage"
            problems.append(f'use: "{name}" does not make {kind}; {known} does')
    return problems


def _ordered(stages: list[Stage], skipped: Sequence[str]) -> tuple[list[Stage], list[str]]:
    """The stages in an order in which every need is made before, or the problems that prevent it."""
    problems = list(_missing_makers(stages, skipped))
    if problems:
        return stages, problems
    ordered: list[Stage] = []
    made: set[Kind] = {LibraryRow}
    waiting = sorted(stages, key=lambda stage: stage.name)
    while waiting:
        ready = [stage for stage in waiting if made.issuperset(stage.needs)]
        if not ready:
            return stages, [_cycle(waiting)]
        ordered += ready
        made.update(kind for stage in ready for kind in stage.makes)
        waiting = [stage for stage in waiting if stage not in ready]
    return ordered, []


def _two_makers(stages: list[Any]) -> list[str]:
    """Sentences about record kinds that more than one stage makes, or that more than one type goes by."""
    makers: dict[str, list[tuple[str, Kind]]] = {}
    for stage in stages:
        for kind in stage.makes:
            makers.setdefault(kind.kind, []).append((stage.name, kind))
    return [text for kind, made in sorted(makers.items()) if (text := _conflict(kind, made))]


def _conflict(kind: str, made: list[tuple[str, Kind]]) -> str | None:
    names = sorted(name for name, _ in made)
    if kind == LibraryRow.kind:
        return f"stage {names[0]} makes library_row, which only the library does: choose another kind"
    if len({made_kind for _, made_kind in made}) > 1:
        return f'{" and ".join(names)} use the name "{kind}" for different records: rename one'
    if len(names) > 1:
        choice = " or ".join(f'"{name}"' for name in names)
        return f"{' and '.join(names)} both make {kind}: choose with [use] {kind} = {choice}"
    return None


def _missing_makers(stages: list[Stage], skipped: Sequence[str]) -> Iterator[str]:
    makers = {kind for stage in stages for kind in stage.makes}
    for stage in stages:
        for kind in stage.needs:
            if kind is not LibraryRow and kind not in makers:
                why = f" ({'; '.join(skipped)})" if skipped else ""
                yield f"stage {stage.name} needs {kind.kind}, and no usable stage makes it{why}"


def _cycle(waiting: list[Stage]) -> str:
    """A sentence about one closed loop among stages that wait for each other."""
    path = [waiting[0]]
    while True:
        needs = set(path[-1].needs)
        before = next(stage for stage in waiting if needs.intersection(stage.makes))
        if before in path:
            loop = [stage.name for stage in path[path.index(before) :]]
            return f"stages wait for each other in a circle: {' <- '.join([*loop, loop[0]])}"
        path.append(before)


def _unknown_settings(registry: Registry, brief: Brief) -> list[str]:
    known = [*registry.stages, *registry.library_stages]
    problems = []
    for name in brief.stage:
        if name not in known:
            hint = suggestion(name, known) or f"known stages are {', '.join(known)}"
            problems.append(f"[stage.{name}] is for no stage, {hint}")
    return problems


def _settings(stages: list[Any], brief: Brief) -> tuple[dict[str, Frozen], list[str]]:
    settings: dict[str, Frozen] = {}
    problems: list[str] = []
    for stage in stages:
        found, faults = _settings_of(stage, brief)
        if found is not None:
            settings[stage.name] = found
        problems += faults
    return settings, problems


def _settings_of(stage: Any, brief: Brief) -> tuple[Frozen | None, list[str]]:
    try:
        return stage.Settings(**brief.stage.get(stage.name, {})), []
    except ValidationError as error:
        return None, [f"[stage.{stage.name}] {text}" for text in sentences(error, stage.Settings)]


def _brief_problems(stages: list[Any], brief: Brief) -> list[str]:
    checks = [check for stage in stages if (check := getattr(stage, "check_brief", None)) is not None]
    return [text for check in checks for text in check(brief)]


def _library_step(stage: LibraryStage, settings: Frozen, brief: Brief) -> LibraryStep:
    return LibraryStep(stage, settings, _json(settings), tuple(stage.reads(brief, settings)))


def _essential(ordered: list[Stage], wanted: set[str]) -> set[str]:
    """Names of the stages that lead to a wanted quantity."""
    needed: set[Kind] = set()
    names = set()
    for stage in reversed(ordered):
        offers = {info.name for kind in stage.makes for info in kind.offers}
        if offers & wanted or needed.intersection(stage.makes):
            names.add(stage.name)
            needed.update(stage.needs)
    return names


def _offers(stages: list[Stage]) -> dict[str, QuantityInfo]:
    return {info.name: info for stage in stages for kind in stage.makes for info in kind.offers}


def _json(settings: Frozen) -> str:
    return canonical_json(settings.model_dump(mode="json"))
