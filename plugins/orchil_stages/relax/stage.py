"""The stage `relax`: Identity, Medium, Conformers -> Geometry."""

from __future__ import annotations

from collections.abc import Iterable
from importlib.metadata import PackageNotFoundError, version

from orchil_schemas import (
    Availability,
    Conformers,
    Context,
    Frozen,
    Geometry,
    Identity,
    Inputs,
    Medium,
    Record,
)

from .settings import RelaxSettings


class Relax:
    """Relaxes every conformer it is given and keeps the lowest; see :mod:`.relaxation`."""

    name = "relax"
    version = "2"
    needs: tuple[type[Record], ...] = (Identity, Medium, Conformers)
    makes: tuple[type[Record], ...] = (Geometry,)
    Settings: type[Frozen] = RelaxSettings
    time_limit_seconds = 600.0

    def found(self) -> Availability:
        """Is a GFN2-xTB engine installed?"""
        from orchil_stages.ground_state import engine_names

        names = engine_names()
        if not names:
            return Availability(ok=False, hint="pip install xtb (CPython before 3.12) or tblite")
        try:
            return Availability(ok=True, versions={name: version(name) for name in (*names[:1], "scipy")})
        except PackageNotFoundError as error:
            return Availability(ok=False, hint=f"pip install {error.name}")

    def run(self, inputs: Inputs, settings: RelaxSettings, context: Context) -> Iterable[Record]:
        """One Geometry; NotConverged, BadResult or TopologyChanged when no conformer gives one."""
        from .relaxation import relax_lowest

        yield relax_lowest(
            inputs[Conformers],
            inputs[Identity],
            inputs[Medium].solvation,
            settings,
            attempt=context.attempt,
        )
