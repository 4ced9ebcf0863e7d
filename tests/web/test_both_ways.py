"""Water only presumed: the field's page says how it stands both ways, and takes either word."""

import re
from datetime import timedelta

import pytest

from app.workflows.both_ways import both_ways
from tests.web.conftest import Browser
from tests.web.test_logging import depletion
from tests.workflows import basin

PAGE = "/fields/long-piece"
DAY = basin.TODAY - timedelta(days=2)
PRESUMED = {"day": str(DAY), "amount": "4", "unit": "hours", "confirmation": "presumed"}


def block_of(live: Browser) -> int:
    with live.db.read() as session:
        from app.storage.pages_field import field_blocks

        return field_blocks(session, "long-piece", None)[0].id


def test_either_way_is_what_the_ledger_would_be(live: Browser) -> None:
    with live.db.read() as session:
        assert both_ways(session, block_of(live), basin.TODAY) is None
    assert "only presumed" not in live.get(PAGE).text
    days = "/api/v1/fields/long-piece/ledger"
    dry = live.get(days).json()["days"][-1]["depletion_mm"]
    live.post(f"{PAGE}/events", data=PRESUMED | {"token": "p"})
    wet = live.get(days).json()["days"][-1]["depletion_mm"]
    with live.db.read() as session:
        told = both_ways(session, block_of(live), basin.TODAY)
    assert told is not None
    assert told.presumed_mm == pytest.approx(wet)
    assert told.without_mm == pytest.approx(dry)
    assert told.without_mm > told.presumed_mm
    text = live.get(PAGE).text
    assert "is only presumed" in text
    assert f"{told.without_mm:.0f} mm" in text


@pytest.mark.parametrize("ran", [True, False])
def test_a_word_settles_it(live: Browser, ran: bool) -> None:
    before = depletion(live)
    live.post(f"{PAGE}/events", data=PRESUMED | {"token": "p"})
    presumed = depletion(live)
    text = live.get(PAGE).text
    number = re.search(r'action="/fields/long-piece/events/(\d+)"><input[^>]*\.ran"', text)
    assert number is not None
    address = f"{PAGE}/events/{number.group(1)}"
    if ran:
        answer = live.post(address, data={**PRESUMED, "confirmation": "reported"})
    else:
        answer = live.post(f"{address}/delete")
    assert answer.status_code == 303
    assert "only presumed" not in live.get(PAGE).text
    assert depletion(live) == (presumed if ran else before)
