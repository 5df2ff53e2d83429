"""Why a stage can fail for one candidate.

::

    StageError                   a typed reason; the candidate fails, the night goes on
    ├── BadInput                 the row itself cannot be used (never retried)
    ├── OutOfScope               a valid row this stage does not handle (metals, radicals, too large; never retried)
    ├── NotConverged             an iteration gave up (recoverable: retried once with attempt = 2)
    ├── BadResult                the numbers that came back are impossible (recoverable)
    └── TopologyChanged          a relaxation broke or made bonds (recoverable)

The engine adds the reasons it sees from outside: ``timeout``, ``crashed``, ``out_of_memory``, ``unexpected``.
"""

from __future__ import annotations

from typing import ClassVar


class StageError(Exception):
    """A failure with a reason code; ``recoverable`` ones are tried once more with ``context.attempt == 2``."""

    code: ClassVar[str] = "stage_error"
    recoverable: ClassVar[bool] = False

    def __init__(self, message: str, *, code: str | None = None) -> None:
        super().__init__(message)
        self.reason_code = code or self.code


class BadInput(StageError):
    """The row cannot be used: unparsable structure, impossible valence, contradicting charge."""

    code = "bad_input"


class OutOfScope(StageError):
    """A valid row that this stage does not handle; the message says what it does handle."""

    code = "out_of_scope"


class NotConverged(StageError):
    """An embedding, self-consistent field, relaxation or eigenvalue search gave up."""

    code = "not_converged"
    recoverable = True


class BadResult(StageError):
    """Numbers came back that cannot be right (NaN, wrong net charge, no gap)."""

    code = "bad_result"
    recoverable = True


class TopologyChanged(StageError):
    """The relaxed structure is another molecule than the one asked for."""

    code = "topology_changed"
    recoverable = True
