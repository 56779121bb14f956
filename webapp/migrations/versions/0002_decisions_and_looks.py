"""Keep what was decided on site, and what of the field sheet each person was shown."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0002", "0001"


def upgrade():
    """Make both tables."""
    op.create_table(
        "decision",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("plan_version_id", sa.String(length=36), nullable=False),
        sa.Column("kind", sa.String(length=12), nullable=False),
        sa.Column("chosen", sa.String(length=100), nullable=False),
        sa.Column("reason", sa.Text(), nullable=False),
        sa.Column("screen", sa.JSON(), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_decision_made_by_id")),
        sa.ForeignKeyConstraint(["plan_version_id"], ["plan_version.id"], name=op.f("fk_decision_plan_version_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_decision_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_decision")),
    )
    op.create_index(op.f("ix_decision_survey_id"), "decision", ["survey_id"], unique=False)
    op.create_table(
        "seen",
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("plan_number", sa.Integer(), nullable=False),
        sa.Column("release_at", sa.DateTime(), nullable=True),
        sa.Column("at", sa.DateTime(), nullable=False),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_seen_person_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_seen_survey_id")),
        sa.PrimaryKeyConstraint("survey_id", "person_id", name=op.f("pk_seen")),
    )
