"""Names for work: the same stage, version, settings and inputs are the same work, now and later."""

from __future__ import annotations

from collections.abc import Iterable

from orchil_schemas import content_digest

Named = tuple[str, str]
"""(kind, digest) of one record."""


def work_digest(stage: str, version: str, settings_json: str, inputs: Iterable[Named]) -> str:
    """64 hexadecimal digits that name one run of one stage."""
    return content_digest("work", stage, version, settings_json, *_sorted(inputs))


def work_seed(inputs: Iterable[Named]) -> int:
    """A seed from 1 to 2^31 - 1 that depends on the inputs alone, so retries and other settings keep it."""
    return (int(content_digest("seed", *_sorted(inputs))[:8], 16) & 0x7FFFFFFF) or 1


def _sorted(inputs: Iterable[Named]) -> list[str]:
    return sorted(f"{kind}:{digest}" for kind, digest in inputs)
