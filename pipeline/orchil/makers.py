"""Decides who makes each record kind, so that two makers of one kind never bring a screen to a halt.

The brief decides first (``[use]``); a stage chosen there makes all it can. Where the brief is silent, the stage
of that distribution holds which defines the record: a plugin that offers another way waits to be chosen. Where
even that leaves a tie, nobody makes the kind, and a remark says how to choose.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from orchil_schemas import Brief, Record

from .registry import Registry

Kind = type[Record]


@dataclass
class Settled:
    """What each stage gives, by its name; ``remarks`` say who was left out, ``problems`` what is wrong in ``[use]``."""

    gives: dict[str, tuple[Kind, ...]] = field(default_factory=dict)
    remarks: list[str] = field(default_factory=list)
    problems: list[str] = field(default_factory=list)


def settle(stages: Sequence[Any], brief: Brief, registry: Registry) -> Settled:
    """Who makes what among the usable ``stages`` of both sorts."""
    settled = Settled()
    makers = _makers(stages)
    choices = _choices(makers, brief.use, registry, settled)
    holds = {kind: _holder(kind, names, choices, registry, settled) for kind, names in makers.items()}
    for stage in stages:
        settled.gives[stage.name] = tuple(kind for kind in stage.makes if holds[kind] == stage.name)
    return settled


def kept(stages: Sequence[Any], gives: Mapping[str, Sequence[Kind]], wanted: Iterable[str]) -> list[Any]:
    """The stages without those that lost a kind to another maker and whose other kinds nobody needs."""
    needed = {kind for stage in stages if gives[stage.name] for kind in getattr(stage, "needs", ())}
    names = set(wanted)

    def worth(stage: Any) -> bool:
        given = gives[stage.name]
        whole = len(given) == len(stage.makes)
        return whole or any(kind in needed or names.intersection(info.name for info in kind.offers) for kind in given)

    remaining = [stage for stage in stages if worth(stage)]
    return remaining if len(remaining) == len(stages) else kept(remaining, gives, names)


def _makers(stages: Sequence[Any]) -> dict[Kind, list[str]]:
    makers: dict[Kind, list[str]] = {}
    for stage in stages:
        for kind in stage.makes:
            makers.setdefault(kind, []).append(stage.name)
    return makers


def _choices(
    makers: Mapping[Kind, Sequence[str]], use: Mapping[str, str], registry: Registry, settled: Settled
) -> dict[Kind, str]:
    """``[use]`` by record type; a record may be named by its kind or by its type (``transitions``, ``Transitions``)."""
    choices: dict[Kind, str] = {}
    for word, name in use.items():
        kinds = [kind for kind in makers if word in (kind.kind, kind.__name__)]
        known = [maker for kind in kinds for maker in makers[kind]]
        if name in known:
            choices.update((kind, name) for kind in kinds)
        elif name in registry.sources and not any(name in names for names in makers.values()):
            settled.problems.append(
                f'use: "{name}" ({registry.distribution(name)}) cannot run here: see `orchil stages`'
            )
        else:
            settled.problems.append(f'use: "{name}" does not make {word}; {", ".join(known) or "no stage"} does')
    return choices


def _holder(
    kind: Kind, names: Sequence[str], choices: Mapping[Kind, str], registry: Registry, settled: Settled
) -> str | None:
    if kind in choices:
        return choices[kind]
    for favoured in ([name for name in names if name in choices.values()], _at_home(kind, names, registry)):
        if len(favoured) == 1 and len(names) > 1:
            settled.remarks += _waiting(kind, favoured[0], names, choices, registry)
            return favoured[0]
    if len(names) == 1:
        return names[0]
    said = " and ".join(f"{name} ({registry.distribution(name)})" for name in sorted(names))
    choice = " or ".join(f'"{name}"' for name in sorted(names))
    settled.remarks.append(f"{said} both make {kind.kind}: choose with [use] {kind.kind} = {choice}")
    return None


def _waiting(
    kind: Kind, holder: str, names: Sequence[str], choices: Mapping[Kind, str], registry: Registry
) -> list[str]:
    """What is worth saying of makers that wait to be chosen; nothing where the brief has chosen."""
    if holder in choices.values():
        return []
    return [
        f"{name} ({registry.distribution(name)}) waits: {holder} makes {kind.kind} unless the brief says "
        f'[use] {kind.kind} = "{name}"'
        for name in sorted(names)
        if name != holder
    ]


def _at_home(kind: Kind, names: Sequence[str], registry: Registry) -> list[str]:
    home = registry.home(kind)
    return [name for name in names if home is not None and registry.distribution(name) == home]
