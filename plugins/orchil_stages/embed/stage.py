"""The stage `embed`: Identity -> Conformers."""

from __future__ import annotations

from collections.abc import Iterable
from importlib.metadata import PackageNotFoundError, version

from orchil_schemas import Availability, Conformers, Context, Frozen, Identity, Inputs, Record

from .settings import EmbedSettings


class Embed:
    """Makes three-dimensional starting structures from the canonical SMILES; see :mod:`.ladder`."""

    name = "embed"
    version = "3"
    needs: tuple[type[Record], ...] = (Identity,)
    makes: tuple[type[Record], ...] = (Conformers,)
    Settings: type[Frozen] = EmbedSettings
    time_limit_seconds = 120.0

    def found(self) -> Availability:
        """Is RDKit installed?"""
        try:
            return Availability(ok=True, versions={"rdkit": version("rdkit")})
        except PackageNotFoundError:
            return Availability(ok=False, hint="pip install rdkit")

    def run(self, inputs: Inputs, settings: EmbedSettings, context: Context) -> Iterable[Record]:
        """One Conformers record; NotConverged (code "no_3d") when every rung of the ladder fails."""
        from .ladder import embed_structures

        identity = inputs[Identity]
        yield embed_structures(identity.smiles, settings, seed=context.seed, deadline=context.deadline)
