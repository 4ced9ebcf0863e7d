"""What came of past advice: seven days on each, and the skill of all of them together."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.advice.outturn import Skill, comparable, done, skill
from app.storage.decisions import Decided, decided_on
from app.storage.outturns import Known, PastAdvice, known_days, past_advice
from app.storage.scope import Farms

DAYS = 7
"""An advice is looked back on after so many days."""
DAY = timedelta(days=1)


@dataclass(frozen=True)
class Outturn:
    """One advice, seven days on: what the advisor decided, what was done of that, the depletion
    foretold and known on the last day before water came (None where water came at once), days that
    closed past the limit."""

    advice: PastAdvice
    decided: Decided | None
    done: str
    lead: int
    foretold_mm: float | None
    known_mm: float | None
    late_days: int


@dataclass(frozen=True)
class Outturns:
    """The outturns of a span of mornings, oldest first, and the skill over them."""

    each: tuple[Outturn, ...]
    skill: tuple[Skill, ...]

    def count(self, what: str) -> int:
        """How many turned out so."""
        return sum(one.done == what for one in self.each)


def outturns(
    session: Session,
    today: date,
    mornings: int,
    farms: Farms = None,
    farm: str | None = None,
) -> Outturns:
    """The outturns of the last `mornings` mornings that are seven days past.

    Persistence carries the mean crop ET of the seven days before on, without rain.
    """
    last = today - DAYS * DAY
    advised = past_advice(session, last - (mornings - 1) * DAY, last, farms, farm)
    if not advised:
        return Outturns((), ())
    blocks = sorted({one.block_id for one in advised})
    known = known_days(
        session, blocks, advised[0].issued_on - DAYS * DAY, advised[-1].issued_on + DAYS * DAY
    )
    advised = _acted_on(advised, known)
    tables = [_tables(one, known) for one in advised]
    foretold, low, high, came, net, persistence, limit = (
        np.array([table[n] for table in tables]) for n in range(7)
    )
    use = comparable(net)
    decided = decided_on(session, [one.number for one in advised])
    each = tuple(
        _outturn(
            one, decided.get(one.number), foretold[n], came[n], net[n], limit[n], int(use[n].sum())
        )
        for n, one in enumerate(advised)
    )
    return Outturns(each, tuple(skill(foretold, low, high, came, persistence, use)))


def _acted_on(
    advised: Sequence[PastAdvice], known: dict[tuple[int, date], Known]
) -> list[PastAdvice]:
    """Of each block's morning the number that was acted on: the one that stands, or the first
    where water of that day was told and changed the advice."""
    found: dict[tuple[int, date], PastAdvice] = {}
    for one in advised:
        key = one.block_id, one.issued_on
        day = known.get(key)
        watered = day is not None and day.irrigation_net_mm > 0
        if key not in found or (one.stands and not watered):
            found[key] = one
    return list(found.values())


def _tables(one: PastAdvice, known: dict[tuple[int, date], Known]) -> Sequence[Floats]:
    """Foretold, its range, known, net irrigation, persistence and limit of the seven days (days,)
    [mm]."""
    path = [_column(one.outlook, name) for name in ("depletion", "p10", "p90")]
    days = [known.get((one.block_id, one.issued_on + n * DAY)) for n in range(DAYS)]
    week = [known.get((one.block_id, one.issued_on - n * DAY)) for n in range(1, DAYS + 1)]
    used = [day.et_actual_mm for day in week if day is not None]
    mean = float(np.mean(used)) if used else np.nan
    nan = np.nan
    return [
        *path,
        np.array([nan if day is None else day.depletion_mm for day in days]),
        np.array([nan if day is None else day.irrigation_net_mm for day in days]),
        one.depletion_mm + mean * np.arange(1, DAYS + 1),
        np.array([nan if day is None else day.limit_mm for day in days]),
    ]


def _column(outlook: dict[str, list[float | None]], name: str) -> Floats:
    """A column of a kept outlook over the seven days, NaN where it does not reach."""
    values = [np.nan if value is None else value for value in (outlook.get(name) or [])[:DAYS]]
    return np.array(values + [np.nan] * (DAYS - len(values)), dtype=np.float64)


def _outturn(
    one: PastAdvice,
    decided: Decided | None,
    foretold: Floats,
    came: Floats,
    net: Floats,
    limit: Floats,
    dry: int,
) -> Outturn:
    day, asked = (one.day, one.net_mm) if decided is None else (decided.day, decided.net_mm)
    at = None if day is None or asked <= 0 else (day - one.issued_on).days
    within = at if at is not None and at < DAYS else None
    told = dry > 0 and not np.isnan(foretold[dry - 1])
    return Outturn(
        advice=one,
        decided=decided,
        done=done(within, asked, net),
        lead=dry,
        foretold_mm=float(foretold[dry - 1]) if told else None,
        known_mm=float(came[dry - 1]) if told else None,
        late_days=int((came > limit).sum()),
    )
