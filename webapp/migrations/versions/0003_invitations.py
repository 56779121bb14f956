"""Keep invitations, and the phones that they signed in."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0003", "0002"


def upgrade():
    """Make both tables."""
    op.create_table(
        "invitation",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("token_hash", sa.String(length=64), nullable=False),
        sa.Column("made_by_id", sa.String(length=36), nullable=False),
        sa.Column("made_at", sa.DateTime(), nullable=False),
        sa.Column("expires_at", sa.DateTime(), nullable=False),
        sa.Column("used_at", sa.DateTime(), nullable=True),
        sa.Column("withdrawn_at", sa.DateTime(), nullable=True),
        sa.ForeignKeyConstraint(["made_by_id"], ["person.id"], name=op.f("fk_invitation_made_by_id")),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_invitation_person_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_invitation_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_invitation")),
        sa.UniqueConstraint("token_hash", name=op.f("uq_invitation_token_hash")),
    )
    op.create_index(op.f("ix_invitation_survey_id"), "invitation", ["survey_id"], unique=False)
    op.create_table(
        "phone_session",
        sa.Column("id", sa.String(length=36), nullable=False),
        sa.Column("survey_id", sa.String(length=36), nullable=False),
        sa.Column("person_id", sa.String(length=36), nullable=False),
        sa.Column("invitation_id", sa.String(length=36), nullable=False),
        sa.Column("device", sa.String(length=60), nullable=False),
        sa.Column("browser_hash", sa.String(length=64), nullable=False),
        sa.Column("started_at", sa.DateTime(), nullable=False),
        sa.Column("until", sa.DateTime(), nullable=False),
        sa.Column("ended_at", sa.DateTime(), nullable=True),
        sa.ForeignKeyConstraint(["invitation_id"], ["invitation.id"], name=op.f("fk_phone_session_invitation_id")),
        sa.ForeignKeyConstraint(["person_id"], ["person.id"], name=op.f("fk_phone_session_person_id")),
        sa.ForeignKeyConstraint(["survey_id"], ["survey.id"], name=op.f("fk_phone_session_survey_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_phone_session")),
        sa.UniqueConstraint("invitation_id", name=op.f("uq_phone_session_invitation_id")),
    )
    op.create_index(op.f("ix_phone_session_survey_id"), "phone_session", ["survey_id"], unique=False)
