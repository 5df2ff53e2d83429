"""Is what a stage depends on installed, and in which version? Imports none of it."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version

from orchil_schemas import Availability


def availability(*distributions: str) -> Availability:
    """Versions of the distributions that are here, and how to install those that are not."""
    found = {name: _version(name) for name in distributions}
    missing = [name for name, number in found.items() if not number]
    versions = {name: number for name, number in found.items() if number}
    return Availability(ok=not missing, versions=versions, hint="; ".join(f"pip install {m}" for m in missing))


def _version(distribution: str) -> str:
    try:
        return version(distribution)
    except PackageNotFoundError:
        return ""
