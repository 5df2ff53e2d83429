"""One set of predictions for the whole session, kept in the cache folder of pytest between sessions."""

from __future__ import annotations

from pathlib import Path

import pytest

from .demo import make_demo_store
from .prediction import Predictor


@pytest.fixture(scope="session")
def predictor(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Predictor:
    """Runs the stages in process; see :mod:`tests.prediction`."""
    cache = getattr(request.config, "cache", None)  # None when the cache plugin is switched off
    folder = cache.mkdir("predictions") if cache else tmp_path_factory.mktemp("predictions")
    return Predictor(folder)


@pytest.fixture(scope="session")
def demo_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A small real night; see :mod:`tests.demo`. Read it, never write it."""
    return make_demo_store(tmp_path_factory.mktemp("demo"))
