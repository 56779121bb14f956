import re
import shutil
import sqlite3
import threading
import time
from dataclasses import replace

import pytest
from click.testing import CliRunner

from tests.conftest import Browser
from tests.webapp.days import demo_readings, demo_survey, store
from webapp import backup, cli, create_app, secret
from webapp.backup import NoBackup
from webapp.config import read_config
from webapp.plan.queries import current_plan


@pytest.fixture
def day(app, people):
    """The demo's survey with its plan and readings."""
    with app.extensions["bankside_database"].writing() as db:
        survey = demo_survey(db, people)
    with app.extensions["bankside_database"].reading() as db:
        plan = current_plan(db, survey.id)
    for new in demo_readings()[:3]:
        store(app, survey, plan, people["crew"], new)
    return survey


def run(*arguments):
    return CliRunner().invoke(cli.main, ["backup", *map(str, arguments)])


def ids_in(path):
    connection = sqlite3.connect(path)
    ids = {row[0] for row in connection.execute("SELECT id FROM history")}
    sound = connection.execute("PRAGMA integrity_check").fetchall()
    connection.close()
    assert sound == [("ok",)]
    return ids


def keep_writing(path, acknowledged, stop, stuck):
    """Insert rows as fast as they commit; append each id once it is acknowledged."""
    connection = sqlite3.connect(path, isolation_level=None, timeout=10)
    connection.execute("PRAGMA synchronous=FULL")
    insert = "INSERT INTO history (id, at, what, entity, entity_id, particulars) VALUES (?, ?, 'x', '', '', ?)"
    try:
        while not stop.is_set():
            name = f"row-{len(acknowledged)}"
            connection.execute(insert, (name, "2026-08-12 00:00:00", '{"much": "' + "w" * 3000 + '"}'))
            acknowledged.append(name)
    except sqlite3.Error as trouble:
        stuck.append(trouble)
    finally:
        connection.close()


def test_backup_while_somebody_writes_holds_every_row_acknowledged_before_it(config, day, tmp_path):
    acknowledged, stop, stuck = [], threading.Event(), []
    writer = threading.Thread(target=keep_writing, args=(config.sqlite_path, acknowledged, stop, stuck))
    writer.start()
    try:
        for number in range(4):
            while len(acknowledged) < 20 * (number + 1):
                time.sleep(0.005)
            before = set(acknowledged)
            made = backup.backup(config, tmp_path / f"copy-{number}")
            assert before <= ids_in(made.folder / backup.DATABASE_NAME)
    finally:
        stop.set()
        writer.join()
    assert stuck == []
    assert set(acknowledged) <= ids_in(config.sqlite_path)


def test_a_backup_put_back_has_everything_and_the_same_sessions(config, app, day, people, browser_as, tmp_path):
    crew = browser_as("crew")
    before = without_token(crew.get(f"/surveys/{day.id}/readings").text)
    answer = run("--data", config.data_dir, tmp_path / "kept")
    assert answer.exit_code == 0, answer.output
    assert "3 readings" in answer.output
    app.extensions["bankside_database"].engine.dispose()
    config.data_dir.rename(tmp_path / "broken")
    shutil.copytree(tmp_path / "kept", config.data_dir)
    again = create_app(config, TESTING=True, RATELIMIT_ENABLED=False)
    crew.client = _same_cookies(crew, again)
    assert without_token(crew.get(f"/surveys/{day.id}/readings").text) == before
    assert Browser(again).sign_in(people["office"]).status_code == 303
    again.extensions["bankside_database"].engine.dispose()


def without_token(page):
    return re.sub(r'name="csrf_token" value="[^"]+"', "", page)  # the hour is in it


def _same_cookies(browser, app):
    client = app.test_client()
    cookie = browser.client.get_cookie("session")
    client.set_cookie("session", cookie.value)
    return client


def test_a_backup_is_for_its_owner_only_and_leaves_the_copies_of_upgrades_out(config, day, tmp_path):
    (config.data_dir / "authority").mkdir(mode=0o755)
    (config.data_dir / "authority" / "key.pem").write_text("k")
    (config.data_dir / "copies").mkdir()
    (config.data_dir / "copies" / "old.sqlite3").write_text("old")
    folder = backup.backup(config, tmp_path / "kept").folder
    inside = {str(path.relative_to(folder)): path.stat().st_mode & 0o777 for path in folder.rglob("*")}
    files = {"bankside.sqlite3": 0o600, secret.FILE_NAME: 0o600, "authority/key.pem": 0o600}
    assert inside == {**files, "authority": 0o700}
    assert folder.stat().st_mode & 0o777 == 0o700
    assert (folder / secret.FILE_NAME).read_text() == (config.data_dir / secret.FILE_NAME).read_text()


def test_a_backup_never_replaces_anything(config, day, tmp_path):
    (tmp_path / "kept").mkdir()
    (tmp_path / "kept" / "mine").write_text("mine")
    answer = run("--data", config.data_dir, tmp_path / "kept")
    assert answer.exit_code == 1
    assert "never replaces" in answer.output
    assert [path.name for path in (tmp_path / "kept").iterdir()] == ["mine"]


def test_a_database_elsewhere_is_copied_under_the_usual_name(config, app, day, tmp_path):
    elsewhere = tmp_path / "other" / "river.db"
    elsewhere.parent.mkdir()
    shutil.copy(backup.backup(config, tmp_path / "first").folder / backup.DATABASE_NAME, elsewhere)
    (config.data_dir / backup.DATABASE_NAME).write_text("not this one")
    made = backup.backup(replace(config, database_url=f"sqlite:///{elsewhere}"), tmp_path / "kept")
    assert made.readings == 3


def test_no_database_no_backup_and_no_file_made(tmp_path):
    answer = run("--data", tmp_path / "nothing", tmp_path / "kept")
    assert answer.exit_code == 1
    assert "no database at" in answer.output
    assert list(tmp_path.iterdir()) == []


def test_a_damaged_database_gives_no_backup(config, day, app, tmp_path):
    app.extensions["bankside_database"].engine.dispose()
    content = bytearray(config.sqlite_path.read_bytes())
    content[4096 * 3 : 4096 * 9] = b"\x55" * (4096 * 6)
    config.sqlite_path.write_bytes(content)
    with pytest.raises(NoBackup, match="not sound|could not be made"):
        backup.backup(config, tmp_path / "kept")
    assert not (tmp_path / "kept").exists()
    assert not [path for path in tmp_path.iterdir() if path.name.startswith(".kept")]


def test_a_backup_inside_the_data_folder_is_refused(config, day):
    with pytest.raises(NoBackup, match="outside"):
        backup.backup(config, config.data_dir / "kept")


def test_a_place_that_can_not_be_written_is_told(config, day, tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(NoBackup, match="Could not write"):
        backup.backup(config, tmp_path / "file" / "kept")


def test_on_postgresql_it_points_to_the_servers_own_tools(tmp_path):
    config = replace(read_config({}, data_dir=tmp_path), database_url="postgresql+psycopg://app@host/bankside")
    with pytest.raises(NoBackup, match="pg_dump"):
        backup.backup(config, tmp_path / "kept")
