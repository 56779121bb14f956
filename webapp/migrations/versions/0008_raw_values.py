"""Keep the several raw values of a reading, and what a decision about one rests on."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0008", "0007"


def upgrade():
    """Add the columns; readings there were have no raw values and are neither stable nor not."""
    for column in (
        sa.Column("ph", sa.Float(), nullable=True),
        sa.Column("series", sa.JSON(), nullable=True),
        sa.Column("soak_s", sa.Float(), nullable=True),
        sa.Column("stable", sa.Boolean(), nullable=True),
        sa.Column("unstable_reason", sa.Text(), nullable=True),
        sa.Column("distance_left_m", sa.Float(), nullable=True),
    ):
        op.add_column("reading", column)
    op.execute("UPDATE reading SET series = '[]', unstable_reason = ''")
    op.add_column("reading_event", sa.Column("particulars", sa.JSON(), nullable=True))
    op.execute("UPDATE reading_event SET particulars = '{}'")
    with op.batch_alter_table("reading") as reading:
        reading.alter_column("series", existing_type=sa.JSON(), nullable=False)
        reading.alter_column("unstable_reason", existing_type=sa.Text(), nullable=False)
    with op.batch_alter_table("reading_event") as event:
        event.alter_column("particulars", existing_type=sa.JSON(), nullable=False)
