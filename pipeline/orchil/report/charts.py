"""Charts: Vega-Lite specifications drawn as SVG here, without a browser and without a network."""

from __future__ import annotations

import json
from functools import lru_cache
from typing import Any

WIDTH, HEIGHT = 300, 190
INK, GRID = "#1b1f24", "#dfe3e8"
FONT = "DejaVu Sans, Verdana, sans-serif"

CONFIG: dict[str, Any] = {
    "font": FONT,
    "mark": {"aria": False},  # the picture as a whole is described in words
    "background": "transparent",
    "view": {"stroke": "#8a929b"},
    "axis": {
        "aria": False,
        "labelColor": INK,
        "titleColor": INK,
        "gridColor": GRID,
        "domainColor": "#8a929b",
        "tickColor": "#8a929b",
        "labelFontSize": 11,
        "titleFontSize": 11.5,
        "titleFontWeight": "normal",
        "titlePadding": 7,
        "labelOverlap": True,
    },
    "legend": {
        "aria": False,
        "labelColor": INK,
        "titleColor": INK,
        "labelFontSize": 11,
        "titleFontSize": 11.5,
        "orient": "bottom",
    },
}
"""The look of every chart, in the files and in the browser."""


def chart_svg(spec: dict[str, Any]) -> str:
    """The chart as SVG text; ``ValueError`` with what is wrong with the specification."""
    whole = {**spec, "width": WIDTH, "height": HEIGHT, "autosize": {"type": "pad"}}
    return _drawn(json.dumps(whole, sort_keys=True))


@lru_cache(maxsize=512)
def _drawn(spec: str) -> str:
    import vl_convert

    # No address is allowed: a specification may not read files or the network.
    return vl_convert.vegalite_to_svg(spec, config=CONFIG, allowed_base_urls=[])


@lru_cache(maxsize=1)
def library() -> str:
    """Vega, Vega-Lite and Vega-Embed as one script for the browser; BSD-3-Clause."""
    import vl_convert

    return vl_convert.javascript_bundle("window.vegaEmbed = vegaEmbed;")
