"""`orchil new-stage`: a small package to begin from."""

from __future__ import annotations

from pathlib import Path

from orchil.scaffold import make_package

from .common import loaded_registry


def run_new_stage(name: str, into: Path) -> None:
    """Write the package and say what to do next."""
    made = make_package(name, into, loaded_registry())
    for path in made.files:
        print(path)
    print(f"\nnow: pip install {_shown(made.folder)}, orchil stages, python -m pytest {_shown(made.folder)}")


def _shown(folder: Path) -> str:
    return str(folder) if folder.is_absolute() else f"./{folder}"
