"""Readings that loggers push, marks and the sensor log, over the API."""

from datetime import date
from typing import Any

import pytest
from sqlalchemy import update

from app.storage.tables import StationDay
from tests.web.conftest import Browser

STATION = "/api/v1/stations/bench"


def push(hours: int = 24, warmer: float = 0.0) -> dict[str, Any]:
    """Hourly rows of the station's 29 June, offset -7."""
    rows = []
    for hour in range(1, hours + 1):
        day, clock = (29, hour) if hour < 24 else (30, 0)
        rows.append(
            {
                "at": f"2026-06-{day}T{clock:02d}:00:00-07:00",
                "values": {"air_temperature": 50.0 + hour + warmer, "rain": None},
            }
        )
    return {"interval_s": 3600, "units": {"air_temperature": "degF", "rain": "mm"}, "rows": rows}


def test_pushed_rows_go_through_the_intake_and_are_undone(live: Browser) -> None:
    before = live.get(f"{STATION}/days").json()["days"]
    answer = live.post(f"{STATION}/readings", json=push())
    assert answer.status_code == 200, answer.text
    told = answer.json()
    assert (told["rows"], told["days_changed"], told["already_here"]) == (24, 1, False)
    assert told["problems"] == []
    intake = live.get(f"/api/v1/intakes/{told['intake']}").json()
    assert intake["state"] == "applied"
    text = live.get("/stations/bench/days/2026-06-29").text
    assert "push-20260629T080000Z-24.csv" in text

    again = live.post(f"{STATION}/readings", json=push()).json()
    assert again["already_here"]
    assert again["days_changed"] == 0
    # another value at the same instants: the later one stands
    warmer = live.post(f"{STATION}/readings", json=push(warmer=1.0)).json()
    assert warmer["days_changed"] == 1
    for number in (warmer["intake"], told["intake"]):
        assert live.post(f"/api/v1/intakes/{number}/undo").status_code == 200
    assert live.get(f"{STATION}/days").json()["days"] == before


def test_a_push_that_brings_nothing_new_leaves_no_intake(live: Browser) -> None:
    first = live.post(f"{STATION}/readings", json=push()).json()
    count = len(live.get("/api/v1/intakes").json())
    again = live.post(f"{STATION}/readings", json=push())
    assert again.status_code == 200
    assert again.json() == {**first, "already_here": True, "days_changed": 0, "blocks": 0}
    part = live.post(f"{STATION}/readings", json=push(6)).json()
    assert (part["already_here"], part["intake"], part["rows"]) == (True, None, 6)
    assert len(live.get("/api/v1/intakes").json()) == count


def test_a_push_from_a_clock_that_runs_ahead_is_refused(live: Browser) -> None:
    body = push(1)
    body["rows"][0]["at"] = "2126-06-29T10:00:00-07:00"
    answer = live.post(f"{STATION}/readings", json=body)
    assert answer.status_code == 422
    (error,) = answer.json()["errors"]
    assert (error["field"], error["value"]) == ("rows.1.at", "2126-06-29 17:00 UTC")
    assert "Set the logger's clock" in error["remedy"]


def test_many_pushes_are_one_line_a_day_in_the_list(live: Browser) -> None:
    numbers = []
    for quarter in range(48):
        row = {"at": f"2026-06-29T{quarter // 4:02d}:{quarter % 4 * 15:02d}:00-07:00",
               "values": {"wind_speed": 1.0 + quarter / 10}}  # fmt: skip
        body = {"interval_s": 900, "units": {"wind_speed": "m/s"}, "rows": [row]}
        numbers.append(live.post(f"{STATION}/readings", json=body).json()["intake"])
    text = live.get("/intake").text
    assert "47 pushes" in text  # the first, at midnight, ends the day before
    assert text.count("push-2026") == 2  # its name, and the name on its button
    day = live.get("/intake/pushes/bench/2026-06-29")
    assert day.text.count("<tr>") == 48
    assert live.get("/intake/pushes/bench/2031-01-01").status_code == 404
    assert live.post(f"/intake/{numbers[-1]}/undo").status_code == 303
    assert "46 pushes" in live.get("/intake").text
    older = live.get(f"/api/v1/intakes?before={numbers[1]}").json()
    assert older[0]["id"] == numbers[0]


def test_a_value_no_sensor_can_read_is_left_out_and_named(live: Browser) -> None:
    body = push(3)
    body["rows"][1]["values"]["air_temperature"] = -9999.0
    told = live.post(f"{STATION}/readings", json=body).json()
    assert len(told["problems"]) == 1
    problem = told["problems"][0]
    assert (problem["row"], problem["quantity"]) == (2, "air_temperature")
    assert "-9999" in problem["value"]
    assert problem["why"]
    assert problem["remedy"]


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"units": {"luck": "kPa"}}, "no quantity 'luck'"),
        ({"units": {"air_temperature": "mm", "rain": "mm"}}, "'mm' is no unit of air_temperature"),
        ({"units": {"rain": "mm"}}, "Row 1 has 'air_temperature', whose unit is not stated."),
        ({"rows": [{"at": "2026-06-29T10:00:00", "values": {}}]}, "timezone"),
        ({"rows": [{"at": "0001-01-01T00:00:00Z", "values": {}}]}, "year between 1980"),
        ({"rows": [{"at": "2026-06-29T10:00:00.5Z", "values": {}}]}, "whole seconds"),
        ({"rows": 2 * [{"at": "2026-06-29T10:00:00Z", "values": {"rain": 1}}]}, "same instant"),
        ({"rows": []}, "rows"),
        ({"interval_s": 0}, "interval_s"),
    ],
)
def test_a_push_that_cannot_be_read_is_refused_whole(
    live: Browser, change: dict[str, Any], says: str
) -> None:
    count = len(live.get("/api/v1/intakes").json())
    answer = live.post(f"{STATION}/readings", json={**push(2), **change})
    assert answer.status_code == 422
    assert says in answer.text
    assert len(live.get("/api/v1/intakes").json()) == count


def test_marks_and_log_over_the_api(live: Browser) -> None:
    mark = {
        "quantity": "shortwave_down", "first": "2026-06-20", "last": "2026-06-20",
        "verdict": "bad", "why": "a bird", "token": "bird",
    }  # fmt: skip
    first = live.post(f"{STATION}/marks", json=mark)
    assert first.status_code == 201, first.text
    assert live.post(f"{STATION}/marks", json=mark).json() == first.json()
    assert [item["why"] for item in live.get(f"{STATION}/marks").json()] == ["a bird"]
    number = first.json()["id"]
    elsewhere = live.request("DELETE", f"/api/v1/stations/meadow/marks/{number}")
    assert elsewhere.status_code == 404
    assert live.request("DELETE", f"{STATION}/marks/{number}").status_code == 204
    assert live.get(f"{STATION}/marks").json() == []
    late = live.post(f"{STATION}/marks", json={**mark, "last": "2031-01-01", "token": "late"})
    assert late.status_code == 422
    assert "to come" in late.text

    line = {"kind": "cleaning", "day": "2026-06-21", "note": "wiped", "token": "wipe"}
    entry = live.post(f"{STATION}/log", json=line)
    assert entry.status_code == 201
    assert [item["kind"] for item in live.get(f"{STATION}/log").json()] == ["cleaning"]
    assert live.request("DELETE", f"{STATION}/log/{entry.json()['id']}").status_code == 204
    assert live.get(f"{STATION}/log").json() == []


def test_days_have_rungs_why_checks_with_figures_and_both_net_radiations(
    live: Browser,
) -> None:
    with live.db.write() as session:
        session.execute(
            update(StationDay)
            .where(StationDay.day == date(2026, 6, 30))
            .values(flags="window_hours=4 wind_low=0.31 night_offset=-3.2")
        )
        session.execute(
            update(StationDay)
            .where(StationDay.day == date(2026, 6, 29))
            .values(humidity_rung=0, wind_rung=0)
        )
    guessed, day = live.get(f"{STATION}/days").json()["days"][-2:]
    assert guessed["wind"] == {
        "number": 0,
        "name": "none",
        "uncertainty": None,
        "not_to_be_had": ["measured", "neighbours", "2 m/s assumed"],
    }
    assert guessed["humidity"]["uncertainty"] is None
    assert (day["rung"], day["rung_name"]) == (5, "model from solar")
    assert [item["rung"] for item in day["why_not"]] == [1, 2, 3, 4]
    assert all(item["reason"] for item in day["why_not"])
    assert day["humidity"] == {
        "number": 2,
        "name": "RHmax and RHmin",
        "uncertainty": pytest.approx(0.05 * day["vapour_pressure"]),
        "not_to_be_had": ["vapour pressure or dew point"],
    }
    assert day["wind"] == {
        "number": 1,
        "name": "measured",
        "uncertainty": pytest.approx(0.05 * day["wind_2m"]),
        "not_to_be_had": [],
    }
    assert [(item["check"], item["figure"]) for item in day["checks"]] == [
        ("window_hours", 4.0),
        ("wind_low", 0.31),
        ("night_offset", -3.2),
    ]
    assert day["checks"][1]["says"] == "wind is below 0.5 m/s"
    assert day["rn_measured"] is None
    assert day["rn"] == day["rn_modelled"] > 0.0
    assert 0.12 * day["rn"] == pytest.approx(day["rn_uncertainty"])
    columns = {column.name for column in StationDay.__table__.columns}
    assert columns - {"station_id", "humidity_rung", "wind_rung", "flags"} <= set(day)


def test_one_row_and_rows_with_gaps_keep_the_stated_step(live: Browser) -> None:
    body = push(1)
    assert live.post(f"{STATION}/readings", json=body).json()["rows"] == 1
    body = push(24)
    body["rows"] = [body["rows"][0], body["rows"][-1]]
    told = live.post(f"{STATION}/readings", json=body).json()
    assert (told["rows"], told["problems"]) == (2, [])
    mapping = live.get(f"/api/v1/intakes/{told['intake']}").json()["mapping"]
    assert mapping["interval_s"] == 3600
    assert live.get(f"/intake/{told['intake']}").status_code == 200


def test_nothing_but_impossible_values_changes_no_day(live: Browser) -> None:
    before = live.get(f"{STATION}/days").json()["days"]
    body = push(1)
    body["rows"][0]["values"] = {"air_temperature": 999.0}
    told = live.post(f"{STATION}/readings", json=body)
    assert told.status_code == 200
    assert "impossible air temperature" in told.text
    assert live.get(f"{STATION}/days").json()["days"] == before
