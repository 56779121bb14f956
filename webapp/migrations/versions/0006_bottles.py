"""Keep bottles, their hand-overs and what the laboratory found."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0006", "0005"


def upgrade():
    """Make the tables."""
    _bottle()
    _hand_over()
    _lab_result()


def _bottle():
    op.create_table(
        "bottle",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("station_id", sa.String(length=36), nullable=False),
        sa.Column("code", sa.String(length=40), nullable=False),
        sa.Column("analysis", sa.String(length=16), nullable=False),
        sa.Column("kind", sa.String(length=10), nullable=False),
        sa.Column("replicate_of", sa.String(length=40), nullable=False),
        sa.Column("collected_at", sa.DateTime(), nullable=False),
        sa.Column("received_at", sa.DateTime(), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.Column("sample_depth_m", sa.Float(), nullable=True),
        sa.Column("position", sa.String(length=10), nullable=False),
        sa.Column("volume_ml", sa.Float(), nullable=True),
        sa.Column("preservative", sa.String(length=60), nullable=False),
        sa.Column("full", sa.Boolean(), nullable=True),
        sa.Column("filtered", sa.Boolean(), nullable=False),
        sa.Column("on_ice_at", sa.DateTime(), nullable=True),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("entered", sa.JSON(), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_bottle_author_id")),
        sa.ForeignKeyConstraint(["station_id"], ["station.id"], name=op.f("fk_bottle_station_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_bottle_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_bottle")),
    )
    op.create_index(op.f("ix_bottle_station_id"), "bottle", ["station_id"], unique=False)
    op.create_index(op.f("ix_bottle_survey_id"), "bottle", ["survey_id"], unique=False)


def _hand_over():
    op.create_table(
        "hand_over",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("bottles", sa.JSON(), nullable=False),
        sa.Column("gave", sa.String(length=100), nullable=False),
        sa.Column("took", sa.String(length=100), nullable=False),
        sa.Column("at", sa.DateTime(), nullable=False),
        sa.Column("place", sa.String(length=100), nullable=False),
        sa.Column("temperature_c", sa.Float(), nullable=True),
        sa.Column("seal", sa.String(length=60), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_hand_over_author_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_hand_over_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_hand_over")),
    )
    op.create_index(op.f("ix_hand_over_survey_id"), "hand_over", ["survey_id"], unique=False)


def _lab_result():
    op.create_table(
        "lab_result",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("bottle_id", sa.String(length=36), nullable=False),
        sa.Column("laboratory", sa.String(length=100), nullable=False),
        sa.Column("lab_number", sa.String(length=40), nullable=False),
        sa.Column("method", sa.String(length=60), nullable=False),
        sa.Column("arrived_at", sa.DateTime(), nullable=True),
        sa.Column("arrival_temp_c", sa.Float(), nullable=True),
        sa.Column("started_at", sa.DateTime(), nullable=True),
        sa.Column("finished_at", sa.DateTime(), nullable=True),
        sa.Column("censor", sa.String(length=12), nullable=False),
        sa.Column("value", sa.Float(), nullable=True),
        sa.Column("limit_value", sa.Float(), nullable=True),
        sa.Column("quality", sa.JSON(), nullable=False),
        sa.Column("analyst", sa.String(length=100), nullable=False),
        sa.Column("note", sa.Text(), nullable=False),
        sa.Column("entered", sa.JSON(), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_lab_result_author_id")),
        sa.ForeignKeyConstraint(["bottle_id"], ["bottle.id"], name=op.f("fk_lab_result_bottle_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_lab_result_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_lab_result")),
    )
    op.create_index(op.f("ix_lab_result_bottle_id"), "lab_result", ["bottle_id"], unique=False)
    op.create_index(op.f("ix_lab_result_survey_id"), "lab_result", ["survey_id"], unique=False)
