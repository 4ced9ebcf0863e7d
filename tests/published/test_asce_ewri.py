"""The ASCE Standardized Reference Evapotranspiration Equation (2005), Appendix C, Greeley rows.

Inputs and printed values are from memory, as examples.csv says of each row; inputs are printed to
one or two digits, so a row whose status is "memory row, within 0.03" is allowed 0.03 mm.
"""

import re

import numpy as np
import pytest

from app.science.constants import ASCE
from app.science.energy import humidity as hum
from app.science.energy import longwave as lw
from app.science.energy import reference_et as ref
from app.science.energy import shortwave, sun, wind
from tests.published.examples import Row, all_rows, assert_printed

LATITUDE, LONGITUDE, OFFSET, ELEVATION, WIND_HEIGHT = 40.41, -104.78, -7.0, 1462.4, 3.0
SURFACES: dict[str, ref.Surface] = {"ETos": "short", "ETrs": "tall"}

ROWS = [row for row in all_rows() if row.example.startswith("Greeley")]
DAILY = [row for row in ROWS if row.example.startswith("Greeley daily")]
HOURLY = [row for row in ROWS if row.example.startswith("Greeley hourly")]


def figures(row: Row) -> dict[str, float]:
    """The `name=value` inputs of a row; "as above" rows carry the same text in the file."""
    return {k: float(v) for k, v in re.findall(r"(\w+)=(-?[\d.]+)", row.inputs)}


@pytest.mark.parametrize("row", DAILY, ids=lambda r: f"{r.example}-{r.quantity}")
def test_daily(row: Row) -> None:
    given = figures(row)
    day_of_july = int(re.search(r"daily (\d+) Jul", row.example)[1])
    j = sun.day_of_year(np.datetime64(f"2000-07-{day_of_july:02d}"))
    ra = sun.extraterrestrial_daily(LATITUDE, j)
    ratio = lw.clear_sky_ratio(given["Rs"], shortwave.clear_sky(ra, ELEVATION))
    rnl = lw.net_longwave_daily(given["Tmax"], given["Tmin"], given["ea"], ratio)
    rn = shortwave.net_shortwave(given["Rs"]) - rnl
    u2 = wind.wind_at_2m(given["u3m"], WIND_HEIGHT)
    et = ref.reference_et_daily(
        given["Tmax"],
        given["Tmin"],
        given["ea"],
        rn,
        u2,
        hum.atmospheric_pressure(ELEVATION),
        surface=SURFACES[row.quantity],
    )
    assert_printed(row, et)


def hourly(surface: ref.Surface) -> dict[str, float]:
    """Hours of 1 July 2000 in time order, by example: cloudiness is carried into the evening."""
    rows = {row.example: figures(row) for row in HOURLY}
    ends = np.array([int(name.rsplit(" ", 1)[1].rstrip("h")) for name in rows], dtype=float)
    assert (np.diff(ends) == 1.0).all()
    t, ea, rs, u3 = (np.array([g[k] for g in rows.values()]) for k in ("T", "ea", "Rs", "u3m"))
    j = sun.day_of_year(np.datetime64("2000-07-01"))
    omega = sun.hour_angle(ends - 0.5, j, LONGITUDE, OFFSET)
    ra = sun.extraterrestrial_period(LATITUDE, j, omega)
    ratio = lw.clear_sky_ratio(rs, shortwave.clear_sky(ra, ELEVATION))
    cloud = lw.hourly_cloudiness(ratio, sun.sine_of_elevation(LATITUDE, j, omega), ASCE)
    rn = shortwave.net_shortwave(rs) - lw.net_longwave_hourly(t, ea, cloud)
    u2 = wind.wind_at_2m(u3, WIND_HEIGHT)
    p = hum.atmospheric_pressure(ELEVATION)
    et = ref.reference_et_hourly(t, ea, rn, u2, p, surface=surface)
    return dict(zip(rows, et, strict=True))


@pytest.mark.parametrize("row", HOURLY, ids=lambda r: f"{r.example}-{r.quantity}")
def test_hourly(row: Row) -> None:
    assert_printed(row, hourly(SURFACES[row.quantity])[row.example])


def test_every_row_is_covered() -> None:
    """Each Greeley row is a daily or an hourly one of a known surface, and none is left over."""
    assert {row.quantity for row in ROWS} == set(SURFACES)
    assert len(ROWS) == len(DAILY) + len(HOURLY) == 23
