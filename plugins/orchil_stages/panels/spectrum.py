"""Panel: the absorption spectrum with what is not known about it, and the windows the brief asks for."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
from orchil_schemas import Anchor, Band, FloatArray, Record, Transitions
from orchil_schemas.panel import Chart, Fact, Facts, Part, Subject

BLUE, SHADE, WINDOW = "#0b5394", "#9fc5e8", "#b7791f"
_POINTS = 111
_WINDOWS = ("absorption_max_nm", "strongest_absorption_max_nm")


class SpectrumPanel:
    """Molar absorptivity against wavelength."""

    name = "spectrum"
    title = "Absorption spectrum"
    place = 20
    needs: tuple[type[Record], ...] = (Band, Transitions)

    def parts(self, subject: Subject) -> Iterable[Part]:
        """One chart, and the reported band in numbers."""
        band = band_now(subject)
        windows = [want.limits for want in subject.brief.want if want.quantity in _WINDOWS]
        yield _chart(band, subject[Transitions], windows)
        yield Facts(facts=_facts(band))


def band_now(subject: Subject) -> Band:
    """The band where measurements of relatives have moved it to; as it was predicted where there are none."""
    anchor = subject.get(Anchor)
    moved: dict[str, float] = {}
    for change in anchor.changes if anchor is not None else ():
        stem = change.quantity.removesuffix("_max_nm")
        moved |= {change.quantity: change.after_nm}
        moved |= {f"{stem}_low_nm": change.after_low_nm, f"{stem}_high_nm": change.after_high_nm}
    return subject[Band].model_copy(update=moved)


def _facts(band: Band) -> tuple[Fact, ...]:
    emission = Fact(
        label="emission maximum",
        value=band.emission_max_nm,
        unit="nm",
        low=band.emission_low_nm,
        high=band.emission_high_nm,
    )
    return (
        Fact(
            label="absorption maximum",
            value=band.absorption_max_nm,
            unit="nm",
            low=band.absorption_low_nm,
            high=band.absorption_high_nm,
        ),
        Fact(
            label="molar absorptivity",
            value=band.molar_absorptivity,
            unit="M^-1 cm^-1",
            low=band.molar_absorptivity_low,
            high=band.molar_absorptivity_high,
        ),
        Fact(label="full width at half maximum", value=band.width_ev, unit="eV"),
        Fact(label="oscillator strength", value=band.oscillator_strength),
        *((emission,) if band.emission_max_nm is not None else ()),
        Fact(label="computed before the correction", value=band.physics_absorption_max_nm, unit="nm"),
        Fact(label="against the dyes it was trained on", text=band.trust),
    )


def _chart(band: Band, transitions: Transitions, windows: list[tuple[float, float]]) -> Chart:
    wavelength = _wavelengths(band, windows)
    middle, low, high = curves(band, transitions, wavelength)
    rows = [
        {"nm": round(float(x), 1), "eps": round(float(y)), "low": round(float(a)), "high": round(float(b))}
        for x, y, a, b in zip(wavelength, middle, low, high, strict=True)
    ]
    x = _across("nm", wavelength)
    percent = f"{100 * band.coverage:.0f} %"
    layers: list[dict[str, Any]] = [
        *_window_layers(windows, wavelength),
        {"mark": {"type": "area", "color": SHADE, "opacity": 0.75}, "encoding": _area(x)},
        {"mark": {"type": "line", "color": BLUE, "strokeWidth": 2}, "encoding": {"x": x, "y": _axis("eps")}},
    ]
    return Chart(
        spec={"data": {"values": rows}, "layer": layers},
        alt=_in_words(band, wavelength) + "".join(f" Wanted {_said(window)}." for window in windows),
        caption=(
            f"Line: most likely spectrum. Shade: at each wavelength, where the curve lies with {percent} probability."
            + (" Dashed edges: the wanted window of the maximum." if windows else "")
        ),
    )


def _in_words(band: Band, wavelength: FloatArray) -> str:
    return (
        f"Absorption spectrum from {wavelength[0]:.0f} to {wavelength[-1]:.0f} nm; the reported band at "
        f"{band.absorption_max_nm:.0f} nm, between {band.absorption_low_nm:.0f} and {band.absorption_high_nm:.0f} nm "
        f"with a probability of {100 * band.coverage:.0f} %."
    )


def _across(field: str, wavelength: FloatArray) -> dict[str, Any]:
    """Every layer has the same domain, or the widest would win."""
    scale = {"domain": [float(wavelength[0]), float(wavelength[-1])], "nice": False, "zero": False}
    return {"field": field, "type": "quantitative", "title": "wavelength / nm", "scale": scale}


def _axis(field: str) -> dict[str, Any]:
    title = "molar absorptivity / M⁻¹ cm⁻¹"
    return {"field": field, "type": "quantitative", "title": title, "axis": {"format": "~s", "tickCount": 5}}


def _area(x: dict[str, Any]) -> dict[str, Any]:
    return {"x": x, "y": _axis("low"), "y2": {"field": "high"}}


def _window_layers(windows: list[tuple[float, float]], wavelength: FloatArray) -> list[dict[str, Any]]:
    """A pale bar and dashed edges; an open side ends at the side of the chart."""
    left, right = float(wavelength[0]), float(wavelength[-1])
    bars = [{"from": max(low, left), "to": min(high, right)} for low, high in windows]
    edges = [{"nm": edge} for window in windows for edge in window if left <= edge <= right]
    bar = {
        "data": {"values": bars},
        "mark": {"type": "rect", "color": WINDOW, "opacity": 0.16},
        "encoding": {"x": _across("from", wavelength), "x2": {"field": "to"}},
    }
    edge = {
        "data": {"values": edges},
        "mark": {"type": "rule", "color": WINDOW, "strokeDash": [5, 3], "strokeWidth": 1.5},
        "encoding": {"x": _across("nm", wavelength)},
    }
    return ([bar] if bars else []) + ([edge] if edges else [])


def _said(window: tuple[float, float]) -> str:
    low, high = window
    if np.isinf(low):
        return f"at most {high:g} nm"
    return f"at least {low:g} nm" if np.isinf(high) else f"between {low:g} and {high:g} nm"


def _wavelengths(band: Band, windows: list[tuple[float, float]]) -> FloatArray:
    """From the ultraviolet to beyond the band, its interval and the windows."""
    ends = [edge for window in windows for edge in window if np.isfinite(edge)]
    left = min(300.0, band.absorption_low_nm - 60, *(edge - 20 for edge in ends))
    right = max(650.0, band.absorption_high_nm + 90, *(edge + 20 for edge in ends))
    return np.linspace(max(left, 200.0), min(right, 2500.0), _POINTS)


def curves(
    band: Band, transitions: Transitions, wavelength_nm: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Most likely spectrum and, point by point, the ends of its interval (points,); M^-1 cm^-1.

    All bands move together by the shifts that the interval of the reported one allows, and scale with its absorptivity.
    """
    from orchil_stages.spectrum.lines import band_lines
    from orchil_stages.spectrum.spread import possible

    lines, could = band_lines(band, transitions), possible(band)
    moved = lines.at(wavelength_nm, could.shift_ev)
    every = (moved[:, None, :] * could.factor[None, :, None]).reshape(-1, len(wavelength_nm))
    tail = (1 - could.coverage) / 2
    low, high = np.quantile(every, [tail, 1 - tail], axis=0)
    return lines.at(wavelength_nm), low, high
