"""A small store for page tests, written row by row: the figures are ours, not the science's."""

from datetime import UTC, date, datetime, timedelta
from typing import Any

from sqlalchemy import insert
from sqlalchemy.orm import Session

from app.book.schema import LayerPart, SoilPart, SystemPart
from app.book.season import SeasonPart
from app.storage.database import Database
from app.storage.tables import (
    Advice,
    Block,
    Event,
    Farm,
    Field,
    IrrigationSystem,
    LedgerDay,
    Season,
    Soil,
    Source,
    Station,
    StationDay,
)
from app.storage.tables_letters import Recipient
from app.storage.tables_meters import Meter, MeterField, MeterReading

TODAY = date(2026, 7, 14)
PLANTING = date(2026, 5, 8)
HOSTILE = "<script>alert(1)</script>\"'&{{7*7}}"
STANDINGS = ("late", "due", "due", "soon", "easy", "easy", "easy", "easy", "wet", "easy")
STATION = {
    "latitude_deg": 44.2,
    "longitude_deg": -110.4,
    "elevation_m": 1430.0,
    "utc_offset_h": -7.0,
    "time_zone": None,
    "wind_height_m": 2.0,
    "reference_surface": True,
    "arid": False,
    "coastal": False,
}


def fill(db: Database, fields: int = 12, days: int = 40, hostile: bool = True) -> None:
    """Three stations (one silent), three farms and `fields` fields, some in two blocks."""
    with db.write() as session:
        for number, (key, name) in enumerate(
            [("north", "North mast"), ("bench", "Bench"), ("lane", "Sand lane")], 1
        ):
            details = {**STATION, "key": key, "name": name}
            session.add(Station(id=number, key=key, name=name, details=details, dirty_from=None))
        layer = LayerPart(bottom_m=1.2, field_capacity=0.3, wilting_point=0.15)
        soil = SoilPart(key="loam", name="Loam", layers=[layer])
        session.add(Soil(id=1, key="loam", name="Loam", details=soil.model_dump(mode="json")))
        system = SystemPart(
            key="pivot", name="Pivot", kind="centre pivot", efficiency=0.8, rate_mm_h=7.2
        )
        session.add(
            IrrigationSystem(
                id=1, key="pivot", name="Pivot", details=system.model_dump(mode="json")
            )
        )
        for number, (key, name) in enumerate(
            [("hollin", "Hollin Farm"), ("tern", "Tern Creek"), ("odd", HOSTILE)], 1
        ):
            session.add(Farm(id=number, key=key, name=name, details={"grower": "A. Person"}))
            session.flush()
            session.add(_recipient(number, name))
        session.flush()
        for station in (1, 2, 3):
            _station_days(session, station, days)
        for number in range(1, fields + 1):
            _field(session, number, days, hostile)
        session.flush()
        if fields >= 3:
            _meter(session)
        session.add(
            Event(
                id=1,
                block_id=10,
                kind="irrigation",
                day=TODAY - timedelta(days=2),
                amount=5.5,
                unit="hours",
                purpose="crop",
                confirmation="presumed",
                note=HOSTILE if hostile else None,
                who="advisor",
                entered=datetime(2026, 7, 13, 6, tzinfo=UTC),
            )
        )


def _meter(session: Session) -> None:
    """A meter of Hollin Farm on field-3, read twice."""
    session.add(
        Meter(id=50, key="hollin-gate", name=HOSTILE, farm_id=1, unit="m3", multiplier=10.0)
    )
    session.flush()
    session.add(MeterField(meter_id=50, field_id=3))
    session.add_all(
        MeterReading(
            id=50 + n, meter_id=50, kind="reading", day=TODAY - timedelta(days=20 - 7 * n),
            register=1000.0 + 90 * n, restarts=False, note=HOSTILE, who="test",
            entered=datetime(2026, 7, 13, tzinfo=UTC), origin=f"factory-{n}",
        )
        for n in range(2)
    )  # fmt: skip


def _recipient(farm: int, name: str) -> Recipient:
    return Recipient(
        farm_id=farm,
        name=f"Reader of {name}",
        address=f"reader{farm}@example.org",
        language="es" if farm == 2 else "en",
        units="us" if farm == 1 else "metric",
        weekday=1,
        hour=5,
        paused=False,
        stopped_at=None,
    )


def _station_days(session: Session, station: int, days: int) -> None:
    rows = []
    for back in range(1, days + 1):
        day = TODAY - timedelta(days=back)
        if station == 3 and back <= 4:
            continue
        fell = station == 2 and back <= 3
        rung = 5 if fell or station == 3 else 2
        rows.append(
            {
                "station_id": station,
                "day": day,
                "tmax": 29.0 + back % 4,
                "tmin": 11.0,
                "tmean": 20.0,
                "rh_max": 92.0,
                "rh_min": 34.0,
                "vapour_pressure": 1.4,
                "wind_2m": 2.1,
                "rain": 6.0 if back == 9 else 0.0,
                "shortwave_down": 25.0,
                "shortwave_up": 5.6,
                "longwave_down": None if fell else 29.0,
                "longwave_up": 36.0,
                "rs": 25.0,
                "rso": 30.0,
                "ra": 41.0,
                "rung": rung,
                "why_not": "1:surface"
                if rung == 2
                else "1:surface 2:missing:longwave_down 3:surface 4:no_fit",
                "humidity_rung": 2,
                "wind_rung": 1,
                "rn": 14.2 + back % 3,
                "rn_uncertainty": 0.7 if rung == 2 else 1.7,
                "rn_measured": None if rung == 5 else 14.2 + back % 3,
                "rn_modelled": 15.4 + back % 3,
                "rh_min_used": 34.0,
                "eto": 5.9,
                "etr": 7.6,
                "eto_uncertainty": 0.3,
                "flags": "wind_stuck=0.0" if station == 2 and back == 1 else "",
                "notes": "longwave_down:missing:12:under 90 % of the day" if fell else "",
            }
        )
    session.execute(insert(StationDay), rows)


def _field(session: Session, number: int, days: int, hostile: bool) -> None:
    names = {
        2: "A very long name of a field beyond the old railway siding, lower end",
        3: HOSTILE if hostile else "Three",
        5: "Unbrokenlongnamewithoutanyspacewhatsoeverinitatall",
    }
    two = number % 10 == 4
    session.add(
        Field(
            id=number,
            key=f"field-{number}",
            name=names.get(number, f"Long Piece {number}"),
            farm_id=1 + number % 3,
            area_ha=12.4,
            managed_by="driest",
            details={"keep_offs": []},
        )
    )
    session.flush()
    for variable in ("energy", "temperature", "wind", "rain"):
        session.add(
            Source(
                field_id=number,
                variable=variable,
                since=date(2000, 1, 1),
                station_id=1 + number % 3,
            )
        )
    for place in range(2 if two else 1):
        _block(session, number, number * 10 + place, "ab"[place] if two else "all", days)


def _block(session: Session, number: int, block: int, key: str, days: int) -> None:
    session.add(
        Block(
            id=block,
            field_id=number,
            key=key,
            name=f"Sector {key}",
            area_ha=12.4,
            soil_id=1,
            system_id=1,
            dirty_from=None,
        )
    )
    session.flush()
    if number == 7:  # nothing grows here
        return
    season = SeasonPart(
        field=f"field-{number}",
        crop="maize_grain",
        planting=PLANTING,
        stage_days=(25, 40, 45, 30),
        mad=0.5,
    ).model_dump(mode="json")
    session.add(
        Season(id=block, block_id=block, crop="maize_grain", planting=PLANTING, details=season)
    )
    session.flush()
    _ledger(session, block, days)
    session.add(Advice(**advice(number, block)))


def _ledger(session: Session, block: int, days: int) -> None:
    rows: list[dict[str, Any]] = []
    depletion = 20.0
    for back in range(days, 0, -1):
        net = 36.0 if back == 15 else 0.0
        rain = 6.0 if back == 9 else 0.0
        depletion = depletion + 3.0 - net - rain
        percolation = max(0.0, -depletion)
        depletion = max(0.0, depletion)
        rows.append(
            {
                "day": TODAY - timedelta(days=back),
                "block_id": block,
                "season_id": block,
                "rung": 2,
                "rn_mj_m2": 14.2,
                "eto_mm": 5.9,
                "kcb": 0.95,
                "ke": 0.04,
                "ks": 1.0,
                "kc_actual": 0.99,
                "etc_potential_mm": 3.0,
                "et_actual_mm": 3.0,
                "rain_mm": rain,
                "irrigation_gross_mm": net / 0.8,
                "application_loss_mm": net / 0.8 - net,
                "irrigation_net_mm": net,
                "deep_percolation_mm": percolation,
                "root_depth_m": 0.9,
                "taw_mm": 132.0,
                "raw_mm": 72.0,
                "limit_mm": 66.0,
                "depletion_mm": depletion,
                "depletion_p10_mm": 0.9 * depletion,
                "depletion_p90_mm": 1.1 * depletion,
                "subsoil_depletion_mm": 0.0,
                "evaporation_layer_depletion_mm": 12.0,
                "standing": "easy",
                **dict.fromkeys(
                    (
                        "rain_outside_roots_mm",
                        "runoff_mm",
                        "capillary_rise_mm",
                        "root_growth_depletion_mm",
                        "correction_mm",
                    ),
                    0.0,
                ),
            }
        )
    session.execute(insert(LedgerDay), rows)


def advice(number: int, block: int, issued_on: date = TODAY) -> dict[str, Any]:
    """One advice row whose standing goes with the field's number."""
    standing = STANDINGS[number % len(STANDINGS)]
    depletion = {"late": 71.0, "due": 62.0, "soon": 55.0, "easy": 24.0, "wet": 0.0}[standing]
    watering = standing in ("late", "due", "soon")
    day = TODAY + timedelta(days={"late": 0, "due": 1, "soon": 3}.get(standing, 0))
    ahead = [TODAY + timedelta(days=step) for step in range(14)]
    path = [depletion + 5.0 * (step + 1) for step in range(14)]
    return {
        "number": 1000 + block,
        "block_id": block,
        "season_id": block,
        "issued_on": issued_on,
        "inputs_hash": "0" * 64,
        "program": "rillbook 0",
        "stands": True,
        "standing": standing,
        "unsure": "stale:lane:4" if number % 3 == 2 else "",
        "day": day if watering else None,
        "net_mm": 42.0 if watering else 0.0,
        "gross_mm": 52.5 if watering else 0.0,
        "hours": 7.3 if watering else 0.0,
        "volume_m3": 6510.0 if watering else 0.0,
        "limit_day": day + timedelta(days=1) if standing != "wet" else None,
        "reason": REASON_OF[standing][0],
        "figures": REASON_OF[standing][1],
        "depletion_mm": depletion,
        "depletion_p10_mm": 0.9 * depletion,
        "depletion_p90_mm": 1.1 * depletion + 2,
        "limit_mm": 66.0,
        "taw_mm": 132.0,
        "change_mm": 3.0,
        "rung": 2,
        "data_until": TODAY - timedelta(days=4 if number % 3 == 2 else 1),
        "outlook": {
            "date": [str(day) for day in ahead],
            "depletion": path,
            "p10": [value * 0.9 for value in path],
            "p90": [value * 1.1 for value in path],
            "limit": [66.0] * 14,
            "taw": [132.0] * 14,
            "eto": [5.8] * 14,
            "etc": [5.6] * 14,
            "rain": [0.0] * 14,
        },
    }


NEXT = {"horizon_days": 14.0, "depletion_mm": 71.0, "limit_mm": 66.0}
LIMIT = {**NEXT, "limit_day": str(TODAY + timedelta(days=2)), "bound": ""}
REASON_OF: dict[str, tuple[str, dict[str, Any]]] = {
    "late": ("past_limit", {**LIMIT, "limit_day": str(TODAY)}),
    "due": ("last_chance", LIMIT),
    "soon": ("covering", {**LIMIT, "cover_days": 2.0, "bound": "most"}),
    "easy": ("limit_not_reached", NEXT),
    "wet": ("limit_not_reached", NEXT),
}
