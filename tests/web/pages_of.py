"""Every page there is to see over the factory's rows, by template."""

from tests.web.factory import TODAY

YESTERDAY = "2026-07-13"
PAGES = {
    "pages/rounds.html": ["/", "/?sort=farm&standing=due", "/?find=nothing-of-the-kind"],
    "pages/field.html": [
        "/fields/field-10",
        "/fields/field-4",
        "/fields/field-4?block=a",
        "/fields/field-7",
        "/fields/field-3?season=whole",
    ],
    "pages/seasons.html": ["/fields/field-10/seasons"],
    "pages/outturn.html": ["/outturn", "/outturn?farm=hollin"],
    "pages/event_file.html": ["/events/file"],
    "pages/meters.html": ["/meters"],
    "pages/meter.html": ["/meters/hollin-gate"],
    "pages/working.html": [f"/fields/field-10/days/{YESTERDAY}"],
    "pages/stations.html": ["/stations"],
    "pages/station.html": ["/stations/north", "/stations/bench?span=year", "/stations/lane"],
    "pages/station_day.html": [f"/stations/bench/days/{YESTERDAY}"],
    "pages/intake.html": ["/intake", "/intake?station=north"],
    "pages/letters.html": ["/letters"],
    "pages/letter.html": ["/letters/1", "/letters/3"],
    "pages/recipients.html": ["/recipients"],
    "pages/farm.html": ["/farm/hollin", "/farm/odd?language=es&units=us", "/farm/tern"],
    "pages/tokens.html": ["/stations/north/tokens"],
    "pages/people.html": ["/people"],
    "pages/audit.html": ["/audit"],
    "pages/sign_in.html": ["/sign-in?to=/stations"],
    "pages/forgot.html": ["/forgot"],
    "pages/methods.html": ["/methods"],
    "error.html": ["/nowhere", "/fields/nobody", "/intake/77", f"/stations/lane/days/{TODAY}"],
}
