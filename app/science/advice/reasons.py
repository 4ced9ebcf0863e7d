"""Why an advice says what it says: the codes and the figures each one carries."""

from enum import StrEnum


class Reason(StrEnum):
    """Reason of an advice; wording belongs elsewhere.

    Figures (mm unless said). Every advice: horizon_days, depletion_mm (now), limit_mm (today's),
    cover_days, most_net_mm (of one application), interval_days (from start to start), etc_mm (sum
    over the horizon), chances_before (chances up to the limit day). With any chance: first_chance
    and last_chance (ISO dates; the last at or before the limit day).
    Without a limit day: last_depletion_mm, last_limit_mm (the horizon's last close). With one:
    limit_day (ISO date), limit_day_depletion_mm (its projected close), limit_day_limit_mm.
    With an advised day also: opening_mm (depletion at the opening of that day), refill_to_mm,
    rain_room_mm, efficiency (0-1), bound (what set the depth instead of the depletion: "", least,
    most, hours, intake), past_field_capacity_mm (net that cannot be held: above 0 only where
    `least` exceeds the room). Under a plan by stage also et_target (share of the crop's use that is
    given back).

    LIMIT_NOT_REACHED: no close within the horizon passes the limit; no water.
    BACK_WITHIN: past the limit now, but every close of the horizon is within it (rain); no water.
    LAST_CHANCE: the last chance at or before the limit day.
    COVERING: brought forward by the days the system needs to cover the field.
    EARLY_TO_KEEP_UP: brought forward, because from the last chance on the system could not hold
        the limit over the horizon.
    PAST_LIMIT: past the limit already; the first chance.
    NO_CHANCE_IN_TIME: every chance comes too late to hold the limit; the first one.
    FALLING_BEHIND: no start holds the limit over the horizon; the first chance with room.
    NO_CHANCE: the limit is passed, but the horizon has no chance (keep-off, turn, interval); no
        water.
    """

    LIMIT_NOT_REACHED = "limit_not_reached"
    BACK_WITHIN = "back_within"
    LAST_CHANCE = "last_chance"
    COVERING = "covering"
    EARLY_TO_KEEP_UP = "early_to_keep_up"
    PAST_LIMIT = "past_limit"
    NO_CHANCE_IN_TIME = "no_chance_in_time"
    FALLING_BEHIND = "falling_behind"
    NO_CHANCE = "no_chance"
