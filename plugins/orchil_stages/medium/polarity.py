"""How strongly a medium can orient its molecules around a dipole."""

from __future__ import annotations

from orchil_schemas import Medium

from orchil_stages.optics import solvatochromism


def orientation_polarisability(medium: Medium) -> float:
    """Lippert-Mataga Delta f of a medium; 0 in the gas phase, slightly negative in alkanes."""
    constants = medium.dielectric_constant, medium.refractive_index
    return float(solvatochromism.orientation_polarisability(*constants))
