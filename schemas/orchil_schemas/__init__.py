"""The contracts of Orchil: frozen records with units, the brief, the library row, the stage protocol.

Knows neither the engine nor any chemistry library.
"""

from .arrays import FloatArray, IntArray, Shape
from .base import Frozen, Quantity, QuantityInfo, Record, canonical_json, content_digest
from .brief import Brief, Pick, Want
from .errors import BadInput, BadResult, NotConverged, OutOfScope, StageError, TopologyChanged
from .records import (
    HC_EV_NM,
    Band,
    Conformers,
    Geometry,
    Identity,
    IntakeNotes,
    LibraryRow,
    Medium,
    Orbitals,
    Score,
    Transitions,
    WantResult,
    all_records,
)
from .stage import (
    Availability,
    Check,
    CheckResult,
    Column,
    Context,
    Inputs,
    LibraryStage,
    LibraryTable,
    NoSettings,
    Stage,
)

__all__ = [
    "HC_EV_NM",
    "Availability",
    "BadInput",
    "BadResult",
    "Band",
    "Brief",
    "Check",
    "CheckResult",
    "Column",
    "Conformers",
    "Context",
    "FloatArray",
    "Frozen",
    "Geometry",
    "Identity",
    "Inputs",
    "IntArray",
    "IntakeNotes",
    "LibraryRow",
    "LibraryStage",
    "LibraryTable",
    "Medium",
    "NoSettings",
    "NotConverged",
    "Orbitals",
    "OutOfScope",
    "Pick",
    "Quantity",
    "QuantityInfo",
    "Record",
    "Score",
    "Shape",
    "Stage",
    "StageError",
    "TopologyChanged",
    "Transitions",
    "Want",
    "WantResult",
    "all_records",
    "canonical_json",
    "content_digest",
]
