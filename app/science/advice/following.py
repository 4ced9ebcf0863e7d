"""The applications that follow an advice within its horizon, if it is carried out."""

from dataclasses import replace

import numpy as np

from app.science import Floats
from app.science.advice.decide import Advice, Outlook, decide
from app.science.advice.keeping_up import daily_change
from app.science.advice.system import ApplicationSystem

MOST = 14
"""No more applications than this are looked for."""


def following(
    outlook: Outlook,
    depletion_now: float,
    first: np.datetime64,
    net_mm: float,
    until: np.datetime64,
    system: ApplicationSystem,
    area_ha: float,
    refill_to_mm: float = 0.0,
    rain_room_mm: float = 0.0,
) -> list[Advice]:
    """What would be advised next, up to and with the day `until`, once `net_mm` [mm] is put on the
    day `first`, each application carried out as advised.

    outlook: the days ahead without any of them, from the morning the first was advised on;
    depletion_now [mm]: that morning's. Returns as many `Advice` as fall on or before `until`, none
    where `first` lies outside the outlook. The project's own rule: `decide` again from the day
    after each application.
    """
    found: list[Advice] = []
    day, net = first, net_mm
    for _ in range(MOST):
        after = _watered(outlook, depletion_now, day, net)
        if after is None:
            break
        outlook, depletion_now = after
        advice = decide(
            outlook,
            depletion_now,
            system,
            area_ha,
            refill_to_mm,
            rain_room_mm,
            last_irrigation=day,
        )
        if advice.day is None or advice.day > until:
            break
        found.append(advice)
        day, net = advice.day, advice.net_mm
    return found


def _watered(
    outlook: Outlook, depletion_now: float, day: np.datetime64, net: float
) -> tuple[Outlook, float] | None:
    """The outlook from the day after an application on, and the depletion it opens with."""
    place = int((day - outlook.date[0]).astype(int))
    if not 0 <= place < outlook.date.size - 1:
        return None
    change = daily_change(depletion_now, outlook.depletion, outlook.limit, outlook.etc)
    path = _path(outlook, depletion_now, change, place, net)
    rest = slice(place + 1, None)
    return (
        replace(
            outlook,
            date=outlook.date[rest],
            depletion=path[rest],
            limit=outlook.limit[rest],
            taw=outlook.taw[rest],
            etc=outlook.etc[rest],
            allowed=outlook.allowed[rest],
            p10=None,
            p90=None,
            plan=None if outlook.plan is None else outlook.plan.since(place + 1),
        ),
        float(path[place]),
    )


def _path(outlook: Outlook, depletion_now: float, change: Floats, place: int, net: float) -> Floats:
    """Depletion [mm] at each day's close with `net` put on the day at `place`."""
    path = outlook.depletion.copy()
    depletion = float(outlook.depletion[place - 1]) if place else depletion_now
    depletion = max(depletion - net, min(0.0, depletion))
    for day in range(place, path.size):
        depletion = max(depletion + float(change[day]), min(0.0, depletion))
        path[day] = min(depletion, float(outlook.taw[day]))
    return path
