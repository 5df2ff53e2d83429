"""What is committed comes back: cache, typed tables, views, page; and nothing is written twice."""

from __future__ import annotations

import json
import math
from datetime import datetime, timedelta, timezone

import numpy as np
import pytest
from orchil.store import AttemptRow, Batch, CandidateOutcome, CandidateRow, Store, StoreError
from orchil.store import store as store_module
from orchil_schemas import Anchor, AnchoredQuantity, IntakeNotes, Quantity, QuantityInfo, Record

from .conftest import (
    finished,
    make_attempt,
    make_band,
    make_brief,
    make_identity,
    make_rows,
    make_score,
    make_transitions,
)


class Cluster(Record):
    """A record of someone else's library stage."""

    kind = "cluster"
    number: int
    offers = (QuantityInfo(name="cluster", unit="1", meaning="number of the cluster"),)

    def quantities(self):
        return (Quantity(name="cluster", value=self.number, unit="1"),)


# -- screens


def test_the_same_brief_is_the_same_screen_and_becomes_active_again(store):
    assert store.active_screen() is None
    first = store.begin_screen(library="a.csv", brief=make_brief(), versions={"orchil": "1"})
    second = store.begin_screen(library="a.csv", brief=make_brief(low=600.0), versions={"orchil": "1"})
    assert store.active_screen().id == second != first
    assert store.begin_screen(library="b.csv", brief=make_brief(), versions={"orchil": "2"}) == first
    active = store.active_screen()
    assert (active.id, active.brief, active.library, active.versions) == (
        first,
        make_brief(),
        "b.csv",
        {"orchil": "2"},
    )
    assert abs(active.created - datetime.now(timezone.utc)) < timedelta(minutes=5)


def test_a_clock_set_back_does_not_change_which_screen_is_the_latest(store, monkeypatch):
    store.begin_screen(library="a", brief=make_brief(), versions={})
    monkeypatch.setattr(store_module, "now", lambda: datetime(2001, 1, 1, tzinfo=timezone.utc))
    second = store.begin_screen(library="a", brief=make_brief(low=600.0), versions={})
    assert store.active_screen().id == second


# -- candidates


def test_candidates_are_added_once(store):
    rows = [*make_rows(3), CandidateRow(4, "ion", "[Na+].[Cl-]", "smiles", None, -1, {"Ort": "Köln"})]
    store.add_candidates(rows)
    store.add_candidates(rows)
    store.add_candidates([*rows, CandidateRow(9, "late", "C")])
    found = store.candidates()
    assert [one.row_number for one in found] == [1, 2, 3, 4, 9]
    assert (found[3].name, found[3].medium, found[3].charge, found[3].status) == ("ion", None, -1, "waiting")
    assert store.candidate_page("ion").extra == {"Ort": "Köln"}


def test_a_changed_library_is_refused_whole(store):
    store.add_candidates(make_rows(3))
    changed = [
        *make_rows(2),
        CandidateRow(3, "dye-3", "CCO", medium="toluene", extra={"batch": "A"}),
        CandidateRow(4, "new", "C"),
    ]
    with pytest.raises(StoreError, match=r"row 3 structure 'CCCC' became 'CCO'; .*new store"):
        store.add_candidates(changed)
    assert len(store.candidates()) == 3
    with pytest.raises(StoreError, match="row 7"):
        store.add_candidates([CandidateRow(7, "a", "C"), CandidateRow(7, "b", "C")])


# -- cache


def test_finished_work_and_its_records_are_found_again(filled):
    identity, notes = make_identity(), IntakeNotes(cautions=("energetic group",))
    assert filled.known_work(["work-of-1-intake", "never"]) == {"work-of-1-intake": (identity.digest, notes.digest)}
    assert filled.load_records([identity.digest, "never"]) == {identity.digest: ("identity", identity.canonical_json)}
    assert filled.known_work([]) == {}
    many = [f"no-{n}" for n in range(12_000)]
    assert set(filled.known_work([*many, "work-of-1-excite"])) == {"work-of-1-excite"}


def test_writing_a_batch_again_changes_nothing(filled):
    before = filled.ranking()
    filled.commit(finished(1, make_transitions(), stage="excite"))
    assert filled.ranking().equals(before)
    assert len(filled.query("SELECT * FROM states")) == 2
    assert len(filled.query("SELECT * FROM work")) == 3


def test_a_batch_is_written_whole_or_not_at_all(filled):
    batch = finished(3, make_band())
    batch.outcomes.append(CandidateOutcome(3, "finished"))
    with pytest.raises(StoreError, match="CHECK"):
        filled.commit(batch)
    assert filled.candidates()[2].status == "waiting"
    assert filled.query("SELECT * FROM band WHERE candidate_id = 3").empty


def test_a_link_to_no_candidate_is_refused(store):
    with pytest.raises(StoreError, match="FOREIGN KEY"):
        store.commit(Batch(links=[(99, make_band())]))


def test_records_are_shared_between_candidates(store):
    store.add_candidates(make_rows(2))
    band = make_band()
    store.commit(
        Batch(
            links=[(1, band), (2, band)],
            outcomes=[CandidateOutcome(1, "done"), CandidateOutcome(2, "done", duplicate_of=1)],
        )
    )
    assert len(store.query("SELECT * FROM record")) == 1
    found = store.ranking()
    assert found["duplicate_of"].tolist()[1] == "dye-1"
    assert found["absorption_max_nm"].tolist() == [520.0, 520.0]
    assert store.candidate_page("dye-1").repeated_by == ("dye-2",)
    assert store.candidate_page("dye-2").duplicate_of == "dye-1"


# -- typed tables


def test_states_count_from_one_and_carry_their_wavelength(filled):
    states = filled.query("SELECT * FROM states ORDER BY state")
    assert states["state"].tolist() == [1, 2]
    # 1239.841984 eV nm, CODATA 2018: 2 eV is 619.92 nm.
    assert states["wavelength_nm"].tolist() == pytest.approx([619.920992, 413.280661])
    assert states[["dipole_x_debye", "dipole_y_debye", "dipole_z_debye"]].to_numpy().tolist() == [
        [0, 1, 2],
        [3, 4, 5],
    ]
    assert states["leading"].tolist() == ["HOMO -> LUMO (0.75)", "HOMO-1 -> LUMO (0.75)"]
    joined = filled.query("SELECT t.energy_ev FROM band b JOIN transition t USING (candidate_id, state)")
    assert joined["energy_ev"].tolist() == [3.0]  # Band.state 1 is the second state


def test_a_state_without_positive_energy_has_no_wavelength(store):
    store.add_candidates(make_rows(1))
    store.commit(Batch(links=[(1, make_transitions((0.0, 2.0)))]))
    assert math.isnan(store.query("SELECT wavelength_nm FROM transition ORDER BY state")["wavelength_nm"][0])


def test_quantities_have_units_and_intervals(filled):
    found = filled.query("SELECT * FROM quantities").set_index("quantity")
    assert found.loc["absorption_max_nm", ["value", "low", "high", "unit"]].tolist() == [520, 490, 550, "nm"]
    assert found.loc["molar_absorptivity", "unit"] == "M^-1 cm^-1"
    assert np.isnan(found.loc["heavy_atoms", "low"])
    assert np.isnan(found.loc["heavy_atoms", "coverage"])


def test_a_new_record_replaces_the_old_one_with_all_it_said(store):
    store.add_candidates(make_rows(1))
    store.commit(finished(1, make_band(520.0, emission=560.0, cautions=("old",)), make_transitions((1, 2, 3))))
    store.commit(finished(1, make_band(480.0), make_transitions((2.5,))))
    row = store.ranking().iloc[0]
    assert row["absorption_max_nm"] == 480
    assert row["cautions"] is None
    names = store.query("SELECT quantity FROM quantities")["quantity"].tolist()
    assert "emission_max_nm" not in names
    assert "absorption_max_nm" in names
    assert len(store.query("SELECT * FROM states")) == 1


def test_no_nan_enters_a_column(store):
    store.add_candidates(make_rows(1))
    bad = Quantity.model_construct(name="cluster", value=math.nan, unit="1", low=None, high=None, coverage=0.9)
    record = Cluster(number=1)
    object.__setattr__(record, "quantities", lambda: (bad,))
    store.commit(Batch(attempts=[make_attempt("a", "w", 1, cpu=math.nan)], links=[(1, record)]))
    assert store.query("SELECT * FROM attempt WHERE cpu_seconds IS NULL AND seconds IS NULL").shape[0] == 1
    assert store.query("SELECT * FROM quantity").empty
    for word in ("NaN", "-Infinity"):
        with pytest.raises(StoreError, match=f"{word}: a stage must fail"):
            store.commit(Batch(records=[("d", "odd", f'{{"x":{word}}}')]))
    store.commit(Batch(records=[("d", "text", '{"x":"NaN"}')]))


def test_a_moment_without_a_zone_is_refused(store):
    naive = AttemptRow("w", "a", "1", 1, True, 1.0, 1.0, finished_at=datetime(2025, 1, 1))
    with pytest.raises(ValueError, match="time zone"):
        store.commit(Batch(attempts=[naive]))


def test_forgetting_results_keeps_the_cache(filled):
    filled.forget_results([1, 2])
    assert {one.status for one in filled.candidates()} == {"waiting"}
    row = filled.ranking().iloc[0]
    assert row[["rank", "smiles", "reason", "absorption_max_nm", "cautions"]].isna().all()
    assert filled.query("SELECT * FROM quantities").empty
    assert len(filled.known_work(["work-of-1-intake", "work-of-1-excite", "work-of-1-calibrate"])) == 3


# -- the ranking and the other views

RANKING = [
    "rank",
    "candidate",
    "smiles",
    "medium",
    "status",
    "reason",
    "score",
    "hit_probability",
    "pareto_front",
    "pick",
    "absorption_max_nm",
    "absorption_low_nm",
    "absorption_high_nm",
    "molar_absorptivity",
    "oscillator_strength",
    "transition_dipole_debye",
    "long_axis_angle_deg",
    "electron_shift_angstrom",
    "emission_max_nm",
    "width_ev",
    "trust",
    "cautions",
    "duplicate_of",
    "row_number",
    "measured_absorption_max_nm",
    "measured_emission_max_nm",
    "unanchored_absorption_max_nm",
    "unanchored_emission_max_nm",
]


def test_the_ranking_has_one_row_per_candidate(filled):
    found = filled.ranking()
    assert list(found.columns) == RANKING
    assert found["candidate"].tolist() == ["dye-1", "dye-2", "dye-3"]
    assert found["status"].tolist() == ["done", "failed", "waiting"]
    assert found["reason"].tolist()[1] == "relax: not_converged: SCF did not converge"
    assert found["reason"].isna().tolist() == [True, False, True]
    first = found.iloc[0]
    assert (first["rank"], first["pick"], first["smiles"], first["trust"]) == (1, 1, "C=C", "inside")
    assert first["cautions"] == "energetic group; edge of the model"
    assert len(filled.ranking(limit=2)) == 2


def test_ranked_rows_come_first_and_ties_keep_the_order_of_the_library(store):
    store.add_candidates(make_rows(5))
    screen = store.begin_screen(library="a", brief=make_brief(), versions={})
    store.commit(Batch(outcomes=[CandidateOutcome(n, "done") for n in (2, 3, 4, 5)]))
    store.put_library_records(screen, [(5, make_score(1)), (4, make_score(2)), (3, make_score(2))])
    assert store.ranking()["candidate"].tolist() == ["dye-5", "dye-3", "dye-4", "dye-1", "dye-2"]


def test_the_ranking_is_of_the_latest_screen(filled):
    second = filled.begin_screen(library="a", brief=make_brief(low=600.0), versions={})
    assert filled.ranking()["rank"].isna().all()
    filled.put_library_records(second, [(1, make_score(7))])
    assert filled.ranking()["rank"].tolist()[0] == 7
    filled.begin_screen(library="a", brief=make_brief(), versions={})
    assert filled.ranking()["rank"].tolist()[0] == 1


def test_scores_replace_the_earlier_ones_of_their_screen(filled):
    screen = filled.active_screen().id
    filled.commit(Batch(outcomes=[CandidateOutcome(3, "done")]))
    filled.put_library_records(screen, [(3, make_score(1, value=None))])
    assert filled.query("SELECT candidate_id FROM score")["candidate_id"].tolist() == [3]
    assert filled.query("SELECT * FROM want_result")[["candidate_id", "position"]].to_numpy().tolist() == [[3, 1]]
    filled.put_library_records(screen, [(3, Cluster(number=4))])  # another library stage leaves the scores alone
    assert filled.ranking()["rank"].tolist()[0] == 1
    assert filled.candidate_page("dye-3").records["cluster"] == {"number": 4}
    assert filled.library_table(["cluster"]).column("cluster").value[1] == 4


def make_anchor(before=520.0, after=540.0):
    change = AnchoredQuantity(
        quantity="absorption_max_nm",
        coverage=0.9,
        before_nm=before,
        before_low_nm=before - 30,
        before_high_nm=before + 30,
        after_nm=after,
        after_low_nm=after - 10,
        after_high_nm=after + 15,
        shift_ev=-0.1,
        error_ratio=0.4,
        anchors=(),
        caution="look at it",
    )
    return Anchor(changes=(change,))


def test_anchored_numbers_stand_in_and_go_back(filled):
    screen, names = filled.active_screen().id, ["absorption_max_nm"]
    filled.put_library_records(screen, [(1, make_anchor())], (Anchor,))
    first = filled.ranking().iloc[0]
    assert first[["absorption_max_nm", "absorption_low_nm", "absorption_high_nm"]].tolist() == [540, 530, 555]
    assert (first["unanchored_absorption_max_nm"], first["rank"]) == (520, 1)
    assert first["cautions"] == "energetic group; edge of the model; look at it"
    column = filled.library_table(names).column(names[0])
    assert (column.value[0], column.high[0]) == (540, 555)
    before = filled.library_table(names, anchored=False).column(names[0])
    assert (before.value[0], before.low[0], before.high[0], before.coverage[0]) == (520, 490, 550, 0.9)
    assert filled.candidate_page("dye-1").records["band"]["absorption_max_nm"] == 520
    filled.put_library_records(screen, [], (Anchor,))
    assert filled.ranking().iloc[0]["absorption_high_nm"] == 550
    assert "anchor" not in filled.candidate_page("dye-1").records


def test_a_band_that_is_predicted_anew_is_not_put_back(filled):
    screen = filled.active_screen().id
    filled.put_library_records(screen, [(1, make_anchor())], (Anchor,))
    filled.commit(finished(1, make_band(600.0)))
    assert "anchor" not in filled.candidate_page("dye-1").records
    filled.put_library_records(screen, [], (Anchor,))
    first = filled.ranking().iloc[0]
    assert first["absorption_max_nm"] == 600
    assert first["unanchored_absorption_max_nm"] is None
    filled.put_library_records(screen, [(1, make_anchor(600.0, 590.0))], (Anchor,))
    filled.forget_results([1])
    assert filled.query("SELECT count(*) AS n FROM anchor")["n"].tolist() == [0]


def test_a_candidate_that_failed_later_shows_no_rank(filled):
    filled.commit(Batch(outcomes=[CandidateOutcome(1, "failed", "excite", "timeout", "took too long")]))
    first = filled.ranking().set_index("candidate").loc["dye-1"]
    assert first[["rank", "score"]].isna().all()
    assert first["reason"] == "excite: timeout: took too long"
    assert filled.candidate_page("dye-1").score is None
    filled.commit(Batch(outcomes=[CandidateOutcome(1, "done")]))
    assert filled.query("SELECT * FROM failures")["candidate"].tolist() == ["dye-2"]


def test_failures_and_timing(filled):
    failures = filled.query("SELECT * FROM failures")
    assert failures[["candidate", "failed_stage", "reason_code"]].to_numpy().tolist() == [
        ["dye-2", "relax", "not_converged"]
    ]
    filled.commit(Batch(attempts=[make_attempt("relax", "other", 3, cpu=1.0)]))
    timing = filled.query("SELECT * FROM timing").set_index("stage")
    assert timing.loc["relax", ["n", "ok", "total_cpu_seconds", "mean_cpu_seconds"]].tolist() == [
        2,
        1,
        5.0,
        2.5,
    ]
    assert timing.index[0] == "relax"


# -- the page of one candidate


def test_the_page_of_a_candidate(filled):
    page = filled.candidate_page("dye-1")
    assert page.score == {"rank": 1, "score": 1.0, "hit_probability": 0.5, "pareto_front": 1, "pick": 1}
    assert set(page.records) == {"identity", "intake_notes", "transitions", "band"}
    assert page.records["band"] == json.loads(make_band(cautions=("edge of the model",)).canonical_json)
    assert [one["stage"] for one in page.attempts] == ["intake", "excite", "calibrate"]
    assert page.attempts[0]["finished_at"].tzinfo is not None
    assert page.wants[0]["quantity"] == "absorption_max_nm"
    assert page.extra == {"batch": "A"}


def test_the_page_of_a_failed_candidate_has_its_attempts(filled):
    page = filled.candidate_page("dye-2")
    assert (page.score, page.records, page.wants) == (None, {}, ())
    assert [(one["stage"], one["ok"], one["reason_code"]) for one in page.attempts] == [
        ("relax", False, "not_converged")
    ]


def test_shared_work_shows_its_attempts_to_all_who_hold_its_results(store):
    store.add_candidates(make_rows(2))
    store.commit(finished(1, make_identity(), make_band(), stage="all"))
    store.commit(Batch(links=[(2, make_identity()), (2, make_band())]))
    assert [one["stage"] for one in store.candidate_page("dye-2").attempts] == ["all"]
    store.commit(Batch(links=[(2, make_band(700.0))]))  # holds only a part of that work's results now
    assert store.candidate_page("dye-2").attempts == ()


def test_names_go_before_ids_and_may_repeat(store):
    store.add_candidates(
        [CandidateRow(1, "2", "C"), CandidateRow(2, "x", "C"), CandidateRow(3, "x", "C", medium="water")]
    )
    assert store.candidate_page("2").candidate.row_number == 1
    assert store.candidate_page("3").candidate.row_number == 3
    assert store.candidate_page("x").same_name == (3,)
    assert store.candidate_page("x").row["medium"] is None
    for nobody in ("nobody", "99", "9" * 30, "²"):
        assert store.candidate_page(nobody) is None


# -- many


@pytest.mark.slow
def test_twenty_thousand_candidates(path):
    n, rng = 20_000, np.random.default_rng(1)
    peaks, order = rng.uniform(350, 750, n), rng.permutation(n)
    with Store.open(path, create=True) as store:
        store.add_candidates(make_rows(n))
        screen = store.begin_screen(library="many.csv", brief=make_brief(), versions={})
        identity = make_identity()
        for start in range(0, n, 4000):
            part = range(start, min(start + 4000, n))
            links = [(i + 1, make_band(peaks[i])) for i in part] + [(i + 1, identity) for i in part]
            states = [CandidateOutcome(i + 1, "failed" if i % 10 == 9 else "done") for i in part]
            store.commit(Batch(links=links, outcomes=states))
        table = store.library_table(["absorption_max_nm", "emission_max_nm"])
        done = np.flatnonzero(np.arange(n) % 10 != 9)
        assert np.array_equal(table.candidate, done + 1)
        column = table.column("absorption_max_nm")
        assert np.array_equal(column.value, peaks[done])
        assert np.array_equal(column.high, peaks[done] + 30)
        assert (column.coverage == 0.9).all()
        assert np.isnan(table.column("emission_max_nm").value).all()
        assert set(table.smiles) == {"C=C"}
        ranks = order[done].argsort().argsort() + 1
        store.put_library_records(screen, [(int(i) + 1, make_score(int(r))) for i, r in zip(done, ranks, strict=True)])
        found = store.ranking(limit=len(done))
        assert found["rank"].tolist() == list(range(1, len(done) + 1))
        assert np.array_equal(found["absorption_max_nm"], peaks[done][ranks.argsort()])
        plan = store.query("EXPLAIN QUERY PLAN SELECT * FROM ranking WHERE absorption_max_nm BETWEEN 500 AND 510")
        assert any("ix_band_absorption_max_nm" in step for step in plan["detail"])
        window = store.query("SELECT * FROM ranking WHERE absorption_max_nm BETWEEN 500 AND 510")
        assert len(window) == ((peaks >= 500) & (peaks <= 510)).sum()
