"""When a field's season may be watered for the last time, and how much: nothing is stored."""

from dataclasses import dataclass, replace
from datetime import date, timedelta

import numpy as np
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.advice.closing import ALLOWED_AT_MATURITY, closing
from app.science.advice.keeping_up import chances
from app.science.energy.ladder import USUAL
from app.science.energy.sun import day_of_year, extraterrestrial_daily
from app.science.energy.usual import HALF_WINDOW, usual_for_date
from app.science.ledger import BlockLedger, block_ledgers
from app.science.outlook.sequences import MOST_YEARS
from app.science.outlook.usual import RECORD_DAYS, usual_ahead
from app.science.soil.salinity import gross_with_leaching
from app.storage.ledgers import read_sources, station_details
from app.storage.series import read_past_years
from app.workflows import agronomy
from app.workflows.assemble import Subject, assemble
from app.workflows.recompute import compute


@dataclass(frozen=True)
class Application:
    """One application: its day, net and gross depth [mm], and hours."""

    day: date
    net_mm: float
    gross_mm: float
    hours: float


@dataclass(frozen=True)
class ClosingWater:
    """The applications to maturity, the last of them the last that pays; depletion [mm] at
    maturity with them, allowed, and missing."""

    maturity: date
    applications: tuple[Application, ...]
    left_mm: float
    allowed_mm: float
    allowed_share: float
    short_mm: float


def closing_water(session: Session, block: int, today: date) -> ClosingWater | None:
    """Closing water of the season that grows on a block; None where nothing grows towards a
    maturity: no season, forage, perennials, stages by warmth (their last day is a bound)."""
    subjects = assemble(session, {block: today}, today - timedelta(days=1))
    if not subjects or subjects[-1].past >= subjects[-1].plan.days:
        return None
    crop = subjects[-1].crop
    if subjects[-1].stretch.bare or crop.perennial or crop.cycle_days or crop.cuttings:
        return None
    if crop.degree_days is not None:
        return None
    # Readings and the season before speak first; then the days to maturity, without water.
    subject = compute(subjects)[-1].subject
    ledger = _to_maturity(session, subject)
    past = subject.past
    days = ledger.date[past:]
    system = agronomy.application_system(subject.block.system)
    details = subject.season.details
    requirement = agronomy.leaching(subject.block.field, details)
    per_net = float(gross_with_leaching(1.0, system.efficiency, requirement))
    gap = max(system.interval_days, system.cover_days)
    ready = 0
    if subject.last_irrigation is not None:
        ready = max(gap - (today - subject.last_irrigation).days, 0)
    now = ledger.depletion_mm[past - 1] if past else ledger.opening_depletion_mm
    share = details.get("allowed_at_maturity")
    share = ALLOWED_AT_MATURITY if share is None else float(share)
    allowed = agronomy.keep_off_mask(subject.block.field, days, subject.keep_offs)
    found = closing(
        days,
        float(now),
        ledger.depletion_mm[past:],
        ledger.limit_mm[past:],
        ledger.etc_potential_mm[past:],
        chances(allowed, ready, system.cover_days),
        share * float(ledger.taw_mm[-1]),
        net_least=system.least_mm / per_net,
        net_most=system.deliverable_mm / per_net,
        gap=gap,
        refill_to_mm=details["refill_to_mm"],
    )
    return ClosingWater(
        maturity=agronomy.as_date(crop.last_day),
        applications=tuple(
            Application(agronomy.as_date(day), net, net * per_net, net * per_net / system.rate_mm_h)
            for day, net in zip(found.day, found.net.tolist(), strict=True)
        ),
        left_mm=found.left_mm,
        allowed_mm=found.allowed_mm,
        allowed_share=share,
        short_mm=found.short_mm,
    )


def _to_maturity(session: Session, subject: Subject) -> BlockLedger:
    """The subject's ledger carried on to its crop's last day under the usual weather, no rain."""
    plan, weather, past = subject.plan, subject.weather, subject.past
    more = int((subject.crop.last_day - plan.date[-1]).astype(int))
    if more > 0:
        eto = _usual(session, subject, plan.days - past + more)[plan.days - past :]

        def on(values: Floats, further: float) -> Floats:
            return np.concatenate((values, np.full(more, further)))

        def last(values: Floats | None) -> Floats | None:
            return None if values is None else on(values, values[-1])

        weather = replace(
            weather,
            eto=np.r_[weather.eto, eto],
            rain=on(weather.rain, 0.0),
            u2=on(weather.u2, weather.u2[-1]),
            rh_min=on(weather.rh_min, weather.rh_min[-1]),
            rung=np.r_[weather.rung, np.full(more, USUAL, np.int8)],
            rn=on(weather.rn, np.nan),
            tmax=last(weather.tmax),
            tmin=last(weather.tmin),
        )
        plan = replace(
            plan,
            days=plan.days + more,
            irrigation_gross=on(plan.irrigation_gross, 0.0),
            irrigation_net=on(plan.irrigation_net, 0.0),
            irrigation_fw=on(plan.irrigation_fw, np.nan),
            correction=None if plan.correction is None else on(plan.correction, 0.0),
            capillary_rise=None if plan.capillary_rise is None else on(plan.capillary_rise, 0.0),
            water_table_m=last(plan.water_table_m),
        )
    return block_ledgers([plan], [weather])[0]


def _usual(session: Session, subject: Subject, days: int) -> Floats:
    """Usual ETo [mm] of `days` from the outlook's first day on, by the rule of the outlook."""
    past = subject.past
    first = subject.plan.date[past]
    through = agronomy.as_date(first) - timedelta(days=1)
    station = [
        row.station_id
        for row in read_sources(session, [subject.block.field_id])
        if row.variable == "energy" and row.since <= through
    ][-1]
    latitude = float(station_details(session, [station])[station]["latitude_deg"])
    record = read_past_years(
        session,
        [station],
        through,
        years=MOST_YEARS,
        before=RECORD_DAYS + HALF_WINDOW,
        after=min(days + HALF_WINDOW, 350),
        recent=RECORD_DAYS,
    )[station]
    eto = record.values["eto"]
    history = subject.weather.eto[max(past - RECORD_DAYS, 0) : past]
    axis = first + np.arange(-history.size, days)
    usual = usual_for_date(axis, np.datetime64(record.first, "D") + np.arange(eto.size), eto)
    ra = extraterrestrial_daily(np.full(axis.size, latitude), day_of_year(axis))
    found = usual_ahead(history, ra[: history.size], ra[history.size :], usual)
    # A season of which nothing is known yet goes on as its outlook ends.
    return np.asarray(np.where(np.isnan(found), subject.weather.eto[-1], found))
