"""What every record is: frozen, strict about its fields, identified by its content."""

from __future__ import annotations

import hashlib
import json
from functools import cached_property
from typing import Any, ClassVar

from pydantic import BaseModel, ConfigDict, model_validator
from typing_extensions import Self

from .arrays import Shape


class Frozen(BaseModel):
    """A frozen model that refuses unknown fields; base of records, settings and parts of them."""

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True, allow_inf_nan=False)


class Quantity(Frozen):
    """One number a brief can want: value in ``unit`` with a central interval of probability ``coverage``.

    ``low`` and ``high`` are None for a number whose uncertainty is not known; a want on it is then met or not.
    """

    name: str
    value: float
    unit: str
    low: float | None = None
    high: float | None = None
    coverage: float = 0.9


class QuantityInfo(Frozen):
    """What a quantity is, for `orchil stages`, the manual and the checking of briefs."""

    name: str
    unit: str
    meaning: str


class Record(Frozen):
    """One thing a stage makes for one candidate.

    Equal content means equal record: ``digest`` is the SHA-256 of the kind and the canonical JSON of all fields.
    Arrays with dimensions of one name must agree in size.
    """

    kind: ClassVar[str]
    offers: ClassVar[tuple[QuantityInfo, ...]] = ()

    @model_validator(mode="after")
    def _sizes_agree(self) -> Self:
        sizes: dict[str, int] = {}
        for name, field in type(self).model_fields.items():
            shape = next((m for m in field.metadata if isinstance(m, Shape)), None)
            if shape is None:
                continue
            for dimension, size in zip(shape.dimensions, getattr(self, name).shape, strict=True):
                if isinstance(dimension, str) and sizes.setdefault(dimension, size) != size:
                    raise ValueError(f"{name}: dimension '{dimension}' is {size}, elsewhere {sizes[dimension]}")
        return self

    @cached_property
    def canonical_json(self) -> str:
        """The fields as JSON with sorted keys and shortest exact floats; NaN is refused."""
        return canonical_json(self.model_dump(mode="json"))

    @cached_property
    def digest(self) -> str:
        """64 hexadecimal digits that name this content."""
        return content_digest(self.kind, self.canonical_json)

    def quantities(self) -> tuple[Quantity, ...]:
        """The numbers of this record that briefs can want; names are among ``offers``."""
        return ()

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Record) and self.digest == other.digest

    def __hash__(self) -> int:
        return hash(self.digest)


def canonical_json(value: Any) -> str:
    """JSON text that is equal for equal content: sorted keys, no spaces, NaN refused (``ValueError``)."""
    return json.dumps(value, sort_keys=True, separators=(",", ":"), allow_nan=False, ensure_ascii=False)


def content_digest(*parts: str) -> str:
    """SHA-256 over the parts with their lengths, so that no two lists of parts run together."""
    digest = hashlib.sha256()
    for part in parts:
        data = part.encode()
        digest.update(str(len(data)).encode() + b":" + data)
    return digest.hexdigest()
