"""Structures in two dimensions, and the most alike of a list."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from orchil_schemas.panel import Drawing, Finding

from .structures import fingerprint, molecule

_WIDTH, _HEIGHT = 320, 220


class RdkitStructures:
    """Drawings and likeness from RDKit."""

    def drawing(self, smiles: str) -> Drawing | None:
        """The structure in black on nothing, so that it prints; None for what cannot be read."""
        found = molecule(smiles)
        return None if found is None else Drawing(svg=_svg(found), alt=f"structure {smiles}")

    def nearest(self, smiles: str, among: Sequence[str], count: int) -> Sequence[Finding]:
        """The most alike of the list; equal structures, the one asked about among them, are left out."""
        from rdkit.DataStructs import BulkTanimotoSimilarity

        ours = fingerprint(smiles)
        if ours is None:
            return []
        prints = [(at, fingerprint(one)) for at, one in enumerate(among) if one and one != smiles]
        known = [(at, one) for at, one in prints if one is not None]
        likeness = BulkTanimotoSimilarity(ours, [one for _, one in known])
        ranked = sorted(zip(likeness, (at for at, _ in known), strict=True), key=lambda pair: (-pair[0], pair[1]))
        return [Finding(at=at, similarity=alike) for alike, at in ranked[:count]]


def _svg(found: object) -> str:
    from rdkit.Chem.Draw import rdMolDraw2D

    drawer = rdMolDraw2D.MolDraw2DSVG(_WIDTH, _HEIGHT)
    options: Any = drawer.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False
    options.bondLineWidth = 1.6
    options.padding = 0.04
    options.fixedBondLength = 26
    options.annotationFontScale = 0.6
    rdMolDraw2D.PrepareAndDrawMolecule(drawer, found)
    drawer.FinishDrawing()
    return str(drawer.GetDrawingText())
