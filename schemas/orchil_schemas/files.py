"""Files that a setting names: they enter the name of the work by their content, not by their path alone."""

from __future__ import annotations

import hashlib
from pathlib import Path
from typing import Any

from pydantic import Field, model_validator
from typing_extensions import Self

from .base import Frozen
from .errors import BadInput


class InputFile(Frozen):
    """A file named in a brief: ``price_list = "prices.csv"`` under ``[stage.NAME]``.

    The path is made absolute where the brief is read, because workers work in folders of their own. ``sha256`` is
    filled in then; a file that changes afterwards is refused instead of mixing two contents in one store.
    """

    path: str = Field(description="path of the file, relative to where the command is run")
    sha256: str = Field(default="", description="filled in: names the content")

    @model_validator(mode="before")
    @classmethod
    def _from_text(cls, given: Any) -> Any:
        return {"path": given} if isinstance(given, str | Path) else given

    @model_validator(mode="after")
    def _named_by_content(self) -> Self:
        if self.sha256:
            return self
        path = Path(self.path).expanduser().absolute()
        if not path.is_file():
            raise ValueError(f"there is no file {path}")
        self.__dict__.update(path=str(path), sha256=_sha256(path))
        return self

    def read_text(self) -> str:
        """The text (UTF-8); :class:`BadInput` when the file is gone or has changed since the brief was read."""
        path = Path(self.path)
        if not path.is_file() or _sha256(path) != self.sha256:
            raise BadInput(f"{path} is gone or has changed since the screen began: run the command again")
        return path.read_text(encoding="utf-8-sig")


def _sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
