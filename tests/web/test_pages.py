"""Pages through the real app over rows of the factory."""

import re
from collections.abc import Callable
from datetime import timedelta
from html.parser import HTMLParser

import pytest
from sqlalchemy import update

from app.resources import resource
from app.storage.database import Database
from app.storage.tables import Advice
from app.wording import CAUTION_TITLE
from app.wording.reader import reader
from tests.web.conftest import Browser
from tests.web.factory import HOSTILE, TODAY
from tests.web.pages_of import PAGES

EVERY = [(template, path) for template, paths in PAGES.items() for path in paths]


class Reader(HTMLParser):
    """Headings, ids, labels and scripts of a page."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def of(self, tag: str) -> list[dict[str, str | None]]:
        """The attributes of every such tag."""
        return [attributes for name, attributes in self.tags if name == tag]


@pytest.mark.parametrize(("template", "path"), EVERY)
def test_every_page_is_whole_safe_and_carries_the_caution(
    browse: Browser, template: str, path: str
) -> None:
    answer = browse.get(path)
    assert answer.status_code == (404 if template == "error.html" else 200)
    text = answer.text
    language = "es" if '<html lang="es">' in text else "en"
    assert reader(language, "metric").say("common", "caution_title") in text
    assert "No admin can sign in yet" in text
    page = Reader(text)
    assert len(page.of("h1")) == 1
    assert not [tag for tag in page.of("script") if "src" not in tag]
    for tag, attributes in page.tags:
        assert "style" not in attributes, (tag, attributes)
        assert not [name for name in attributes if name.startswith("on")], (tag, attributes)
    ids = [attributes["id"] for _, attributes in page.tags if "id" in attributes]
    assert len(ids) == len(set(ids))
    assert "<script>alert" not in text
    assert re.findall(r"\b(None|nan|Undefined)\b", re.sub(r"<[^>]*>", " ", text)) == []


def test_every_template_of_a_page_is_rendered_here() -> None:
    folder = resource("templates")
    pages = {path.relative_to(folder).as_posix() for path in folder.rglob("*.html")}
    parts = {name for name in pages if name.startswith(("parts/", "letters/"))} | {"base.html"}
    # test_access, test_intake_pages, test_station_api
    elsewhere = {"pages/enter.html", "pages/intake_file.html", "pages/intake_pushes.html"}
    elsewhere |= {"pages/what_if.html"}  # test_what_if
    elsewhere |= {"pages/supplies.html", "pages/supply.html"}  # test_supply
    # test_letters
    elsewhere |= {"pages/answer.html", "pages/answer_broken.html", "pages/stop.html"}
    elsewhere |= {"pages/me.html", "pages/person.html", "pages/link.html"}  # test_people
    assert pages - parts - elsewhere == set(PAGES)


def test_every_input_of_a_page_has_a_name_to_be_read_out(browse: Browser) -> None:
    for path in ("/", "/fields/field-4", "/intake", "/letters/1", "/recipients", "/farm/hollin"):
        text = browse.get(path).text
        for found in re.finditer(r"<(input|select)\b([^>]*)>", text):
            attributes = found.group(2)
            if 'type="hidden"' in attributes or "aria-label" in attributes:
                continue
            before = text[: found.start()]
            assert before.rfind("<label") > before.rfind("</label>"), (path, found.group(0))


def test_rounds_puts_the_most_urgent_first_and_one_row_a_field(browse: Browser) -> None:
    text = browse.get("/").text
    standings = re.findall(r"<td class=s-(\w+)>", text)
    order = ["late", "due", "soon", "easy", "wet", "none"]
    assert standings == sorted(standings, key=order.index)
    assert len(standings) == 12
    assert text.count('id="field-4"') == 1
    assert "Sector" not in text


def test_rounds_can_be_sifted_sorted_and_searched(browse: Browser) -> None:
    def names(query: str) -> list[str]:
        return re.findall(r'<tr id="([\w-]+)"', browse.get(f"/?{query}").text)

    assert names("standing=wet") == ["field-8"]
    assert names("standing=none") == ["field-7"]
    assert names("farm=tern&sort=field") == ["field-1", "field-10", "field-4", "field-7"]
    assert set(names("standing=unsure")) == {"field-2", "field-5", "field-8", "field-11"}
    assert names("station=lane&find=PIECE 11") == ["field-11"]
    assert names("crop=maize_grain&find=unbroken") == ["field-5"]
    assert len(names("sort=nonsense&part=99")) == 12


def test_rounds_shows_trouble_age_and_what_ran(browse: Browser) -> None:
    text = browse.get("/").text
    assert "Silent; last data Thu 9 Jul." in text
    assert "Energy fell from measured sky to model from solar since Sat 11 Jul" in text
    assert "no downward longwave" in text
    assert "5.5 h Sunday, presumed done" in text
    assert "Sand lane: last data " in text


def test_a_hostile_name_is_only_a_name(browse: Browser) -> None:
    for path in ("/", "/fields/field-3", "/fields/field-1", "/fields/field-3/days/2026-07-13"):
        text = browse.get(path).text
        assert "&lt;script&gt;alert(1)&lt;/script&gt;" in text, path
        assert "{{7*7}}" in text
        assert HOSTILE not in text


def test_blocks_are_named_only_where_there_are_several(browse: Browser) -> None:
    one, two = browse.get("/fields/field-10").text, browse.get("/fields/field-4").text
    assert "block" not in re.sub(r"<[^>]*>", "", one).lower()
    assert "Sector a" in two
    assert "Sector b" in two
    assert browse.get("/fields/field-4?block=nope").status_code == 404


def test_the_field_page_says_what_to_do_and_why(browse: Browser) -> None:
    text = browse.get("/fields/field-10").text
    assert "Water today:" in text
    assert "52 mm gross, 7.3 hours, 6\u202f510 m³." in text
    assert "Past its limit: 71 mm of 66 mm." in text
    assert 'role="img" aria-label="Root-zone depletion' in text
    assert "The days ahead as a table" in text
    assert "No water needed." in browse.get("/fields/field-4").text
    assert "Nothing is planted here." in browse.get("/fields/field-7").text


def test_a_day_the_ledger_does_not_have_has_no_working(browse: Browser) -> None:
    assert browse.get("/fields/field-10/days/2026-07-13").status_code == 200
    assert browse.get("/fields/field-10/days/2020-01-01").status_code == 404


def test_the_station_page_holds_measured_against_modelled(browse: Browser) -> None:
    text = browse.get("/stations/north").text
    assert "mm higher" in text
    assert "measured sky" in text
    bench = browse.get("/stations/bench").text
    assert "wind stood still" in bench
    lane = browse.get("/stations/lane").text
    assert "Net radiation is not measured here." in lane
    assert "10 July to 13 July 2026 (4 days)" in lane


def test_empty_states(empty_db: Database, open_browser: Callable[..., Browser]) -> None:
    browser = open_browser(empty_db)
    assert "No fields yet" in browser.get("/").text
    assert "No stations yet" in browser.get("/stations").text
    assert "No stations yet" in browser.get("/intake").text
    assert browser.get("/stations/none").status_code == 404


def test_advice_of_another_morning_is_said_to_be_old(
    empty_db: Database, open_browser: Callable[..., Browser]
) -> None:
    from tests.web.factory import fill

    fill(empty_db, fields=2)
    with empty_db.write() as session:
        session.execute(update(Advice).values(issued_on=TODAY - timedelta(days=1)))
    browser = open_browser(empty_db)
    assert "This advice is of Monday 13 July." in browser.get("/").text
    assert "today’s has not been worked out" in browser.get("/fields/field-1").text


def test_exports_carry_the_caution(browse: Browser) -> None:
    for path in ("/fields/field-10/ledger.csv", "/stations/north/days.csv", "/advice.csv"):
        answer = browse.get(path)
        assert answer.status_code == 200
        assert answer.headers["content-type"].startswith("text/csv")
        assert "Local water rights" in answer.text.splitlines()[1]
    assert browse.get("/fields/field-4/ledger.csv?block=nope").status_code == 404


def test_an_error_of_ours_is_a_page_in_plain_words(
    browse: Browser, monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(*_: object) -> None:
        raise RuntimeError("secret detail")

    monkeypatch.setattr("app.storage.pages.last_morning", broken)
    answer = browse.get("/")
    assert answer.status_code == 500
    assert "Something went wrong on our side" in answer.text
    assert "secret detail" not in answer.text
    assert "default-src 'none'" in answer.headers["content-security-policy"]
    told = browse.get("/api/v1/rounds")
    assert told.status_code == 500
    assert told.json()["title"] == "Something went wrong on our side"
    assert CAUTION_TITLE in answer.text


@pytest.mark.parametrize(
    "path",
    [
        "/intake/99999999999999999999",
        "/fields/field-10/days/0001-01-01",
        "/fields/field-10/days/nonsense",
        "/fields/UPPER%00/",
        "/fields/a%00b",
        "/stations/bench/days/9999-12-31",
    ],
)
def test_odd_addresses_are_not_found(browse: Browser, path: str) -> None:
    assert browse.get(path).status_code in (404, 307)


def test_what_measuring_is_worth_is_told_on_station_and_field(browse: Browser) -> None:
    station = browse.get("/stations/north").text
    assert "Modelled energy would have asked for" in station
    assert "acre-feet" in station
    field = browse.get("/fields/field-3").text
    assert re.search(r"would have asked for <b>\d+ mm more</b> on .* since planting", field)
    assert "would have asked for" not in browse.get("/stations/lane").text
    assert "By season" in browse.get("/stations/north?span=year").text
