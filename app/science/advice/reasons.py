"""Why an advice says what it says: the codes and the figures each one carries."""

from enum import StrEnum


class Reason(StrEnum):
    """Reason of an advice; wording belongs elsewhere.

    Every advice carries: horizon_days, depletion_mm (now), limit_mm (today's).
    With a limit day: limit_day (ISO date), limit_day_depletion_mm (its projected close),
    limit_day_limit_mm. With an advised day: opening_mm (depletion at the opening of that day),
    refill_to_mm, rain_room_mm, efficiency, chances_before (chances up to the limit day),
    bound ("", "least", "most", "hours", "intake": what set the depth instead of the depletion),
    past_field_capacity_mm (net that cannot be held, 0 but where `least` is more than the room).

    LIMIT_NOT_REACHED: no close within the horizon passes the limit; no water. last_depletion_mm,
        last_limit_mm.
    BACK_WITHIN: past the limit now, but every close of the horizon is within it (rain); no water.
        last_depletion_mm, last_limit_mm.
    LAST_CHANCE: the last chance at or before the limit day.
    COVERING: the same, brought forward by the days the system needs to cover the field.
        cover_days.
    PAST_LIMIT: past the limit already; the first chance.
    NO_CHANCE_IN_TIME: every chance comes too late to hold the limit; the first one.
        first_chance (ISO date).
    FALLING_BEHIND: no use of the chances holds the limit over the horizon; start at the first
        chance with room. most_net_mm (an application), interval_days, etc_mm (horizon's sum).
    NO_CHANCE: the limit is passed but the horizon has no chance (keep-off, turn, interval).
    """

    LIMIT_NOT_REACHED = "limit_not_reached"
    BACK_WITHIN = "back_within"
    LAST_CHANCE = "last_chance"
    COVERING = "covering"
    PAST_LIMIT = "past_limit"
    NO_CHANCE_IN_TIME = "no_chance_in_time"
    FALLING_BEHIND = "falling_behind"
    NO_CHANCE = "no_chance"
