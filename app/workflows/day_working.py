"""Open one day of a block's ledger: the same facts worked out again, figure by figure."""

from dataclasses import dataclass
from datetime import date

import numpy as np
from sqlalchemy.orm import Session

from app.science.crop.season import CropSeason
from app.science.soil.day import DayWorking, day_working
from app.science.soil.profile import Profile
from app.workflows.assemble import Subject, assemble
from app.workflows.recompute import compute


@dataclass(frozen=True)
class Opened:
    """A day's working with the soil and the crop season it rests on."""

    day: DayWorking
    soil: Profile
    season: CropSeason
    subject: Subject


def open_day(session: Session, block: int, day: date) -> Opened | None:
    """The working of a day of a block; None where its ledger does not have the day."""
    wanted = np.datetime64(day, "D")
    for one in compute(assemble(session, {block: day}, day)):
        place = int((wanted - one.subject.plan.start).astype(np.int64))
        if 0 <= place < one.subject.plan.days:
            plan, weather = one.subject.plan, one.subject.weather
            found = day_working(plan, weather, one.ledger, place)
            return Opened(found, plan.profile, plan.season, one.subject)
    return None
