"""The first tables and views.

A frozen picture: later changes are later revisions, never edits of this file.
"""

from typing import Any

import sqlalchemy as sa
from alembic import op
from sqlalchemy.dialects.postgresql import JSONB

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

JSON = sa.JSON(none_as_null=True).with_variant(JSONB(none_as_null=True), "postgresql")
MOMENT = sa.DateTime(timezone=True)
DIGEST = sa.String(64)


def upgrade() -> None:
    _library()
    _cache()
    _results()
    _scores()
    for name, query in VIEWS.items():
        op.execute(f"CREATE VIEW {name} AS {query}")


def downgrade() -> None:
    raise RuntimeError("there is nothing before the first revision: remove the store instead")


def _number(name: str, *, optional: bool = False, index: bool = False) -> sa.Column[Any]:
    return sa.Column(name, sa.Double, nullable=optional, index=index)


def _key(name: str, *target: sa.ForeignKey) -> sa.Column[Any]:
    return sa.Column(name, sa.Integer, *target, primary_key=True, autoincrement=False)


def _candidate_key() -> sa.Column[Any]:
    return _key("candidate_id", sa.ForeignKey("candidate.id"))


def _library() -> None:
    op.create_table(
        "screen",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column("created", MOMENT, nullable=False),
        sa.Column("active_at", MOMENT, nullable=False, index=True),
        sa.Column("library", sa.Text, nullable=False),
        sa.Column("brief", JSON, nullable=False),
        sa.Column("brief_digest", DIGEST, nullable=False, unique=True),
        sa.Column("versions", JSON, nullable=False),
    )
    op.create_table(
        "candidate",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column("row_number", sa.Integer, nullable=False, unique=True),
        sa.Column("name", sa.Text, nullable=False, index=True),
        sa.Column("structure", sa.Text, nullable=False),
        sa.Column("format", sa.Text, nullable=False),
        sa.Column("medium", sa.Text),
        sa.Column("charge", sa.Integer),
        sa.Column("extra", JSON, nullable=False),
        sa.Column("smiles", sa.Text),
        sa.Column("medium_used", sa.Text, comment="as intake understood it; the brief's where the row names none"),
        sa.Column("status", sa.Text, nullable=False, index=True),
        sa.Column("failed_stage", sa.Text),
        sa.Column("reason_code", sa.Text),
        sa.Column("reason", sa.Text),
        sa.Column("cautions", sa.Text, comment="from intake; those of the band are in band.cautions"),
        sa.Column("duplicate_of", sa.Integer, sa.ForeignKey("candidate.id"), index=True),
        sa.CheckConstraint("status IN ('waiting', 'done', 'failed')", name="status"),
    )


def _cache() -> None:
    op.create_table(
        "record",
        sa.Column("digest", DIGEST, primary_key=True),
        sa.Column("kind", sa.Text, nullable=False),
        sa.Column("payload", sa.Text, nullable=False, comment="canonical JSON; text, because the digest is over it"),
        sa.Column("made_by", DIGEST, comment="digest of the first work that made it"),
    )
    op.create_table(
        "work",
        sa.Column("digest", DIGEST, primary_key=True),
        sa.Column("stage", sa.Text, nullable=False),
        sa.Column("stage_version", sa.Text, nullable=False),
        sa.Column("settings", JSON, nullable=False),
        sa.Column("outputs", JSON, nullable=False, comment="digests of the records it made, in order"),
    )
    op.create_table(
        "attempt",
        sa.Column("id", sa.Integer, primary_key=True),
        sa.Column("work_digest", DIGEST, nullable=False, index=True),
        sa.Column("candidate_id", sa.Integer, sa.ForeignKey("candidate.id"), index=True),
        sa.Column("stage", sa.Text, nullable=False),
        sa.Column("stage_version", sa.Text, nullable=False),
        sa.Column("attempt", sa.Integer, nullable=False),
        sa.Column("ok", sa.Boolean, nullable=False),
        sa.Column("seconds", sa.Double, comment="wall time"),
        sa.Column("cpu_seconds", sa.Double),
        sa.Column("reason_code", sa.Text),
        sa.Column("reason", sa.Text),
        sa.Column("versions", JSON, nullable=False),
        sa.Column("host", sa.Text, nullable=False),
        sa.Column("finished_at", MOMENT, nullable=False),
    )
    op.create_table(
        "candidate_record",
        _candidate_key(),
        sa.Column("kind", sa.Text, primary_key=True),
        sa.Column("record_digest", DIGEST, sa.ForeignKey("record.digest"), nullable=False, index=True),
        sqlite_with_rowid=False,
    )


def _results() -> None:
    op.create_table(
        "quantity",
        sa.Column("name", sa.Text, primary_key=True),
        _candidate_key(),
        _number("value"),
        _number("low", optional=True),
        _number("high", optional=True),
        _number("coverage", optional=True),
        sa.Column("unit", sa.Text, nullable=False),
        sqlite_with_rowid=False,
    )
    op.create_index("ix_quantity_name_value", "quantity", ["name", "value"])
    op.create_index("ix_quantity_candidate_id", "quantity", ["candidate_id"])
    op.create_table(
        "transition",
        _candidate_key(),
        sa.Column("state", sa.Integer, primary_key=True, autoincrement=False, comment="1 is the lowest"),
        _number("energy_ev"),
        _number("wavelength_nm", optional=True, index=True),
        _number("oscillator_strength", index=True),
        _number("dipole_x_debye"),
        _number("dipole_y_debye"),
        _number("dipole_z_debye"),
        _number("long_axis_angle_deg"),
        _number("electron_shift_angstrom"),
        _number("charge_transfer_share"),
        _number("overlap"),
        _number("pi_share"),
        sa.Column("leading", sa.Text, nullable=False, comment="orbital pair of the largest weight"),
        sqlite_with_rowid=False,
    )
    _band()


def _band() -> None:
    counted = "counted from 1, as transition.state"
    op.create_table(
        "band",
        _candidate_key(),
        sa.Column("state", sa.Integer, nullable=False, comment=counted),
        sa.Column("first_bright_state", sa.Integer, nullable=False, comment=counted),
        sa.Column("strongest_state", sa.Integer, nullable=False, comment=counted),
        _number("coverage"),
        _number("absorption_max_nm", index=True),
        _number("absorption_low_nm"),
        _number("absorption_high_nm"),
        _number("physics_absorption_max_nm"),
        _number("strongest_absorption_max_nm"),
        _number("molar_absorptivity", index=True),
        _number("molar_absorptivity_low"),
        _number("molar_absorptivity_high"),
        _number("width_ev"),
        _number("oscillator_strength", index=True),
        _number("transition_dipole_debye"),
        _number("long_axis_angle_deg", index=True),
        _number("electron_shift_angstrom", index=True),
        _number("emission_max_nm", optional=True, index=True),
        _number("emission_low_nm", optional=True),
        _number("emission_high_nm", optional=True),
        sa.Column("trust", sa.Text, nullable=False),
        sa.Column("cautions", sa.Text),
    )


def _scores() -> None:
    op.create_table(
        "score",
        _key("screen_id", sa.ForeignKey("screen.id")),
        _candidate_key(),
        sa.Column("rank", sa.Integer, nullable=False),
        _number("score"),
        _number("hit_probability"),
        sa.Column("pareto_front", sa.Integer, nullable=False),
        sa.Column("pick", sa.Integer),
        sqlite_with_rowid=False,
    )
    for column in ("rank", "pick", "hit_probability"):
        op.create_index(f"ix_score_screen_id_{column}", "score", ["screen_id", column])
    op.create_table(
        "want_result",
        _key("screen_id", sa.ForeignKey("screen.id")),
        _candidate_key(),
        sa.Column(
            "position",
            sa.Integer,
            primary_key=True,
            autoincrement=False,
            comment="of the want in the brief, from 1",
        ),
        sa.Column("quantity", sa.Text, nullable=False),
        _number("value", optional=True),
        _number("probability"),
        _number("weight"),
        _number("contribution"),
        sqlite_with_rowid=False,
    )


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
    coalesce(c.cautions || '; ' || b.cautions, c.cautions, b.cautions) AS cautions,
    d.name AS duplicate_of, c.row_number
FROM candidate c
LEFT JOIN score s ON s.candidate_id = c.id AND c.status = 'done'
    AND s.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1)
LEFT JOIN band b ON b.candidate_id = c.id
LEFT JOIN candidate d ON d.id = c.duplicate_of
ORDER BY s.rank IS NULL, s.rank, c.row_number
"""

STATES = """
SELECT
    c.name AS candidate, coalesce(c.medium_used, c.medium) AS medium, t.state,
    t.energy_ev, t.wavelength_nm, t.oscillator_strength,
    t.dipole_x_debye, t.dipole_y_debye, t.dipole_z_debye, t.long_axis_angle_deg, t.electron_shift_angstrom,
    t.charge_transfer_share, t.overlap, t.pi_share, t."leading"
FROM transition t JOIN candidate c ON c.id = t.candidate_id
"""

QUANTITIES = """
SELECT
    c.name AS candidate, coalesce(c.medium_used, c.medium) AS medium, q.name AS quantity,
    q.value, q.low, q.high, q.coverage, q.unit
FROM quantity q JOIN candidate c ON c.id = q.candidate_id
"""

FAILURES = """
SELECT
    name AS candidate, row_number, coalesce(medium_used, medium) AS medium, structure, failed_stage, reason_code, reason
FROM candidate WHERE status = 'failed' ORDER BY row_number
"""

TIMING = """
SELECT
    stage, count(*) AS n, sum(CASE WHEN ok THEN 1 ELSE 0 END) AS ok,
    sum(cpu_seconds) AS total_cpu_seconds, avg(cpu_seconds) AS mean_cpu_seconds,
    sum(seconds) AS total_seconds, max(seconds) AS longest_seconds
FROM attempt GROUP BY stage ORDER BY sum(cpu_seconds) DESC
"""

VIEWS = {
    "ranking": RANKING,
    "states": STATES,
    "quantities": QUANTITIES,
    "failures": FAILURES,
    "timing": TIMING,
}
