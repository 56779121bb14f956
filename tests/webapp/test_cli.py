import pytest
from click.testing import CliRunner

from webapp import cli
from webapp.config import read_config
from webapp.db import Database, make_engine
from webapp.people import queries, service

OFFICE = ["--office-name", "Olive Reed", "--office-sign-in", "olive", "--office-password", "heron under willow"]


@pytest.fixture
def served(monkeypatch):
    """Collect the configurations that would be served, instead of serving them for ever."""
    configs = []
    monkeypatch.setattr(cli, "_serve", configs.append)
    return configs


def run(*arguments, **more):
    return CliRunner().invoke(cli.main, list(arguments), **more)


def test_first_start_makes_database_and_office_account(tmp_path, served):
    answer = run("serve", "--data", str(tmp_path / "d"), *OFFICE)
    assert answer.exit_code == 0, answer.output
    database = Database(make_engine(served[0].database_url))
    with database.reading() as db:
        assert service.check_sign_in(db, "olive", "heron under willow").role == "office"
    database.engine.dispose()
    assert run("serve", "--data", str(tmp_path / "d")).exit_code == 0


def test_first_start_without_a_terminal_says_how_to_give_the_account(tmp_path, served):
    answer = run("serve", "--data", str(tmp_path / "d"))
    assert answer.exit_code == 1
    assert "--office-sign-in" in answer.output
    assert served == []


def test_first_account_needs_a_good_password(tmp_path, served):
    answer = run("serve", "--data", str(tmp_path / "d"), *OFFICE[:-1], "short")
    assert answer.exit_code == 1
    assert "10 characters" in answer.output


def test_forgotten_password_is_set_from_the_command_line(tmp_path, served):
    run("serve", "--data", str(tmp_path / "d"), *OFFICE)
    answer = run("password", "--data", str(tmp_path / "d"), "olive", input="otter at the ford\notter at the ford\n")
    assert answer.exit_code == 0, answer.output
    assert run("password", "--data", str(tmp_path / "d"), "nobody", "--password", "otter at the ford").exit_code == 1
    database = Database(make_engine(served[0].database_url))
    with database.reading() as db:
        assert service.check_sign_in(db, "olive", "otter at the ford") is not None
        assert queries.active_offices(db) == 1
    database.engine.dispose()


def test_welcome_gives_both_addresses_and_a_code_for_phones(tmp_path):
    lines = cli.welcome(read_config({}, data_dir=tmp_path, port=8123), network_address="10.1.2.3")
    assert "http://127.0.0.1:8123/" in lines[0]
    assert "http://10.1.2.3:8123/" in lines[1]
    assert "▄" in lines[2] or "█" in lines[2]


def test_a_server_for_this_machine_only_offers_no_phone_address(tmp_path):
    lines = cli.welcome(read_config({}, data_dir=tmp_path, host="127.0.0.1"))
    assert "itself only" in lines[1]


def test_bad_environment_is_told_and_not_served(tmp_path, served, monkeypatch):
    monkeypatch.setenv("BANKSIDE_THREADS", "many")
    answer = run("serve", "--data", str(tmp_path))
    assert answer.exit_code == 1
    assert "BANKSIDE_THREADS" in answer.output
