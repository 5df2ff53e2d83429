"""Reading the user's list: each kind of file, each kind of bad input."""

from __future__ import annotations

import pytest
from orchil.errors import RequestError
from orchil.library import read


def rows(tmp_path, text, name="list.csv", encoding="utf-8"):
    path = tmp_path / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode(encoding))
    return list(read(path))


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_encodings_and_delimiters(tmp_path, encoding, delimiter, line_end):
    lines = [["Name", "SMILES", "Solvent", "Charge", "batch"], ["Grün", "CCO", "water", "-1", "x"]]
    text = line_end.join(delimiter.join(cells) for cells in lines) + line_end
    (row,) = rows(tmp_path, text, encoding=encoding)
    assert (row.name, row.structure, row.medium, row.charge) == ("Grün", "CCO", "water", -1)
    assert row.extra == {"batch": "x"}
    assert row.error is None


@pytest.mark.parametrize("header", ["ID,Structure", "identifier,smiles", "CODE,SMILES", " name , Smiles "])
def test_headers_go_by_common_names(tmp_path, header):
    (row,) = rows(tmp_path, f"{header}\na,CC\n")
    assert (row.name, row.structure) == ("a", "CC")


def test_a_list_of_smiles_alone_gets_names_by_row(tmp_path):
    found = rows(tmp_path, "smiles\nC\n\nCC")
    assert [(row.row_number, row.name, row.structure) for row in found] == [
        (1, "row-1", "C"),
        (2, "row-2", "CC"),
    ]


AWKWARD = ['a"b', "a,b", "a\nb", "<b>bold</b>", "[red]x", "=1+1", "'", "ünïcode", "x" * 5000]


@pytest.mark.parametrize("name", AWKWARD)
def test_awkward_names_survive(tmp_path, name):
    quoted = '"' + name.replace('"', '""') + '"'
    found = rows(tmp_path, f"id,smiles\n{quoted},CC\nnext,CCC\n")
    assert [row.name for row in found] == [name, "next"]
    assert [row.structure for row in found] == ["CC", "CCC"]


def test_repeated_names_are_kept_apart_unless_the_medium_differs(tmp_path):
    text = "id,smiles,medium\na,C,\na,CC,\na (2),CCC,\na,C,water\na,CCCC,\n"
    found = rows(tmp_path, text)
    assert [row.name for row in found] == ["a", "a (2)", "a (2) (2)", "a", "a (3)"]
    assert [bool(row.note) for row in found] == [False, True, True, False, True]


@pytest.mark.parametrize(
    ("line", "part"),
    [
        ("a,,0", "no structure"),
        ("a,  ,0", "no structure"),
        ("a,CC", "2 cells, the header 3"),
        ("a,CC,0,more", "4 cells, the header 3"),
        ("a,CC,x", 'charge "x" is no whole number'),
        ("a,CC,0.5", "no whole number"),
        ("a,CC,nan", "no whole number"),
        ("a,CC,1e9", "no whole number"),
        (",,", "no structure"),
    ],
)
def test_a_bad_row_carries_its_error_and_hurts_no_other(tmp_path, line, part):
    found = rows(tmp_path, f"id,smiles,charge\nfirst,C,0\n{line}\nlast,CC,1\n")
    assert [row.row_number for row in found] == [1, 2, 3]
    assert part in found[1].error
    assert [row.error for row in (found[0], found[2])] == [None, None]


@pytest.mark.parametrize(
    ("text", "charge"),
    [("+1", 1), ("1+", 1), ("2-", -2), ("-", -1), ("\N{MINUS SIGN}1", -1), ("1.0", 1), ("", None)],
)
def test_charges_as_people_write_them(tmp_path, text, charge):
    (row,) = rows(tmp_path, f"smiles,charge\nC,{text}\n")
    assert (row.charge, row.error) == (charge, None)


@pytest.mark.parametrize(
    ("content", "part"),
    [
        (b"", "is empty"),
        (b" \n\n", "is empty"),
        (b"id,smiles\n", "no candidates"),
        (b"id,colour\na,red\n", 'call one column "smiles"'),
        (b"CCO\nCCC\n", 'call one column "smiles"'),
        (b"PK\x03\x04spreadsheet", "save the list as CSV"),
        (b"id,smiles\n\x00\x01", "no text file"),
        ("id,smiles\na,C\n".encode("utf-16-le"), "no text file"),
        (b'id,smiles\na,"CC\nb,CC\n', "row 1 never ends"),
    ],
)
def test_unusable_files_say_what_would_be_right(tmp_path, content, part):
    with pytest.raises(RequestError, match=part) as caught:
        rows(tmp_path, content)
    assert "\n" not in str(caught.value)
    assert "list.csv" in str(caught.value)


def test_missing_file_and_folder(tmp_path):
    with pytest.raises(RequestError, match="check the path"):
        list(read(tmp_path / "none.csv"))
    with pytest.raises(RequestError, match="is a folder"):
        list(read(tmp_path))


def test_smi(tmp_path):
    found = rows(tmp_path, "CCO ethanol, pure\nC\tmethane\n\nCC\n", "list.smi")
    assert [(row.structure, row.name) for row in found] == [
        ("CCO", "ethanol, pure"),
        ("C", "methane"),
        ("CC", "row-3"),
    ]


# Layout of a mol block and of data items as in the CTfile formats document (BIOVIA, 2020), from memory.
MOLBLOCK = "methane\n  made by hand\n\n  1  0  0  0  0  0  0  0  0  0999 V2000\n    0.0 0.0 0.0 C   0  0\nM  END\n"


def test_sdf(tmp_path):
    fields = "> <ID>\nm-1\n\n> 25 <Solvent> (3)\nwater\n\n> <CHARGE>\n-1\n\n> <NOTE>\ntwo\nlines\n\n"
    text = MOLBLOCK + fields + "$$$$\n" + MOLBLOCK + "$$$$\nbroken\n\n$$$$\n" + MOLBLOCK
    first, second, third, last = rows(tmp_path, text, "list.sdf")
    assert (first.name, first.medium, first.charge) == ("m-1", "water", -1)
    assert first.extra == {"NOTE": "two\nlines"}
    assert first.structure == MOLBLOCK
    assert first.format == "molblock"
    assert (second.name, second.error) == ("methane", None)
    assert "M  END" in third.error
    assert last.name == "methane (2)"


def test_the_physics_of_a_row_leaves_its_name_out(tmp_path):
    one, other = rows(tmp_path, "id,smiles\na,CC\nb,CC\n")
    assert one.row == other.row
