"""SVG that came from a library or a plugin, made safe to stand in a page, smaller, and with ids of its own.

Only shapes, text, groups, gradients and clip paths are kept, with attributes that draw. Scripts, links, event
handlers, foreign content and references to anything outside the picture are left out.
"""

from __future__ import annotations

import re
from xml.etree import ElementTree

_SVG = "{http://www.w3.org/2000/svg}"
_ELEMENTS = {
    *("svg", "g", "path", "rect", "circle", "ellipse", "line", "polyline", "polygon", "text", "tspan", "title"),
    *("desc", "defs", "clipPath", "linearGradient", "radialGradient", "stop"),
}
_ATTRIBUTES = {
    *("d", "x", "y", "x1", "y1", "x2", "y2", "cx", "cy", "r", "rx", "ry", "dx", "dy", "points", "width", "height"),
    *("viewBox", "transform", "fill", "stroke", "opacity", "id", "clip-path", "offset", "stop-color", "stop-opacity"),
    *("fill-opacity", "fill-rule", "stroke-width", "stroke-opacity", "stroke-linecap", "stroke-linejoin"),
    *("stroke-dasharray", "stroke-dashoffset", "stroke-miterlimit", "font-family", "font-size", "font-weight"),
    *("font-style", "text-anchor", "dominant-baseline", "gradientUnits", "clipPathUnits", "clip-rule"),
}
_DEFAULTS = {
    *(("fill-rule", "evenodd"), ("stroke-linecap", "butt"), ("stroke-linejoin", "miter"), ("stroke-opacity", "1")),
    *(("fill-opacity", "1"), ("opacity", "1"), ("stroke-dasharray", ""), ("stroke-dashoffset", "0")),
}
_LONG_DECIMAL = re.compile(r"(-?\d+\.\d{2})\d+")
_LOCAL = re.compile(r"url\(\s*['\"]?#([\w.-]+)['\"]?\s*\)")
_OUTSIDE = re.compile(r"url\(\s*['\"]?(?!#)|javascript:|expression\(", re.IGNORECASE)

ElementTree.register_namespace("", _SVG[1:-1])


class UnsafeSvgError(ValueError):
    """The text is no SVG, or one with a document type of its own."""


def safe_svg(text: str, prefix: str) -> str:
    """The picture as SVG without an XML header; ids begin with ``prefix``. :class:`UnsafeSvgError` on no SVG.

    Width and height are left out of the outermost element in favour of its viewBox, so that it scales.
    """
    if "<!DOCTYPE" in text or "<!ENTITY" in text:
        raise UnsafeSvgError("an SVG with a document type is not shown")
    try:
        root = ElementTree.fromstring(text.encode())
    except (ElementTree.ParseError, LookupError):
        try:
            root = ElementTree.fromstring(re.sub(r"^<\?xml[^>]*\?>", "", text))
        except ElementTree.ParseError as error:
            raise UnsafeSvgError(f"no SVG: {error}") from error
    if root.tag != f"{_SVG}svg":
        raise UnsafeSvgError("no SVG: its outermost element is another one")
    _fit(root)
    _clean(root, prefix)
    return ElementTree.tostring(root, encoding="unicode")


def _fit(root: ElementTree.Element) -> None:
    width, height = (root.attrib.pop(side, "300").removesuffix("px") for side in ("width", "height"))
    root.attrib.setdefault("viewBox", f"0 0 {width} {height}")


def _clean(element: ElementTree.Element, prefix: str) -> None:
    for child in list(element):
        if not isinstance(child.tag, str) or child.tag.removeprefix(_SVG) not in _ELEMENTS:
            element.remove(child)
        else:
            _clean(child, prefix)
            child.tail = None
    element.attrib = dict(_attributes(element, prefix))
    if element.tag.removeprefix(_SVG) not in {"text", "tspan", "title", "desc"}:
        element.text = None


def _attributes(element: ElementTree.Element, prefix: str) -> list[tuple[str, str]]:
    styles = [part.partition(":") for part in element.attrib.pop("style", "").split(";")]
    found = {**element.attrib, **{name.strip(): value.strip() for name, _, value in styles}}
    kept = [
        (name, value)
        for name, value in found.items()
        if name in _ATTRIBUTES and (name, value) not in _DEFAULTS and not _OUTSIDE.search(value)
    ]
    return [(name, _local(name, _LONG_DECIMAL.sub(r"\1", value), prefix)) for name, value in kept]


def _local(name: str, value: str, prefix: str) -> str:
    return prefix + value if name == "id" else _LOCAL.sub(rf"url(#{prefix}\1)", value)
