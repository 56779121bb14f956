"""The dataset's file on a desk: the page says that it is being made, and imports it again."""

import zipfile

from playwright.sync_api import expect

from tests.browser.conftest import DESK, survey_address


def test_the_link_says_that_the_dataset_is_being_made_until_it_is_there(page_as):
    page = page_as("office", DESK)
    page.goto(f"{survey_address(page)}/dataset")
    held = []
    page.route("**/dataset.zip", lambda route: held.append(route))
    with page.expect_download() as download:
        page.get_by_role("link", name="Download the zip").click()
        expect(page.get_by_role("status").filter(has_text="Making the dataset…")).to_be_visible()
        held[0].continue_()
    assert "readings.csv" in zipfile.ZipFile(download.value.path()).namelist()
    assert download.value.suggested_filename.endswith(".zip")
    expect(page.get_by_role("status").filter(has_text=download.value.suggested_filename)).to_be_visible()
    assert not page.console_errors


def test_without_a_script_the_link_downloads_and_the_import_compares(page_as):
    page = page_as("office", DESK, java_script_enabled=False)
    page.goto(f"{survey_address(page)}/dataset")
    with page.expect_download() as download:
        page.get_by_role("link", name="Download the zip").click()
    page.get_by_role("link", name="Import a dataset").click()
    page.get_by_label("Dataset").set_input_files(download.value.path())
    page.get_by_role("button", name="Look into the dataset").click()
    expect(page.get_by_text("the dataset is equal to it")).to_be_visible()
