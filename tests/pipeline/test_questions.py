"""Ready-made questions: files with a sentence and parameters, ours and the user's."""

from __future__ import annotations

import pytest
from orchil.errors import RequestError
from orchil.questions import FOLDERS, find, number_or_text, questions, read
from orchil.store import Store


def test_ours_say_what_they_ask_and_use_what_they_declare():
    known = questions()
    assert len(known) >= 10
    for name, one in known.items():
        assert "?" in one.asks, name
        for parameter in one.parameters:
            assert f":{parameter.name}" in one.sql.partition("SELECT")[2], (name, parameter.name)
            assert parameter.meaning, (name, parameter.name)


def test_a_folder_of_the_user_adds_and_replaces(tmp_path, monkeypatch):
    (tmp_path / "mine.sql").write_text("-- How many? All of them.\nSELECT count(*) AS n FROM ranking\n")
    (tmp_path / "picks.sql").write_text("-- Mine instead?\nSELECT 1 AS mine\n")
    monkeypatch.setenv(FOLDERS, str(tmp_path))
    assert find("mine").asks == "How many? All of them."
    assert find("picks").sql.endswith("SELECT 1 AS mine\n")
    assert find(str(tmp_path / "mine.sql")).name == "mine"


def test_parameters_have_defaults_and_only_known_names(tmp_path):
    path = tmp_path / "q.sql"
    path.write_text("-- Which?\n-- :best = 10; how far\n-- :word = a b; text\nSELECT :best, :word\n")
    question = read(path)
    assert question.values({}) == {"best": 10, "word": "a b"}
    assert question.values({"best": "2.5"})["best"] == 2.5
    with pytest.raises(RequestError, match="no parameter worst: it has best, word"):
        question.values({"worst": "1"})


@pytest.mark.parametrize(("text", "value"), [("7", 7), ("7.5", 7.5), ("1e3", 1000.0), ("CCO", "CCO"), ("", "")])
def test_numbers_are_numbers(text, value):
    assert number_or_text(text) == value
    assert type(number_or_text(text)) is type(value)


@pytest.mark.parametrize(
    ("name", "said"),
    [("nothing", "there are cautions"), ("no/where.sql", "cannot be read")],
)
def test_what_is_not_there(name, said):
    with pytest.raises(RequestError, match=said):
        find(name)


def test_faults_of_files_and_folders(tmp_path, monkeypatch):
    (tmp_path / "q.sql").write_text("SELECT 1\n")
    with pytest.raises(RequestError, match="must begin with a comment"):
        read(tmp_path / "q.sql")
    monkeypatch.setenv(FOLDERS, str(tmp_path / "none"))
    with pytest.raises(RequestError, match="which is no folder"):
        questions()


# Functions that plugins lend


def test_functions_in_sql_and_their_complaints(tmp_path):
    from orchil.store import StoreError
    from orchil_schemas.panel import SqlFunction

    def half(value):
        if value == 0:
            raise ValueError("zero has no half here")
        return None if value is None else value / 2

    lent = [SqlFunction("half", 1, half, "half(x)")]
    with Store.open(tmp_path / "s.db", create=True) as store:
        assert store.query("SELECT half(3) AS h, half(NULL) AS n", (), lent)["h"].tolist() == [1.5]
        with pytest.raises(StoreError, match="cannot run: zero has no half here"):
            store.query("SELECT half(0)", (), lent)
        with pytest.raises(StoreError, match="no such function: half"):
            store.query("SELECT half(3)")
