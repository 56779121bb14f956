"""Make room for the longest name of what a meter is checked against: PostgreSQL refused a reference thermometer."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = "0009", "0008"


def upgrade():
    """Widen the column; SQLite never held it to a length."""
    with op.batch_alter_table("meter_check") as meter_check:
        meter_check.alter_column("standard", existing_type=sa.String(20), type_=sa.String(30), existing_nullable=False)
