"""Keep meters and the checks on them."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0004", "0003"


def upgrade():
    """Make the tables."""
    _meter()
    _meter_check()
    _meter_check_event()


def _meter():
    op.create_table(
        "meter",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("name", sa.String(length=60), nullable=False),
        sa.Column("method", sa.String(length=12), nullable=False),
        sa.Column("maker", sa.String(length=60), nullable=False),
        sa.Column("model", sa.String(length=60), nullable=False),
        sa.Column("serial", sa.String(length=60), nullable=False),
        sa.Column("cap_changed_on", sa.String(length=10), nullable=False),
        sa.Column("serviced_on", sa.String(length=10), nullable=False),
        sa.Column("resolution_mg_l", sa.Float(), nullable=True),
        sa.Column("percent_basis", sa.String(length=8), nullable=False),
        sa.Column("out_of_service", sa.Boolean(), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_meter_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_meter")),
    )
    op.create_index(op.f("ix_meter_survey_id"), "meter", ["survey_id"], unique=False)


def _meter_check():
    op.create_table(
        "meter_check",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("meter_id", sa.String(length=36), nullable=False),
        sa.Column("checked_at", sa.DateTime(), nullable=False),
        sa.Column("received_at", sa.DateTime(), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.String(length=14), nullable=False),
        sa.Column("parameter", sa.String(length=12), nullable=False),
        sa.Column("standard", sa.String(length=30), nullable=False),
        sa.Column("value", sa.Float(), nullable=False),
        sa.Column("expected", sa.Float(), nullable=True),
        sa.Column("compared", sa.Float(), nullable=True),
        sa.Column("water_temp_c", sa.Float(), nullable=True),
        sa.Column("pressure_mmhg", sa.Float(), nullable=True),
        sa.Column("pressure_source", sa.String(length=10), nullable=False),
        sa.Column("conductance_us_cm", sa.Float(), nullable=True),
        sa.Column("place", sa.String(length=60), nullable=False),
        sa.Column("lot", sa.String(length=60), nullable=False),
        sa.Column("expires_on", sa.String(length=10), nullable=False),
        sa.Column("action", sa.String(length=12), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("entered", sa.JSON(), nullable=False),
        sa.Column("judged", sa.JSON(), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_meter_check_author_id")),
        sa.ForeignKeyConstraint(["meter_id"], ["meter.id"], name=op.f("fk_meter_check_meter_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_meter_check_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_meter_check")),
    )
    op.create_index(op.f("ix_meter_check_meter_id"), "meter_check", ["meter_id"], unique=False)
    op.create_index(op.f("ix_meter_check_survey_id"), "meter_check", ["survey_id"], unique=False)


def _meter_check_event():
    op.create_table(
        "meter_check_event",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("check_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.String(length=12), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["check_id"], ["meter_check.id"], name=op.f("fk_meter_check_event_check_id")),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_meter_check_event_made_by_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_meter_check_event")),
    )
    op.create_index(op.f("ix_meter_check_event_check_id"), "meter_check_event", ["check_id"], unique=False)
