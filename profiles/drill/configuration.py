"""The array's configuration and its layouts as text: what a run of the demo needs beside the deliveries.

``config/layouts/`` holds the same layouts with a comment on every key.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from profiles.drill.array import Site

HALCYON = """\
kind = "wide"
comment = "#"
missing = ["-9.999"]
[time]
column = "date"
format = "%Y-%m-%d"
mean_hours = 24
stamp = "start"
[depth]
pattern = "T_{depth}m"
"""
MARLIN = """\
kind = "long"
delimiter = ";"
decimal = ","
missing = ["NA"]
station = "station"
[time]
column = "time_local"
format = "%d.%m.%Y %H:%M"
zone = "+10:00"
mean_hours = 24
[depth]
column = "depth_m"
[temperature]
column = "temp_c"
"""
FRIGATE = """\
kind = "netcdf"
[variables]
temperature = "TEMP"
temperature_qc = "TEMP_QC"
time = "TIME"
depth = "DEPTH"
"""
SHEARWATER = """\
kind = "wide"
delimiter = "\\t"
comment = "%"
missing = ["-99.99"]
[time]
columns = ["year", "day"]
format = "%Y %j"
mean_hours = 24
stamp = "start"
[depth]
pattern = "P{depth}"
units = "dbar"
[temperature]
units = "kelvin"
"""


@dataclass(frozen=True)
class Form:
    """In which form an institute delivers: name of the layout's file, its text, and the ending of a delivery."""

    layout: str
    text: str
    ending: str


FORMS: Mapping[str, Form] = {
    "halcyon": Form("halcyon_wide.toml", HALCYON, "csv.gz"),
    "marlin": Form("marlin_long.toml", MARLIN, "csv.gz"),
    "frigate": Form("frigate_netcdf.toml", FRIGATE, "nc"),
    "frigate_fast": Form("frigate_netcdf.toml", FRIGATE, "nc"),
    "shearwater": Form("shearwater_wide.toml", SHEARWATER, "tsv.gz"),
}

ARRAY = """\
[array]
name = "Tropicbird Array"
summary = "Invented: moorings with 14 thermistors each, 149E to 94W, sampled from a simulated ocean with known truth."
institution = "Halcyon Marine Survey, Marlin Laboratory, Frigate Marine Institute, Shearwater Ocean Service (invented)"
creator_name = "Tropicbird data desk (invented)"
creator_email = "desk@tropicbird.invalid"
creator_url = "https://tropicbird.invalid"
project = "Tropicbird Array (invented)"
license = "BSD-3-Clause"
acknowledgement = "No ship, no mooring and no institute took part: the data is simulated."
naming_authority = "invalid.tropicbird"
"""


def delivery_path(site: Site) -> str:
    """Return where a mooring's delivery lies below the demo's folder."""
    return f"deliveries/{site.institute}/{site.id}.{FORMS[site.institute].ending}"


def configuration_text(sites: tuple[Site, ...], *, head: str = "", below: str = "", log: str = "") -> str:
    """Return a configuration of ``sites`` as TOML.

    Parameters
    ----------
    sites : tuple of Site
    head : str, optional
        Comment at the top, lines with their ``#``.
    below : str, optional
        How the demo's folder is seen from the configuration, with a slash behind it; the layouts are always in
        ``layouts/`` beside the configuration.
    log : str, optional
        Name of the recovery log in the demo's folder; none if it is empty.
    """
    named = f'recovery_log = "{below}{log}"\n\n' if log else ""
    tables = [
        f"""\
[[moorings]]
id = "{site.id}"
latitude = {float(site.latitude)}
longitude = {float(site.longitude)}
deliveries = [{{ path = "{below}{delivery_path(site)}", layout = "layouts/{FORMS[site.institute].layout}" }}]
"""
        for site in sites
    ]
    return "\n".join([f"{head}{named}{ARRAY}", *tables])
