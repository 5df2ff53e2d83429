"""The pages of the report, live over a running night: loopback only, read-only, behind a random token."""

from .app import make_app
from .run import run_server

__all__ = ["make_app", "run_server"]
