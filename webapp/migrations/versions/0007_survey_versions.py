"""Keep which state of a survey was reviewed and approved."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0007", "0006"


def upgrade():
    """Make the tables."""
    _survey_event()
    _frozen_dataset()


def _survey_event():
    op.create_table(
        "survey_event",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.String(length=12), nullable=False),
        sa.Column("version", sa.String(length=60), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_survey_event_made_by_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_survey_event_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_survey_event")),
    )
    op.create_index(op.f("ix_survey_event_survey_id"), "survey_event", ["survey_id"], unique=False)


def _frozen_dataset():
    op.create_table(
        "frozen_dataset",
        sa.Column("event_id", sa.String(length=36), nullable=False),
        sa.Column("file_name", sa.String(length=120), nullable=False),
        sa.Column("sha256", sa.String(length=64), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(["event_id"], ["survey_event.id"], name=op.f("fk_frozen_dataset_event_id")),
        sa.PrimaryKeyConstraint("event_id", name=op.f("pk_frozen_dataset")),
    )
