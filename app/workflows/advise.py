"""Issue the morning's advice: one frozen, numbered row for each block with a crop.

The same inputs give the same advice and issue no second number. Changed inputs, such as an
irrigation just logged, issue a new number for the same morning; the last one stands.
"""

import hashlib
import json
from collections.abc import Sequence
from dataclasses import fields
from datetime import date, timedelta
from typing import Any

import numpy as np
from sqlalchemy import select, update
from sqlalchemy.orm import Session

from app import __version__
from app.science.advice.decide import Advice, Outlook, decide
from app.storage.ledgers import depletion_before
from app.storage.series import last_days
from app.storage.tables import Advice as AdviceRow
from app.storage.tables import Source, Station
from app.workflows import agronomy
from app.workflows.assemble import Subject
from app.workflows.recompute import Computed

STALE_DAYS = 2
"""An input older than this makes an advice unsure (working value)."""


def advise(session: Session, on: date, computed: Sequence[Computed]) -> int:
    """Issue advice of the morning of `on` for seasons that go on; returns new numbers issued.

    Their ledgers must have been written through the day before.
    """
    growing = [one for one in computed if one.subject.past < one.subject.plan.days]
    numbers = [one.subject.block.block_id for one in growing]
    there = {
        row.block_id: row
        for row in session.scalars(
            select(AdviceRow).where(
                AdviceRow.issued_on == on,
                AdviceRow.stands.is_(True),
                AdviceRow.block_id.in_(numbers),
            )
        )
    }
    ages = _ages(session, on)
    yesterday, before = on - timedelta(days=1), on - timedelta(days=2)
    closing = depletion_before(session, numbers, [yesterday, before])
    issued = 0
    for one in growing:
        subject, block = one.subject, one.subject.block.block_id
        stale = ages.get(subject.block.field_id, [])
        inputs = inputs_hash(subject, stale)
        standing = there.get(block)
        if standing is not None and standing.inputs_hash == inputs:
            continue
        row = _row(one, on, stale)
        row.inputs_hash = inputs
        today, yesterday_mm = closing.get((block, yesterday)), closing.get((block, before))
        if today is not None and yesterday_mm is not None:
            row.change_mm = today - yesterday_mm
        if standing is not None:
            session.execute(
                update(AdviceRow).where(AdviceRow.number == standing.number).values(stands=False)
            )
        session.add(row)
        issued += 1
    session.flush()
    return issued


def _ages(session: Session, on: date) -> dict[int, list[tuple[str, int, date | None]]]:
    """For each field, its stations of this morning: key, days since the last data, last day."""
    last = last_days(session, on)
    newest: dict[tuple[int, str], tuple[int, str]] = {}
    for field, variable, number, key in session.execute(
        select(Source.field_id, Source.variable, Source.station_id, Station.key)
        .join(Station, Station.id == Source.station_id)
        .where(Source.since <= on)
        .order_by(Source.since)
    ):
        newest[field, variable] = (number, key)
    found: dict[int, list[tuple[str, int, date | None]]] = {}
    for (field, _), (number, key) in sorted(newest.items()):
        day = last.get(number)
        age = (on - day).days if day is not None else 9999
        entry = (key, age, day)
        if entry not in found.setdefault(field, []):
            found[field].append(entry)
    return found


def inputs_hash(subject: Subject, stale: Any) -> str:
    """Fingerprint of all an advice rests on, the program's version included."""
    digest = hashlib.sha256(__version__.encode())
    for part in (subject.plan, subject.weather, subject.ahead):
        for field in fields(part):
            value = getattr(part, field.name)
            digest.update(field.name.encode())
            digest.update(
                value.tobytes() if isinstance(value, np.ndarray) else repr(value).encode()
            )
    block, season = subject.block, subject.season
    words = [block.system, block.field, season.details, subject.past, subject.keep_offs]
    digest.update(json.dumps([words, stale], sort_keys=True, default=str).encode())
    digest.update(repr((subject.last_irrigation, subject.opening_width_mm)).encode())
    return digest.hexdigest()


def _row(computed: Computed, on: date, stale: list[tuple[str, int, date | None]]) -> AdviceRow:
    subject, ledger = computed.subject, computed.ledger
    past, p10, p90 = subject.past, computed.p10, computed.p90
    days = ledger.date[past:]
    outlook = Outlook(
        date=days,
        depletion=ledger.depletion_mm[past:],
        limit=ledger.limit_mm[past:],
        taw=ledger.taw_mm[past:],
        etc=ledger.etc_potential_mm[past:],
        allowed=agronomy.keep_off_mask(subject.block.field, days, subject.keep_offs),
        p10=p10[past:],
        p90=p90[past:],
        plan=agronomy.plan_by_stage(
            subject.crop,
            subject.plan,
            subject.weather,
            subject.season.details,
            ledger.taw_mm[past:],
        ),
    )
    now = ledger.depletion_mm[past - 1] if past else ledger.opening_depletion_mm
    details = subject.season.details
    age = max((entry[1] for entry in stale), default=9999)
    advice = decide(
        outlook,
        float(now),
        agronomy.application_system(subject.block.system),
        subject.block.area_ha,
        refill_to_mm=details["refill_to_mm"],
        rain_room_mm=details["rain_room_mm"],
        last_irrigation=_day(subject.last_irrigation),
        leaching_requirement=agronomy.leaching(subject.block.field, details),
        input_age_days=age,
    )
    known = [entry[2] for entry in stale if entry[2] is not None]
    return AdviceRow(
        block_id=subject.block.block_id,
        season_id=subject.season.season_id,
        issued_on=on,
        program=f"rillbook {__version__}",
        stands=True,
        standing=advice.standing,
        unsure=_unsure(advice, stale, outlook),
        day=_date(advice.day),
        net_mm=advice.net_mm,
        gross_mm=advice.gross_mm,
        hours=advice.hours,
        volume_m3=advice.volume_m3,
        limit_day=_date(advice.limit_day),
        reason=advice.reason,
        figures=_plain(advice.figures),
        depletion_mm=float(now),
        depletion_p10_mm=float(p10[past - 1]) if past else float(now),
        depletion_p90_mm=float(p90[past - 1]) if past else float(now),
        limit_mm=float(ledger.limit_mm[max(past - 1, 0)]),
        taw_mm=float(ledger.taw_mm[max(past - 1, 0)]),
        rung=int(ledger.rung[max(past - 1, 0)]),
        data_until=min(known) if known else None,
        outlook={
            "date": [str(day) for day in days],
            "depletion": _rounded(outlook.depletion),
            "p10": _rounded(p10[past:]),
            "p90": _rounded(p90[past:]),
            "limit": _rounded(outlook.limit),
            "taw": _rounded(outlook.taw),
            "eto": _rounded(subject.weather.eto[past:]),
            "etc": _rounded(outlook.etc),
            "rain": _rounded(subject.weather.rain[past:]),
            **_planned(outlook),
        },
    )


def _planned(outlook: Outlook) -> dict[str, list[float | None]]:
    plan = outlook.plan
    if plan is None:
        return {}
    floor = np.where(np.isinf(plan.floor), np.nan, plan.floor)
    columns = {"refill": plan.refill, "target": plan.target, "floor": floor}
    return {name: _rounded(values) for name, values in columns.items()}


def _unsure(advice: Advice, stale: list[tuple[str, int, date | None]], outlook: Outlook) -> str:
    words = [f"stale:{key}:{age}" for key, age, _ in stale if age > STALE_DAYS]
    if advice.unsure and not words:
        words.append(f"range:{_range_days(outlook)}")
    return " ".join(words)


def _range_days(outlook: Outlook) -> int:
    """Days between the limit dates of the dry and the wet side of the range."""
    assert outlook.p10 is not None
    assert outlook.p90 is not None
    dry = np.flatnonzero(outlook.p90 > outlook.limit)
    wet = np.flatnonzero(outlook.p10 > outlook.limit)
    horizon = outlook.limit.size
    return int(wet[0] if wet.size else horizon) - int(dry[0] if dry.size else horizon)


def _day(day: date | None) -> np.datetime64 | None:
    return None if day is None else np.datetime64(day, "D")


def _date(day: np.datetime64 | None) -> date | None:
    return None if day is None else agronomy.as_date(day)


def _rounded(values: Any) -> list[float | None]:
    return [None if value != value else round(value, 3) for value in np.asarray(values).tolist()]


def _plain(figures: dict[str, Any]) -> dict[str, Any]:
    """Figures as JSON holds them: no number stands for a NaN."""
    return {
        name: None
        if value != value
        else value
        if isinstance(value, str | int | float)
        else str(value)
        for name, value in figures.items()
    }
