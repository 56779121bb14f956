"""Make the first tables."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0001", None


def upgrade():
    """Make them in the order of their keys."""
    _person()
    _survey()
    _history()
    _plan_version()
    _settings_version()
    _station()
    _survey_member()
    _reading()
    _reading_event()


def _person():
    op.create_table(
        "person",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.String(length=100), nullable=False),
        sa.Column("sign_in", sa.String(length=100), nullable=False),
        sa.Column("password_hash", sa.String(length=300), nullable=False),
        sa.Column("role", sa.String(length=10), nullable=False),
        sa.Column("active", sa.Boolean(), nullable=False),
        sa.Column("session_key", sa.String(length=36), nullable=False),
        sa.Column("created_at", sa.DateTime(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_person")),
        sa.UniqueConstraint("sign_in", name=op.f("uq_person_sign_in")),
    )


def _survey():
    op.create_table(
        "survey",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.String(length=120), nullable=False),
        sa.Column("river", sa.String(length=120), nullable=False),
        sa.Column("purpose", sa.Text(), nullable=False),
        sa.Column("time_zone", sa.String(length=64), nullable=False),
        sa.Column("unit_system", sa.String(length=2), nullable=False),
        sa.Column("distance_rule", sa.String(length=12), nullable=False),
        sa.Column("outfall_mark", sa.Float(), nullable=True),
        sa.Column("elevation_m", sa.Float(), nullable=False),
        sa.Column("do_criterion_mg_l", sa.Float(), nullable=True),
        sa.Column("criterion_basis", sa.String(length=200), nullable=False),
        sa.Column("sampling", sa.String(length=12), nullable=False),
        sa.Column("release_at", sa.DateTime(), nullable=True),
        sa.Column("safety_note", sa.Text(), nullable=False),
        sa.Column("created_at", sa.DateTime(), nullable=False),
        sa.Column("created_by_id", sa.String(length=36), nullable=False),
        sa.ForeignKeyConstraint(["created_by_id"], ["person.id"], name=op.f("fk_survey_created_by_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_survey")),
    )


def _history():
    op.create_table(
        "history",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=True),
        sa.Column("person_id", sa.String(length=36), nullable=True),
        sa.Column("at", sa.DateTime(), nullable=False),
        sa.Column("what", sa.String(length=40), nullable=False),
        sa.Column("entity", sa.String(length=40), nullable=False),
        sa.Column("entity_id", sa.String(length=36), nullable=False),
        sa.Column("particulars", sa.JSON(), nullable=False),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_history_person_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_history_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_history")),
    )
    op.create_index(op.f("ix_history_survey_id"), "history", ["survey_id"], unique=False)


def _plan_version():
    op.create_table(
        "plan_version",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("tables", sa.JSON(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_plan_version_made_by_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_plan_version_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_plan_version")),
        sa.UniqueConstraint("survey_id", "number", name=op.f("uq_plan_version_survey_id")),
    )


def _settings_version():
    op.create_table(
        "settings_version",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("thresholds", sa.JSON(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_settings_version_made_by_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_settings_version_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_settings_version")),
        sa.UniqueConstraint("survey_id", "number", name=op.f("uq_settings_version_survey_id")),
    )


def _station():
    op.create_table(
        "station",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("code", sa.String(length=20), nullable=False),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_station_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_station")),
        sa.UniqueConstraint("survey_id", "code", name=op.f("uq_station_survey_id")),
    )


def _survey_member():
    op.create_table(
        "survey_member",
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_survey_member_person_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_survey_member_survey_id")),
        sa.PrimaryKeyConstraint("survey_id", "person_id", name=op.f("pk_survey_member")),
    )
    op.create_index(op.f("ix_survey_member_person_id"), "survey_member", ["person_id"], unique=False)


def _reading():
    op.create_table(
        "reading",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("station_id", sa.String(length=36), nullable=False),
        sa.Column("plan_version_id", sa.String(length=36), nullable=False),
        sa.Column("taken_at", sa.DateTime(), nullable=False),
        sa.Column("received_at", sa.DateTime(), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.Column("do_mg_l", sa.Float(), nullable=True),
        sa.Column("water_temp_c", sa.Float(), nullable=True),
        sa.Column("depth_m", sa.Float(), nullable=True),
        sa.Column("do_percent", sa.Float(), nullable=True),
        sa.Column("percent_basis", sa.String(length=8), nullable=False),
        sa.Column("conductance_us_cm", sa.Float(), nullable=True),
        sa.Column("pressure_mmhg", sa.Float(), nullable=True),
        sa.Column("pressure_source", sa.String(length=10), nullable=False),
        sa.Column("position", sa.String(length=10), nullable=False),
        sa.Column("sensor_depth_m", sa.Float(), nullable=True),
        sa.Column("velocity_m_s", sa.Float(), nullable=True),
        sa.Column("velocity_method", sa.String(length=10), nullable=False),
        sa.Column("meter", sa.String(length=60), nullable=False),
        sa.Column("replicate", sa.Boolean(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("latitude", sa.Float(), nullable=True),
        sa.Column("longitude", sa.Float(), nullable=True),
        sa.Column("position_radius_m", sa.Float(), nullable=True),
        sa.Column("entered", sa.JSON(), nullable=False),
        sa.Column("kept_findings", sa.JSON(), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_reading_author_id")),
        sa.ForeignKeyConstraint(["plan_version_id"], ["plan_version.id"], name=op.f("fk_reading_plan_version_id")),
        sa.ForeignKeyConstraint(["station_id"], ["station.id"], name=op.f("fk_reading_station_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_reading_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_reading")),
    )
    op.create_index(op.f("ix_reading_station_id"), "reading", ["station_id"], unique=False)
    op.create_index(op.f("ix_reading_survey_id"), "reading", ["survey_id"], unique=False)


def _reading_event():
    op.create_table(
        "reading_event",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("reading_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.String(length=12), nullable=False),
        sa.Column("field", sa.String(length=30), nullable=False),
        sa.Column("old_value", sa.Float(), nullable=True),
        sa.Column("new_value", sa.Float(), nullable=True),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_reading_event_made_by_id")),
        sa.ForeignKeyConstraint(["reading_id"], ["reading.id"], name=op.f("fk_reading_event_reading_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_reading_event")),
    )
    op.create_index(op.f("ix_reading_event_reading_id"), "reading_event", ["reading_id"], unique=False)
