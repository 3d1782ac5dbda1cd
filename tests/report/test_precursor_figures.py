"""Figures of precursors: what stands in them, and that the same data gives the same bytes."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from profiles.config import HindcastSettings, LeadLagSettings
from profiles.precursor import (
    anomalies,
    before_events,
    find_events,
    hindcast,
    lead_lag,
    monthly_series,
    outlook,
    reliability,
    verify,
)
from profiles.precursor.recharge import simulate
from profiles.report import style, write_precursor_figures
from profiles.report.precursor import (
    events_and_volume,
    lead_lag_by_month,
    lead_lag_curves,
    lead_lag_in_windows,
    outlook_plume,
    reliability_diagram,
    skill_by_lead,
    skill_by_season,
)
from profiles.vocabulary import CAUTION

YEARS = 20
SETTINGS = HindcastSettings(longest_lead=4, spread_blocks=4)


@pytest.fixture(scope="module")
def series() -> tuple[xr.DataArray, xr.DataArray]:
    angle = 2.0 * np.pi / 30.0
    turn = 0.95 * np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    index, volume = simulate(turn, np.eye(2) - turn @ turn.T, 12 * YEARS, 1, np.random.default_rng(3))[0]
    time = np.arange("2031-01", f"{2031 + YEARS}-01", dtype="datetime64[M]").astype("M8[ns]")
    named = {"name": "surface_temperature_index", "units": "degree_Celsius"}
    return monthly_series(index, time, **named), monthly_series(1e14 * volume, time, name="volume", units="m3")


@pytest.fixture(scope="module")
def precursor(series: tuple[xr.DataArray, xr.DataArray]) -> xr.Dataset:
    """Series, lead-lag and events on one dataset, as the pipeline writes them."""
    index, volume = (anomalies(one) for one in series)
    settings = LeadLagSettings(draws=100, window_months=120, least_years=8)
    found = lead_lag(volume, index, np.arange(-6, 13), settings=settings).expand_dims(predictor=["volume"])
    events = find_events(index)
    return xr.merge(
        [
            found.drop_vars(["window_first", "window_last"]),
            index.to_dataset(),
            volume.rename("predictor_anomaly").expand_dims(predictor=["volume"]).to_dataset(),
            before_events(events, {"volume": volume}),
            events,
        ],
        combine_attrs="drop_conflicts",
        compat="no_conflicts",
        join="outer",
    ).pipe(_with_units)


def _with_units(dataset: xr.Dataset) -> xr.Dataset:
    dataset["predictor_anomaly"].attrs["units_by_predictor"] = "volume: m3"
    return dataset.assign_attrs(target="surface_temperature_index_anomaly")


@pytest.fixture(scope="module")
def made(series: tuple[xr.DataArray, xr.DataArray]) -> xr.Dataset:
    return hindcast(series[0], {"volume": series[1]}, settings=SETTINGS)


@pytest.fixture(scope="module")
def issued(series: tuple[xr.DataArray, xr.DataArray], made: xr.Dataset) -> xr.Dataset:
    return outlook(series[0], {"volume": series[1]}, hindcast=made, settings=SETTINGS)


def words(figure: object) -> list[str]:
    """Return every text of a figure."""
    return [text.get_text() for text in figure.findobj(lambda artist: hasattr(artist, "get_text"))]  # type: ignore[attr-defined]


def test_curves_show_significance_interval_and_strongest_lead(precursor: xr.Dataset) -> None:
    figure = lead_lag_curves(precursor)
    axis = figure.axes[0]
    labels = axis.get_legend_handles_labels()[1]
    assert labels[-1] == "strongest lead, 95 %"
    assert {"95 % interval, effective size", "the same by block bootstrap", "significant at 5 %"} <= set(labels)
    line = next(line for line in axis.lines if line.get_label() == "significant at 5 %")
    assert line.get_xdata().size == int(precursor["significant"].sum())
    assert "lead (months)" in axis.get_xlabel()


def test_maps_hatch_what_is_not_significant(precursor: xr.Dataset) -> None:
    figure = lead_lag_by_month(precursor)
    mesh, hatched = figure.axes[0].collections[:2]
    assert mesh.get_array().shape == (12, precursor.sizes["lead"])
    assert hatched.get_hatch() == "////"
    assert len(hatched.get_paths()) > 0
    sure = precursor.assign(significant_by_month=xr.ones_like(precursor["significant_by_month"]))
    assert len(lead_lag_by_month(sure).axes[0].collections[1].get_paths()) == 0


def test_windows_show_the_strongest_lead_of_each(precursor: xr.Dataset) -> None:
    axis = lead_lag_in_windows(precursor).axes[0]
    points = next(line for line in axis.lines if line.get_xdata().size == precursor.sizes["window"])
    np.testing.assert_allclose(points.get_ydata(), precursor["peak_lead_in_window"].values.ravel())


def test_events_are_counted_and_set_against_the_volume(precursor: xr.Dataset) -> None:
    figure = events_and_volume(precursor, "surface_temperature_index_anomaly")
    known = np.isfinite(precursor["before_onset"].sel(predictor="volume", months_before=6).values)
    kinds = list(precursor["kind"].values[known])
    assert f"warm ({kinds.count('warm')})" in words(figure)
    assert f"cold ({kinds.count('cold')})" in words(figure)
    # In 1e14 m3.
    across = np.concatenate([line.get_xdata() for line in figure.axes[2].lines if line.get_marker() in "^v"])
    expected = precursor["before_onset"].sel(predictor="volume", months_before=6).values / 1e14
    np.testing.assert_allclose(np.sort(across), np.sort(expected))


def test_skill_has_a_line_with_intervals_for_every_forecaster_but_climatology(made: xr.Dataset) -> None:
    figure = skill_by_lead(verify(made))
    assert len(figure.axes[0].containers) == made.sizes["forecaster"] - 1
    assert figure.axes[1].get_title(loc="left") == "rms error (°C)"


def test_seasons_show_persistence_forecast_and_gain(made: xr.Dataset) -> None:
    figure = skill_by_season(verify(made), forecaster="combined")
    assert [axis.get_title(loc="left") for axis in figure.axes[:3]] == [
        "correlation, damped persistence",
        "correlation, regression with oscillator",
        "skill of that over the former",
    ]
    assert [label.get_text() for label in figure.axes[0].get_xticklabels()][:2] == ["DJF", "JFM"]


def test_reliability_states_its_slope(made: xr.Dataset) -> None:
    found = reliability(made)
    slope = float(found["reliability_slope"].sel(forecaster="combined"))
    assert any(
        text.startswith(f"slope {slope:.2f} (") for text in words(reliability_diagram(found, forecaster="combined"))
    )


def test_the_plume_carries_the_caution_and_the_probabilities(
    series: tuple[xr.DataArray, xr.DataArray], issued: xr.Dataset
) -> None:
    shown = words(outlook_plume(issued, anomalies(series[0])))
    assert CAUTION in shown
    assert any("Research outlook from December 2050" in text for text in shown)
    first = issued["probability"].isel(lead=0)
    for category in ("cold", "neutral", "warm"):
        share = float(first.sel(category=category))
        assert share < 0.08 or f"{100 * share:.0f}" in shown


def test_what_is_withheld_is_hatched_and_said(series: tuple[xr.DataArray, xr.DataArray], issued: xr.Dataset) -> None:
    part = issued.copy(deep=True)
    for name in ("forecast", "spread", "plume", "probability", "usual_probability"):
        part[name] = part[name].where(part["lead"] < 3)
    part.attrs["reason"] = "withheld: the hindcast shows no skill (3, 4 months)"
    shown = words(outlook_plume(part, anomalies(series[0])))
    assert "withheld" in shown
    assert any("no skill (3, 4" in text.replace("\n", " ") for text in shown)
    assert "withheld" not in words(outlook_plume(issued, anomalies(series[0])))


def test_figures_are_written_by_name_with_the_same_bytes(precursor: xr.Dataset, tmp_path: object) -> None:
    written = []
    for _ in range(2):
        files = write_precursor_figures(tmp_path, precursor=precursor)  # type: ignore[arg-type]
        written.append({name: path.read_bytes() for name, path in files.items()})
    assert list(written[0]) == ["precursor_lead_lag", "precursor_by_month", "precursor_windows", "precursor_events"]
    assert written[0] == written[1]


def test_a_withheld_outlook_has_no_figure(precursor: xr.Dataset, issued: xr.Dataset, tmp_path: object) -> None:
    nothing = issued.copy(deep=True)
    nothing["forecast"][:] = np.nan
    assert "precursor_outlook" not in write_precursor_figures(tmp_path, precursor=precursor, outlook=nothing)  # type: ignore[arg-type]


def test_warm_and_cold_differ_in_shape_as_well_as_colour() -> None:
    from profiles.report.precursor import _CATEGORY_LOOKS

    assert len({marker for _, marker in _CATEGORY_LOOKS.values()}) == 3
    assert _CATEGORY_LOOKS["warm"][0] == style.ORANGE
