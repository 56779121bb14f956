"""A dataset read back: equal on a server that did not have it, compared where it does, bad cells named."""


import pytest

from tests.webapp import servers
from tests.webapp.everything import put_everything
from webapp.dataset import importing, service
from webapp.models import Survey
from webapp.people import service as people_service
from webapp.people.forms import NewPerson

STRANGER = NewPerson("Ivo Marsh", "ivo", "office", "heron under willow")


@pytest.fixture
def filled(db, survey, people):
    """A survey with one of everything."""
    put_everything(db, survey, people)
    return survey


@pytest.fixture
def strange(tmp_path):
    """A server that knows nobody but an office of its own, and that person's id."""
    with servers.server(f"sqlite:///{tmp_path / 'strange.sqlite3'}") as database:
        with database.writing() as db:
            office = people_service.add_person(db, STRANGER).id
        yield database, office


def exported(db, survey):
    db.rollback()
    db.expire_all()
    return service.dataset_of(db, survey)


def imported(database, content, by_id):
    with database.writing() as db:
        mark = importing.look(db, content, by_id).outcome.mark
        return importing.import_dataset(db, content, by_id, mark)


def test_read_back_on_a_fresh_server_it_is_the_same_files_byte_by_byte(db, filled, strange):
    database, office = strange
    dataset = exported(db, filled)
    found = imported(database, service.zip_of(dataset), office)
    assert found.outcome.new and not found.changed
    with database.reading() as there:
        again = service.dataset_of(there, there.get(Survey, filled.id))
    for name, content in dataset.files.items():
        assert again.files[name].decode() == content.decode(), name
    assert again.version == dataset.version
