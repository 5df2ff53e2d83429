"""The store: one database that keeps the library, finished work, and the ranking people query."""

from .errors import StoreError
from .rows import (
    AttemptRow,
    Batch,
    CandidateOutcome,
    CandidatePage,
    CandidateRow,
    CandidateState,
    ScreenInfo,
    WorkRow,
)
from .store import Store

__all__ = [
    "AttemptRow",
    "Batch",
    "CandidateOutcome",
    "CandidatePage",
    "CandidateRow",
    "CandidateState",
    "ScreenInfo",
    "Store",
    "StoreError",
    "WorkRow",
]
