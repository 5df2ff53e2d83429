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


class Scaled(Frozen):
    scale: float = 1.0


def stage(name, needs, makes, *, settings=NoSettings, ok=True, **more):
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
    } | more
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
        ([MAKE_A, stage("x", (C,), (B,))], "stage x (test) needs c, and no usable stage makes it: install"),
        (
            [MAKE_A, stage("x", (C,), (B,)), stage("y", (B,), (C,))],
            "wait for each other in a circle: x <- y <- x",
        ),
        (
            [MAKE_A, stage("x", (A,), (B,), ok=False), stage("y", (B,), (C,))],
            "stage y (test) needs b, and no usable stage makes it",
        ),
        (
            [MAKE_A, stage("x", (A,), (B,)), stage("y", (A,), (B,))],
            'x (test) and y (test) both make b: choose with [use] b = "x" or "y"',
        ),
        ([MAKE_A, stage("x", (A,), (B,), check_brief=1 / 2)], "stage x (test) has a fault in check_brief (TypeError"),
    ],
)
def test_what_does_not_fit_is_left_out_with_a_sentence(stages, sentence):
    chain = resolve(registry(*stages), brief())
    assert "make-a" in names(chain)
    assert [text for text in chain.skipped if sentence in text]


class BrokenReads:
    name, version, makes, Settings = "x", "1", (B,), NoSettings

    def found(self):
        return Availability(True)

    def reads(self, brief, settings):
        raise KeyError("no")

    def run(self, table, brief, settings):
        return []


def test_a_library_stage_with_a_fault_in_reads_is_left_out():
    chain = resolve(registry(MAKE_A, BrokenReads()), brief())
    assert chain.library_steps == ()
    assert chain.skipped == ("stage x (test) has a fault in reads (KeyError: 'no'): update or uninstall test",)


@pytest.mark.parametrize(
    ("stages", "reason"),
    [
        ([stage("x", (C,), (A,))], "stage x (test) needs c"),
        ([MAKE_A, stage("x", (LibraryRow,), (A,))], 'choose with [use] a = "make-a" or "x"'),
        ([stage("x", (LibraryRow,), (A,), ok=False)], "stage x (test) is not usable here: install the part"),
    ],
)
def test_a_brief_is_refused_when_what_it_wants_is_lost(stages, reason):
    with pytest.raises(RequestError) as caught:
        resolve(registry(*stages), brief())
    assert "want 1: length_nm cannot be had here: " in str(caught.value)
    assert reason in str(caught.value)


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


@pytest.mark.parametrize("word", ["a", "A"])
def test_use_chooses_between_makers_by_kind_or_by_type(word):
    other = stage("other", (LibraryRow,), (A,))
    chain = resolve(registry(MAKE_A, other), brief(use={word: "other"}))
    assert (names(chain), chain.skipped) == (["other"], ())


def test_the_distribution_that_defines_a_record_makes_it_until_the_brief_says_otherwise():
    made = Registry()
    made.add(MAKE_A, "ours", "ours")
    foreign = stage("other", (LibraryRow,), (A,))
    type(foreign).__module__ = "somewhere.else"
    made.add(foreign, "theirs", "theirs")
    chain = resolve(made, brief())
    assert names(chain) == ["make-a"]
    assert chain.skipped == ('other (theirs) waits: make-a makes a unless the brief says [use] a = "other"',)
    assert names(resolve(made, brief(use={"A": "other"}))) == ["other"]


def test_a_stage_keeps_what_was_not_taken_from_it_while_someone_needs_it():
    both = stage("both", (LibraryRow,), (A, B))
    other, user = stage("other", (LibraryRow,), (A,)), stage("user", (B,), (C,))
    steps = resolve(registry(both, other, user), brief(use={"a": "other"})).steps
    assert {step.stage.name: step.gives for step in steps} == {"both": (B,), "other": (A,), "user": (C,)}
    assert names(resolve(registry(both, other), brief(use={"a": "other"}))) == ["other"]


def test_a_chosen_stage_makes_all_it_can():
    both, one, two = (
        stage("both", (LibraryRow,), (A, B)),
        stage("one", (LibraryRow,), (A,)),
        stage("two", (A,), (B,)),
    )
    assert names(resolve(registry(both, one, two), brief(use={"a": "both"}))) == ["both"]
    mixed = resolve(registry(both, one, two), brief(use={"a": "both", "b": "two"}))
    assert {step.stage.name: step.gives for step in mixed.steps} == {"both": (A,), "two": (B,)}


def test_what_is_taken_from_a_stage_is_part_of_the_name_of_a_computation():
    both, one, user = (
        stage("both", (LibraryRow,), (A, B)),
        stage("one", (LibraryRow,), (A, B)),
        stage("u", (A, B), (C,)),
    )
    chains = [
        resolve(registry(both, one, user), brief(use=use))
        for use in ({"a": "both", "b": "one"}, {"a": "one", "b": "both"})
    ]
    assert [sorted(names(chain)) for chain in chains] == [["both", "one", "u"]] * 2
    assert chains[0].computation("") != chains[1].computation("")


def test_a_stage_that_cannot_run_here_and_that_nobody_needs_is_skipped():
    chain = resolve(registry(MAKE_A, stage("x", (A,), (B,), ok=False)), brief())
    assert names(chain) == ["make-a"]
    assert chain.skipped == ("stage x (test) is not usable here: install the part",)


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
