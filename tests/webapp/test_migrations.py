import shutil
import sqlite3

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext

from webapp import migrate
from webapp.db import make_engine
from webapp.models import Base


@pytest.fixture
def url(tmp_path):
    return f"sqlite:///{tmp_path / 'bankside.sqlite3'}"


def test_migrations_make_exactly_the_models_tables(url):
    migrate.upgrade(url)
    engine = make_engine(url)
    with engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, Base.metadata) == []
    engine.dispose()


def test_a_database_that_is_up_to_date_is_left_alone(url, tmp_path):
    assert migrate.upgrade(url) is None
    before = (tmp_path / "bankside.sqlite3").read_bytes()
    assert migrate.upgrade(url) is None
    assert (tmp_path / "bankside.sqlite3").read_bytes() == before


def newest():
    return sorted(path.name for path in (migrate.MIGRATIONS / "versions").glob("0*.py"))[-1][:4]


def further(tmp_path, monkeypatch, body):
    """Put a further migration after a copy of the real ones."""
    folder = tmp_path / "migrations"
    shutil.copytree(migrate.MIGRATIONS, folder)
    (folder / "versions" / "9999_more.py").write_text(
        "import sqlalchemy as sa\nfrom alembic import op\n"
        f'revision, down_revision = "9999", "{newest()}"\n\n\ndef upgrade():\n{body}'
    )
    monkeypatch.setattr(migrate, "MIGRATIONS", folder)


def person_names(path):
    connection = sqlite3.connect(path)
    names = [row[0] for row in connection.execute("SELECT name FROM person")]
    connection.close()
    return names


def insert_person(path):
    connection = sqlite3.connect(path)
    connection.execute(
        "INSERT INTO person (id, name, sign_in, password_hash, role, active, session_key, created_at) "
        "VALUES ('1', 'Dana', 'dana', 'x', 'crew', 1, 'k', '2026-08-12 00:00:00')"
    )
    connection.commit()
    connection.close()


def test_an_upgrade_keeps_a_copy_first_and_the_rows(url, tmp_path, monkeypatch):
    migrate.upgrade(url)
    insert_person(tmp_path / "bankside.sqlite3")
    further(tmp_path, monkeypatch, '    op.add_column("person", sa.Column("phone", sa.String))\n')
    copy = migrate.upgrade(url)
    assert person_names(copy) == ["Dana"]
    assert copy.stat().st_mode & 0o777 == 0o600
    assert person_names(tmp_path / "bankside.sqlite3") == ["Dana"]


def test_a_failed_upgrade_changes_nothing(url, tmp_path, monkeypatch):
    migrate.upgrade(url)
    insert_person(tmp_path / "bankside.sqlite3")
    body = '    op.add_column("person", sa.Column("phone", sa.String))\n    raise RuntimeError("half way")\n'
    further(tmp_path, monkeypatch, body)
    with pytest.raises(RuntimeError, match="half way"):
        migrate.upgrade(url)
    connection = sqlite3.connect(tmp_path / "bankside.sqlite3")
    columns = [row[1] for row in connection.execute("PRAGMA table_info(person)")]
    assert "phone" not in columns
    assert connection.execute("SELECT version_num FROM alembic_version").fetchone() == (newest(),)
    connection.close()


def test_an_upgrade_that_would_orphan_rows_is_undone(url, tmp_path, monkeypatch):
    migrate.upgrade(url)
    insert_person(tmp_path / "bankside.sqlite3")
    body = "    op.execute(\"INSERT INTO survey_member (survey_id, person_id) VALUES ('no survey', '1')\")\n"
    further(tmp_path, monkeypatch, body)
    with pytest.raises(RuntimeError, match="without their parents"):
        migrate.upgrade(url)
    connection = sqlite3.connect(tmp_path / "bankside.sqlite3")
    assert connection.execute("SELECT count(*) FROM survey_member").fetchone() == (0,)
    connection.close()


def test_rebuilding_a_parent_table_keeps_its_children(url, tmp_path, monkeypatch):
    migrate.upgrade(url)
    insert_person(tmp_path / "bankside.sqlite3")
    connection = sqlite3.connect(tmp_path / "bankside.sqlite3")
    connection.execute(
        "INSERT INTO history (id, person_id, at, what, entity, entity_id, particulars) "
        "VALUES ('h', '1', '2026-08-12 00:00:00', 'x', 'person', '1', '{}')"
    )
    connection.commit()
    body = (
        '    with op.batch_alter_table("person", recreate="always") as person:\n'
        '        person.alter_column("name", existing_type=sa.String(100), nullable=True)\n'
    )
    further(tmp_path, monkeypatch, body)
    migrate.upgrade(url)
    assert connection.execute("SELECT person_id FROM history").fetchone() == ("1",)
    connection.close()
