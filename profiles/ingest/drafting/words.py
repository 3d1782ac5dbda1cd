"""What names and units of columns say (common practice, no source)."""

from __future__ import annotations

import re
from typing import Literal

Role = Literal[
    "temperature", "depth", "pressure", "time", "date", "quality", "station", "spread", "counter", "position", "other"
]

_TIME_WORDS = (
    "datetime|date_?time|timestamp|time_?stamp|time|tstamp|zeit|uhrzeit|hora|heure|clock|hhmm(?:ss)?|epoch|posix|serial|"
    "julian|jd|mjd|datenum|stamp|dt|tmstamp|datumzeit|when"
)
_DATE_WORDS = "date|datum|fecha|day|dato|jour|yyyymmdd|ymd|data|month|year|dag"

#: Role by words of a name, the first that fits; words are runs of letters.
_ROLES: tuple[tuple[Role, str], ...] = (
    ("quality", r"q|qc|qf|flags?|flg|qual|quality|qflag|qcflag|qcode|code|codes|mark|marks|flagged"),
    (
        "spread",
        r"sd|std|stdev|stddev|dev|var|min|max|minimum|maximum|count|samples|nobs|n|rms|range|err|error|uncertainty",
    ),
    (
        "other",
        r"sal|salinity|psal|cond|conductivity|cndc|do|dox|doxy|oxy|oxygen|dosat|sat|chl|chla|chlorophyll|fluor|turb|"
        r"turbidity|ph|orp|par|batt|battery|volt|volts|voltage|vbatt|wind|air|ta|airt|atemp|rh|humidity|hum|rain|precip|"
        r"baro|dens|density|sigma|sigmat|sound|speed|dir|direction|u|v|w|heading|pitch|roll|tilt|panel|logger|ptemp|box|"
        r"internal|board|enclosure|nitrate|co|pco|o|cdom|phyco|redox|sw|lw|rad|solar|current|amps|swdown|wdir|wspd|"
        r"bottom|bathymetry|sounding|seafloor|buoy|length|level|stage|dewpoint|case|housing",
    ),
    ("pressure", r"pres|press|pressure|prs|dbar|decibar|druck|pressao|presion|p"),
    (
        "temperature",
        (
            r"temp|temps|temper|temperature|temperatures|tmp|tmpr|t|tw|wt|wtr|wtemp|watertemp|water|sst|th|therm|thermistor|"
            r"thermistors|theta|tc|degc|celsius|tn|temperatur|temperatura|wassertemperatur|wassertemp|tempe|tempc|te|tem|"
            r"sensor|sens|node|ch|chan|channel|probe|tchain|chain|teperature|température|lämpötila|tmpc|wtmp|watertemperature|"
            r"t90|t68|potential|insitu"
        ),
    ),
    (
        "depth",
        r"depth|depths|dep|dpt|deph|dep_?m|z|tiefe|prof|profondeur|profundidad|profundidade|level|djup|dyp|height|depthm|zm|lvl",
    ),
    ("position", r"lat|latitude|lon|long|longitude|x|y"),
    ("counter", r"record|rec|recnum|recno|no|nr|num|number|index|idx|id|row|line|seq|sample|scan|ensemble|obs|#|cycle"),
    (
        "station",
        r"station|stn|site|mooring|platform|name|buoyid|location|lake|instrument|serialno|deployment|stationid|siteid",
    ),
)
_COMPILED = tuple((role, re.compile(words)) for role, words in _ROLES)
_TIME, _DATE = re.compile(_TIME_WORDS), re.compile(_DATE_WORDS)
_WORDS = re.compile(r"[a-zà-ÿ#]+[0-9]{0,2}(?![0-9])|[a-zà-ÿ#]+")
_ORDER = {role: place for place, (role, _) in enumerate(_ROLES)}


def words_of(text: str) -> list[str]:
    """Return the words of a name, in lower case; a change from small to capital letters begins a word."""
    without_serial = re.sub(r"(?i)\b(s/?n|ser(ial)?)[ .:#-]*[0-9]+", " ", text)
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z])|(?<=[A-Z])(?=[A-Z][a-z])", " ", without_serial)
    plain = [match.group() for match in re.finditer(r"[a-zà-ÿ#]+", spaced.casefold())]
    return plain


def roles_of(text: str) -> set[Role]:
    """Return every role that a word of the name stands for."""
    found: set[Role] = set()
    for word in words_of(text):
        found |= {role for role, pattern in _COMPILED if pattern.fullmatch(word)}
        if _TIME.fullmatch(word):
            found.add("time")
        if _DATE.fullmatch(word):
            found.add("date")
    return found


def temperature_worth(text: str) -> float:
    """Return how much a name, units included, speaks for a water temperature: above 0 for, below 0 against."""
    roles = roles_of(text)
    worth = 2.0 if "temperature" in roles else 0.0
    if "quality" in roles or "spread" in roles:
        worth -= 4.0
    if "other" in roles or "counter" in roles:
        worth -= 3.0
    if ("pressure" in roles or "position" in roles) and "temperature" not in roles:
        worth -= 1.0
    if temperature_units(text) is not None:
        worth += 1.5
    return worth


# --------------------------------------------------------------------------------------------------------------
# Units

_TEMPERATURE_UNITS = (
    (
        "degree_Celsius",
        r"deg(?:rees?)?[ _.]*c(?:el(?:sius)?)?|celsius|°[ ]*c|º[ ]*c|degree_celsius|grad[ _]?c|\[c\]|\(c\)|_c|c",
    ),
    ("degree_Fahrenheit", r"deg(?:rees?)?[ _.]*f(?:ahrenheit)?|fahrenheit|°[ ]*f|º[ ]*f|\[f\]|\(f\)|f"),
    ("kelvin", r"kelvin|deg[ _.]*k|\[k\]|\(k\)|°[ ]*k|k"),
)
_ALONE = {"c", "f", "k"}
_DEPTH_UNITS = (
    ("m", r"m|metres?|meters?|mtr|mts"),
    ("cm", r"cm|centimet(?:re|er)s?"),
    ("feet", r"ft|feet|foot"),
    ("dbar", r"dbars?|decibars?|db"),
    ("fathom", r"fathoms?|fm"),
)


def temperature_units(text: str) -> str | None:
    """Return the units of temperature that a name or a cell of units states, or None."""
    folded = text.casefold().strip()
    for units, pattern in _TEMPERATURE_UNITS:
        alternatives = (
            pattern
            if folded in _ALONE
            else "|".join(each for each in pattern.split("|") if each not in _ALONE and each != "_c")
        )
        if re.search(rf"(?<![a-zà-ÿ])(?:{alternatives})(?![a-zà-ÿ])", folded):
            return units
    return None


def depth_units(text: str) -> str | None:
    """Return the units of depth or pressure that a text states, or None."""
    folded = text.casefold().strip()
    for units, pattern in _DEPTH_UNITS:
        if re.search(rf"(?<![a-zà-ÿ])(?:{pattern})(?![a-zà-ÿ])", folded):
            return units
    return None


_UNIT_CELL = re.compile(
    r"[(\[]?(?:°\s*[cfk]|º\s*c|deg.{0,4}[cfk]|degrees?.*|celsius|c|k|m|metres?|meters?|cm|ft|feet|dbar|db|utc|gmt|v|volts?|"
    r"psu|pss|%|mg/l|s|sec|seconds|yyyy.*|dd.*|mm/.*|hh.*|-|days?.*|ms/cm|ntu|kelvin|none|unitless|dimensionless|1)?[)\]]?"
)
_AGGREGATION = {
    "avg": "mean",
    "average": "mean",
    "mean": "mean",
    "ave": "mean",
    "smp": "instant",
    "sample": "instant",
    "inst": "instant",
    "instantaneous": "instant",
    "spot": "instant",
    "std": "spread",
    "min": "spread",
    "max": "spread",
    "stdev": "spread",
}


def is_unit(text: str) -> bool:
    """Tell whether a cell of a header looks like a unit; an empty one does."""
    return _UNIT_CELL.fullmatch(text.casefold().strip()) is not None


def aggregation(text: str) -> str | None:
    """Return ``"mean"``, ``"instant"`` or ``"spread"`` where a name or cell says how a reading came about."""
    return next((_AGGREGATION[word] for word in reversed(words_of(text)) if word in _AGGREGATION), None)
