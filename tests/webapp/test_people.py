import pytest

from webapp.models import Person


def test_front_page_asks_a_stranger_to_sign_in(app):
    answer = app.test_client().get("/")
    assert answer.status_code == 302
    assert "/sign-in" in answer.headers["Location"]


def test_right_password_opens_the_surveys(browser_as):
    answer = browser_as("crew").get("/")
    assert answer.status_code == 200
    assert "Cleo Banks" in answer.text
