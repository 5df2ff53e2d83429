"""`orchil stages --explain`: the resolved chain as text and as a picture."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree

import pytest
from orchil import cli
from orchil.chain import resolve
from orchil.explain import as_text, explained
from orchil.explain_svg import as_svg
from orchil.registry import EXTRA_PLUGINS, Registry
from orchil_schemas import LibraryRow

from .conftest import BRIEF, FAKE_PLUGIN
from .test_chain import A, B, C, brief, registry, stage

SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture
def three():
    made = registry(
        stage("both", (LibraryRow,), (A, B)),
        stage("other", (LibraryRow,), (A,)),
        stage("user", (A, B), (C,)),
        stage("lame <&>", (A,), (Missing,), ok=False),
    )
    return made, resolve(made, brief(use={"a": "other"}))


class Missing(A):
    kind = "missing"
    offers = ()


def test_text_says_from_whom_each_need_comes_and_what_is_left_out(three):
    made, chain = three
    assert as_text(chain, made).splitlines() == [
        "for each candidate, in this order:",
        "  1   both 1 (test)",
        "        <- library_row (the library)",
        "        -> b, a (not used: other makes it)",
        "  2 * other 1 (test)",
        "        <- library_row (the library)",
        "        -> a",
        "  3   user 1 (test)",
        "        <- a (other), b (both)",
        "        -> c",
        "* leads to what is wanted: where it fails, the candidate has failed",
        "left out:",
        "    stage lame <&> (test) is not usable here: install the part",
    ]


def test_a_chain_can_be_explained_without_a_brief(three):
    assert [step.essential for step in explained(three[0], None).steps] == [False]
    assert "choose with [use] a" in as_text(explained(three[0], None), three[0])


def test_the_picture_has_a_row_for_each_stage_and_a_dot_for_each_make_and_use(three):
    made, chain = three
    picture = ElementTree.fromstring(as_svg(chain, made))
    boxes = [one for one in picture.iter(f"{SVG}rect") if "box" in one.get("class", "")]
    assert len(boxes) == 1 + len(chain.steps)
    assert sum(one.get("class") == "box wanted" for one in boxes) == 2
    dots = [one.get("class") for one in picture.iter(f"{SVG}circle")]
    assert dots.count("made") == 1 + sum(len(step.gives) for step in chain.steps)
    assert dots.count("used") == sum(len(step.stage.needs) for step in chain.steps)
    texts = [one.text for one in picture.iter(f"{SVG}text")]
    assert {"library_row", "a", "b", "c", "both 1 (test)"} <= set(texts)
    assert "left out: stage lame <&> (test) is not usable here: install the part" in texts


def test_every_dot_lies_on_the_row_of_its_stage(three):
    made, chain = three
    picture = ElementTree.fromstring(as_svg(chain, made))
    boxes = [one for one in picture.iter(f"{SVG}rect") if "box" in one.get("class", "")]
    middles = {round(float(one.get("y")) + float(one.get("height")) / 2, 1) for one in boxes}
    assert {float(one.get("cy")) for one in picture.iter(f"{SVG}circle")} <= middles
    _, _, width, height = map(float, picture.get("viewBox").split())
    assert all(
        0 < float(one.get("cx")) < width and 0 < float(one.get("cy")) < height for one in picture.iter(f"{SVG}circle")
    )


@pytest.fixture
def orchil(fakes, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)

    def run(*words):
        code = cli.run(list(words))
        return code, *capsys.readouterr()

    return run


def test_the_command_draws_text_and_picture(orchil, tmp_path):
    (tmp_path / "b.toml").write_text(BRIEF)
    code, out, _ = orchil("stages", "--explain", "--brief", "b.toml", "--svg", "chain.svg")
    assert code == cli.DONE
    assert f"  2 * brew 1 ({FAKE_PLUGIN})\n        <- word (read)\n        -> brew\n" in out
    assert ElementTree.parse(tmp_path / "chain.svg").getroot().tag == f"{SVG}svg"
    assert orchil("stages", "--explain")[0] == cli.DONE


def test_the_command_explains_a_plugin_that_was_left_out(orchil, tmp_path, monkeypatch):
    (tmp_path / "broken.py").write_text("1 / 0\n")
    monkeypatch.setenv(EXTRA_PLUGINS, f"{tmp_path / 'broken.py'},{FAKE_PLUGIN}")
    code, out, err = orchil("stages", "--explain")
    assert code == cli.DONE
    assert "left out: ZeroDivisionError" in out
    assert "read 1" in out
    assert err.count("\n") == 1


def test_a_place_that_cannot_be_written_is_a_sentence(orchil):
    code, _, err = orchil("stages", "--svg", "/proc/none/chain.svg")
    assert code == cli.WRONG_REQUEST
    assert "cannot be written" in err


def test_the_chain_of_our_own_stages_is_drawn_without_a_word_about_leaving_out():
    made = Registry.load()
    text = as_text(explained(made, None), made)
    assert "left out" not in text
    assert "relax" in text
    assert all(step.stage.name in text for step in explained(made, None).steps)
