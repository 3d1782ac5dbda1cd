"""The global attributes of every file: where it comes from and what it covers (ACDD-1.3)."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr
from pydantic import BaseModel

from profiles.config import Config
from profiles.vocabulary import CAUTION

KEYWORDS = "EARTH SCIENCE > OCEANS > OCEAN TEMPERATURE > THERMOCLINE"
VOCABULARY = "CF Standard Name Table v93"


def global_attributes(
    config: Config,
    dataset: xr.Dataset,
    *,
    name: str,
    title: str,
    summary: str,
    level: str,
    created: str,
    settings: Mapping[str, BaseModel],
    feature: str | None = None,
) -> dict[str, Any]:
    """Return the attributes of one file.

    Parameters
    ----------
    config : Config
        The array's description.
    dataset : xarray.Dataset
        What is written, for its extent.
    name, title, summary, level : str
        Identifier within the array, title, summary and ``processing_level``.
    created : str
        ISO 8601; the date of the newest delivery, so that the same inputs give the same bytes.
    settings : mapping of str to model
        The tables of the configuration that were used.
    feature : str, optional
        CF ``featureType``.
    """
    described = config.array
    given = {
        "title": f"{described.name}: {title}",
        "summary": " ".join(filter(None, [summary, described.summary])),
        "keywords": KEYWORDS,
        "keywords_vocabulary": "GCMD Science Keywords",
        "featureType": feature,
        "cdm_data_type": {"timeSeries": "Station", "timeSeriesProfile": "Station"}.get(feature or "", "Grid"),
        "id": name,
        "naming_authority": described.naming_authority,
        "institution": described.institution,
        "project": described.project,
        "creator_name": described.creator_name,
        "creator_email": described.creator_email,
        "creator_url": described.creator_url,
        "publisher_name": described.creator_name,
        "publisher_email": described.creator_email,
        "publisher_url": described.creator_url,
        "license": described.license,
        "acknowledgement": described.acknowledgement,
        "source": "moored thermistor chains",
        "processing_level": level,
        "standard_name_vocabulary": VOCABULARY,
        "comment": CAUTION,
        "history": f"{created} made by thermotilt from the deliveries of that date",
        "date_created": created,
        "settings": json.dumps({table: model.model_dump(mode="json") for table, model in settings.items()}),
    }
    return {key: value for key, value in given.items() if value} | _extent(dataset)


def _extent(dataset: xr.Dataset) -> dict[str, Any]:
    extent: dict[str, Any] = {}
    for name, axis, units in (("latitude", "lat", "degrees_north"), ("longitude", "lon", "degrees_east")):
        if name in dataset.coords:
            extent[f"geospatial_{axis}_min"] = float(dataset[name].min())
            extent[f"geospatial_{axis}_max"] = float(dataset[name].max())
            extent[f"geospatial_{axis}_units"] = units
    if {"latitude", "longitude"} <= set(dataset.coords):
        extent |= {"geospatial_bounds": _polygon(extent), "geospatial_bounds_crs": "EPSG:4326"}
    if "depth" in dataset.coords:
        extent |= {
            "geospatial_vertical_min": float(dataset["depth"].min()),
            "geospatial_vertical_max": float(dataset["depth"].max()),
            "geospatial_vertical_units": "m",
            "geospatial_vertical_positive": "down",
            "geospatial_bounds_vertical_crs": "EPSG:5831",
        }
    return extent | _duration(dataset)


def _polygon(extent: Mapping[str, float]) -> str:
    south, north = extent["geospatial_lat_min"], extent["geospatial_lat_max"]
    west, east = extent["geospatial_lon_min"], extent["geospatial_lon_max"]
    if south == north and west == east:
        return f"POINT ({south:g} {west:g})"
    corners = [(south, west), (north, west), (north, east), (south, east), (south, west)]
    return f"POLYGON (({', '.join(f'{latitude:g} {longitude:g}' for latitude, longitude in corners)}))"


def _duration(dataset: xr.Dataset) -> dict[str, Any]:
    times = pd.DatetimeIndex(dataset["time"].values)
    start, end = times[0], times[-1]
    step = pd.Timedelta(np.median(np.diff(times.to_numpy()))) if times.size > 1 else pd.Timedelta(0)
    monthly = pd.Timedelta("27D") < step < pd.Timedelta("32D")
    return {
        "time_coverage_start": start.strftime("%Y-%m-%dT%H:%M:%SZ"),
        "time_coverage_end": end.strftime("%Y-%m-%dT%H:%M:%SZ"),
        "time_coverage_duration": (end - start).isoformat(),
        "time_coverage_resolution": "P1M" if monthly else step.isoformat(),
    }
