"""`orchil stages` and `orchil check`."""

from __future__ import annotations

import json
import sys
import time
from collections.abc import Iterable, Iterator
from pathlib import Path

from orchil_schemas import Availability, Brief, Check, CheckResult, LibraryRow, LibraryStage, Stage
from pydantic import BaseModel

from orchil import briefs
from orchil.chain import Kind, offered
from orchil.errors import RequestError
from orchil.explain import as_text, explained
from orchil.explain_svg import as_svg
from orchil.registry import Registry, availability
from orchil.supervisor import ONE_THREAD

from . import BROKE, DONE
from .common import loaded_registry
from .tables import console, table


def run_stages(quantities: bool, schema: Path | None) -> None:
    """List stages or quantities, or write schemas."""
    registry = loaded_registry()
    if schema is not None:
        _write_schemas(registry, schema)
    elif quantities:
        infos = offered(registry).values()
        rows = [(info.name, info.unit, info.meaning) for info in infos]
        console().print(table(["quantity", "unit", "meaning"], rows))
    else:
        headers = ["stage", "version", "needs", "makes", "usable", "from"]
        console().print(table(headers, [_stage_row(stage, registry) for stage in _all_stages(registry)]))


def run_explain(brief_path: Path | None, svg: Path | None) -> None:
    """Draw the chain of a brief, or the chain as it is when nothing is wanted."""
    registry = loaded_registry()
    brief = None if brief_path is None else briefs.load(brief_path)
    chain = explained(registry, brief)
    print(as_text(chain, registry))
    if svg is not None:
        _write(svg, as_svg(chain, registry))


def run_check() -> int:
    """Report what is installed and run the checks of the plugins; returns the exit code."""
    registry = loaded_registry()
    rows = [*_found_rows(registry), *_check_rows(registry.checks)]
    rows += [("setting", f"workers run with {name}", "ok", value) for name, value in ONE_THREAD.items()]
    console().print(table(["kind", "what", "result", "detail"], rows))
    bad = bool(registry.problems) or any(row[2] != "ok" for row in rows)
    print("not ready: see above" if bad else "ready", file=sys.stderr)
    return BROKE if bad else DONE


def _all_stages(registry: Registry) -> list[Stage | LibraryStage]:
    return [*registry.stages.values(), *registry.library_stages.values()]


def _stage_row(stage: Stage | LibraryStage, registry: Registry) -> tuple[str, ...]:
    needs = _names(stage.needs) if isinstance(stage, Stage) else "the whole library"
    usable = _usable(availability(stage))
    return stage.name, stage.version, needs, _names(stage.makes), usable, registry.sources[stage.name]


def _names(kinds: Iterable[Kind]) -> str:
    return ", ".join(kind.kind for kind in kinds)


def _usable(found: Availability) -> str:
    return "yes" if found.ok else f"no: {found.hint}"


def _found_rows(registry: Registry) -> Iterator[tuple[str, str, str, str]]:
    for stage in _all_stages(registry):
        found = availability(stage)
        versions = ", ".join(f"{name} {version}" for name, version in found.versions.items())
        yield "stage", stage.name, "ok" if found.ok else "missing", versions if found.ok else found.hint


def _check_rows(checks: Iterable[Check]) -> Iterator[tuple[str, str, str, str]]:
    for check in checks:
        began = time.monotonic()
        result = _result(check)
        detail = f"{result.detail} ({time.monotonic() - began:.1f} s)"
        yield "check", check.name, "ok" if result.ok else "failed", detail


def _result(check: Check) -> CheckResult:
    try:
        return check.run()
    except Exception as error:
        return CheckResult(False, f"{type(error).__name__}: {error}")


def _write_schemas(registry: Registry, folder: Path) -> None:
    kinds: dict[str, Kind] = {kind.kind: kind for stage in _all_stages(registry) for kind in stage.makes}
    models: dict[str, type[BaseModel]] = {**kinds, LibraryRow.kind: LibraryRow, "brief": Brief}
    for name, model in models.items():
        _write(folder / f"{name}.schema.json", json.dumps(model.model_json_schema(), indent=2) + "\n")
    print(f"{len(models)} schemas in {folder}", file=sys.stderr)


def _write(path: Path, text: str) -> None:
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    except OSError as error:
        raise RequestError(f"{path} cannot be written: {error.strerror}") from error
