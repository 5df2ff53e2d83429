"""Numbers, quantities and wants in words."""

from __future__ import annotations

import math
from dataclasses import dataclass

from orchil_schemas import Brief, Want

_UNITS = ("nm", "ev", "deg", "debye", "angstrom", "g_mol", "per_s", "ns", "cm1", "cm2", "v", "percent", "ma_cm2")
_SPELLED = {"max": "maximum", "min": "minimum", "a": "a*", "b": "b*"}
THIN = "\N{NARROW NO-BREAK SPACE}"
NOISE = 1e-4
"""A number without an interval that is smaller is numerical noise around zero; one with an interval says itself."""
_MINUS = "\N{MINUS SIGN}"
_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


@dataclass(frozen=True)
class Named:
    """A quantity for people: its label, its unit and what it means."""

    name: str
    label: str
    unit: str
    meaning: str

    @property
    def title(self) -> str:
        """Label and unit as an axis or a column has them."""
        return f"{self.label} / {self.unit}" if self.unit else self.label


def named(name: str, unit: str, meaning: str) -> Named:
    """A quantity by its name in briefs."""
    return Named(name, label(name), pretty_unit(unit), meaning)


def label(name: str) -> str:
    """``absorption_max_nm`` as ``absorption maximum``."""
    for unit in _UNITS:
        name = name.removesuffix(f"_{unit}")
    return " ".join(_SPELLED.get(word, word) for word in name.split("_"))


def pretty_unit(unit: str) -> str:
    """``M^-1 cm^-1`` with raised exponents; nothing for the unit 1."""
    if unit == "1":
        return ""
    words = []
    for word in unit.split(" "):
        base, caret, exponent = word.partition("^")
        words.append(base + exponent.translate(_SUPERSCRIPT) if caret else base)
    return " ".join(words)


def number(value: float | None, low: float | None = None, high: float | None = None) -> str:
    """``531 (484-590)``: as many digits as the interval leaves meaning, three where there is none."""
    if value is None or not math.isfinite(value):
        return ""
    if low is None or high is None or not low < high:
        if abs(value) < NOISE:
            return "0"
        if value == round(value) and abs(value) < 1000:
            return _plain(value, 1.0)
        rounded = round(value / _step(abs(value), 3)) * _step(abs(value), 3)
        return _plain(value, _step(abs(rounded), 3))
    step = max(_step((high - low) / 2, 2), _step(max(abs(low), abs(high), abs(value)), 4))
    return f"{_plain(value, step)} ({_plain(low, step)}\N{EN DASH}{_plain(high, step)})"


def _step(size: float, significant: int) -> float:
    """The last decimal place of a number of that size with so many digits."""
    return float(10.0 ** (math.floor(math.log10(size)) - significant + 1)) if size > 0 else 1.0


def _plain(value: float, step: float) -> str:
    """The value rounded to ``step``; very large and very small ones as a power of ten."""
    rounded = round(value / step) * step
    if rounded and not 1e-4 <= abs(rounded) < 1e7:
        power = math.floor(math.log10(abs(rounded)))
        decimals = max(0, power - round(math.log10(step)))
        mantissa = f"{rounded / 10**power:.{decimals}f}".replace("-", _MINUS)
        return f"{mantissa} × 10{str(power).translate(_SUPERSCRIPT)}"
    decimals = max(0, -round(math.log10(step)))
    text = f"{rounded:,.{decimals}f}" if abs(rounded) >= 9999.5 else f"{rounded:.{decimals}f}"
    return text.replace(",", THIN).replace("-", _MINUS)


def percent(probability: float | None) -> str:
    """A probability in whole percent, with a decimal below 1 %."""
    if probability is None:
        return ""
    share = 100 * probability
    return f"{share:.0f}{THIN}%" if share >= 0.95 or share == 0 else f"{share:.1f}{THIN}%"


def limits(want: Want, unit: str) -> str:
    """``between 505 and 565 nm``."""
    tail = f" {unit}" if unit else ""
    if want.near is not None and want.within is not None:
        return f"within {number(want.within)} of {number(want.near)}{tail}"
    low, high = want.limits
    if math.isinf(low):
        return f"at most {number(high)}{tail}"
    if math.isinf(high):
        return f"at least {number(low)}{tail}"
    return f"between {number(low)} and {number(high)}{tail}"


def want_sentence(want: Want, quantity: Named) -> str:
    """One wish of the brief in words."""
    must = "; a must" if want.must else ""
    return f"{quantity.label} {limits(want, quantity.unit)} (weight {number(want.weight)}{must})"


def pick_sentence(brief: Brief) -> str:
    """How many are picked and how different they must be."""
    alike = f"{1 - brief.pick.spread:.3g}"
    return f"Pick {brief.pick.count}, no two of them more alike than {alike} (Tanimoto coefficient)."
