"""The Methods page's figures, taken from where the program itself takes them."""

from app.intake import complete, grid
from app.science.advice import closing, decide
from app.science.energy import checks, day_checks, ladder
from app.science.outlook import ensemble, sequences, usual
from app.wording import number, share
from app.workflows import field_weather, recompute


def rungs() -> list[tuple[int, str, str, str]]:
    """Rung, how the energy is obtained, its standard uncertainty, whether it serves yet."""
    return [
        (
            rung.number,
            rung.name,
            share(rung.share),
            ""
            if not rung.absent or rung.number == ladder.USUAL
            else "its place is kept; it does not serve yet",
        )
        for rung in ladder.LADDER
    ]


def working_values() -> list[tuple[str, str, str]]:
    """What has no published source: what it is, its value, where it is used."""
    low, high = day_checks.GRASS_ALBEDO_RANGE
    near_share, near_mj = day_checks.NET_AGREES
    return [
        ("intervals needed for a day", share(complete.DAY_SHARE), "station day"),
        ("daylight needed for shortwave", share(complete.DAYLIGHT_SHARE), "station day"),
        ("night needed for longwave and net", share(complete.NIGHT_SHARE), "station day"),
        ("longest gap interpolated", f"{grid.LONGEST_GAP_S / 3600:g} h", "station day"),
        ("night shortwave called offset below", f"{number(grid.OFFSET_FROM)} W/m²", "checks"),
        (
            "night shortwave set aside below",
            f"{number(checks.NIGHT_OFFSET_LIMIT)} W/m²",
            "checks",
        ),
        ("net radiation above shortwave", f"{checks.NET_ABOVE_SHORTWAVE:g} W/m²", "checks"),
        ("a sensor is stuck after", f"{checks.STUCK_HOURS:g} h", "checks"),
        ("wind is stuck after", f"{day_checks.WIND_STUCK_DAYS} days", "checks"),
        (
            "shortwave above clear sky, doubted, set aside",
            f"{share(day_checks.ENVELOPE_WARN - 1)}, {share(day_checks.ENVELOPE_FAIL - 1)}",
            "checks",
        ),
        ("darkest sky, Rs/Ra", number(day_checks.DARKEST, 2), "checks"),
        ("albedo of grass", f"{number(low, 2)} to {number(high, 2)}", "checks"),
        ("covered window, within of a black body", f"{day_checks.WINDOW_GAP:g} W/m²", "checks"),
        (
            "logger net against components",
            f"{share(near_share)} and {near_mj:g} MJ/m²",
            "checks",
        ),
        (
            "least uncertainty of a day’s net radiation",
            f"{ladder.LEAST_UNCERTAINTY:g} MJ/m²",
            "ladder",
        ),
        ("season-long factor for Kc", share(ensemble.WORKING.kc), "range"),
        ("season-long factor for TAW", share(ensemble.WORKING.taw), "range"),
        ("season-long factor for efficiency", share(ensemble.WORKING.efficiency), "range"),
        (
            "rain of the station against the field’s",
            f"{share(ensemble.WORKING.rain)} + {ensemble.WORKING.rain_mm:g} mm on wet days",
            "range",
        ),
        ("members", number(recompute.MEMBERS), "range"),
        ("days the usual ratio of ETo to Ra is taken over", f"{usual.RATIO_DAYS}", "ahead"),
        ("share of a recent departure carried on", share(usual.CARRIED), "ahead"),
        ("past years whose mornings lend a range", f"{sequences.MOST_YEARS}", "range"),
        ("past years below which recent mornings do", f"{sequences.LEAST_YEARS}", "range"),
        ("days on either side of the date", f"{sequences.NEAR_DATE}", "range"),
        ("recent mornings", f"{sequences.RECENT}", "range"),
        ("leads apart that mornings count as independent", f"{sequences.APART}", "range"),
        ("days looked ahead", f"{field_weather.HORIZON}", "ahead"),
        (
            "depletion allowed at maturity, of TAW",
            share(closing.ALLOWED_AT_MATURITY),
            "closing water",
        ),
        ("soon: days after due", f"{decide.SOON_DAYS}", "advice"),
        ("unsure: an input older than", f"{decide.STALE_DAYS} days", "advice"),
        ("unsure: early and late limit dates apart", f"over {decide.WIDE_DAYS} days", "advice"),
        ("unsure: the early one within", f"{decide.NEAR_DAYS} days", "advice"),
    ]
