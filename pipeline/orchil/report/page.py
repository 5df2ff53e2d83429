"""Templates: HTML with everything escaped, and data for scripts that cannot end its own element."""

from __future__ import annotations

import json
from functools import lru_cache
from pathlib import Path
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from .candidate import AMONG
from .charts import CONFIG

_HERE = Path(__file__).parent
ASSETS = _HERE / "assets"
SCRIPTS = ("start.js", "strip.js", "space.js", "table.js", "compare.js", "plot.js", "run.js")


@lru_cache(maxsize=1)
def environment() -> Environment:
    """The templates; an undefined name is an error."""
    made = Environment(
        loader=FileSystemLoader(_HERE / "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    made.filters["json"] = script_json
    made.filters["json_attribute"] = json.dumps
    made.globals["among"] = AMONG
    return made


def script_json(value: Any) -> Markup:
    """JSON to stand inside a script element: no text in it can end the element or begin a comment."""
    text = json.dumps(value, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return Markup(text.translate(_ESCAPES))


_ESCAPES = {ord(sign): f"\\u{ord(sign):04x}" for sign in "<>&\u2028\u2029"}


def inline_script(text: str) -> str:
    """A script to stand inside its element: what would end it is written another way."""
    return text.replace("</script", "<\\/script").replace("</SCRIPT", "<\\/SCRIPT").replace("<!--", "<\\!--")


@lru_cache(maxsize=1)
def style() -> str:
    """The style sheet of every page."""
    return (ASSETS / "page.css").read_text(encoding="utf-8")


@lru_cache(maxsize=1)
def script() -> str:
    """The script of every page, in one function of its own."""
    parts = [(ASSETS / name).read_text(encoding="utf-8") for name in SCRIPTS]
    return inline_script('(function () {\n"use strict";\n' + "\n".join(parts) + "\n})();")


def page_data(night: Any, **more: Any) -> dict[str, Any]:
    """What the script must know about a night."""
    wants = [
        {"quantity": want.quantity, "from": _finite(want.limits[0]), "to": _finite(want.limits[1])}
        for want in night.screen.brief.want
    ]
    quantities = [
        {"name": one.name, "label": one.label, "unit": one.unit, "title": one.title, "meaning": one.meaning}
        for one in night.quantities.values()
    ]
    return {"quantities": quantities, "wanted": night.wanted, "wants": wants, "chart": CONFIG, **more}


def _finite(edge: float) -> float | None:
    return None if abs(edge) == float("inf") else edge
