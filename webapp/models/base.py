"""What every table shares. Ids are UUIDs made by whoever makes the row, so that rows move between servers unchanged."""

import uuid
from datetime import UTC, datetime

from sqlalchemy import DateTime, ForeignKey, MetaData, String, TypeDecorator
from sqlalchemy.orm import DeclarativeBase, mapped_column

NAMES = {
    "ix": "ix_%(column_0_label)s",
    "uq": "uq_%(table_name)s_%(column_0_name)s",
    "fk": "fk_%(table_name)s_%(column_0_name)s",
    "pk": "pk_%(table_name)s",
}


class UtcDateTime(TypeDecorator):
    """An instant: stored in UTC, always read back with its zone. SQLite would drop the offset in silence."""

    impl = DateTime
    cache_ok = True

    def process_bind_param(self, value, dialect):
        """Refuse a time without zone; store UTC."""
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError("a stored time needs its zone")
        return value.astimezone(UTC).replace(tzinfo=None)

    def process_result_value(self, value, dialect):
        """Give the zone back."""
        return None if value is None else value.replace(tzinfo=UTC)


class Base(DeclarativeBase):
    """What every table shares."""

    metadata = MetaData(naming_convention=NAMES)


def new_id():
    """Return a new row id."""
    return str(uuid.uuid4())


def now():
    """Return the present instant, to the second below which no reader cares."""
    return datetime.now(UTC)


def row_id():
    """Return the column of a row's id."""
    return mapped_column(String(36), primary_key=True, default=new_id)


def to(target, **more):
    """Return a column that points at another table's row."""
    return mapped_column(String(36), ForeignKey(target), **more)
