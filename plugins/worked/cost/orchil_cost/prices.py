"""Reading a price list: columns ``smiles`` and ``price_per_gram``, in the user's own currency."""

from __future__ import annotations

import csv
from collections.abc import Mapping
from functools import lru_cache
from importlib.resources import files

from orchil_schemas import BadInput

from .routes import key, molar_mass

COLUMNS = ("smiles", "price_per_gram")


def example() -> str:
    """An invented list that goes with the package, to try it with."""
    return files(__package__).joinpath("example_prices.csv").read_text(encoding="utf-8")


@lru_cache(maxsize=4)
def prices_per_mol(text: str) -> Mapping[str, float]:
    """Price of one mol by :func:`key`, the cheapest where several are alike; BadInput names the line."""
    from rdkit import Chem

    rows = csv.DictReader(text.splitlines())
    if not set(COLUMNS) <= set(rows.fieldnames or ()):
        raise BadInput(f"the price list needs the columns {' and '.join(COLUMNS)} in its first line")
    prices: dict[str, float] = {}
    for row in rows:
        name, price = key(row["smiles"]), _number(row["price_per_gram"], rows.line_num)
        mass = molar_mass(Chem.MolFromSmiles(row["smiles"]))
        prices[name] = min(price * mass, prices.get(name, float("inf")))
    return prices


def _number(text: str, line: int) -> float:
    try:
        price = float(text)
    except (TypeError, ValueError):
        price = -1.0
    if not 0 <= price < float("inf"):
        raise BadInput(f'line {line} of the price list: "{text}" is no price per gram')
    return price
