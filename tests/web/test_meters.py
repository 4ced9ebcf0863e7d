"""Water meters through the pages and the API."""

import re

from tests.web.conftest import Browser

NEW = {"name": "Head Gate 4", "unit": "m3", "rolls_over_at": "1000000", "field": ["long-piece"]}


def test_a_meter_is_put_up_read_and_shared_out_on_the_page(live: Browser) -> None:
    assert 'href="/meters"' in live.get("/").text
    made = live.post("/meters", data=NEW)
    assert made.headers["location"] == "/meters/head-gate-4"
    page = "/meters/head-gate-4"
    assert "Not read yet" in live.get(page).text
    log = {"day": "2026-06-20", "amount": "5", "unit": "hours", "token": "w"}
    live.post("/fields/long-piece/events", data=log)
    for day, register in (("2026-06-18", "1000"), ("2026-06-24", "3400")):
        answer = live.post(f"{page}/readings", data={"day": day, "shows": register})
        assert answer.status_code == 303
    text = live.get(page).text
    assert "<b>2\u202f400 m³</b> metered" in text or "<b>2,400 m³</b> metered" in text
    assert "+25 %" in text
    share = re.search(r'action="(/meters/head-gate-4/readings/\d+/share)"', text)
    assert share is not None
    assert live.post(share.group(1)).status_code == 303
    assert "shared out: they count as metered" in live.get(page).text
    logged = live.get("/api/v1/fields/long-piece/events").json()
    told = next(row for row in logged if row["day"] == "2026-06-20")
    assert (told["amount"], told["unit"], told["confirmation"]) == (2400, "volume_m3", "metered")
    assert "to share out" not in live.get("/meters").text


def test_what_cannot_be_is_refused_in_words(live: Browser) -> None:
    assert "No field is chosen" in live.post("/meters", data=NEW | {"field": []}).text
    live.post("/meters", data=NEW)
    page = "/meters/head-gate-4"
    for register, says in (("", "is no number"), ("1,234", "thousands"), ("1e9", "below 1000000")):
        answer = live.post(f"{page}/readings", data={"day": "2026-06-18", "shows": register})
        assert answer.status_code == 422
        assert says in answer.text
        assert "Nothing was stored" in answer.text
    assert live.get("/meters/nothing").status_code == 404
    assert live.post(f"{page}/readings/9/share").status_code == 422


def test_the_api_reads_tells_and_deletes(live: Browser) -> None:
    live.post("/meters", data=NEW)
    base = "/api/v1/meters"
    (meter,) = live.get(base).json()
    assert meter["fields"] == ["long-piece"]
    for day, shows in (("2026-06-04", 100), ("2026-06-08", 2600)):
        given = {"day": day, "register_shows": shows, "token": f"t-{day}"}
        made = live.post(f"{base}/head-gate-4/readings", json=given)
        assert made.status_code == 201
        assert live.post(f"{base}/head-gate-4/readings", json=given).json() == made.json()
    first, last = live.get(f"{base}/head-gate-4/readings").json()
    assert first["metered_m3"] is None
    assert (last["metered_m3"], last["logged_m3"]) == (2500, 2500)  # 25 mm on 10 ha
    number = last["reading"]
    shared = live.post(f"{base}/head-gate-4/readings/{number}/share?token=abcd")
    assert shared.json() == {"irrigations": 1}
    gone = live.request("DELETE", f"{base}/head-gate-4/readings/{number}?token=efgh")
    assert gone.status_code == 204
    assert len(live.get(f"{base}/head-gate-4/readings").json()) == 1


def test_readings_stand_in_the_record_of_changes(live: Browser) -> None:
    live.post("/meters", data=NEW)
    live.post("/meters/head-gate-4/readings", data={"day": "2026-06-18", "shows": "77123"})
    text = live.get("/audit").text
    assert "meter reading" in text
    assert "77123" in text


def test_the_list_tells_metered_against_logged(live: Browser) -> None:
    live.post("/meters", data=NEW)
    for day, shows in (("2026-06-04", "100"), ("2026-06-08", "2100")):
        live.post("/meters/head-gate-4/readings", data={"day": day, "shows": shows})
    text = live.get("/meters").text
    assert "+25 %" in text  # 2500 logged, 2000 metered
    assert "1 to share out" in text


def test_a_meter_is_changed_and_every_reading_told_anew(live: Browser) -> None:
    live.post("/meters", data=NEW)
    page = "/meters/head-gate-4"
    for day, shows in (("2026-06-04", "100"), ("2026-06-08", "350")):
        live.post(f"{page}/readings", data={"day": day, "shows": shows})
    changed = {**NEW, "multiplier": "10", "field": ["long-piece", "two-halves"]}
    assert live.post(page, data=changed).status_code == 303
    (_, last) = live.get("/api/v1/meters/head-gate-4/readings").json()
    assert last["metered_m3"] == 2500
    assert "Two Halves" in live.get(page).text
    assert live.post(page, data=changed | {"multiplier": "no"}).status_code == 422
    assert live.post(page, data=changed | {"field": ["nowhere"]}).status_code == 422


def test_a_long_register_is_shown_to_its_last_digit(live: Browser) -> None:
    live.post("/meters", data=NEW)
    page = "/meters/head-gate-4"
    live.post(f"{page}/readings", data={"day": "2026-06-04", "shows": "987654.5"})
    text = live.get(page).text
    assert "987654.5" in text
    assert 'value="1000000"' in text
