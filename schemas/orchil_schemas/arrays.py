"""Array fields for records: float64 or int64 NumPy arrays with a declared shape, read-only, JSON as nested lists.

A field is written ``positions_angstrom: Annotated[FloatArray, Shape("atoms", 3)]``. Names are free dimensions;
one name has one size inside one record (:class:`orchil_schemas.base.Record` checks that).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import core_schema

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Shape:
    """Shape and number type of an array field: ``Shape("atoms", 3)`` or ``Shape("atoms", number="int")``."""

    dimensions: tuple[str | int, ...]
    number: str = "float"

    def __init__(self, *dimensions: str | int, number: str = "float") -> None:
        object.__setattr__(self, "dimensions", dimensions)
        object.__setattr__(self, "number", number)

    def read(self, value: Any) -> NDArray[Any]:
        """A read-only array of the declared type and rank; ``ValueError`` on a wrong rank, fixed size or NaN."""
        array = np.array(value, dtype=np.float64 if self.number == "float" else np.int64)
        if array.size == 0 and array.ndim < len(self.dimensions):
            array = array.reshape(tuple(0 if isinstance(d, str) else d for d in self.dimensions))
        if array.ndim != len(self.dimensions):
            raise ValueError(f"array of rank {array.ndim}, expected shape {self.dimensions}")
        for size, wanted in zip(array.shape, self.dimensions, strict=True):
            if isinstance(wanted, int) and size != wanted:
                raise ValueError(f"array of shape {array.shape}, expected {self.dimensions}")
        if not np.isfinite(array).all():
            raise ValueError("array holds a NaN or infinite value")
        array.setflags(write=False)
        return array

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        return core_schema.no_info_plain_validator_function(
            self.read,
            serialization=core_schema.plain_serializer_function_ser_schema(lambda array: array.tolist()),
        )

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        item: dict[str, Any] = {"type": "number" if self.number == "float" else "integer"}
        for size in reversed(self.dimensions):
            item = {"type": "array", "items": item}
            if isinstance(size, int):
                item |= {"minItems": size, "maxItems": size}
        return item | {"description": "shape " + " x ".join(str(d) for d in self.dimensions)}
