"""Keep visits, in the entries that tell of them."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0005", "0004"


def upgrade():
    """Make the tables."""
    _visit()
    _visit_entry()


def _visit():
    op.create_table(
        "visit",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("station_id", sa.String(length=36), nullable=False),
        sa.Column("opened_by_id", sa.String(length=36), nullable=False),
        sa.ForeignKeyConstraint(["opened_by_id"], ["person.id"], name=op.f("fk_visit_opened_by_id")),
        sa.ForeignKeyConstraint(["station_id"], ["station.id"], name=op.f("fk_visit_station_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_visit_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_visit")),
    )
    op.create_index(op.f("ix_visit_station_id"), "visit", ["station_id"], unique=False)
    op.create_index(op.f("ix_visit_survey_id"), "visit", ["survey_id"], unique=False)


def _visit_entry():
    op.create_table(
        "visit_entry",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("visit_id", sa.String(length=36), nullable=False),
        sa.Column("author_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.Column("received_at", sa.DateTime(), nullable=False),
        sa.Column("seen", sa.JSON(), nullable=False),
        sa.Column("facts", sa.JSON(), nullable=False),
        sa.Column("entered", sa.JSON(), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(["author_id"], ["person.id"], name=op.f("fk_visit_entry_author_id")),
        sa.ForeignKeyConstraint(["visit_id"], ["visit.id"], name=op.f("fk_visit_entry_visit_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_visit_entry")),
    )
    op.create_index(op.f("ix_visit_entry_visit_id"), "visit_entry", ["visit_id"], unique=False)
