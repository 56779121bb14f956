import threading

import pytest
from sqlalchemy import text

from webapp import secret
from webapp.config import BadSetting, read_config
from webapp.db import Database, make_engine


@pytest.fixture
def database(app):
    return app.extensions["bankside_database"]


def test_every_connection_is_durable_and_minds_its_keys(database):
    with database.engine.connect() as first, database.engine.connect() as second:
        for connection in (first, second):
            assert connection.execute(text("PRAGMA synchronous")).scalar() == 2
            assert connection.execute(text("PRAGMA journal_mode")).scalar() == "wal"
            assert connection.execute(text("PRAGMA foreign_keys")).scalar() == 1


def test_the_next_writer_waits_until_the_commit_and_no_longer(database):
    order = []
    first = database.writing()
    first.execute(text("SELECT 1"))

    def second_writer():
        with database.writing() as session:
            session.execute(text("SELECT 1"))
            order.append("second wrote")
            session.commit()

    thread = threading.Thread(target=second_writer)
    thread.start()
    thread.join(0.2)
    assert thread.is_alive()
    order.append("first commits")
    first.commit()
    first.execute(text("SELECT 1"))  # reading on after the commit holds nobody up
    thread.join(5)
    assert order == ["first commits", "second wrote"]
    first.close()


def test_a_failed_write_lets_the_next_one_go(database):
    with pytest.raises(RuntimeError, match="on purpose"), database.writing() as session:
        session.execute(text("SELECT 1"))
        raise RuntimeError("on purpose")
    with database.writing() as session:
        session.execute(text("SELECT 1"))
        session.commit()


def test_secret_key_is_made_once_for_its_owner_only(tmp_path):
    key = secret.read_or_make(tmp_path / "data")
    assert secret.read_or_make(tmp_path / "data") == key
    assert len(key) >= 43
    assert (tmp_path / "data" / "secret-key").stat().st_mode & 0o777 == 0o600


def test_an_empty_secret_key_stops_the_start_and_says_what_to_do(tmp_path):
    (tmp_path / "secret-key").write_text("")
    with pytest.raises(BadSetting, match="holds no key. Delete it"):
        secret.read_or_make(tmp_path)


def test_default_database_lies_in_the_data_folder(tmp_path):
    config = read_config({"BANKSIDE_DATA": str(tmp_path)})
    assert config.sqlite_path == tmp_path / "bankside.sqlite3"
    assert (config.host, config.port, config.threads) == ("0.0.0.0", 8080, 4)


@pytest.mark.parametrize(
    ("name", "value", "message"),
    [
        ("BANKSIDE_PORT", "eighty", "BANKSIDE_PORT must be a whole number from 1 to 65535"),
        ("BANKSIDE_PORT", "70000", "BANKSIDE_PORT must be a whole number"),
        ("BANKSIDE_THREADS", "0", "BANKSIDE_THREADS must be a whole number"),
        ("BANKSIDE_SECURE_COOKIES", "maybe", "BANKSIDE_SECURE_COOKIES must be yes or no"),
        ("BANKSIDE_DATABASE_URL", "mysql://x", "BANKSIDE_DATABASE_URL must begin with"),
    ],
)
def test_bad_setting_stops_the_start_and_says_what_to_write(name, value, message):
    with pytest.raises(BadSetting, match=message):
        read_config({name: value})


def test_a_database_server_needs_no_lock_here():
    engine = make_engine("postgresql+psycopg://nobody@localhost/none")
    assert Database(engine).lock is None
