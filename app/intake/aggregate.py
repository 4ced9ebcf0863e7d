"""From rows to station days (METHODS section 2)."""

import numpy as np
from numpy.typing import NDArray

from app.intake.model import DayNote, Rows
from app.science.energy.station_day import DailyWeather, Site


def aggregate(
    rows: Rows, site: Site, days: NDArray[np.datetime64]
) -> tuple[DailyWeather, list[DayNote]]:
    """Daily weather of `days` from rows (give a day more on either side, so gaps can close)."""
    raise NotImplementedError
