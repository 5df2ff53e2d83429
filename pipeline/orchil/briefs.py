"""Reads a brief and turns each fault into a sentence that names the key and says what is right."""

from __future__ import annotations

import difflib
import sys
from collections.abc import Iterable
from pathlib import Path
from typing import Any, get_args

from orchil_schemas import Brief
from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from .errors import RequestError

if sys.version_info >= (3, 11):
    import tomllib
else:
    import tomli as tomllib


def load(path: Path) -> Brief:
    """The brief in a TOML file; :class:`RequestError` with one sentence per fault, each naming the file."""
    try:
        return Brief(**_toml(path))
    except ValidationError as error:
        raise RequestError(*(f"{path.name}: {text}" for text in sentences(error, Brief))) from error


def _toml(path: Path) -> dict[str, Any]:
    if path.is_dir():
        raise RequestError(f"{path} is a folder: name the brief inside it, a TOML file")
    try:
        return tomllib.loads(path.read_bytes().decode("utf-8-sig"))
    except FileNotFoundError:
        raise RequestError(f"there is no brief {path}: check the path") from None
    except OSError as error:
        raise RequestError(f"the brief {path} cannot be read: {error.strerror}") from error
    except UnicodeDecodeError as error:
        raise RequestError(f"{path.name} is not UTF-8 text: save the brief as UTF-8") from error
    except tomllib.TOMLDecodeError as error:
        raise RequestError(f"{path.name} is not valid TOML: {error}") from error


def sentences(error: ValidationError, model: type[BaseModel]) -> list[str]:
    """One sentence per fault, with the place as a reader of the file knows it ("want 2: at_least ...")."""
    details = error.errors(include_url=False)
    # A list is reported as too short when its items are faulty: the faults of the items say it better.
    inner = {detail["loc"][:length] for detail in details for length in range(len(detail["loc"]))}
    return [_sentence(detail, model) for detail in details if detail["loc"] not in inner or not detail["loc"]]


def suggestion(word: str, known: Iterable[str]) -> str:
    """``did you mean "x" or "y"?`` for names that look like ``word``, or nothing."""
    near = difflib.get_close_matches(word, list(known), n=3, cutoff=0.6)
    return f"did you mean {' or '.join(_quoted(name) for name in near)}?" if near else ""


def _sentence(detail: ErrorDetails, model: type[BaseModel]) -> str:
    *parents, last = detail["loc"] or ("",)
    owner = _model_at(model, parents)
    key = str(last)
    if detail["type"] == "extra_forbidden":
        known = list(owner.model_fields) if owner else []
        hint = suggestion(key, known) or f"known keys are {', '.join(known)}"
        return f"{_place(parents)}unknown key {_quoted(key)}, {hint}"
    if detail["type"] == "missing":
        return f"{_place(parents)}{_quoted(key)} is missing{_meaning(owner, key)}"
    if detail["type"] == "value_error":
        return f"{_place(detail['loc'])}{_reason(detail)}"
    return f"{_place(detail['loc'])}{_reason(detail)} (found {detail['input']!r})"


def _reason(detail: ErrorDetails) -> str:
    text = detail["msg"].removeprefix("Value error, ")
    return text[:1].lower() + text[1:] if text.startswith(("Input", "Tuple", "Value")) else text


def _place(location: Iterable[int | str]) -> str:
    """``("want", 1, "near")`` as ``want 2: near: ``; lists are counted from one."""
    parts: list[str] = []
    for part in location:
        if isinstance(part, int) and parts:
            parts[-1] += f" {part + 1}"
        elif part != "":
            parts.append(str(part))
    return "".join(f"{part}: " for part in parts)


def _model_at(model: type[BaseModel], location: list[int | str]) -> type[BaseModel] | None:
    """The model that holds the last key of a location."""
    here: type[BaseModel] | None = model
    for part in location:
        if isinstance(part, int) or here is None:
            continue
        field = here.model_fields.get(part)
        here = _inner_model(field.annotation) if field else None
    return here


def _inner_model(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((found for inner in get_args(annotation) if (found := _inner_model(inner))), None)


def _meaning(owner: type[BaseModel] | None, key: str) -> str:
    field = owner.model_fields.get(key) if owner else None
    if field is not None and field.description:
        return f": {field.description}"
    return _MISSING.get(key, "")


_MISSING = {
    "title": ': begin the brief with title = "..."',
    "want": ": give at least one [[want]] with a quantity and a limit",
    "quantity": ': name what is wanted, for example quantity = "absorption_max_nm"',
}


def _quoted(name: str) -> str:
    return f'"{name}"'
