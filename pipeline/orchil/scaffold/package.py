"""Names for a new stage that hurt nobody, and the files of its package."""

from __future__ import annotations

import importlib.util
import keyword
import re
from collections.abc import Iterator
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path
from string import Template

import orchil_schemas
from orchil_schemas import LibraryStage, Stage
from orchil_schemas.api import API_VERSION

from orchil import __version__
from orchil.chain import offered
from orchil.errors import RequestError
from orchil.registry import Registry

LONGEST = 40
NAME = re.compile(r"[a-z][a-z0-9]*(-[a-z0-9]+)*")


@dataclass(frozen=True)
class NewPackage:
    """Where the new package is, and what it holds, in the order in which it is worth reading."""

    folder: Path
    files: tuple[Path, ...]


def make_package(name: str, into: Path, registry: Registry) -> NewPackage:
    """Write the package ``orchil-<name>`` below ``into``; :class:`RequestError` when a name is taken."""
    problems = list(_problems(name, registry))
    folder = into / f"orchil-{name}"
    if folder.exists():
        problems.append(f"{folder} is there already: move it away, or choose another name")
    if problems:
        raise RequestError(*problems)
    words = _words(name)
    targets = {
        "module.py": f"{words['module']}.py",
        "test.py": f"tests/test_{words['module']}.py",
        "pyproject.toml": "pyproject.toml",
        "README.md": "README.md",
    }
    try:
        made = [_write(folder / target, template, words) for template, target in targets.items()]
    except OSError as error:
        raise RequestError(f"{folder} cannot be written: {error.strerror}") from error
    return NewPackage(folder, tuple(made))


def _words(name: str) -> dict[str, str]:
    """What the templates leave open."""
    snake = name.replace("-", "_")
    return {
        "name": name,
        "title": name.replace("-", " ").capitalize(),
        "snake": snake,
        "camel": "".join(part.capitalize() for part in name.split("-")),
        "module": f"orchil_{snake}",
        "api": API_VERSION,
        "orchil": __version__,
    }


def _problems(name: str, registry: Registry) -> Iterator[str]:
    if not NAME.fullmatch(name) or len(name) > LONGEST:
        yield (
            f'"{name}" cannot be the name of a stage: use up to {LONGEST} lower-case letters and digits, with single '
            'hyphens between them, like "ring-count"'
        )
        return
    words = _words(name)
    taken = {*registry.stages, *registry.library_stages}
    stages: list[Stage | LibraryStage] = [*registry.stages.values(), *registry.library_stages.values()]
    kinds = {kind.kind for stage in stages for kind in stage.makes}
    if name in taken:
        yield f'there is a stage "{name}" already, from {registry.sources[name]}: choose another name'
    elif words["snake"] in kinds | set(offered(registry)) or hasattr(orchil_schemas, words["camel"]):
        yield f'"{words["snake"]}" is the name of a record or quantity already: choose another name'
    elif keyword.iskeyword(words["snake"]) or importlib.util.find_spec(words["module"]) is not None:
        yield f'"{words["module"]}" cannot be the name of a new module here: choose another name'


def _write(target: Path, template: str, words: dict[str, str]) -> Path:
    text = files(__package__).joinpath("files", f"{template}.tmpl").read_text(encoding="utf-8")
    target.parent.mkdir(parents=True, exist_ok=True)
    target.write_text(Template(text).substitute(words), encoding="utf-8")
    return target
