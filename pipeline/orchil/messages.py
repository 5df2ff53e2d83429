"""What the supervisor and its workers say to each other: plain JSON texts, no pickles."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from typing import Any

from typing_extensions import Self

Payload = tuple[str, str]
"""(kind, JSON text) of one record."""


class Message:
    """A dataclass that travels as JSON."""

    def encode(self) -> bytes:
        """The fields as UTF-8 JSON."""
        return json.dumps(asdict(self)).encode()  # type: ignore[call-overload]

    @classmethod
    def decode(cls, data: bytes) -> Self:
        """The message in ``data``; ``ValueError`` or ``TypeError`` when it is not one."""
        fields: dict[str, Any] = json.loads(data)
        return cls(**fields)


@dataclass(frozen=True)
class Setup(Message):
    """First word to a child: where to import from, whose child it is, how much memory it may take."""

    sys_path: list[str]
    parent: int
    memory_bytes: int


@dataclass(frozen=True)
class Task(Message):
    """One run of one stage for one candidate; ``key`` is its work digest, ``scratch`` its private folder."""

    key: str
    stage: str
    settings_json: str
    inputs: list[Payload]
    seed: int
    attempt: int
    time_limit: float
    scratch: str = ""


@dataclass(frozen=True)
class Reply(Message):
    """What came of a task: records, or a reason.

    ``grown_bytes`` is resident memory above that after the first task of the child. ``disturbed`` when the child was
    killed by somebody for no fault of the task, which then begins again as if it had never been begun.
    """

    ok: bool
    records: list[Payload] = field(default_factory=list)
    code: str = ""
    message: str = ""
    recoverable: bool = False
    seconds: float = 0.0
    cpu_seconds: float | None = None
    versions: Mapping[str, str] = field(default_factory=dict)
    grown_bytes: int = 0
    disturbed: bool = False


READY = b"ready"
