"""Intake through its pages: upload, questions, correction, apply, undo, put away."""

import re

import pytest

from tests.web.conftest import Browser
from tests.workflows.basin import daily_csv

LATER = "date,tmax (degC),tmin (degC)\n2026-06-29,44.0,11.0\n2026-06-30,45.0,12.0\n"
DOUBTFUL = "date,tmax (degC),tmin (degC)\n01/06/2026,30,11\n02/06/2026,31,12\n03/06/2026,32,9\n"


def upload(browser: Browser, text: str | bytes, name: str = "found.csv") -> str:
    """Upload a file for the bench station; the address of its page."""
    answer = browser.post(
        "/intake", data={"station": "bench"}, files={"file": (name, text, "text/csv")}
    )
    assert answer.status_code == 303, answer.text
    return str(answer.headers["location"])


def test_a_file_is_looked_at_taken_in_and_undone(live: Browser) -> None:
    before = live.get("/api/v1/fields/long-piece/ledger").json()
    page = upload(live, LATER)
    text = live.get(page).text
    assert "2 rows" in text
    assert "Nothing is stored as a reading yet." in text
    assert "2 rows differ from what is here and will replace it" in text
    assert live.get("/api/v1/fields/long-piece/ledger").json() == before

    assert live.post(f"{page}/apply").headers["location"] == page
    applied = live.get(page).text
    assert "2 rows taken in" in applied
    assert live.get("/api/v1/fields/long-piece/ledger").json() != before
    day = live.get("/stations/bench/days/2026-06-30").text
    assert "found.csv" in day
    assert "daily.csv" in day
    again = live.post(f"{page}/apply")
    assert again.status_code == 422
    assert "already been taken in" in again.text

    assert live.post(f"{page}/undo").status_code == 303
    assert live.get("/api/v1/fields/long-piece/ledger").json() == before
    assert "undone" in live.get("/intake").text


def test_the_same_file_again_is_nothing_new(live: Browser) -> None:
    page = upload(live, daily_csv())
    assert "Nothing new" in live.get(page).text
    live.post(f"{page}/apply")
    assert "every row was here already and the same" in live.get(page).text


def test_an_ambiguous_date_is_asked_and_never_guessed(live: Browser) -> None:
    page = upload(live, DOUBTFUL)
    text = live.get(page).text
    assert "1 question" in text
    assert "In which order are the dates written" in text
    assert not re.search(r'name="q\.time\.order"[^>]*checked', text)
    assert "Take it in</button>" not in text
    answered = live.post(f"{page}/mapping", data={"q.time.order": "dmy"})
    assert answered.status_code == 303
    text = live.get(page).text
    assert "Take it in</button>" in text
    assert "1 June 2026" in text


def test_a_column_can_be_corrected_or_left_out(live: Browser) -> None:
    page = upload(live, LATER)
    wrong = live.post(f"{page}/mapping", data={"quantity.1": "rain", "unit.1": "degC"})
    assert wrong.status_code == 422
    assert "cannot be in °C" in wrong.text
    left = {"quantity.1": "", "quantity.2": "air_temperature_min", "unit.2": "degF"}
    assert live.post(f"{page}/mapping", data=left).status_code == 303
    mapping = live.get(f"/api/v1/intakes/{page.rsplit('/', 1)[1]}").json()["mapping"]
    units = {
        column["position"]: (column["quantity"], column["unit"]) for column in mapping["columns"]
    }
    assert units[1][0] is None
    assert units[2] == ("air_temperature_min", "degF")


@pytest.mark.parametrize(
    ("form", "says"),
    [
        ({"first_data_line": "two"}, "write a whole number"),
        ({"first_data_line": "-4"}, "first_data_line"),
        ({"decimal": ";"}, "decimal"),
        ({"time_zone": "Mars/Olympus"}, "Mars/Olympus"),
        ({"q.nonsense": "1"}, "no question"),
    ],
)
def test_a_correction_that_cannot_be_used_says_why(
    live: Browser, form: dict[str, str], says: str
) -> None:
    page = upload(live, LATER)
    answer = live.post(f"{page}/mapping", data=form)
    assert answer.status_code == 422
    assert says in answer.text
    assert "Nothing was changed." in answer.text


def test_a_file_put_away_is_never_taken_in(live: Browser) -> None:
    page = upload(live, LATER)
    assert live.post(f"{page}/discard").headers["location"] == "/intake"
    assert "put away" in live.get("/intake").text
    assert live.post(f"{page}/apply").status_code == 422
    assert live.post(f"{page}/undo").status_code == 422
    assert "Put away" in live.get(page).text


def test_what_is_no_table_is_kept_with_its_message(live: Browser) -> None:
    for data in (b"", b"PK\x03\x04\x00\x00zipped", b"\x89PNG\r\n\x1a\n\x00", b"just words\n"):
        page = upload(live, data, "odd.bin")
        text = live.get(page).text
        assert "This file cannot be taken in as it is." in text
        assert "Take it in</button>" not in text
        assert live.post(f"{page}/apply").status_code == 422
    assert live.get("/intake").text.count("<td>cannot be read</td>") == 4


def test_a_file_of_a_wrong_year_is_taken_only_if_said_so(live: Browser) -> None:
    page = upload(live, LATER.replace("2026", "2126"))
    text = live.get(page).text
    assert "2 rows are dated after now" in text
    assert "Take the rows dated after now all the same" in text
    refused = live.post(f"{page}/apply")
    assert refused.status_code == 422
    assert "2 of its rows are dated after now" in refused.text
    number = page.rsplit("/", 1)[1]
    assert live.post(f"/api/v1/intakes/{number}/apply").status_code == 422
    assert live.get(f"/api/v1/intakes/{number}").json()["rows_ahead"] == 2
    assert live.post(f"{page}/apply", data={"ahead": "true"}).status_code == 303
    assert "2 rows taken in" in live.get(page).text


def test_what_brings_nothing_is_not_offered(live: Browser) -> None:
    bare = LATER.partition("\n")[2] + "2026-07-01,40,12\n"
    for text, says in (
        (daily_csv().decode(), "There is nothing in it to take."),
        (bare, "Correct how it is read, or mend the file"),
        ("tmax,tmin\n3,4\n5,6\n", "Mend the file and send it again."),
    ):
        shown = live.get(upload(live, text)).text
        assert "Take it in</button>" not in shown
        assert says in shown


def test_problems_are_listed_by_line_and_values_escaped(live: Browser) -> None:
    bad = LATER + "2026-07-01,<img src=x>,12\n2026-13-40,30,10\n"
    text = live.get(upload(live, bad, "<script>alert(1)</script>.csv")).text
    assert "&lt;img src=x&gt;" in text
    assert "<img" not in text
    assert "<script>alert" not in text
    assert "2026-13-40" in text


def test_an_upload_without_file_or_station_is_asked_for_again(live: Browser) -> None:
    assert "Choose a file first." in live.post("/intake", data={"station": "bench"}).text
    nowhere = live.post("/intake", data={"station": "moon"}, files={"file": ("a.csv", LATER)})
    assert nowhere.status_code == 422
    assert "There is no station &#39;moon&#39;" in nowhere.text
