"""The learned correction as two files of the package: half precision and bytes, small enough to ship."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict
from functools import cache
from importlib.resources import as_file, files
from pathlib import Path
from typing import Any

import numpy as np
from scipy.sparse import csr_array

from .correction import Correction, ErrorSize, Head, View
from .kernel import Bands, unit_rows

FOLDER = "trained"
_ARRAYS, _NUMBERS = "points.npz", "numbers.json"
_STEPS = 255.0


@cache
def trained_correction() -> Correction:
    """The correction shipped with the package."""
    with as_file(files(__package__).joinpath(FOLDER)) as folder:
        return load(folder)


def save(correction: Correction, folder: Path, about: Mapping[str, object]) -> None:
    """Write the files; what :func:`load` gives back differs by rounding."""
    folder.mkdir(exist_ok=True)
    points = correction.points
    arrays: dict[str, Any] = {
        "codes": correction.view.codes.astype(np.uint32),
        "indptr": points.environments.indptr.astype(np.uint32),
        "indices": points.environments.indices.astype(np.uint16),
        "data": np.round(points.environments.data * _STEPS).astype(np.uint8),
        "features": points.features.astype(np.float16),
    }
    arrays |= {f"weights_{name}": head.weights.astype(np.float32) for name, head in correction.heads.items()}
    np.savez_compressed(folder / _ARRAYS, **arrays)
    numbers = {
        "about": dict(about),
        "centre": correction.view.centre,
        "scale": correction.view.scale,
        "likeness_edges": correction.likeness_edges,
        "heads": {
            name: {"middle": head.middle, "error": asdict(head.error)} for name, head in correction.heads.items()
        },
    }
    text = json.dumps(numbers, indent=1, default=_rounded)
    (folder / _NUMBERS).write_text(text + "\n", encoding="utf-8")


def load(folder: Path) -> Correction:
    """The correction of a folder."""
    numbers = json.loads((folder / _NUMBERS).read_text(encoding="utf-8"))
    with np.load(folder / _ARRAYS) as kept:
        view = View(kept["codes"].astype(np.int64), np.array(numbers["centre"]), np.array(numbers["scale"]))
        points = _points(kept, len(view.codes))
        heads = {
            name: _head(found, kept[f"weights_{name}"].astype(np.float64)) for name, found in numbers["heads"].items()
        }
    inner, outer = numbers["likeness_edges"]
    return Correction(view, points, heads, (inner, outer))


def rounded(points: Bands) -> Bands:
    """The pseudo-inputs as :func:`load` will give them back: weights are solved for these."""
    environments = points.environments.copy()
    environments.data = np.round(environments.data * _STEPS) / _STEPS
    features = points.features.astype(np.float16).astype(np.float64)
    return Bands(unit_rows(environments), features, np.ones(len(features)))


def _points(kept: Mapping[str, Any], codes: int) -> Bands:
    features = kept["features"].astype(np.float64)
    data = kept["data"].astype(np.float64) / _STEPS
    parts = (data, kept["indices"].astype(np.int32), kept["indptr"].astype(np.int32))
    environments = csr_array(parts, shape=(len(features), 2 * codes))
    return Bands(unit_rows(environments), features, np.ones(len(features)))


def _head(found: Mapping[str, Any], weights: Any) -> Head:
    error = dict(found["error"])
    error |= {name: np.array(error[name]) for name in ("offset", "slope")}
    return Head(found["middle"], weights, ErrorSize(**error))


def _rounded(values: Any) -> list[float]:
    return [float(f"{value:.6g}") for value in np.asarray(values).tolist()]
