"""Ready-made questions: SQL files with a name, a sentence and parameters.

The first line of a file is a comment with the question. Every parameter has a line ``-- :name = default; meaning``.
The name is that of the file without ``.sql``. Beside the ones that come with Orchil, files are found in the folders
that the environment variable ``ORCHIL_QUESTIONS`` names; there, an equal name takes the place of ours.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

from orchil.errors import RequestError

FOLDERS = "ORCHIL_QUESTIONS"
_OURS = Path(__file__).parent
_PARAMETER = re.compile(r"^--\s*:(\w+)\s*=\s*(.*?)\s*(?:;\s*(.*?)\s*)?$")


@dataclass(frozen=True)
class Parameter:
    """One parameter of a question with its default."""

    name: str
    default: str
    meaning: str


@dataclass(frozen=True)
class Question:
    """One file: ``asks`` is its sentence, ``sql`` its text."""

    name: str
    asks: str
    sql: str
    parameters: tuple[Parameter, ...]

    def values(self, given: Mapping[str, str]) -> dict[str, str | int | float]:
        """The parameters for SQLite; :class:`RequestError` for one the question does not have."""
        unknown = given.keys() - {one.name for one in self.parameters}
        if unknown:
            has = ", ".join(one.name for one in self.parameters) or "none"
            lacks = ", ".join(sorted(unknown))
            raise RequestError(f'the question "{self.name}" has no parameter {lacks}: it has {has}')
        return {one.name: number_or_text(given.get(one.name, one.default)) for one in self.parameters}


def find(name: str) -> Question:
    """The question of that name, or in that file; :class:`RequestError` names those there are."""
    if name.endswith(".sql"):
        return read(Path(name))
    known = questions()
    if name not in known:
        raise RequestError(f'there is no question "{name}": there are {", ".join(known)}')
    return known[name]


def questions() -> dict[str, Question]:
    """All questions by name, in alphabetical order."""
    return dict(sorted((path.stem, read(path)) for path in _files()))


def _files() -> Iterator[Path]:
    folders = [Path(text) for text in os.environ.get(FOLDERS, "").split(os.pathsep) if text]
    for folder in folders:
        if not folder.is_dir():
            raise RequestError(f"{FOLDERS} names {folder}, which is no folder")
    found = {path.name: path for folder in (_OURS, *reversed(folders)) for path in folder.glob("*.sql")}
    return iter(found.values())


def read(path: Path) -> Question:
    """Read one file; :class:`RequestError` says what it lacks."""
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise RequestError(f"the question {path} cannot be read: {error}") from error
    first, *rest = text.splitlines() or [""]
    asks = first.removeprefix("--").strip()
    if not first.startswith("--") or not asks:
        raise RequestError(f"{path} must begin with a comment that says what it asks, for example: -- What was picked?")
    found = [match.groups(default="") for match in map(_PARAMETER.match, rest) if match]
    return Question(path.stem, asks, text, tuple(Parameter(*parts) for parts in found))


def number_or_text(text: str) -> str | int | float:
    """A whole number, else a number, else the text itself."""
    if re.fullmatch(r"[+-]?\d+", text):
        return int(text)
    try:
        return float(text)
    except ValueError:
        return text
