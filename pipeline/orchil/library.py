"""Reads the user's list of candidates: delimited text, ``.smi`` or ``.sdf``, in common encodings, row by row.

A row that cannot be used comes out with ``error`` set; a file that cannot be used is a :class:`RequestError`.
No chemistry happens here: structures stay text.
"""

from __future__ import annotations

import codecs
import csv
import io
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TextIO

from orchil_schemas import MEASURED, LibraryRow

from .errors import RequestError

SYNONYMS = {
    "name": (
        "id",
        "name",
        "identifier",
        "code",
        "candidate",
        "compound",
        "compound_id",
        "compound id",
        "title",
    ),
    "structure": ("smiles", "structure", "canonical_smiles", "isomeric_smiles", "canonical smiles"),
    "medium": ("medium", "solvent"),
    "charge": ("charge", "net charge", "net_charge", "total charge", "total_charge"),
    "measured_absorption_max_nm": ("measured_absorption_max_nm", "measured absorption max nm"),
    "measured_emission_max_nm": ("measured_emission_max_nm", "measured emission max nm"),
}
MEASURABLE = tuple(meaning for meaning in SYNONYMS if meaning.startswith(MEASURED))
MEASURED_LIMITS_NM = 100.0, 5000.0
DELIMITERS = ",;\t|"
CELL_LIMIT = 10_000_000
SENTINEL = "\x1eend of library\x1e"
CHUNK = 1 << 20


@dataclass(frozen=True)
class ParsedRow:
    """One row of the library; ``row_number`` counts data from 1; ``error`` says why it cannot be used.

    ``measured`` holds the user's own values by the name of the predicted quantity.
    """

    row_number: int
    name: str
    structure: str
    format: str = "smiles"
    medium: str | None = None
    charge: int | None = None
    extra: dict[str, str] = field(default_factory=dict)
    measured: dict[str, float] = field(default_factory=dict)
    error: str | None = None
    note: str | None = None

    @property
    def row(self) -> LibraryRow:
        """The part that enters the physics."""
        return LibraryRow(structure=self.structure, format=self.format, medium=self.medium, charge=self.charge)


def read(path: Path) -> Iterator[ParsedRow]:
    """The rows of a library file in order, names made unique; :class:`RequestError` if it is unusable."""
    encoding = _encoding(path)
    with path.open(encoding=encoding, newline="") as lines:
        rows = _reader(path)(lines, path.name)
        count = 0
        for row in _unique(rows):
            count += 1
            yield row
    if not count:
        raise RequestError(f"{path.name} holds no candidates: put one per row under the header")


def _reader(path: Path) -> Callable[[TextIO, str], Iterator[ParsedRow]]:
    readers = {".smi": _smi, ".smiles": _smi, ".sdf": _sdf, ".sd": _sdf, ".mol": _sdf}
    return readers.get(path.suffix.lower(), _table)


def _unique(rows: Iterable[ParsedRow]) -> Iterator[ParsedRow]:
    """Fill missing names, number repeated ones; one name in two media stays as it is."""
    seen: set[tuple[str, str | None]] = set()
    counts: dict[tuple[str, str | None], int] = {}
    for row in rows:
        name = wanted = row.name or f"row-{row.row_number}"
        while (name, row.medium) in seen:
            counts[wanted, row.medium] = counts.get((wanted, row.medium), 1) + 1
            name = f"{wanted} ({counts[wanted, row.medium]})"
        seen.add((name, row.medium))
        note = f'the name "{wanted}" is used more than once in the library' if name != wanted else None
        yield replace(row, name=name, note=note) if (name, note) != (row.name, row.note) else row


# Encoding


def _encoding(path: Path) -> str:
    if path.is_dir():
        raise RequestError(f"{path} is a folder: name the library file inside it")
    try:
        with path.open("rb") as file:
            return _encoding_of(file, path.name)
    except FileNotFoundError:
        raise RequestError(f"there is no library {path}: check the path") from None
    except OSError as error:
        raise RequestError(f"the library {path} cannot be read: {error.strerror}") from error


def _encoding_of(file: io.BufferedReader, name: str) -> str:
    head = file.peek(4)
    if not head.strip():
        raise RequestError(f'{name} is empty: a header with a "smiles" column and one candidate per row are needed')
    if head.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        return "utf-16"
    if b"\0" in head or head.startswith((b"PK\x03\x04", b"\xd0\xcf\x11\xe0", b"\x1f\x8b", b"%PDF")):
        raise RequestError(f"{name} is no text file: save the list as CSV (UTF-8), .smi or .sdf")
    decoder = codecs.getincrementaldecoder("utf-8")()
    try:
        while chunk := file.read(CHUNK):
            decoder.decode(chunk)
        decoder.decode(b"", final=True)
    except UnicodeDecodeError:
        return "latin-1"
    return "utf-8-sig"


# Delimited text


def _table(lines: TextIO, file_name: str) -> Iterator[ParsedRow]:
    csv.field_size_limit(CELL_LIMIT)
    header_line = next((line for line in lines if line.strip()), "")
    delimiter = _delimiter(header_line)
    header = [cell.strip() for cell in next(csv.reader([header_line], delimiter=delimiter))]
    columns = _columns(header, file_name)
    for number, cells in enumerate(_cells(lines, delimiter, file_name), 1):
        yield _table_row(number, cells, header, columns)


def _cells(lines: Iterable[str], delimiter: str, file_name: str) -> Iterator[list[str]]:
    """Rows of cells, blank lines left out; a quote that is never closed is an error of the file."""
    reader = csv.reader(_with_sentinel(lines), delimiter=delimiter)
    row = 0
    try:
        for cells in reader:
            if cells == [SENTINEL]:
                return
            row += bool(cells)
            if cells and SENTINEL in cells[-1]:
                raise RequestError(f"{file_name}: a quoted cell in row {row} never ends: close its quotation mark")
            if cells:
                yield cells
    except csv.Error as error:
        raise RequestError(f"{file_name}: row {row + 1} cannot be read ({error}): look for a stray quote") from error


def _with_sentinel(lines: Iterable[str]) -> Iterator[str]:
    last = "\n"
    for line in lines:
        last = line
        yield line
    if not last.endswith(("\n", "\r")):
        yield "\n"
    yield SENTINEL


def _delimiter(header_line: str) -> str:
    """The delimiter that finds a structure column and the most columns."""

    def worth(delimiter: str) -> tuple[bool, int]:
        cells = next(csv.reader([header_line], delimiter=delimiter), [])
        return any(_meaning(cell) == "structure" for cell in cells), len(cells)

    return max(DELIMITERS, key=worth)


def _meaning(cell: str) -> str | None:
    text = cell.strip().lower()
    return next((meaning for meaning, words in SYNONYMS.items() if text in words), None)


def _columns(header: list[str], file_name: str) -> dict[str, int]:
    """Positions of the columns with a meaning; a second column of one meaning stays an extra one."""
    columns: dict[str, int] = {}
    for position, cell in enumerate(header):
        meaning = _meaning(cell)
        if meaning:
            columns.setdefault(meaning, position)
    if "structure" not in columns:
        found = ", ".join(f'"{cell[:40]}"' for cell in header[:12])
        raise RequestError(f'{file_name} has no structure column (found {found}): call one column "smiles"')
    return columns


def _table_row(number: int, cells: list[str], header: list[str], columns: dict[str, int]) -> ParsedRow:
    named = {meaning: cells[at].strip() for meaning, at in columns.items() if at < len(cells)}
    taken = set(columns.values())
    extra = {
        title or f"column {at + 1}": cell
        for at, (title, cell) in enumerate(zip(header, cells, strict=False))
        if at not in taken
    }
    return _row(number, named, extra, "smiles", _cell_count_error(len(cells), len(header)))


def _cell_count_error(found: int, expected: int) -> str | None:
    if found == expected:
        return None
    more = "a cell that holds the delimiter must be quoted" if found > expected else "fill up the empty cells"
    return f"the row has {found} cells, the header {expected}: {more}"


def _row(number: int, named: dict[str, str], extra: dict[str, str], kind: str, error: str | None) -> ParsedRow:
    """A row from texts by meaning; the first fault is its error."""
    charge, charge_error = _charge(named.get("charge", ""))
    measured, measured_error = _measured(named)
    structure = named.get("structure", "")
    missing = None if structure.strip() else "the row has no structure: a SMILES is needed"
    return ParsedRow(
        row_number=number,
        name=named.get("name", ""),
        structure=structure,
        format=kind,
        medium=named.get("medium") or None,
        charge=charge,
        extra=extra,
        measured=measured,
        error=error or missing or charge_error or measured_error,
    )


def _charge(text: str) -> tuple[int | None, str | None]:
    """A whole number as people write charges: -1, +1, 1+, 2-, 1.0; or a sentence why not."""
    if not text:
        return None, None
    plain = text.strip().replace("\N{MINUS SIGN}", "-")
    if plain[-1:] in ("+", "-"):
        plain = plain[-1] + (plain[:-1] or "1")
    try:
        value = float(plain)
        if value.is_integer() and abs(value) < 1000:
            return int(value), None
    except ValueError:
        pass
    return None, f'the charge "{text[:40]}" is no whole number: write for example -1, 0 or 1'


def _measured(named: dict[str, str]) -> tuple[dict[str, float], str | None]:
    """Measured values by the name of the predicted quantity, and a sentence about the first that cannot be used."""
    values: dict[str, float] = {}
    for meaning in MEASURABLE:
        text = named.get(meaning, "").strip()
        value = _wavelength(text)
        if value is not None:
            values[meaning.removeprefix(MEASURED)] = value
        elif text:
            low, high = MEASURED_LIMITS_NM
            return {}, (
                f'{meaning} "{text[:40]}" is no wavelength in nm from {low:g} to {high:g}: '
                "write one number, for example 532, or leave the cell empty"
            )
    return values, None


def _wavelength(text: str) -> float | None:
    """Nanometres as people write them: 532, 532.5, 532,5, 532 nm."""
    plain = text.lower().removesuffix("nm").strip().replace(",", ".")
    try:
        value = float(plain)
    except ValueError:
        return None
    low, high = MEASURED_LIMITS_NM
    return value if low <= value <= high else None


# .smi


def _smi(lines: TextIO, file_name: str) -> Iterator[ParsedRow]:
    number = 0
    for line in lines:
        structure, _, name = line.strip().replace("\t", " ").partition(" ")
        if not structure or (number == 0 and structure.lower() == "smiles"):
            continue
        number += 1
        yield _row(number, {"structure": structure, "name": name.strip()}, {}, "smiles", None)


# .sdf


def _sdf(lines: TextIO, file_name: str) -> Iterator[ParsedRow]:
    for number, block in enumerate(_sdf_blocks(lines), 1):
        yield _sdf_row(number, block)


def _sdf_blocks(lines: Iterable[str]) -> Iterator[list[str]]:
    block: list[str] = []
    for raw in lines:
        line = raw.rstrip("\r\n")
        if line.startswith("$$$$"):
            yield block
            block = []
        else:
            block.append(line)
    if any(line.strip() for line in block):
        yield block


def _sdf_row(number: int, block: list[str]) -> ParsedRow:
    end = next((at for at, line in enumerate(block) if line.split() == ["M", "END"]), None)
    error = 'the record has no "M  END" line: export the structure again' if end is None else None
    molblock = "\n".join(block[: (end + 1 if end is not None else len(block))]) + "\n"
    named = {"structure": molblock, "name": block[0].strip() if block else ""}
    extra: dict[str, str] = {}
    for title, value in _sdf_fields(block[end + 1 :] if end is not None else []):
        meaning = _meaning(title)
        if meaning in ("name", "medium", "charge", *MEASURABLE):
            named[meaning] = value
        else:
            extra[title] = value
    return _row(number, named, extra, "molblock", error)


def _sdf_fields(lines: list[str]) -> Iterator[tuple[str, str]]:
    """(name, text) of the data fields after a mol block: ``> <NAME>``, lines, a blank line."""
    title: str | None = None
    value: list[str] = []
    for line in [*lines, ""]:
        if title is None and line.startswith(">") and "<" in line:
            title, value = line[line.index("<") + 1 : line.rindex(">")], []
        elif title is not None and line.strip():
            value.append(line)
        elif title is not None:
            yield title, "\n".join(value)
            title = None
