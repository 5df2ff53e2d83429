"""What a plugin may use, as text: names, signatures, fields. A test compares it with the text kept for the version.

``python -m orchil.plugin_api`` prints it.
"""

from __future__ import annotations

import dataclasses
import inspect
import re
from collections.abc import Iterator
from enum import Enum
from typing import Any

import orchil_schemas
import orchil_schemas.files
import orchil_schemas.panel
import orchil_schemas.program
from orchil_schemas.api import API_VERSION
from pydantic import BaseModel

from . import contract, hookspecs

MODULES = (orchil_schemas, orchil_schemas.panel, orchil_schemas.files, orchil_schemas.program, contract)
"""Public names are those of ``__all__``; where there is none, the classes and functions that the module defines."""

ARRAY = re.compile(r"numpy\.ndarray\[.*?numpy\.(float64|int64)\]\]")


def described() -> str:
    """One line for each thing a plugin may use, sorted, below the version."""
    lines = sorted({line for module in MODULES for line in _module(module)} | set(_hooks()))
    return "\n".join([f"plugin API {API_VERSION}", *lines]) + "\n"


def _hooks() -> Iterator[str]:
    for name, found in vars(hookspecs).items():
        if hasattr(found, f"{hookspecs.PROJECT}_spec"):
            yield f"hook {name}{_signature(found)}"


def _module(module: Any) -> Iterator[str]:
    for name in getattr(module, "__all__", None) or _defined(module):
        found = getattr(module, name)
        where = f"{module.__name__}.{name}"
        yield from _class(where, found) if inspect.isclass(found) else _other(where, found)


def _defined(module: Any) -> list[str]:
    return [
        name
        for name, found in vars(module).items()
        if not name.startswith("_") and getattr(found, "__module__", None) == module.__name__
    ]


def _other(where: str, found: Any) -> Iterator[str]:
    yield f"{where}{_signature(found)}" if inspect.isfunction(found) else f"{where}: {type(found).__name__}"


def _class(where: str, found: type) -> Iterator[str]:
    bases = ", ".join(base.__name__ for base in found.__bases__ if base is not object)
    yield f"{where}({bases})"
    yield from (f"{where}.{line}" for line in _fields(found))
    for name, member in vars(found).items():
        if name.startswith("_") and name not in {"__getitem__", "__init__"}:
            continue
        function = member.__func__ if isinstance(member, classmethod | staticmethod) else member
        if inspect.isfunction(function) and not (name == "__init__" and _has_fields(found)):
            yield f"{where}.{name}{_signature(function)}"
        elif isinstance(member, property):
            yield f"{where}.{name}: property"


def _has_fields(found: type) -> bool:
    return dataclasses.is_dataclass(found) or issubclass(found, BaseModel)


def _fields(found: type) -> Iterator[str]:
    if issubclass(found, BaseModel):
        for name, field in found.model_fields.items():
            yield f"{name}: {_type(field.annotation)}{' (required)' if field.is_required() else ''}"
        yield from (f"quantity {info.name} [{info.unit}]" for info in getattr(found, "offers", ()))
    elif issubclass(found, Enum):
        yield from (member.name for member in found)
    else:
        own = inspect.get_annotations(found)
        yield from (f"{name}: {_type(annotation)}" for name, annotation in own.items() if not name.startswith("_"))


def _signature(function: Any) -> str:
    return str(inspect.signature(function)).replace("'", "")


def _type(annotation: Any) -> str:
    text = annotation if isinstance(annotation, str) else inspect.formatannotation(annotation)
    return ARRAY.sub(r"array of \1", text)  # releases of NumPy write the same array type in different ways


if __name__ == "__main__":
    print(described(), end="")
