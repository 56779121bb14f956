"""The field pack on a phone: a day without a server, and the phone's check against calc's."""

import random
import sqlite3
from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from playwright.sync_api import expect

from calc.oxygen import salinity_psu, saturation_mg_l, station_pressure_mmhg
from tests.browser.conftest import PHONE, sign_in, survey_address, watched
from tests.browser.server import Server
from tests.browser.test_waiting import LINE, fill, save, stored  # noqa: F401

ELEVATION_M = 310.0


@pytest.fixture(scope="module")
def server(tmp_path_factory):
    """A server of this module's own."""
    server = Server(tmp_path_factory.mktemp("pack"))
    server.start()
    yield server
    server.kill()


@pytest.fixture(scope="module")
def ready(browser, server):
    """A crew's phone that was made ready for the river, its field sheet open."""
    context = browser.new_context(base_url=server.address, **PHONE)
    page = watched(context.new_page())
    sign_in(page, server.address, "crew")
    page.survey = survey_address(page)
    page.goto(page.survey + "/sheet")
    page.get_by_role("button", name="Make ready for the river").tap()
    expect(page.get_by_text("Ready for the river: plan version 1")).to_be_visible(timeout=60000)
    assert page.console_errors == []
    yield page
    context.close()


def test_a_day_without_a_server_and_back(ready, server, stored):  # noqa: F811
    page = ready
    server.kill()
    page.goto(page.survey + "/sheet")
    expect(page.get_by_text("No answer from the server: this is the page as it was")).to_be_visible()
    expect(page.get_by_text("Ready for the river: plan version 1")).to_be_visible()
    taken = []
    for number, code in enumerate(("D7", "D8", "D9"), start=1):
        fill(page, f"7,{number}", f"day {number}", code=code)
        taken.append(_type_an_earlier_time(page, minutes=4 * number))
        save(page)
        expect(page.locator("main")).to_contain_text("Saved on this phone, not on the server yet")
        expect(page.locator("#reading")).to_contain_text("of 8.")
        if code != "D9":
            expect(page.get_by_role("link", name=f"Next: D{7 + number}")).to_be_visible()
        page.get_by_role("link", name="Field sheet").last.tap()
        expect(page.locator(f"#station-{code}")).to_contain_text("1 reading on this phone, not sent yet")
    expect(page.locator(LINE)).to_contain_text("3 readings wait on this phone")
    page.goto(page.survey + "/plan")
    expect(page.get_by_text("The page you asked for needs signal.")).to_be_visible()
    expect(page.get_by_role("link", name="plan version 1")).to_be_visible()
    server.start()
    expect(page.locator(LINE)).to_contain_text("Nothing waits on this phone", timeout=60000)
    assert [one[1:] for one in stored("day")] == [(7.1, "crew"), (7.2, "crew"), (7.3, "crew")]
    assert _taken_at(server) == taken


def _type_an_earlier_time(page, minutes):
    """Type a time before the one the phone offers, and return that instant in UTC."""
    field = page.get_by_label("Time of the reading")
    earlier = datetime.fromisoformat(field.input_value()) - timedelta(minutes=minutes)
    field.fill(earlier.strftime("%Y-%m-%dT%H:%M"))
    zone = page.locator("form[data-waiting]").get_attribute("data-zone")
    return earlier.replace(tzinfo=ZoneInfo(zone)).astimezone(UTC).replace(tzinfo=None)


def _taken_at(server):
    with sqlite3.connect(f"file:{server.data_dir}/bankside.sqlite3?mode=ro", uri=True) as db:
        rows = db.execute("select taken_at from reading where note like 'day%' order by do_mg_l")
        return [datetime.fromisoformat(at) for (at,) in rows]


def test_page_opens_from_the_phone_when_the_server_hangs(ready, server):
    server.hang()
    try:
        ready.goto(ready.survey + "/stations/D5/reading")
        expect(ready.get_by_text("No answer from the server")).to_be_visible()
        expect(ready.get_by_role("heading", name="Reading at D5")).to_be_visible()
    finally:
        server.go_on()


def on_phone(page, records):
    """Return what the phone's own check says of each record."""
    return page.evaluate(
        """async ([survey, records]) => {
          const at = (name) => document.querySelector('script[src*="waiting_line"]').src.replace("waiting_line", name);
          const { checkOnPhone } = await import(at("check"));
          const { get } = await import(at("waiting_store"));
          const pack = await get("packs", survey);
          return records.map((record) => checkOnPhone(pack, record));
        }""",
        [page.survey.rsplit("/", 1)[1], records],
    )


def test_check_on_the_phone_agrees_with_calc_over_temperature_pressure_and_conductance(ready):
    numbers = random.Random(5)
    cases = [
        (celsius, mmhg, conductance)
        for celsius in (0, 0.4, 7.3, 14.5, 20.15, 26.6, 33.3, 40)
        for mmhg in (600, 641.7, 702.2, 733, 768.4, 800)
        for conductance in (0, 55, 410, 1234.5, 9800, numbers.uniform(12000, 59000))
    ]
    fields = {"do_mg_l": "5", "units": "si", "pressure_unit": "mm[Hg]", "pressure_source": "meter", "taken_at": ""}
    found = on_phone(ready, [
        {"code": "D5", "fields": fields | {
            "water_temp_c": str(celsius), "pressure": str(mmhg), "conductance_us_cm": str(conductance)}}
        for celsius, mmhg, conductance in cases
    ])  # fmt: skip
    apart = [
        abs(one["saturation"] - saturation_mg_l(celsius, mmhg, salinity_psu(conductance)))
        for one, (celsius, mmhg, conductance) in zip(found, cases, strict=True)
    ]
    assert len(apart) == 288 and max(apart) <= 0.01


def test_check_on_the_phone_agrees_with_the_servers_at_every_station(ready):
    page = ready
    page.goto(page.survey + "/sheet")
    codes = [one.get_attribute("id").removeprefix("station-") for one in page.locator("li.stop").all()]
    assert len(codes) >= 8
    for code in codes[::3]:
        page.goto(f"{page.survey}/stations/{code}/reading")
        page.get_by_label("Oxygen").fill("5.5")
        page.get_by_label("Water temperature").fill("18,7")
        page.get_by_text("More about this reading").tap()
        page.get_by_label("Specific conductance").fill("640")
        page.get_by_label("Air pressure as shown").fill("1012")
        page.get_by_label("Unit", exact=True).select_option("hPa")
        page.get_by_label("Where it comes from").select_option("weather")
        fields = page.evaluate("Object.fromEntries(new FormData(document.querySelector('form[data-waiting]')))")
        save(page)
        keep = page.get_by_role("button", name="Keep")
        expect(keep.or_(page.get_by_text("Saved on the server"))).to_be_visible()
        if keep.is_visible():
            keep.tap()
        expect(page.get_by_text("Saved on the server")).to_be_visible()
        server = page.locator("[data-check]").evaluate("one => ({...one.dataset})")
        (phone,) = on_phone(page, [{"code": code, "fields": fields}])
        for name in ("saturation", "deficit", "predicted"):
            assert phone[name] == pytest.approx(float(server[name]), abs=0.01), (code, name)


def test_weather_pressure_in_inches_and_fahrenheit_are_read_as_the_server_reads_them(ready):
    fields = {"do_mg_l": "5", "units": "us", "water_temp_c": "66,2", "pressure": "29.92", "taken_at": "",
              "pressure_unit": "[in_i'Hg]", "pressure_source": "weather"}  # fmt: skip
    (found,) = on_phone(ready, [{"code": "D5", "fields": fields}])
    pressure = station_pressure_mmhg(29.92 * 25.4, ELEVATION_M)
    assert found["saturation"] == pytest.approx(saturation_mg_l(19.0, pressure), abs=0.01)


def test_point_that_a_link_names_is_on_the_kept_form_and_is_not_kept_with_it(ready, server):
    page, form = ready, f"{ready.survey}/stations/D8/reading"
    page.goto(f"{form}?position=left&sensor_depth_m=0.2", wait_until="networkidle")
    expect(page.locator("[name=position]")).to_have_value("left")
    server.kill()
    page.goto(form)
    expect(page.locator("[name=position]")).to_have_value("")
    page.goto(f"{form}?position=right&sensor_depth_m=0.8&replicate=yes&do_mg_l=9")
    expect(page.locator("[name=position]")).to_have_value("right")
    expect(page.locator("[name=sensor_depth_m]")).to_have_value("0.8")
    expect(page.locator("[name=replicate]")).to_be_checked()
    expect(page.locator("[name=do_mg_l]")).to_have_value("")
    server.start()


def test_answer_that_differs_from_the_phones_replaces_it_and_says_so(ready, server):
    page = ready
    page.goto(f"{page.survey}/stations/D6/reading")
    page.evaluate("""async (survey) => {
      const store = await import(document.querySelector('script[src*="waiting_line"]').src
        .replace("waiting_line", "waiting_store"));
      const pack = await store.get("packs", survey);
      await store.put("packs", { ...pack, standard: pack.standard - 20 });
    }""", page.survey.rsplit("/", 1)[1])  # fmt: skip
    page.get_by_label("Oxygen").fill("4,9")
    page.get_by_label("Water temperature").fill("19,5")
    server.kill()
    save(page)
    expect(page.locator("main")).to_contain_text("Saved on this phone")
    server.start()
    expect(page.get_by_text("This replaces what the phone showed: saturation")).to_be_visible(timeout=60000)
    expect(page.locator("#reading")).to_contain_text("Saved on the server")


COUNT = """() => new Promise((resolve) => {
  indexedDB.open("bankside").onsuccess = ({ target: { result } }) => {
    const deal = result.transaction(["waiting", "packs"]);
    const [waiting, packs] = ["waiting", "packs"].map((name) => deal.objectStore(name).getAll());
    deal.oncomplete = () => resolve([waiting.result.filter((one) => one.state !== "sent").length, packs.result.length]);
  };
})"""


def test_signing_out_takes_pack_and_pages_off_the_phone_but_not_what_waits(ready):
    page = ready
    page.route("**/phone/here", lambda route: route.abort())
    page.route("**/reading", lambda route: route.abort() if route.request.method == "POST" else route.continue_())
    fill(page, "5.1", "left behind", code="D6")
    save(page)
    expect(page.locator("main")).to_contain_text("Saved on this phone")
    assert page.evaluate(COUNT) == [1, 1]
    page.locator("details.menu summary").tap()
    page.get_by_role("button", name="Sign out").tap()
    expect(page.get_by_role("heading", name="Sign in")).to_be_visible()
    assert page.evaluate(COUNT) == [1, 0]
    assert page.evaluate("async () => (await (await caches.open('bankside-pages')).keys()).length") == 0
