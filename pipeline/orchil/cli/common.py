"""What several commands need: the plugins, and sentences on stderr."""

from __future__ import annotations

import sys
from collections.abc import Iterable

from orchil.registry import Registry

from .tables import cell_text


def loaded_registry() -> Registry:
    """All plugins; those left out are named on stderr."""
    registry = Registry.load()
    remark(map(str, registry.problems))
    return registry


def remark(sentences: Iterable[str]) -> None:
    """Each sentence on a line of stderr."""
    for sentence in sentences:
        print(f"orchil: {cell_text(sentence)}", file=sys.stderr)
