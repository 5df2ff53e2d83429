"""The one error of the store, and errors of the database in plain words."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager

import sqlalchemy as sa

from orchil.errors import OrchilError


class StoreError(OrchilError):
    """The store cannot do what was asked; the message is one sentence that says what would be right."""


# What SQLite says, and what to tell the user. First match wins.
_ADVICE = (
    ("file is not a database", "is not an Orchil store: it is some other kind of file"),
    ("malformed", "is damaged: restore a copy, or start a new store"),
    ("readonly", "is read-only: check the permissions of the file and its folder"),
    ("unable to open", "cannot be opened: check that the folder exists and may be written"),
    ("disk is full", "cannot grow, the disk is full: free some space and run the same command again"),
    ("locking protocol", "is on a disk that cannot lock files: keep the store on a local disk"),
    ("disk i/o error", "cannot be read or written there: keep the store on a local disk, and check the disk"),
    ("database is locked", "is being written by another program: wait for it to finish, then try again"),
)


def in_plain_words(place: object, error: BaseException) -> StoreError:
    """A :class:`StoreError` about the store at ``place`` for an error of the database."""
    said = str(getattr(error, "orig", None) or error)
    advice = next((advice for sign, advice in _ADVICE if sign in said.lower()), f"failed: {said}")
    return StoreError(f"{place} {advice}")


@contextmanager
def plain_errors(place: object) -> Iterator[None]:
    """Turn errors of the database inside the block into :class:`StoreError`."""
    try:
        yield
    except (sa.exc.DBAPIError, sqlite3.Error) as error:
        raise in_plain_words(place, error) from error
