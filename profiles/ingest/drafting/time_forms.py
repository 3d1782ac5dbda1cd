"""Forms of stamps: which strptime formats a text could be of."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence

ISO = "iso8601"

_MONTHS = ["jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec"]
_CLOCK = re.compile(
    r"(?P<hour>[0-9]{1,2})(?P<mark>[:h.])(?P<minute>[0-9]{2})(?:(?P=mark)(?P<second>[0-9]{2})(?P<part>[.,][0-9]{1,9})?)?"
    r"(?P<half>\s?[AaPp][Mm])?(?P<zone>\s?(?:Z|[+-][0-9]{2}:?[0-9]{2})|\s?\(?[A-Za-z]{3,4}\)?)?$"
)
_THREE = re.compile(r"(\d{1,4})([-/._ ])(\d{1,2})([-/._ ])(\d{1,4})(\.?)")
_DAY_OF_YEAR = re.compile(r"(\d{4})([-/._ ]?)(\d{3})")
_MONTH_NAMED = re.compile(r"(\d{1,4}|[A-Za-z]{3,9})([-/._ ,]*)(\d{1,2}|[A-Za-z]{3,9})([-/._ ,]*)(\d{2,4})")
_COMPACT = {
    14: ("%Y%m%d%H%M%S", "%d%m%Y%H%M%S"),
    12: ("%Y%m%d%H%M", "%d%m%Y%H%M", "%y%m%d%H%M%S"),
    10: ("%Y%m%d%H", "%y%m%d%H%M"),
    8: ("%Y%m%d", "%d%m%Y", "%m%d%Y"),
    7: ("%Y%j",),
    6: ("%y%m%d", "%d%m%y", "%m%d%y"),
}
_COMPACT_CLOCK = {1: ("%H",), 2: ("%H",), 4: ("%H%M",), 6: ("%H%M%S",)}
_ORDERS = (("y", "m", "d"), ("d", "m", "y"), ("m", "d", "y"))


def formats_of(text: str) -> list[str]:
    """Return the formats that a stamp could be of, the likeliest first; none where it is no stamp."""
    text = text.strip()
    found = [ISO] if re.match(r"\d{4}-\d{2}-\d{2}($|[T ]\d{2}:\d{2})", text) else []
    for date, rest, clock in _split(text):
        found += [f"{day}{_escaped(rest)}{clock}" for day in _dates(date)]
    return [each for each in dict.fromkeys(found) if _is_sound(each)]


def _is_sound(time_format: str) -> bool:
    """Tell whether a format asks for nothing twice."""
    asked = re.findall(r"%([A-Za-z])", time_format.replace("%%", ""))
    return len(set(asked)) == len(asked)


def _escaped(text: str) -> str:
    return text.replace("%", "%%")


def _split(text: str) -> Iterator[tuple[str, str, str]]:
    """Yield date, what stands between, and the format of the clock."""
    for match in re.finditer(r"(?<![0-9])[0-9]{1,2}[:h.][0-9]{2}", text):
        clock = _CLOCK.match(text, match.start())
        if clock is None:
            continue
        date = text[: match.start()]
        bare = date.rstrip(" T,_:-/;")
        if bare:
            yield bare, date[len(bare) :], _clock_format(clock)
    yield text, "", ""
    apart = re.fullmatch(r"(.*[0-9A-Za-z])([ T_-]+)([0-9]{1,2}|[0-9]{4}|[0-9]{6})(Z?)", text)
    if apart is not None:
        for clock_format in _COMPACT_CLOCK[len(apart.group(3))]:
            yield apart.group(1), apart.group(2), clock_format + apart.group(4)


def _clock_format(match: re.Match[str]) -> str:
    mark, half, zone = match["mark"], match["half"], match["zone"]
    parts = [("%I" if half else "%H"), "%M"] + (["%S"] if match["second"] else [])
    text = mark.join(parts)
    if match["part"]:
        text += f"{match['part'][0]}%f"
    if half:
        text += f"{half[: len(half) - 2]}%p"
    if zone:
        bare = zone.strip()
        text += zone[: len(zone) - len(zone.lstrip())] + ("%z" if bare[0] in "+-" or bare == "Z" else _escaped(bare))
    return text


def _dates(text: str) -> Iterator[str]:
    """Yield the formats of a date."""
    if match := _THREE.fullmatch(text):
        yield from _numeric(match)
    if match := _DAY_OF_YEAR.fullmatch(text):
        yield f"%Y{match[2]}%j"
    if text.isdigit():
        yield from _COMPACT.get(len(text), ())
    if match := _MONTH_NAMED.fullmatch(text):
        yield from _named(match)


def _numeric(match: re.Match[str]) -> Iterator[str]:
    first, mark, _, mark_two, last, end = match.groups()
    for order in _ORDERS:
        written, other = (first, last) if order[0] == "y" else (last, first)
        year = {4: "%Y", 2: "%y"}.get(len(written))
        if year is None or len(other) > 2:
            continue
        yield _joined(order, year, mark, mark_two) + end


def _joined(order: Sequence[str], year: str, mark: str, mark_two: str) -> str:
    codes = {"y": year, "m": "%m", "d": "%d"}
    return f"{codes[order[0]]}{mark}{codes[order[1]]}{mark_two}{codes[order[2]]}"


def _named(match: re.Match[str]) -> Iterator[str]:
    first, mark, middle, mark_two, last = match.groups()
    words = [text for text in (first, middle) if text.isalpha()]
    if len(words) != 1 or words[0][:3].casefold() not in _MONTHS:
        return
    month = "%b" if len(words[0]) == 3 else "%B"
    if first.isalpha():
        codes: Sequence[tuple[str, str, str]] = [(month, "%d", _year(last))]
    else:
        codes = [("%d", month, _year(last))] if len(first) <= 2 else []
        if len(first) in {2, 4} and len(last) <= 2:
            codes = [*codes, (_year(first), month, "%d")]
    for one, two, three in codes:
        yield f"{one}{_escaped(mark)}{two}{_escaped(mark_two)}{three}"


def _year(text: str) -> str:
    return "%Y" if len(text) == 4 else "%y"


def is_clock(text: str) -> bool:
    """Tell whether a text is a time of day alone."""
    return _CLOCK.match(text.strip()) is not None
