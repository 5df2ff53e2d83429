"""Words, safe drawings, safe data: what every page is made of."""

from __future__ import annotations

import json
from xml.etree import ElementTree

import pytest
from orchil.cli.formats import defused
from orchil.report.page import inline_script, script_json
from orchil.report.safe_svg import UnsafeSvgError, safe_svg
from orchil.report.words import label, limits, number, percent, pretty_unit
from orchil_schemas import Want

NARROW = "\N{NARROW NO-BREAK SPACE}"


# As many digits as the interval leaves meaning: two in its half-width (common practice for uncertainties; GUM,
# JCGM 100:2008, 7.2.6), three where there is no interval.
@pytest.mark.parametrize(
    ("value", "low", "high", "text"),
    [
        (531.23, 484.06, 589.85, "531 (484–590)"),
        (72032.6, 28011.2, 151308.0, f"72{NARROW}000 (28{NARROW}000–151{NARROW}000)"),
        (0.83164, 0.80123, 0.87881, "0.832 (0.801–0.879)"),
        (-1.2345, -1.5, -1.0, "−1.23 (−1.50–−1.00)"),
        (2.3701, None, None, "2.37"),
        (25.0, None, None, "25"),
        (0.99998, None, None, "1.00"),
        (72032.6, None, None, f"72{NARROW}000"),
        (0.0, None, None, "0"),
        (1.5e-7, None, None, "0"),
        (1.52e-16, 1.1e-16, 2.0e-16, "1.52 × 10⁻¹⁶ (1.10 × 10⁻¹⁶–2.00 × 10⁻¹⁶)"),
        (2.34e8, 2.0e8, 3.1e8, "2.34 × 10⁸ (2.00 × 10⁸–3.10 × 10⁸)"),
        (None, None, None, ""),
        (float("nan"), None, None, ""),
    ],
)
def test_numbers(value, low, high, text):
    assert number(value, low, high) == text


@pytest.mark.parametrize(
    ("probability", "text"),
    [(0.594, "59"), (1.0, "100"), (0.0, "0"), (0.0123, "1"), (0.004, "0.4")],
)
def test_percent(probability, text):
    assert percent(probability) == f"{text}{NARROW}%"


def test_words_of_quantities_and_wants():
    assert label("absorption_max_nm") == "absorption maximum"
    assert label("molar_mass_g_mol") == "molar mass"
    assert pretty_unit("M^-1 cm^-1") == "M⁻¹ cm⁻¹"
    assert pretty_unit("1") == ""
    assert limits(Want(quantity="x", between=(505, 565)), "nm") == "between 505 and 565 nm"
    assert limits(Want(quantity="x", near=610, within=20), "nm") == "within 20 of 610 nm"
    assert limits(Want(quantity="x", at_most=12), "") == "at most 12"


# Drawings

HEAD = '<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" width="20px" height="10px">'
HOSTILE = [
    "<script>alert(1)</script>",
    '<g onclick="alert(1)"><path d="M0,0"/></g>',
    '<a xlink:href="javascript:alert(1)"><path d="M0,0"/></a>',
    "<foreignObject><div xmlns='http://www.w3.org/1999/xhtml'>x</div></foreignObject>",
    '<image xlink:href="http://example.invalid/x.png"/>',
    '<use xlink:href="http://example.invalid/x.svg#a"/>',
    "<style>* { background: url(http://example.invalid/) }</style>",
    '<rect fill="url(http://example.invalid/#a)" width="1" height="1"/>',
    '<rect style="fill:url( //example.invalid/x )" width="1" height="1"/>',
    '<animate attributeName="href" to="javascript:alert(1)"/>',
]


@pytest.mark.parametrize("inside", HOSTILE)
def test_nothing_that_acts_or_loads_is_kept(inside):
    made = safe_svg(f"{HEAD}{inside}<circle r='1'/></svg>", "a-")
    kept = ElementTree.fromstring(made)
    assert any(one.tag.endswith("circle") for one in kept.iter())
    for word in ("script", "alert", "invalid", "onclick", "href", "foreignObject", "style"):
        assert word not in made, made


@pytest.mark.parametrize("text", ["", "no svg", "<html/>", '<!DOCTYPE x [<!ENTITY a "b">]>' + HEAD + "&a;</svg>"])
def test_what_is_no_drawing_is_refused(text):
    with pytest.raises(UnsafeSvgError):
        safe_svg(text, "a-")


def test_ids_are_made_unlike_and_the_picture_scales():
    clip = "<defs><clipPath id='c'><rect width='1.23456' height='1'/></clipPath></defs>"
    text = f"{HEAD}{clip}<g clip-path='url(#c)'/></svg>"
    made = safe_svg(text, "g7-")
    assert 'id="g7-c"' in made
    assert "url(#g7-c)" in made
    assert "1.23456" not in made
    root = ElementTree.fromstring(made)
    assert root.get("viewBox") == "0 0 20 10"
    assert root.get("width") is None


def test_text_in_a_drawing_stays_text():
    made = safe_svg(f"{HEAD}<text>&lt;script&gt;</text></svg>", "a-")
    assert "&lt;script&gt;" in made


# Data and scripts inside a page


@pytest.mark.parametrize("text", ["</script><script>alert(1)</script>", "<!--", "]]>", "a & b", "\u2028"])
def test_data_cannot_leave_its_element(text):
    made = str(script_json({"name": text}))
    assert not set("<>&\u2028") & set(made)
    assert json.loads(made) == {"name": text}


def test_a_script_cannot_end_its_own_element():
    assert "</script" not in inline_script('x = "</script><!--"')


# Cells of a sheet: characters that begin a formula, after OWASP "CSV Injection" (from memory).
@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "\r=1", "\n=1", " =1", "＝1"])
def test_formulas_are_defused(text):
    assert defused(text) == f"'{text}"


@pytest.mark.parametrize("value", ["a=1", "", 5, -5, None, "name"])
def test_other_cells_stay(value):
    assert defused(value) == value
