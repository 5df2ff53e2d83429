"""What the user measured, and the numbers that it moved.

A column of the library that only now has a meaning was kept as text; it becomes a measurement where it is a number.
"""

import json
from typing import Any

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

MEASURED = ("measured_absorption_max_nm", "measured_emission_max_nm")


def upgrade() -> None:
    _tables()
    _take_from_extra_columns()
    for name, query in VIEWS.items():
        op.execute(f"DROP VIEW {name}")
        op.execute(f"CREATE VIEW {name} AS {query}")


def downgrade() -> None:
    raise RuntimeError("measurements have no place in the first revision: use a copy of the store from before")


def _keys(comment: str) -> tuple[sa.Column[Any], sa.Column[Any]]:
    owner = sa.ForeignKey("candidate.id")
    return (
        sa.Column("name", sa.Text, primary_key=True, comment=comment),
        sa.Column("candidate_id", sa.Integer, owner, primary_key=True, autoincrement=False),
    )


def _tables() -> None:
    op.create_table(
        "measurement",
        *_keys("of the predicted quantity"),
        sa.Column("value", sa.Double, nullable=False),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "anchor",
        *_keys("of the quantity"),
        *(sa.Column(f"unanchored_{part}", sa.Double, nullable=False) for part in ("value", "low", "high")),
        sa.Column("caution", sa.Text),
        sqlite_with_rowid=False,
    )
    for table in ("measurement", "anchor"):
        op.create_index(f"ix_{table}_candidate_id", table, ["candidate_id"])


def _take_from_extra_columns() -> None:
    connection = op.get_bind()
    text = sa.text("SELECT id, extra FROM candidate WHERE lower(CAST(extra AS TEXT)) LIKE '%measured%max%nm%'")
    for owner, extra in connection.execute(text).all():
        cells = json.loads(extra) if isinstance(extra, str) else extra
        named = {title: "_".join(title.strip().lower().split()) for title in cells}
        for title in [title for title, meaning in named.items() if meaning in MEASURED]:
            _insert(connection, named[title].removeprefix("measured_"), owner, cells.pop(title))
        change = sa.text("UPDATE candidate SET extra = :extra WHERE id = :id")
        kept = sa.bindparam("extra", type_=sa.JSON())
        connection.execute(change.bindparams(kept), {"extra": cells, "id": owner})


def _insert(connection: sa.Connection, name: str, owner: int, text: str) -> None:
    try:
        value = float(text.lower().removesuffix("nm").strip().replace(",", "."))
    except ValueError:
        return
    if 100 <= value <= 5000:
        statement = sa.text("INSERT INTO measurement (name, candidate_id, value) VALUES (:name, :owner, :value)")
        connection.execute(statement, {"name": name, "owner": owner, "value": value})


# One row per candidate, ranked ones first. The left joins let SQLite use the indexes of band and score when a
# query filters on their columns. A candidate that is not done shows no score of an earlier run.
RANKING = """
SELECT
    s.rank, c.name AS candidate, c.smiles, coalesce(c.medium_used, c.medium) AS medium, c.status,
    CASE WHEN c.status = 'failed' THEN
        coalesce(c.failed_stage || ': ', '') || coalesce(c.reason_code || ': ', '') || coalesce(c.reason, '')
    END AS reason,
    s.score, s.hit_probability, s.pareto_front, s.pick,
    b.absorption_max_nm, b.absorption_low_nm, b.absorption_high_nm,
    b.molar_absorptivity, b.oscillator_strength, b.transition_dipole_debye,
    b.long_axis_angle_deg, b.electron_shift_angstrom, b.emission_max_nm, b.width_ev, b.trust,
    nullif(substr(
        coalesce('; ' || c.cautions, '') || coalesce('; ' || b.cautions, '')
        || coalesce('; ' || aa.caution, '') || coalesce('; ' || ae.caution, ''), 3), '') AS cautions,
    d.name AS duplicate_of, c.row_number,
    ma.value AS measured_absorption_max_nm, me.value AS measured_emission_max_nm,
    aa.unanchored_value AS unanchored_absorption_max_nm, ae.unanchored_value AS unanchored_emission_max_nm
FROM candidate c
LEFT JOIN score s ON s.candidate_id = c.id AND c.status = 'done'
    AND s.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
LEFT JOIN band b ON b.candidate_id = c.id
LEFT JOIN candidate d ON d.id = c.duplicate_of
LEFT JOIN measurement ma ON ma.candidate_id = c.id AND ma.name = 'absorption_max_nm'
LEFT JOIN measurement me ON me.candidate_id = c.id AND me.name = 'emission_max_nm'
LEFT JOIN anchor aa ON aa.candidate_id = c.id AND aa.name = 'absorption_max_nm'
LEFT JOIN anchor ae ON ae.candidate_id = c.id AND ae.name = 'emission_max_nm'
ORDER BY s.rank IS NULL, s.rank, c.row_number
"""

QUANTITIES = """
SELECT
    c.name AS candidate, coalesce(c.medium_used, c.medium) AS medium, q.name AS quantity,
    q.value, q.low, q.high, q.coverage, q.unit
FROM quantity q JOIN candidate c ON c.id = q.candidate_id
UNION ALL
SELECT
    c.name, coalesce(c.medium_used, c.medium), 'unanchored_' || a.name,
    a.unanchored_value, a.unanchored_low, a.unanchored_high, q.coverage, q.unit
FROM anchor a JOIN candidate c ON c.id = a.candidate_id
JOIN quantity q ON q.candidate_id = a.candidate_id AND q.name = a.name
UNION ALL
SELECT
    c.name, coalesce(c.medium_used, c.medium), 'measured_' || m.name, m.value, NULL, NULL, NULL, 'nm'
FROM measurement m JOIN candidate c ON c.id = m.candidate_id
"""

VIEWS = {"ranking": RANKING, "quantities": QUANTITIES}
