"""Order, choice and settings of stages; every fault is found before anything runs."""

from __future__ import annotations

import pytest
from orchil.chain import resolve
from orchil.digests import work_digest, work_seed
from orchil.errors import RequestError
from orchil.registry import Registry
from orchil_schemas import Availability, Brief, Frozen, LibraryRow, NoSettings, QuantityInfo, Record


class A(Record):
    kind = "a"
    offers = (QuantityInfo(name="length_nm", unit="nm", meaning="a length"),)


class B(Record):
    kind = "b"


class C(Record):
    kind = "c"


class OtherA(Record):
    kind = "a"


class Scaled(Frozen):
    scale: float = 1.0


def stage(name, needs, makes, *, settings=NoSettings, ok=True):
    def found(self):
        return Availability(ok, {}, "install the part")

    members = {
        "name": name,
        "version": "1",
        "needs": needs,
        "makes": makes,
        "Settings": settings,
        "time_limit_seconds": 1.0,
        "found": found,
        "run": lambda self, inputs, settings, context: [],
    }
    return type("Fake", (), members)()


def registry(*stages):
    made = Registry()
    for one in stages:
        made.add(one, "test")
    assert not made.problems
    return made


def brief(**more):
    want = {"quantity": "length_nm", "at_least": 3} | more.pop("want", {})
    return Brief(title="t", want=[want], **more)


MAKE_A = stage("make-a", (LibraryRow,), (A,), settings=Scaled)


def names(chain):
    return [step.stage.name for step in chain.steps]


def test_order_follows_needs_not_registration():
    late, early = stage("a-late", (A, B), (C,)), stage("z-early", (A,), (B,))
    chain = resolve(registry(late, early, MAKE_A), brief())
    assert names(chain) == ["make-a", "z-early", "a-late"]
    assert [step.essential for step in chain.steps] == [True, False, False]


@pytest.mark.parametrize(
    ("stages", "sentence"),
    [
        ([MAKE_A, stage("x", (C,), (B,))], "stage x needs c, and no usable stage makes it"),
        (
            [MAKE_A, stage("x", (LibraryRow,), (A,))],
            'make-a and x both make a: choose with [use] a = "make-a" or "x"',
        ),
        (
            [MAKE_A, stage("x", (C,), (B,)), stage("y", (B,), (C,))],
            "wait for each other in a circle: x <- y <- x",
        ),
        ([MAKE_A, stage("x", (A,), (OtherA,))], 'use the name "a" for different records'),
        ([MAKE_A, stage("x", (A,), (LibraryRow,))], "x makes library_row"),
        (
            [MAKE_A, stage("x", (A,), (B,), ok=False), stage("y", (B,), (C,))],
            "stage y needs b, and no usable stage makes it (stage x is not usable here: install the part)",
        ),
    ],
)
def test_chains_that_cannot_be(stages, sentence):
    with pytest.raises(RequestError) as caught:
        resolve(registry(*stages), brief())
    assert sentence in str(caught.value)


@pytest.mark.parametrize(
    ("more", "sentence"),
    [
        (
            {"want": {"quantity": "lenght_nm"}},
            'want 1: unknown quantity "lenght_nm", did you mean "length_nm"?',
        ),
        ({"want": {"quantity": "colour"}}, "`orchil stages --quantities`"),
        ({"want": {"unit": "eV"}}, 'want 1: length_nm is in nm, not "eV": give the limits in nm'),
        ({"stage": {"make-a": {"scael": 2}}}, '[stage.make-a] unknown key "scael", did you mean "scale"?'),
        ({"stage": {"make-a": {"scale": "x"}}}, "[stage.make-a] scale: input should be a valid number"),
        ({"stage": {"make-b": {}}}, '[stage.make-b] is for no stage, did you mean "make-a"?'),
        ({"use": {"a": "nobody"}}, 'use: "nobody" does not make a; make-a does'),
    ],
)
def test_briefs_that_do_not_fit_the_stages(more, sentence):
    with pytest.raises(RequestError) as caught:
        resolve(registry(MAKE_A), brief(**more))
    assert sentence in str(caught.value)


def test_use_chooses_between_makers():
    other = stage("other", (LibraryRow,), (A,))
    assert names(resolve(registry(MAKE_A, other), brief(use={"a": "other"}))) == ["other"]


def test_a_stage_that_cannot_run_here_and_that_nobody_needs_is_skipped():
    chain = resolve(registry(MAKE_A, stage("x", (A,), (B,), ok=False)), brief())
    assert names(chain) == ["make-a"]
    assert chain.skipped == ("stage x is not usable here: install the part",)


def test_settings_reach_the_step_and_its_digest():
    plain = resolve(registry(MAKE_A), brief()).steps[0]
    scaled = resolve(registry(MAKE_A), brief(stage={"make-a": {"scale": 2}})).steps[0]
    assert scaled.settings.scale == 2
    assert plain.settings_json != scaled.settings_json


def test_work_digest_depends_on_each_part_and_not_on_the_order_of_inputs():
    base = ("excite", "1", "{}", [("a", "1"), ("b", "2")])
    others = [
        ("relax", *base[1:]),
        ("excite", "2", *base[2:]),
        ("excite", "1", '{"x":1}', base[3]),
        (*base[:3], [("a", "1"), ("b", "3")]),
    ]
    assert len({work_digest(*parts) for parts in [base, *others]}) == 5
    assert work_digest(*base[:3], base[3][::-1]) == work_digest(*base)


def test_seeds_are_positive_31_bit_numbers_that_differ():
    seeds = {work_seed([("a", str(number))]) for number in range(1000)}
    assert len(seeds) == 1000
    assert min(seeds) >= 1
    assert max(seeds) < 2**31
