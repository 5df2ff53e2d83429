"""One set of predictions for the whole session, kept in the cache folder of pytest between sessions."""

from __future__ import annotations

import pytest

from .prediction import Predictor


@pytest.fixture(scope="session")
def predictor(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Predictor:
    """Runs the stages in process; see :mod:`tests.prediction`."""
    cache = getattr(request.config, "cache", None)  # None when the cache plugin is switched off
    folder = cache.mkdir("predictions") if cache else tmp_path_factory.mktemp("predictions")
    return Predictor(folder)
