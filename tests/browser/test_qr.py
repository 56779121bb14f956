"""What waits as QR codes: our codes against another encoder's, and a reading that another phone takes over."""

import pytest
import segno
from playwright.sync_api import expect

from tests.browser.conftest import PHONE, watched
from tests.browser.look import barriers, barriers_in_the_dark, crowded, wider_than
from tests.browser.test_waiting import LINE, fill, kept, phone, save, server, states, stored  # noqa: F401

ADDRESS = "http://192.168.4.1:8080/phone#take=" + "eyJzdXJ2ZXkiOiI3Yz-_" * 120
# As long as their versions (1, 2, 6, 7, 10, 14, 20, 27, 32, 40) hold, so that nothing is filled up.
WHOLE = [ADDRESS[:length] for length in (17, 32, 134, 154, 271, 458, 858, 1465, 1952)] + ["0" * 2953]
SHORTER = [ADDRESS[:length] for length in (1, 8, 60, 147, 300, 555, 1000, 1400)] + ["Höhe über dem Fluß", "流れ " * 60]
MATRICES = """async (texts) => {
  const page = document.querySelector('script[src*="codes.js"]').src;
  const { qrMatrix } = await import(page.replace("codes.js", "qr_code.js"));
  return texts.map((text) => { const { rows, mask } = qrMatrix(text); return { rows, mask }; });
}"""
SHOWN = """() => {
  const svg = document.querySelector("[data-code] svg"), side = svg.viewBox.baseVal.width;
  const dark = svg.querySelector("path"), rows = [];
  for (let y = 0; y < side; y += 1) {
    rows.push([]);
    for (let x = 0; x < side; x += 1) rows[y].push(Number(dark.isPointInFill(new DOMPoint(x + 0.5, y + 0.5))));
  }
  return { rows, white: svg.querySelector("rect").getAttribute("fill") };
}"""
LETTERS = """async () => {
  const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
  const { records } = await import(at("waiting_store"));
  const { asLetters } = await import(at("copies"));
  return (await records()).map(asLetters);
}"""
ALL_KEPT = """async () => {
  const { records } = await import(document.querySelector('script[src*="waiting_line"]').src
    .replace("waiting_line", "waiting_store"));
  return (await records()).map(({ id, url, author, authorName, fields, keptAt }) =>
    ({ id, url, author, authorName, keptAt,
       fields: Object.fromEntries(Object.entries(fields).filter(([, text]) => text)) }));
}"""


def by_segno(text, mask):
    options = {"error": "L", "mode": "byte", "boost_error": False, "micro": False}
    made = segno.make(text, mask=mask, encoding=None if text.isascii() else "utf-8", **options)
    return [list(row) for row in made.matrix]


def fill_up_as_the_standard_does(monkeypatch):
    """Leave out the word of zeros that segno 1.6 puts before the filling where the bits end with a whole word.

    ISO/IEC 18004, 7.4.10: zeros are added only where the bits do not end at a boundary. Readers take both.
    """
    monkeypatch.setattr("segno.encoder.write_padding_bits", lambda bits, _, length: bits.extend([0] * (-length % 8)))


@pytest.fixture
def second(browser, server, states):  # noqa: F811
    """Another phone of the crew, made ready for the river."""
    context = browser.new_context(base_url=server.address, storage_state=states["crew"], **PHONE)
    page = watched(context.new_page())
    page.goto("/")
    page.get_by_role("link", name="Sallow Water, August low flow").tap()
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text("Ready for the river: plan version")).to_be_visible(timeout=60000)
    yield page
    context.close()


def test_codes_are_those_of_another_encoder(phone, monkeypatch):  # noqa: F811
    phone.goto("/phone")
    for text, made in zip(WHOLE, phone.evaluate(MATRICES, WHOLE), strict=True):
        assert made["rows"] == by_segno(text, made["mask"]), len(text)
    fill_up_as_the_standard_does(monkeypatch)
    for text, made in zip(SHORTER, phone.evaluate(MATRICES, SHORTER), strict=True):
        assert made["rows"] == by_segno(text, made["mask"]), len(text)
    with pytest.raises(Exception, match="too long for a QR code"):
        phone.evaluate(MATRICES, ["0" * 2954])


def test_code_takes_a_reading_to_another_phone_without_signal_and_it_is_stored_once(
    phone, second, server, stored, monkeypatch  # noqa: F811
):  # fmt: skip
    fill_up_as_the_standard_does(monkeypatch)
    fill(phone, "6,6", "by code: Fluß", code="D5")
    other = phone.context.new_page()
    other.goto("/phone")
    server.kill()
    save(phone)
    expect(phone.locator("main")).to_contain_text("Saved on this phone, not on the server yet")
    other.get_by_role("button", name="Show as codes").tap()
    expect(other.locator("[data-code-title]")).to_contain_text("1 of 1: reading of Cleo Banks at D5, time ")
    [letters] = other.evaluate(LETTERS)
    shown = other.evaluate(SHOWN)
    inner = [row[4:-4] for row in shown["rows"][4:-4]]
    assert shown["white"] == "#fff"
    assert sum(map(sum, shown["rows"])) == sum(map(sum, inner))
    address = f"{server.address}/phone#take={letters}"
    assert inner in [by_segno(address, mask) for mask in range(8)]
    for _ in range(2):
        second.goto(address)
        expect(second.locator("[data-taking-says]")).to_contain_text("A reading of Cleo Banks at D5, time ")
        second.get_by_role("button", name="Take it over", exact=True).tap()
        expect(second.locator("[data-taking-says]")).to_contain_text("taken over")
        assert second.url == f"{server.address}/phone"
    expect(second.locator("[data-taking-says]")).to_contain_text("Nothing taken over, 1 here already.")
    assert second.evaluate(ALL_KEPT) == other.evaluate(ALL_KEPT)
    assert other.evaluate(ALL_KEPT)[0]["fields"]["note"] == "by code: Fluß"
    server.start()
    for page in (second, phone):
        expect(page.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert [one[1:] for one in stored("by code")] == [(6.6, "crew")]
    assert [state for state, _ in kept(second)] == ["sent"]


MANY = """async ([survey, notes]) => {
  const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
  const { keepRecord } = await import(at("waiting_store"));
  const { newId, person, phone } = await import(at("phone"));
  for (const [number, note] of notes.entries()) {
    const id = newId();
    const fields = { submission_id: id, author_id: person, units: "si", taken_at: "2026-08-12T09:00", note,
      do_mg_l: "6.5", water_temp_c: "19.5", saved_at: new Date().toISOString() };
    await keepRecord({ v: 1, id, url: `${survey}/stations/D7/reading`, survey: survey.split("/")[2],
      surveyName: "Sallow Water", code: "D7", fields, author: person, authorName: phone.dataset.name,
      keptAt: Date.now() + number, state: "waiting", reason: "", tries: 0, nextAt: Date.now() + 600000 }, "");
  }
}"""


def test_codes_are_turned_one_at_a_time_and_a_long_reading_goes_by_file(phone):  # noqa: F811
    phone.goto("/phone")
    expect(phone.get_by_role("button", name="Show as codes")).to_be_hidden()
    phone.evaluate(MANY, [phone.survey, ["first", "second", "long " * 300]])
    phone.get_by_role("button", name="Show as codes").tap()
    title, picture = phone.locator("[data-code-title]"), phone.locator("[data-code] svg")
    expect(title).to_contain_text("1 of 3: reading of Cleo Banks at D7, time Wed 12 Aug 09:00")
    assert wider_than(phone, 320) == []
    assert picture.bounding_box()["width"] > 280
    assert crowded(phone) == []
    assert barriers(phone) == []
    assert barriers_in_the_dark(phone) == []
    drawn = picture.locator("path").get_attribute("d")
    phone.get_by_role("button", name="Next").tap()
    expect(title).to_contain_text("2 of 3")
    assert picture.locator("path").get_attribute("d") != drawn
    phone.get_by_role("button", name="Next").tap()
    expect(phone.get_by_text("This is too long for a code. Save what waits as a file instead.")).to_be_visible()
    expect(picture).to_have_count(0)
    phone.get_by_role("button", name="Previous").tap()
    expect(title).to_contain_text("2 of 3")
    expect(picture).to_be_visible()
    assert phone.console_errors == []


@pytest.mark.parametrize("letters", ["", "%00", "bm90IGEgcmVhZGluZw", "eyJ2IjoxLCJmaWVsZHMiOnt9fQ"])
def test_code_that_holds_no_reading_is_answered_plainly(phone, letters):  # noqa: F811
    phone.goto(f"/phone#take={letters}")
    expect(phone.get_by_text("There is nothing whole in this code.")).to_be_visible()
    expect(phone.get_by_role("button", name="Take it over", exact=True)).to_be_hidden()
    assert phone.console_errors == []
    assert kept(phone) == []
