"""Every fault in a brief is a sentence that names the file and the key."""

from __future__ import annotations

import pytest
from orchil.briefs import load
from orchil.errors import RequestError

GOOD = 'title = "t"\n[[want]]\nquantity = "strength"\nat_least = 3\n'


def brief(tmp_path, text):
    path = tmp_path / "brief.toml"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return load(path)


def test_a_good_brief(tmp_path):
    assert brief(tmp_path, GOOD).want[0].limits == (3, float("inf"))
    assert brief(tmp_path, b"\xef\xbb\xbf" + GOOD.encode()).title == "t"


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        (GOOD.replace("at_least", "at_leest"), 'want 1: unknown key "at_leest", did you mean "at_least"'),
        (GOOD + "[pick]\ncuont = 3\n", 'pick: unknown key "cuont", did you mean "count"?'),
        ("wants = 1\n" + GOOD, 'unknown key "wants", did you mean "want"?'),
        ("xyz = 1\n" + GOOD, 'unknown key "xyz", known keys are title, medium'),
        (GOOD.replace('title = "t"', ""), '"title" is missing: begin the brief with title'),
        ('title = "t"\n', '"want" is missing: give at least one [[want]]'),
        (GOOD.replace('quantity = "strength"', ""), 'want 1: "quantity" is missing'),
        (GOOD.replace("at_least = 3", "between = [5, 2]"), "want 1: between: between = [5, 2] is empty"),
        (GOOD.replace("at_least = 3", ""), "want 1: give exactly one of between"),
        (GOOD + "at_most = 4\n", "want 1: give exactly one of between"),
        (GOOD.replace("= 3", '= "40k"'), "want 1: at_least: input should be a valid number"),
        (GOOD.replace("at_least = 3", "near = 3"), "want 1: near and within go together"),
        (GOOD + "weight = 0\n", "want 1: weight: input should be greater than 0 (found 0)"),
        (GOOD + "[pick]\ncount = 0\n", "pick: count: input should be greater than or equal to 1"),
        ("title = \n", "not valid TOML"),
        (b"title = '\xff'", "not UTF-8"),
    ],
)
def test_faults_name_their_key(tmp_path, text, sentence):
    with pytest.raises(RequestError) as caught:
        brief(tmp_path, text)
    assert str(caught.value).startswith("brief.toml")
    assert sentence in str(caught.value)


def test_every_fault_is_told(tmp_path):
    with pytest.raises(RequestError) as caught:
        brief(tmp_path, GOOD.replace("at_least", "at_leest") + "[pick]\ncuont = 3\n")
    assert len(caught.value.problems) == 2


def test_missing_brief_and_folder(tmp_path):
    with pytest.raises(RequestError, match="check the path"):
        load(tmp_path / "none.toml")
    with pytest.raises(RequestError, match="is a folder"):
        load(tmp_path)
