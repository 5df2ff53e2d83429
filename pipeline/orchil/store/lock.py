"""One coordinator at a time: an exclusive lock that the operating system releases even after kill -9."""

from __future__ import annotations

import fcntl
import os
import socket
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import sqlalchemy as sa

from .errors import StoreError
from .location import Location

_SERVER_LOCK = int.from_bytes(b"orchil", "big")


@contextmanager
def coordinator_lock(location: Location, engine: sa.Engine) -> Iterator[None]:
    """Hold the store for one coordinator; :class:`StoreError` names the process that has it."""
    held = _file_lock(location.lock_path, location) if location.lock_path else _server_lock(engine, location)
    with held:
        yield


@contextmanager
def _file_lock(path: Path, location: Location) -> Iterator[None]:
    try:
        descriptor = os.open(path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC, 0o644)
    except OSError as error:
        raise StoreError(f"{location} cannot be locked: {error.strerror} ({path.name} beside it)") from error
    try:
        _take(descriptor, location)
        os.ftruncate(descriptor, 0)
        os.pwrite(descriptor, f"process {os.getpid()} on {socket.gethostname()}".encode(), 0)
        yield
    finally:
        # The file stays: removing it would let a third process lock a new file beside a waiting second one.
        os.close(descriptor)


def _take(descriptor: int, location: Location) -> None:
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        holder = os.pread(descriptor, 200, 0).decode(errors="replace") or "another process"
        raise StoreError(f"{location} is in use by {holder}: wait for it, stop it, or use another store") from None


@contextmanager
def _server_lock(engine: sa.Engine, location: Location) -> Iterator[None]:
    with engine.connect() as connection:
        if not connection.scalar(sa.select(sa.func.pg_try_advisory_lock(_SERVER_LOCK))):
            raise StoreError(f"{location} is in use by another coordinator: wait for it or use another database")
        connection.commit()
        try:
            yield
        finally:
            connection.execute(sa.select(sa.func.pg_advisory_unlock(_SERVER_LOCK)))
            connection.commit()
