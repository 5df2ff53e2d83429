"""The resolved chain as text: who runs, what each stage takes from whom, what it gives, and who is left out."""

from __future__ import annotations

from collections.abc import Iterator

from orchil_schemas import Brief, LibraryRow, Pick

from .chain import Chain, Kind, LibraryStep, Step, resolve
from .registry import Registry

LIBRARY = "the library"


def plain_brief() -> Brief:
    """A brief that wants nothing and chooses nothing: the chain as it is when nobody asks for anything."""
    return Brief.model_construct(title="", medium="gas phase", note="", want=(), pick=Pick(), use={}, stage={})


def explained(registry: Registry, brief: Brief | None) -> Chain:
    """The chain of ``brief``; RequestError as a screen would raise it."""
    return resolve(registry, plain_brief() if brief is None else brief)


def makers(chain: Chain) -> dict[Kind, str]:
    """Who gives each record kind: a stage name, or the library."""
    given: dict[Kind, str] = {LibraryRow: LIBRARY}
    return given | {kind: step.stage.name for step in chain.steps for kind in step.gives}


def as_text(chain: Chain, registry: Registry) -> str:
    """Lines to read from above; a star marks what leads to a wanted quantity."""
    lines = ["for each candidate, in this order:"]
    given = makers(chain)
    for number, step in enumerate(chain.steps, 1):
        lines += _step_lines(number, step, given, registry)
    if chain.library_steps:
        lines.append("then, over all of the library:")
    lines += [line for part in chain.library_steps for line in _library_lines(part, registry)]
    if any(step.essential for step in chain.steps):
        lines.append("* leads to what is wanted: where it fails, the candidate has failed")
    return "\n".join([*lines, *_left_out(chain, registry)])


def _step_lines(number: int, step: Step, given: dict[Kind, str], registry: Registry) -> Iterator[str]:
    star = "*" if step.essential else " "
    yield f"{number:3d} {star} {step.stage.name} {step.stage.version} ({registry.distribution(step.stage.name)})"
    yield f"        <- {', '.join(f'{kind.kind} ({given[kind]})' for kind in step.stage.needs)}"
    unused = (
        f"{kind.kind} (not used: {given.get(kind, 'nobody')} makes it)"
        for kind in step.stage.makes
        if kind not in step.gives
    )
    yield f"        -> {', '.join([*(kind.kind for kind in step.gives), *unused])}"


def _library_lines(step: LibraryStep, registry: Registry) -> Iterator[str]:
    yield f"      {step.stage.name} {step.stage.version} ({registry.distribution(step.stage.name)})"
    yield f"        <- {', '.join(step.reads) or 'the quantities that a brief wants'}"
    yield f"        -> {', '.join(kind.kind for kind in step.stage.makes)}"


def _left_out(chain: Chain, registry: Registry) -> list[str]:
    sentences = [*chain.skipped, *map(str, registry.problems)]
    return ["left out:", *(f"    {sentence}" for sentence in sentences)] if sentences else []
