"""The tables of the store, for SQLite and PostgreSQL alike. Change them only together with a migration.

Units are in the column names; molar absorptivity is in M^-1 cm^-1. Digests are 64 hexadecimal digits.
"""

from __future__ import annotations

from datetime import datetime, timezone
from typing import Any

import sqlalchemy as sa
from sqlalchemy.dialects.postgresql import JSONB
from sqlalchemy.engine import Dialect
from sqlalchemy.types import TypeDecorator

metadata = sa.MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
        "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
        "pk": "pk_%(table_name)s",
    }
)


class UtcDateTime(TypeDecorator[datetime]):
    """A moment in UTC; naive datetimes are refused because SQLite would keep them without a zone."""

    impl = sa.DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Turn any zone into UTC."""
        if value is not None and value.tzinfo is None:
            raise ValueError("a moment without a time zone: use datetime.now(timezone.utc)")
        return None if value is None else value.astimezone(timezone.utc)

    def process_result_value(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """SQLite gives the zone back only if we add it."""
        if value is None:
            return None
        return value.replace(tzinfo=timezone.utc) if value.tzinfo is None else value.astimezone(timezone.utc)


def _json() -> sa.types.TypeEngine[Any]:
    """JSON where None is SQL NULL, not the JSON word null."""
    return sa.JSON(none_as_null=True).with_variant(JSONB(none_as_null=True), "postgresql")


def _candidate_key() -> sa.Column[int]:
    return sa.Column("candidate_id", sa.Integer, sa.ForeignKey("candidate.id"), primary_key=True, autoincrement=False)


def _number(name: str, *, optional: bool = False) -> sa.Column[float]:
    return sa.Column(name, sa.Double, nullable=optional)


screen = sa.Table(
    "screen",
    metadata,
    sa.Column("id", sa.Integer, primary_key=True),
    sa.Column("created", UtcDateTime, nullable=False),
    sa.Column("active_at", UtcDateTime, nullable=False, index=True),
    sa.Column("library", sa.Text, nullable=False),
    sa.Column("brief", _json(), nullable=False),
    sa.Column("brief_digest", sa.String(64), nullable=False, unique=True),
    sa.Column("versions", _json(), nullable=False),
)

candidate = sa.Table(
    "candidate",
    metadata,
    sa.Column("id", sa.Integer, primary_key=True),
    sa.Column("row_number", sa.Integer, nullable=False, unique=True),
    sa.Column("name", sa.Text, nullable=False, index=True),
    sa.Column("structure", sa.Text, nullable=False),
    sa.Column("format", sa.Text, nullable=False),
    sa.Column("medium", sa.Text),
    sa.Column("charge", sa.Integer),
    sa.Column("extra", _json(), nullable=False),
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

measurement = sa.Table(
    "measurement",
    metadata,
    sa.Column("name", sa.Text, primary_key=True, comment="of the predicted quantity"),
    _candidate_key(),
    _number("value"),
    sa.Index(None, "candidate_id"),
    sqlite_with_rowid=False,
)

record = sa.Table(
    "record",
    metadata,
    sa.Column("digest", sa.String(64), primary_key=True),
    sa.Column("kind", sa.Text, nullable=False),
    sa.Column("payload", sa.Text, nullable=False, comment="canonical JSON; text, because the digest is over it"),
    sa.Column("made_by", sa.String(64), comment="digest of the first work that made it"),
)

work = sa.Table(
    "work",
    metadata,
    sa.Column("digest", sa.String(64), primary_key=True),
    sa.Column("stage", sa.Text, nullable=False),
    sa.Column("stage_version", sa.Text, nullable=False),
    sa.Column("settings", _json(), nullable=False),
    sa.Column("outputs", _json(), nullable=False, comment="digests of the records it made, in order"),
)

attempt = sa.Table(
    "attempt",
    metadata,
    sa.Column("id", sa.Integer, primary_key=True),
    sa.Column("work_digest", sa.String(64), nullable=False, index=True),
    sa.Column("candidate_id", sa.Integer, sa.ForeignKey("candidate.id"), index=True),
    sa.Column("stage", sa.Text, nullable=False),
    sa.Column("stage_version", sa.Text, nullable=False),
    sa.Column("attempt", sa.Integer, nullable=False),
    sa.Column("ok", sa.Boolean, nullable=False),
    sa.Column("seconds", sa.Double, comment="wall time"),
    sa.Column("cpu_seconds", sa.Double),
    sa.Column("reason_code", sa.Text),
    sa.Column("reason", sa.Text),
    sa.Column("versions", _json(), nullable=False),
    sa.Column("host", sa.Text, nullable=False),
    sa.Column("finished_at", UtcDateTime, nullable=False),
)

candidate_record = sa.Table(
    "candidate_record",
    metadata,
    _candidate_key(),
    sa.Column("kind", sa.Text, primary_key=True),
    sa.Column("record_digest", sa.String(64), sa.ForeignKey("record.digest"), nullable=False, index=True),
    sqlite_with_rowid=False,
)

quantity = sa.Table(
    "quantity",
    metadata,
    # The name leads the key, so that one quantity over the whole library is one range of the table.
    sa.Column("name", sa.Text, primary_key=True),
    _candidate_key(),
    _number("value"),
    _number("low", optional=True),
    _number("high", optional=True),
    _number("coverage", optional=True),
    sa.Column("unit", sa.Text, nullable=False),
    sa.Index(None, "name", "value"),
    sa.Index(None, "candidate_id"),
    sqlite_with_rowid=False,
)

transition = sa.Table(
    "transition",
    metadata,
    _candidate_key(),
    sa.Column("state", sa.Integer, primary_key=True, autoincrement=False, comment="1 is the lowest"),
    _number("energy_ev"),
    sa.Column("wavelength_nm", sa.Double, index=True),
    sa.Column("oscillator_strength", sa.Double, nullable=False, index=True),
    *(_number(f"dipole_{axis}_debye") for axis in "xyz"),
    _number("long_axis_angle_deg"),
    _number("electron_shift_angstrom"),
    _number("charge_transfer_share"),
    _number("overlap"),
    _number("pi_share"),
    sa.Column("leading", sa.Text, nullable=False, comment="orbital pair of the largest weight"),
    sqlite_with_rowid=False,
)

band = sa.Table(
    "band",
    metadata,
    _candidate_key(),
    *(
        sa.Column(name, sa.Integer, nullable=False, comment="counted from 1, as transition.state")
        for name in ("state", "first_bright_state", "strongest_state")
    ),
    _number("coverage"),
    sa.Column("absorption_max_nm", sa.Double, nullable=False, index=True),
    _number("absorption_low_nm"),
    _number("absorption_high_nm"),
    _number("physics_absorption_max_nm"),
    _number("strongest_absorption_max_nm"),
    sa.Column("molar_absorptivity", sa.Double, nullable=False, index=True),
    _number("molar_absorptivity_low"),
    _number("molar_absorptivity_high"),
    _number("width_ev"),
    sa.Column("oscillator_strength", sa.Double, nullable=False, index=True),
    _number("transition_dipole_debye"),
    sa.Column("long_axis_angle_deg", sa.Double, nullable=False, index=True),
    sa.Column("electron_shift_angstrom", sa.Double, nullable=False, index=True),
    sa.Column("emission_max_nm", sa.Double, index=True),
    _number("emission_low_nm", optional=True),
    _number("emission_high_nm", optional=True),
    sa.Column("trust", sa.Text, nullable=False),
    sa.Column("cautions", sa.Text),
)

anchor = sa.Table(
    "anchor",
    metadata,
    # What a measurement has moved stands in ``quantity`` and ``band``; here is what stood there before.
    sa.Column("name", sa.Text, primary_key=True, comment="of the quantity"),
    _candidate_key(),
    *(_number(f"unanchored_{part}") for part in ("value", "low", "high")),
    sa.Column("caution", sa.Text),
    sa.Index(None, "candidate_id"),
    sqlite_with_rowid=False,
)

score = sa.Table(
    "score",
    metadata,
    sa.Column("screen_id", sa.Integer, sa.ForeignKey("screen.id"), primary_key=True, autoincrement=False),
    _candidate_key(),
    sa.Column("rank", sa.Integer, nullable=False),
    _number("score"),
    _number("hit_probability"),
    sa.Column("pareto_front", sa.Integer, nullable=False),
    sa.Column("pick", sa.Integer),
    sa.Index(None, "screen_id", "rank"),
    sa.Index(None, "screen_id", "pick"),
    sa.Index(None, "screen_id", "hit_probability"),
    sqlite_with_rowid=False,
)

want_result = sa.Table(
    "want_result",
    metadata,
    sa.Column("screen_id", sa.Integer, sa.ForeignKey("screen.id"), primary_key=True, autoincrement=False),
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
