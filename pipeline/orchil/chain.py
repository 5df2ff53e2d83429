"""Resolves the chain: which stages run, in which order, with which settings; faults show before any run."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from orchil_schemas import (
    Anchor,
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

from .asked import asked_for
from .briefs import sentences, suggestion
from .errors import RequestError
from .makers import kept, settle
from .registry import Registry, availability

Kind = type[Record]


@dataclass(frozen=True)
class Step:
    """One per-candidate stage with its checked settings; ``position`` counts along the chain.

    ``gives`` are those kinds among what the stage makes that are taken from it. An ``essential`` step leads to a
    quantity that the brief or a library stage wants: where it fails, the candidate has failed.
    """

    stage: Stage
    settings: Frozen
    settings_json: str
    position: int
    essential: bool
    gives: tuple[Kind, ...]


@dataclass(frozen=True)
class LibraryStep:
    """One library stage with its checked settings and the quantities it reads under this brief."""

    stage: LibraryStage
    settings: Frozen
    settings_json: str
    reads: tuple[str, ...]

    @property
    def anchors(self) -> bool:
        """It moves quantities that others read, and needs none of them."""
        return Anchor in self.stage.makes


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
        steps = [f"{step.stage.name} {step.stage.version} {step.settings_json}{_partly(step)}" for step in self.steps]
        return content_digest("computation", medium, *sorted(steps))


def resolve(registry: Registry, brief: Brief) -> Chain:
    """The chain for one brief; :class:`RequestError` lists every fault that can be seen beforehand.

    A plugin that does not fit is left out with a sentence in ``skipped``. It stops the brief only where a wanted
    quantity is lost with it.
    """
    skipped: list[str] = []
    present = asked_for([*registry.stages.values(), *registry.library_stages.values()], brief)
    usable = _usable(present, registry, skipped)
    settled = settle(usable, brief, registry)
    skipped += settled.remarks
    usable = kept(usable, settled.gives, [want.quantity for want in brief.want])
    ordered = _ordered([stage for stage in usable if isinstance(stage, Stage)], settled.gives, registry, skipped)
    library_stages = [stage for stage in usable if not isinstance(stage, Stage)]
    problems = settled.problems + _unknown_settings(registry, brief)
    settings, setting_problems = _settings([*ordered, *library_stages], brief)
    problems += setting_problems
    offers = _offers(kind for stage in ordered for kind in settled.gives[stage.name])
    problems += want_problems(brief, offers, lost=offered(registry), why=skipped)
    problems += [
        text for stage in [*ordered, *library_stages] for text in _brief_problems(stage, brief, registry, skipped)
    ]
    if problems:
        raise RequestError(*problems)
    library_steps = tuple(_library_steps(library_stages, settings, brief, registry, skipped))
    wanted = {want.quantity for want in brief.want}
    wanted |= {name for step in library_steps if not step.anchors for name in step.reads}
    essential = _essential(ordered, settled.gives, wanted)
    steps = tuple(
        Step(
            stage,
            settings[stage.name],
            _json(settings[stage.name]),
            position,
            stage.name in essential,
            settled.gives[stage.name],
        )
        for position, stage in enumerate(ordered)
    )
    return Chain(steps, library_steps, tuple(skipped))


def offered(registry: Registry) -> dict[str, QuantityInfo]:
    """Every quantity that the registered per-candidate stages can offer, by name."""
    return _offers(kind for stage in registry.stages.values() for kind in stage.makes)


def want_problems(
    brief: Brief,
    offers: Mapping[str, QuantityInfo],
    *,
    lost: Mapping[str, QuantityInfo] | None = None,
    why: Sequence[str] = (),
) -> list[str]:
    """What is wrong with the wants: quantities that are unknown or lost (``why``), units that do not fit."""
    problems = []
    for number, want in enumerate(brief.want, 1):
        info = offers.get(want.quantity)
        if info is None and want.quantity in (lost or {}):
            problems.append(f"want {number}: {want.quantity} cannot be had here: {'; '.join(why)}")
        elif info is None:
            near = suggestion(want.quantity, offers)
            hint = near or "`orchil stages --quantities` lists what can be wanted"
            problems.append(f'want {number}: unknown quantity "{want.quantity}", {hint}')
        elif want.unit not in (None, info.unit):
            problems.append(
                f'want {number}: {want.quantity} is in {info.unit}, not "{want.unit}": give the limits in {info.unit}'
            )
    return problems


def _usable(stages: Iterable[Any], registry: Registry, skipped: list[str]) -> list[Any]:
    usable = []
    for stage in stages:
        found = availability(stage)
        if found.ok:
            usable.append(stage)
        else:
            skipped.append(f"{registry.described(stage)} is not usable here: {found.hint or 'no hint given'}")
    return usable


def _ordered(
    stages: list[Stage], gives: Mapping[str, Sequence[Kind]], registry: Registry, skipped: list[str]
) -> list[Stage]:
    """The stages in an order in which every need is made before; one whose needs nobody makes is left out."""
    ordered: list[Stage] = []
    made: set[Kind] = {LibraryRow}
    waiting = sorted(stages, key=lambda stage: stage.name)
    while ready := [stage for stage in waiting if made.issuperset(stage.needs)]:
        ordered += ready
        made.update(kind for stage in ready for kind in gives[stage.name])
        waiting = [stage for stage in waiting if stage not in ready]
    skipped += [_left_waiting(stage, waiting, made, gives, registry) for stage in waiting]
    return ordered


def _left_waiting(
    stage: Stage, waiting: list[Stage], made: set[Kind], gives: Mapping[str, Sequence[Kind]], registry: Registry
) -> str:
    """Why a stage never gets its turn: a need that nobody makes, or a circle."""
    missing = [kind for kind in stage.needs if kind not in made]
    unmade = [kind for kind in missing if not any(kind in gives[other.name] for other in waiting)]
    if unmade:
        return (
            f"{registry.described(stage)} needs {unmade[0].kind}, and no usable stage makes it: "
            f"install a stage that makes {unmade[0].kind}, or uninstall {registry.distribution(stage.name)}"
        )
    maker = next(other for other in waiting if missing[0] in gives[other.name])
    left_out = f"{registry.described(stage)} needs {missing[0].kind}, but {maker.name} is left out"
    return _circle(stage, waiting) or left_out


def _circle(stage: Stage, waiting: list[Stage]) -> str | None:
    """A sentence about the closed loop that ``stage`` waits in, None when it only waits for one."""
    path = [stage]
    while True:
        needs = set(path[-1].needs)
        before = next((other for other in waiting if needs.intersection(other.makes)), None)
        if before is None or (before in path and before is not stage):
            return None
        if before is stage:
            loop = " <- ".join(one.name for one in [*path, stage])
            return f"stages wait for each other in a circle: {loop}: one of them must need less"
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


def _brief_problems(stage: Any, brief: Brief, registry: Registry, skipped: list[str]) -> list[str]:
    """What a stage itself says about the brief."""
    check = getattr(stage, "check_brief", None)
    try:
        return list(check(brief)) if check is not None else []
    except Exception as error:
        skipped.append(_fault(stage, "check_brief", error, registry))
        return []


def _library_steps(
    stages: Iterable[LibraryStage], settings: Mapping[str, Frozen], brief: Brief, registry: Registry, skipped: list[str]
) -> Iterator[LibraryStep]:
    """In the order of registration, but what moves numbers comes before what reads them."""
    for stage in sorted(stages, key=lambda stage: Anchor not in stage.makes):
        chosen = settings[stage.name]
        try:
            yield LibraryStep(stage, chosen, _json(chosen), tuple(stage.reads(brief, chosen)))
        except Exception as error:
            skipped.append(_fault(stage, "reads", error, registry))


def _fault(stage: Any, method: str, error: Exception, registry: Registry) -> str:
    remedy = f"update or uninstall {registry.distribution(stage.name)}"
    return f"{registry.described(stage)} has a fault in {method} ({type(error).__name__}: {error}): {remedy}"


def _essential(ordered: list[Stage], gives: Mapping[str, Sequence[Kind]], wanted: set[str]) -> set[str]:
    """Names of the stages that lead to a wanted quantity."""
    needed: set[Kind] = set()
    names = set()
    for stage in reversed(ordered):
        given = gives[stage.name]
        if wanted.intersection(_offers(given)) or needed.intersection(given):
            names.add(stage.name)
            needed.update(stage.needs)
    return names


def _offers(kinds: Iterable[Kind]) -> dict[str, QuantityInfo]:
    return {info.name: info for kind in kinds for info in kind.offers}


def _partly(step: Step) -> str:
    """Names what is taken from a step where that is not all it makes."""
    return "" if step.gives == step.stage.makes else f" {[kind.kind for kind in step.gives]}"


def _json(settings: Frozen) -> str:
    return canonical_json(settings.model_dump(mode="json"))
