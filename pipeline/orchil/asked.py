"""Stages that run on request: too dear for every candidate, so that a brief must ask for them.

A stage says ``on_request = True``. A brief asks by a table ``[stage.<name>]`` (an empty one will do), by ``[use]``, or
by wanting a quantity that the stage offers.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from orchil_schemas import Brief


def asked_for(stages: Iterable[Any], brief: Brief) -> list[Any]:
    """The stages without those on request that nothing in the brief asks for."""
    return [stage for stage in stages if not getattr(stage, "on_request", False) or _asks(brief, stage)]


def with_stage(brief: Brief, name: str) -> Brief:
    """The brief, asking for one more stage."""
    return brief.model_copy(update={"stage": {name: {}, **brief.stage}})


def _asks(brief: Brief, stage: Any) -> bool:
    offers = {info.name for kind in stage.makes for info in kind.offers}
    named = stage.name in brief.stage or stage.name in brief.use.values()
    return named or any(want.quantity in offers for want in brief.want)
