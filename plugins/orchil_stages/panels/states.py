"""Panel: every computed state as a line of the spectrum."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from orchil_schemas import HC_EV_NM, Band, FloatArray, Record, Transitions
from orchil_schemas.panel import Chart, Part, Subject

from .spectrum import BLUE


class StatesPanel:
    """Oscillator strengths of all states, before the correction of the position."""

    name = "states"
    title = "Computed states"
    place = 60
    needs: tuple[type[Record], ...] = (Transitions, Band)

    def parts(self, subject: Subject) -> Iterable[Part]:
        """One chart."""
        found, state = subject[Transitions], subject[Band].state
        wavelength = HC_EV_NM / found.energy_ev
        yield Chart(
            spec=_spec(wavelength, found.oscillator_strength, state),
            alt=f"{len(wavelength)} states between {wavelength.min():.0f} and {wavelength.max():.0f} nm; "
            f"state {state + 1} is reported, oscillator strength {found.oscillator_strength[state]:.2f}.",
            caption="Straight from the response Hamiltonian, without the correction after it. "
            "Filled circle: the reported state.",
        )


def _spec(wavelength: FloatArray, strength: FloatArray, state: int) -> dict[str, object]:
    rows = [
        {"nm": round(float(x), 1), "f": round(float(y), 4), "zero": 0, "reported": at == state}
        for at, (x, y) in enumerate(zip(wavelength, strength, strict=True))
    ]
    ends = [float(np.floor(wavelength.min() / 50) * 50 - 10), float(np.ceil(wavelength.max() / 50) * 50 + 10)]
    x = {"field": "nm", "type": "quantitative", "title": "wavelength / nm", "scale": {"domain": ends, "nice": False}}
    y = {"field": "f", "type": "quantitative", "title": "oscillator strength / 1"}
    fill = {"condition": {"test": "datum.reported", "value": BLUE}, "value": "white"}
    line = {"mark": {"type": "rule", "color": BLUE}, "encoding": {"x": x, "y": y, "y2": {"field": "zero"}}}
    mark = {"type": "point", "stroke": BLUE, "size": 50, "opacity": 1}
    return {"data": {"values": rows}, "layer": [line, {"mark": mark, "encoding": {"x": x, "y": y, "fill": fill}}]}
