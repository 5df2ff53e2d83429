"""What can end a command early.

::

    OrchilError
    ├── RequestError     what was asked cannot be done: one or more sentences, exit code 2
    └── RunError         the run itself broke: exit code 3

A candidate that fails is neither: it is a row with a reason (:mod:`orchil_schemas.errors`).
"""

from __future__ import annotations


class OrchilError(Exception):
    """Base of the engine's errors."""


class RequestError(OrchilError):
    """A request that cannot be carried out; each problem is a sentence that says what would be right."""

    def __init__(self, *problems: str) -> None:
        super().__init__("\n".join(problems))
        self.problems = problems


class RunError(OrchilError):
    """The run cannot go on: no worker starts, or the store cannot be written."""
