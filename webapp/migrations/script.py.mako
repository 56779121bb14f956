"""${message}."""

import sqlalchemy as sa
from alembic import op

revision, down_revision = ${repr(up_revision)}, ${repr(down_revision)}


def upgrade():
    ${upgrades if upgrades else "pass"}
