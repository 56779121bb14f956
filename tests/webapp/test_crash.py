"""A few kills in the ordinary tests; tests/bench/crash.py does thirty and more."""

import pytest

from tests.browser.server import Server
from tests.crashing import crash_loop


@pytest.fixture
def server(tmp_path):
    """A server with the demo survey that may be killed."""
    server = Server(tmp_path / "data")
    server.start()
    yield server
    server.kill()


def test_no_acknowledged_reading_is_lost_or_doubled_when_the_server_is_killed(server):
    found = crash_loop(server, kills=3)
    assert found["acknowledged"] > 0
    assert (found["lost"], found["doubled"], found["refused"], found["database"]) == ([], 0, [], "ok")
