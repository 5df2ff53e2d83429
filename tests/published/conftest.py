"""Predictions for the comparison with published facts: the stages run as in a screen, with more states."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path

import orchil_stages
import pytest

from tests.prediction import Prediction, Predictor

ROOM = Path(orchil_stages.__file__).parent
TRAINED = (ROOM / "excite" / "trained.json", ROOM / "calibrate" / "trained" / "numbers.json")


@pytest.fixture(scope="session")
def predict(predictor: Predictor) -> Callable[[str, str], Prediction]:
    """``predict(smiles, medium)`` -> identity, geometry, orbitals, transitions, band."""
    _require(TRAINED[0])
    return predictor


@pytest.fixture(scope="session")
def predict_many(predictor: Predictor) -> Callable[[Iterable[tuple[str, str]]], list[Prediction]]:
    """``predict_many(pairs)`` -> the predictions in order, made by two processes where there are many."""
    for path in TRAINED:
        _require(path)
    return predictor.many


def _require(path: Path) -> None:
    if not path.exists():
        pytest.fail(f"{path.parent.name}/{path.name} is missing: python -m orchil_stages.training makes it")
