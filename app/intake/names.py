"""What a column's name says, in English or Spanish: quantity, unit, kind of figure, height."""

import re
import unicodedata
from dataclasses import dataclass
from functools import lru_cache

from app.science.quantities import QUANTITIES
from app.units import UNITS, fits, parse_unit

_KINDS = {
    "mean": "avg average mean med media medio prom promedio smp sample mittel moyenne inst",
    "max": "max maximum maxima maximo mx high hi highest",
    "min": "min minimum minima minimo mn low lo lowest",
    "sum": "sum total tot acum acumulado accumulated suma totalize cum",
    "spread": "std stdev sd stddev sigma variance var desv rms",
}
KIND_OF_WORD = {word: kind for kind, words in _KINDS.items() for word in words.split()}

# Columns nobody should take for weather, and the plain reason.
_LEAVE_OUT = (
    (r"soil|suelo|ground|substrat\w*", "soil, not air"),
    (r"leaf|hoja|canopy|surface|superficie|skin|wetness", "a surface, not the air"),
    (r"bat\w*|volt\w*|panel|supply|charger|signal|rssi|modem|logger|memory", "the logger's own"),
    (r"dir\w*|wdir|wd|azimuth|bearing|direccion", "a direction"),
    (r"gust\w*|racha\w*|peak", "a gust, not a mean"),
    (r"flag\w*|qc|qa|quality|source|uncert\w*|status|code|calidad|error", "a mark, not a reading"),
    (r"eto|et0|etr|etc|et|evapotrans\w*|evap\w*", "a result, not a reading"),
    (r"uv|par|ppfd|photosynth\w*|dni|dhi|etrn|direct|diffuse|difusa|directa|illum\w*|lum|beam",
     "another part of the light"),
    (r"cloud\w*|cld|totcld|opqcld|nubes|visibility|hvis|ceil\w*|pwat|aod|alb\w*|snow|nieve|moon",
     "not used"),
    (r"chill|heat index|feels|apparent|thw|thsw|degree days?|gdd", "derived"),
    (r"case|body|sensor|housing|dome|internal|inside|interior|indoor|carcasa|cuerpo",
     "the instrument's own temperature"),
    (r"record|rec|recno|id|no|index|station|estacion|nr|num|serial|site", "a label"),
    (r"heat flux|co2|no2|ozone|pm 10|lightning|snow depth|water depth"
     r"|sea level|quantity", "not used"),
)  # fmt: skip

_SW = r"shortwave|short wave|sw|solar|onda corta|k|rs|rg|sun|sol|kurz"
_LW = r"longwave|long wave|lw|infrared|ir|onda larga|l|thermal|terrestrial"
_DOWN = r"in|down|dn|d|incoming|incident\w*|entrante|descendente|atmosfer\w*|i|from sky"
_UP = r"out|up|u|outgoing|reflect\w*|reflej\w*|saliente|ascendente|r|o|emitted"

# Taken before anything is left out: their words are also those of columns nobody should take.
_HEAT_FLUXES: tuple[tuple[str, str], ...] = (
    ("soil_heat_flux", r"(?:soil|ground) heat(?: flux)?|shf|g flux|flux g|g(?= |$)"
     r"|(?:flujo de )?calor (?:del |en el )?suelo"),
    ("sensible_heat", r"sensible(?: heat)?(?: flux)?|(?:flujo de )?calor sensible|hs|h flux|h"),
    ("latent_heat", r"latent(?: heat)?(?: flux)?|(?:flujo de )?calor latente|le|l e"),
)  # fmt: skip

# In order: the first that matches, and whose unit (if any is written) measures it, is taken.
_RULES: tuple[tuple[str, str], ...] = (
    ("wet_bulb", r"wet ?bulb|twb|t ?wet|tbh|bulbo humedo|termometro humedo"),
    ("dew_point", r"dew ?point|dew|dewpt|rocio|td|tdew|dewp|tdp|dpt?"),
    ("vapour_pressure_deficit", r"vpd|dpv|deficit|saturation deficit"),
    ("vapour_pressure", r"vapou?r|vapor|ea|vp|avp|e a|hpa vapor"),
    ("net_radiation", r"net|neta|neto|rn|rnet|rneta|netrad|netto|nr|q star"),
    ("longwave_up", rf"(?:{_LW}) (?:\w+ )?(?:{_UP})|lwout|lwup|lwu|rlu|lup|lout|ulr"
     rf"|(?:{_UP}) (?:\w+ )?(?:{_LW})"),
    ("longwave_down", rf"(?:{_LW}) (?:\w+ )?(?:{_DOWN})|lwin|lwdn|lwd|lwdown|rld|ldown|lin|dlr"
     rf"|(?:{_DOWN}) (?:\w+ )?(?:{_LW})|sky (?:{_LW})|atmospheric radiation"),
    ("shortwave_up", rf"(?:{_SW}) (?:\w+ )?(?:{_UP})|swout|swup|swu|rsu|kup|kout|usr|reflected"
     rf"|(?:{_UP}) (?:\w+ )?(?:{_SW})|reflejada"),
    ("sunshine_hours", r"sunshine|sun(?:shine)? (?:hours?|duration)|insolacion|heliofania|brillo"
     r"|sun ?dur|horas (?:de )?sol|bright sun\w*|sunhours"),
    ("shortwave_down", rf"(?:{_SW}) (?:\w+ )?(?:{_DOWN})|swin|swdn|swd|swdown|rsd|kdown|kin|dsr|ghi"
     r"|global|solar|srad|solrad|slr\w*|pyranometer|piranometro|shortwave|short wave|rs|rg|sw|dswr"
     rf"|(?:{_DOWN}) (?:\w+ )?(?:{_SW})|insolation|radiation|radiacion|rad|radn|irradian\w*"),
    ("relative_humidity", r"rh|hr|humid\w*|humedad|rhum|hum|relhum|hrel"),
    ("rain", r"rain|rainfall|precip\w*|lluvia|prcp|ppt|pluvio\w*|pp|lprecip|tip\w*|rr|pcp|prec|p"),
    ("wind_speed", r"wind|windspeed|viento|ws|wspd|u|uz|windrun|anemom\w*|vel viento|ff|wnd|vv"),
    ("pressure", r"pressure|presion|press|baro\w*|bp|patm|atm|pres|p|qfe|pa"),
    ("air_temperature", r"temp|temperature|temperatura|tair|airt|ta|t|tavg|tmean|tmed|airtemp|dry"
     r"|airt[cf]|drybulb|aire?|atmp|tt"),
)  # fmt: skip
_LETTERS = {  # one-letter names stand only with a unit that fits, or alone
    "rain": {"p", "pp"},
    "pressure": {"p", "pa"},
}
_FLUXES = tuple((name, re.compile(rf"(?:^| )(?:{rule})(?= |$)")) for name, rule in _HEAT_FLUXES)
_COMPILED = tuple((name, re.compile(rf"(?:^| )(?:{rule})(?= |$)")) for name, rule in _RULES)
_LEFT = tuple((re.compile(rf"(?:^| )(?:{rule})(?= |$)"), why) for rule, why in _LEAVE_OUT)
_WITH_EXTREMES = {"air_temperature", "relative_humidity"}
_GLUED = re.compile(r"^(t|rh|hr|hum|temp|u)(max|min|mean|avg|med|x|n|mx|mn)$")
_HEIGHT = re.compile(r"(?<![a-z0-9/])(\d{1,2}(?:\.\d+)?) ?m(?:ts|etros|eters)?(?![a-z0-9/-])")


@dataclass(frozen=True)
class NameSays:
    """What a name (with its unit and kind lines) says; None where it says nothing."""

    quantity: str | None
    unit: str | None
    unknown_unit: str | None
    height_m: float | None
    why: str


def plain_words(text: str) -> list[str]:
    """Lower-case words of a name: accents off, camel case and underscores split."""
    bare = "".join(c for c in unicodedata.normalize("NFKD", text) if not unicodedata.combining(c))
    bare = re.sub(r"(?<=[a-z])(?=[A-Z][a-z])|(?<=[a-z]{3})(?=[A-Z])", " ", bare)
    words = re.findall(r"[a-z]+|\d+(?:\.\d+)?|%", bare.lower().replace("%", " % "))
    return [_split(word) for word in words] and " ".join(_split(w) for w in words).split()


def _split(word: str) -> str:
    """`tmax` -> `t max`."""
    glued = _GLUED.match(word)
    if not glued:
        return word
    head, tail = glued.groups()
    return f"{head} { {'x': 'max', 'n': 'min'}.get(tail, tail) }"


@lru_cache(maxsize=4096)
def read_name(name: str, unit_text: str = "", kind_text: str = "") -> NameSays:
    """What the name of a column says, with the unit and kind lines under it where there are any."""
    bracketed = re.findall(r"[\[({]([^\[\](){}]*)[\])}]", name)
    bare = re.sub(r"[\[({][^\[\](){}]*[\])}]", " ", name)
    height = _height(bare, bracketed)
    sunny = re.search(r"sun|sol|insol", bare, re.IGNORECASE)
    stated = [text for text in bracketed if sunny or text.strip().lower() != "min"]
    unit, unknown = _stated_unit([unit_text, *stated])
    words = plain_words(bare) + [
        w for b in bracketed if b != unit for w in plain_words(b) if w in KIND_OF_WORD
    ]
    words += [word for word in plain_words(kind_text) if word in KIND_OF_WORD]
    if unit or unknown:
        quantity, why = _quantity(words, unit)
        return NameSays(quantity, unit, unknown, height, why)
    for count in range(min(4, len(words) - 1), 0, -1):
        unit = _suffix_unit(bare, words, count)
        if unit:
            quantity, why = _quantity(words[:-count], unit)
            if quantity:
                return NameSays(quantity, unit, None, height, why)
    quantity, why = _quantity(words, None)
    return NameSays(quantity, None, None, height, why)


def _stated_unit(texts: list[str]) -> tuple[str | None, str | None]:
    unknown = None
    for text in texts:
        for part in (text, *re.split(r"[,;]", text)):
            unit = parse_unit(part) if part.strip() else None
            if unit:
                return unit, None
        words = plain_words(text)
        if words and not _kind_of(words) and not _HEIGHT.search(text.lower()):
            unknown = text.strip()
    return None, unknown


def _suffix_unit(bare: str, words: list[str], count: int) -> str | None:
    raw = re.split(r"[\s_]+", bare.strip())
    tails = ["/".join(words[-count:]), " ".join(words[-count:]), "".join(words[-count:])]
    if count <= len(raw) - 1:
        tails += ["/".join(raw[-count:]), " ".join(raw[-count:])]
    return next((unit for unit in map(parse_unit, tails) if unit), None)


def _quantity(words: list[str], unit: str | None) -> tuple[str | None, str]:
    text = " ".join(words)
    if unit and UNITS[unit].dimension == UNITS["W/m2"].dimension:
        for quantity, pattern in _FLUXES:
            if found := pattern.search(text):
                return quantity, f"the name says {found.group().strip()!r}"
    for pattern, why in _LEFT:
        found = pattern.search(text)
        if found:
            return None, f"left out: {found.group().strip()!r} says it is {why}"
    kind = _kind_of(words)
    if kind == "spread":
        return None, "left out: a spread, not a mean"
    core = " ".join(word for word in words if word not in KIND_OF_WORD or word == "lo")
    for quantity, pattern in _COMPILED:
        found = pattern.search(core) or pattern.search(text)
        if not found or (unit and not fits(unit, quantity)):
            continue
        word = found.group().strip()
        if word in _LETTERS.get(quantity, ()) and unit is None:
            continue
        if kind in ("max", "min") and unit != kind:  # the minute is a unit too
            if quantity not in _WITH_EXTREMES:
                return None, f"left out: only the mean {QUANTITIES[quantity].term} is used"
            quantity = f"{quantity}_{kind}"
        return quantity, f"the name says {word!r}"
    if unit and UNITS[unit].dimension == "temperature" and not core:
        return "air_temperature", "only the unit says what it is"
    return None, "left out: the name says nothing we know"


def _kind_of(words: list[str]) -> str | None:
    return next((KIND_OF_WORD[word] for word in words if word in KIND_OF_WORD), None)


def _height(bare: str, bracketed: list[str]) -> float | None:
    for text in (bare.replace("_", " ").lower(), *(b.lower() for b in bracketed)):
        found = _HEIGHT.search(text) or re.search(r"(?:^| )u(\d{1,2})(?: |$)", text)
        if found and 0.5 <= float(found.group(1)) <= 100:
            return float(found.group(1))
    return None
