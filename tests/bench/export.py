"""The readings table, the review and the full export of a survey with 5000 readings: python -m tests.bench.export

Prints seconds, and each as a ratio to writing the same 5000 readings out with nothing but the csv module.
"""

import csv
import io
import tempfile
from datetime import UTC, datetime, timedelta
from time import perf_counter

from sqlalchemy import select

from webapp import cli, create_app, demo
from webapp.config import read_config
from webapp.dataset import importing
from webapp.dataset import service as dataset
from webapp.models import Reading, Survey
from webapp.people.queries import find_by_sign_in
from webapp.plan.queries import current_plan, stations_of
from webapp.readings import judging
from webapp.readings.queries import readings_of

READINGS = 5000
GOAL_TABLE_S, GOAL_EXPORT_S = 1.0, 3.0
PAGES = {"readings table": "readings", "bad ones of it": "readings?quality=questionable&page=2", "review": "review"}


def filled(db):
    """Load the demo and add readings up to READINGS; return the survey."""
    demo.load(db, datetime.now(UTC))
    survey = db.scalar(select(Survey).order_by(Survey.created_at.desc()))
    stations, plan = list(stations_of(db, survey.id).values()), current_plan(db, survey.id)
    author = find_by_sign_in(db, "crew")
    begin = datetime.now(UTC) - timedelta(days=5)
    db.add_all(
        Reading(
            survey_id=survey.id,
            station_id=stations[number // 3 % len(stations)].id,
            plan_version_id=plan.id,
            author_id=author.id,
            taken_at=begin + timedelta(minutes=number),
            meter="Meter A",
            do_mg_l=4.5 + number % 7 / 100,
            water_temp_c=20.1,
            pressure_mmhg=732.0,
        )
        for number in range(READINGS - len(readings_of(db, survey.id)))
    )
    db.commit()
    return survey


def timed(deed, before=lambda: None):
    """Return the best of three times, in seconds; before is done before each and not timed."""
    times = []
    for _ in range(3):
        before()
        begun = perf_counter()
        deed()
        times.append(perf_counter() - begun)
    return min(times)


def plainly_written(readings):
    """Write every stored value of the readings as CSV, and no more."""
    columns = [column.key for column in Reading.__table__.columns]
    writer = csv.writer(io.StringIO())
    writer.writerows([getattr(reading, column) for column in columns] for reading in readings)


def main():
    """Print the times and ratios."""
    with tempfile.TemporaryDirectory() as folder:
        config = read_config({}, data_dir=folder)
        database = cli._open(config)
        with database.writing() as db:
            survey = filled(db)
            survey_id = survey.id
        app = create_app(config, RATELIMIT_ENABLED=False, WTF_CSRF_ENABLED=False)
        client = app.test_client()
        name, password, _ = demo.SIGN_INS[2]
        client.post("/sign-in", data={"sign_in": name, "password": password})
        decision = timed(_decisions(client, database, survey_id))
        pages = {name: _both_times(client, f"/surveys/{survey_id}/{path}") for name, path in PAGES.items()}
        with database.reading() as db:
            survey = db.scalar(select(Survey).order_by(Survey.created_at.desc()))
            readings = readings_of(db, survey_id)
            plain = timed(lambda: plainly_written(readings))
        # What judges every reading is kept in memory: the first export after a change does without.
        export = timed(lambda: _export(database), before=judging.forget)
        again = timed(lambda: _export(database))
        content = _export(database)
        with database.reading() as db:
            office = find_by_sign_in(db, name).id
            look = timed(lambda: importing.look(db, content, office))
        database.engine.dispose()
    for name, (cold, warm) in pages.items():
        print(f"{name} of {READINGS}: {cold:.2f} s (goal {GOAL_TABLE_S:.0f}), {cold / plain:.1f} x plain CSV;", end=" ")
        print(f"{warm:.2f} s while nothing changes")
    print(f"keeping a reading and showing the next: {decision:.2f} s, {decision / plain:.1f} x plain CSV")
    print(f"full export as a zip: {export:.2f} s (goal {GOAL_EXPORT_S:.0f}), {export / plain:.1f} x plain CSV")
    print(f"the same again: {again:.2f} s; reading its {len(content) / 1e6:.1f} MB back and comparing: {look:.2f} s")


def _both_times(client, address):
    """Return the time of a page when everything is judged anew, and when nothing changed since. [s]"""

    def fetched():
        answer = client.get(address)
        assert answer.status_code == 200, answer.status

    def judged_anew():
        judging.forget()
        fetched()

    return timed(judged_anew), timed(fetched)


def _decisions(client, database, survey_id):
    """Return a deed that keeps the next reading of the list as a reviewer and goes on to the one after it."""
    with database.reading() as db:
        ids = iter([one.id for one in readings_of(db, survey_id)][READINGS // 2 :])

    def keep():
        form = {"based_on": "0", "why_kept": "nothing speaks against it"}
        address = f"/surveys/{survey_id}/readings/{next(ids)}/keep?list=on"
        answer = client.post(address, data=form, follow_redirects=True)
        assert answer.status_code == 200, answer.status

    return keep


def _export(database):
    with database.reading() as db:
        survey = db.scalar(select(Survey).order_by(Survey.created_at.desc()))
        return dataset.zip_of(dataset.dataset_of(db, survey))


if __name__ == "__main__":
    main()
