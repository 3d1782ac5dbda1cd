"""What the report says of each figure of the array."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from profiles.report.array import LATEST, WEAK_SHARE


@dataclass(frozen=True)
class Caption:
    """A figure's heading, text and text for those who cannot see it; ``caution`` where a decision could lean on it.

    ``{isotherm}`` (°C), ``{window}`` and ``{weak}`` (m) are filled in.
    """

    heading: str
    text: str
    alternative: str
    half_width: bool = False
    caution: bool = False


_INTERVALS = "Bands: 95 % intervals from the covariance of the map, so that errors shared by places count as shared."
_ANOMALY = (
    "An anomaly is the departure from the climatology of this record: mean, annual and semi-annual terms, drawn "
    "towards the packaged atlas."
)

CAPTIONS: Mapping[str, Caption] = {
    "map": Caption(
        "The array",
        "Where the moorings are and, as colour and number, the share of the values expected of each that could be "
        "used. North-south distances are stretched.",
        "Map of the equatorial Pacific with the moorings coloured by data return, the box of the volume and the window "
        "of the tilt.",
    ),
    "volume": Caption(
        "Volume of warm water",
        "Monthly volume of water between the surface and the {isotherm} °C isotherm in 5°S-5°N, 120°E-80°W, whole and "
        f"west and east of 155°W, in 10¹⁴ m³; below, its anomaly. {_ANOMALY} {_INTERVALS}",
        "Volume of warm water and its anomaly against time: the whole box, its western and its eastern part, each with "
        "its 95 % interval.",
        caution=True,
    ),
    "tilt": Caption(
        "Tilt of the thermocline",
        "Monthly slope of an unweighted line through the depth of the {isotherm} °C isotherm, mean of 2.5°S-2.5°N, "
        f"from {{window}}, in m per 1000 km towards the east; below, its anomaly. Negative: shoaling eastward, "
        f"the usual state. {_ANOMALY} {_INTERVALS}",
        "Tilt of the thermocline and its anomaly against time, each with its 95 % interval.",
    ),
    "section": Caption(
        "Section along the equator",
        "Depth of the {isotherm} °C isotherm, mean of the mapped 2.5°S-2.5°N, averaged over the record and over its "
        f"last {LATEST} months. Bands: the mean half-width of the monthly 95 % intervals, which the interval of an "
        "average does not exceed. Symbols: means of the monthly values of the moorings within half a degree of the "
        "equator; they stand for one latitude and the months that they have, the line for a band and all months.",
        "Mean depth of the isotherm along the equator against longitude, with 95 % intervals and the moorings' own "
        "means.",
    ),
    "time_longitude": Caption(
        "Depth of the isotherm along the equator",
        "Monthly depth of the {isotherm} °C isotherm, mean of the mapped 2.5°S-2.5°N, in m. Triangles: longitudes of "
        "moorings. Away from them the map falls back on the climatology.",
        "Depth of the isotherm as colour against longitude and time.",
        half_width=True,
    ),
    "time_longitude_anomaly": Caption(
        "Anomaly of that depth",
        f"{_ANOMALY} Red: deeper than usual. Hatched: the standard error exceeds {{weak}} m, {WEAK_SHARE:g} of the "
        "standard deviation of the signal, so that the array says little there.",
        "Anomaly of the isotherm's depth as colour against longitude and time, hatched where its error is large.",
        half_width=True,
    ),
    "data_return": Caption(
        "Data return by sensor",
        "Share of the values expected of each sensor that are good or not evaluated; each bar reaches half-way to the "
        "next sensor. Expected: the length of the record in nominal sampling intervals.",
        "Share of usable values as colour, a column of sensors for each mooring, depth downward.",
    ),
}

MOORING_TEXT = (
    "Colour: temperature that was used, linear between neighbouring sensors; grey: none. Triangles: questionable "
    "values; crosses: bad values, at their sensor. Black: depth of the {isotherm} °C isotherm in its 95 % interval "
    "(white); it breaks off where none can be given, and the strip below says why. Blue: mixed layer depth. "
    "Long records are averaged in time to fit the width. Below 300 m the depth axis is closer. A mooring without a "
    "chain shows its columns alone, as somebody else computed them."
)
