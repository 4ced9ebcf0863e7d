"""Trees, vines and rows: shade near noon, ground cover, the season of a stand."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.crop.cover import density_coefficient
from app.science.crop.curve import season_of_stand
from app.science.crop.stand import Canopy, effective_cover, stand_kcb
from tests.published.examples import assert_printed, rows
from tests.science.crop.test_curve import MAIZE

VINES = Canopy(shape="rows", width_m=1.0, row_azimuth_deg=90.0, latitude_deg=40.0)


def test_shade_of_rows_by_their_direction() -> None:
    """FAO-56 note to eq 98: rows from east to west count their height in full, from north to
    south not at all; Example 41 (40 N, day 200, cover 0.3, height over width 1)."""
    shade = float(effective_cover(VINES, 0.3, 1.0, 200))
    assert_printed(rows("41")["fc eff"], shade)
    assert float(effective_cover(replace(VINES, width_m=2.0), 0.3, 2.0, 200)) == shade
    along = replace(VINES, row_azimuth_deg=0.0)
    assert float(effective_cover(along, 0.3, 2.0, 200)) == pytest.approx(0.3)
    slant = replace(VINES, row_azimuth_deg=30.0)
    between = float(effective_cover(slant, 0.3, 2.0, 200))
    assert between == pytest.approx(
        0.3 + (float(effective_cover(VINES, 0.3, 2.0, 200)) - 0.3) * np.cos(np.deg2rad(60.0))
    )
    assert float(effective_cover(VINES, 0.9, 30.0, 200)) == 1.0


def test_round_crowns_and_even_stands() -> None:
    crowns = Canopy(shape="round", latitude_deg=30.0)
    assert float(effective_cover(crowns, 0.2, 5.0, 355)) > float(
        effective_cover(crowns, 0.2, 5.0, 172)
    )
    assert float(effective_cover(Canopy(), 0.4, 2.0, 100)) == 0.4
    assert float(effective_cover(Canopy(shape="round", latitude_deg=80.0), 0.2, 5.0, 355)) == 1.0


def test_live_ground_cover_is_the_floor() -> None:
    """Kcb = Kcb cover + Kd max(Kcb full - Kcb cover, half of it) (Irrigation Science 28:17-34,
    2009, from memory)."""
    orchard = Canopy(shape="round", latitude_deg=36.0, ground_cover_kcb=0.8)
    assert float(stand_kcb(orchard, 0.0, 4.0, 180, 1.2)) == pytest.approx(0.8)
    shade = float(effective_cover(orchard, 0.4, 4.0, 180))
    kd = float(density_coefficient(shade, 4.0))
    assert float(stand_kcb(orchard, 0.4, 4.0, 180, 1.2)) == pytest.approx(0.8 + kd * 0.4)
    lush = replace(orchard, ground_cover_kcb=1.25)
    assert float(stand_kcb(lush, 1.0, 4.0, 180, 1.2)) == pytest.approx(1.25 - 0.025)
    controlled = replace(orchard, ground_cover_kcb=None, stomatal=0.5)
    bare = 0.15 + kd * (0.6 - 0.15)
    assert float(stand_kcb(controlled, 0.4, 4.0, 180, 1.2)) == pytest.approx(bare)


@pytest.mark.parametrize("canopy", [Canopy(), VINES, Canopy(shape="round", latitude_deg=-30.0)])
def test_scalar_is_array_nan_stays_and_kcb_rises_with_cover(canopy: Canopy) -> None:
    cover = np.linspace(0.0, 1.0, 30)
    many = stand_kcb(canopy, cover, 2.0, 200, 1.2)
    assert (np.diff(many) >= 0.0).all()
    assert ((many >= 0.15) & (many <= 1.2)).all()
    assert float(stand_kcb(canopy, cover[7], 2.0, 200, 1.2)) == many[7]
    assert np.isnan(stand_kcb(canopy, np.nan, 2.0, 200, 1.2))
    assert np.isnan(stand_kcb(canopy, 0.5, np.nan, 200, 1.2))
    assert np.isnan(effective_cover(canopy, 0.5, 2.0, np.nan))


def test_the_season_of_a_stand() -> None:
    """Kcb mid from cover 0.4 and 3 m; Kcb end keeps its share; mown grass between is the floor."""
    season = replace(MAIZE, canopy=Canopy(ground_cover_kcb=0.6), k_mid=0.9, k_end=0.65)
    stand = season_of_stand(season, 0.4, 3.0)
    kd = float(density_coefficient(0.4, 3.0))
    assert stand.k_mid == pytest.approx(0.6 + kd * 0.6)
    assert stand.k_end == pytest.approx(max(stand.k_mid * 0.65 / 0.9, 0.6))
    assert stand.k_ini == season.k_ini
    assert stand.height_max_m == 3.0
    table = season_of_stand(replace(season, canopy=Canopy(full="table")), 1.0, 3.0)
    assert table.k_mid == pytest.approx(0.9)
    with pytest.raises(ValueError, match="choose dual"):
        season_of_stand(replace(season, coefficients="single"), 0.4, 3.0)


@pytest.mark.parametrize(
    ("wrong", "told"),
    [
        ({"shape": "square"}, "choose one of even, rows, round"),
        ({"shape": "rows", "latitude_deg": 40.0}, "width_m is missing"),
        ({"shape": "round"}, "latitude_deg is missing"),
        ({"full": "guess"}, "choose height or table"),
        ({"multiplier": 3.0}, "multiplier is 3"),
        ({"ground_cover_kcb": 2.0}, "ground_cover_kcb is 2"),
    ],
)
def test_a_wrong_canopy_is_refused_by_name(wrong: dict[str, object], told: str) -> None:
    with pytest.raises(ValueError, match=told):
        Canopy(**wrong)  # type: ignore[arg-type]
