"""Figures, findings and page of a comparison: what stands in them, and that they hold no more than can be told."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from matplotlib.collections import PolyCollection
from matplotlib.patches import Circle

from profiles.report import write_model_figures, write_model_page
from profiles.report.model_findings import QUANTITIES, in_words, model_findings, readings
from profiles.report.validation import (
    COLOURS,
    FIGURES,
    PATTERNS,
    model_section,
    model_tilt,
    model_time_longitude,
    model_volume,
    pattern_diagram,
    place_of,
)
from profiles.report.validation_page import CAPTIONS
from profiles.section.grid import array_grid
from profiles.vocabulary import CAUTION

MONTHS = np.arange("2031-01", "2032-07", dtype="datetime64[M]").astype("datetime64[ns]")
LONGITUDE = array_grid()[1]
SERIES = [(quantity.name, quantity.place) for quantity in QUANTITIES] + [("isotherm_depth", "175E")]
#: Per quantity: the array's mean, its sd, the model's bias as seen, the full model's difference, in the file's units.
STATE = {
    "thermocline_slope": (-12.0, 2.0, 1.0, 1.5),
    "warm_water_volume": (2.4e15, 1e14, 1e13, 2e13),
    "equatorial_isotherm_depth": (120.0, 10.0, 5.0, 8.0),
    "isotherm_depth": (120.0, 10.0, 5.0, np.nan),
    "steepest_gradient_depth": (125.0, 10.0, 5.0, np.nan),
}
#: Standard errors: of a month from measurement, of a month with the map, of the mean difference as seen.
ERRORS = {
    "thermocline_slope": (0.2, 0.4, 0.25),
    "warm_water_volume": (1e13, 3e13, 1e13),
    "equatorial_isotherm_depth": (1.5, 4.0, 1.5),
    "isotherm_depth": (1.0, np.nan, 1.0),
    "steepest_gradient_depth": (np.nan, np.nan, 3.0),
}
AXES = {"warm_water_volume": ("region", 3), "equatorial_isotherm_depth": ("longitude", LONGITUDE.size)}


def one_model(name: str, **scores: float) -> xr.Dataset:
    """A comparison whose differences are the same in every month."""
    season = np.sin(np.arange(MONTHS.size) / 3.0)
    data: dict[str, tuple[object, object]] = {}
    for quantity in ("thermocline_slope", "warm_water_volume", "equatorial_isotherm_depth"):
        mean, sd, bias, difference = STATE[quantity]
        measured, mapped, _ = ERRORS[quantity]
        dims, shape = ("time",), (MONTHS.size,)
        if quantity in AXES:
            dims, shape = ("time", AXES[quantity][0]), (MONTHS.size, AXES[quantity][1])
        array = mean + np.broadcast_to((sd * season).reshape(-1, *(1,) * (len(shape) - 1)), shape)
        full = np.full(shape, 0.0)
        for key, values in {
            f"array_{quantity}": array,
            f"seen_{quantity}": array + bias,
            f"full_{quantity}": array + difference,
            f"array_{quantity}_error": full + mapped,
            f"{quantity}_seen_difference": full + bias,
            f"{quantity}_seen_difference_error": full + measured,
            f"{quantity}_difference": full + difference,
            f"{quantity}_difference_error": full + mapped,
            f"{quantity}_hidden": full + bias - difference,
        }.items():
            data[key] = (dims, values)
    for quantity in ("isotherm_depth", "steepest_gradient_depth"):
        mean, sd, bias, _ = STATE[quantity]
        at_moorings = mean + sd * season[:, None] * np.ones(2)
        data[f"array_{quantity}"] = (("time", "mooring"), at_moorings)
        data[f"model_{quantity}"] = (("time", "mooring"), at_moorings + bias)
    steepest = np.full((MONTHS.size, LONGITUDE.size), 140.0)
    data["full_equatorial_steepest_gradient_depth"] = (("time", "longitude"), steepest)
    data |= {key: ("series", values) for key, values in score_columns(scores).items()}
    understood = {"temperature": "thing: potential temperature, K", "salinity": "atlas", "averaging": "by month"}
    return xr.Dataset(
        data | {"understood": ((), json.dumps(understood))},
        coords={
            "time": MONTHS,
            "longitude": LONGITUDE,
            "region": ["total", "west", "east"],
            "mooring": ["TB-01", "TB-02"],
            "quantity": ("series", np.array([row[0] for row in SERIES], dtype=object)),
            "place": ("series", np.array([row[1] for row in SERIES], dtype=object)),
            "kind": ("series", np.array(["map"] * 4 + ["array", "array", "line"], dtype=object)),
            "model": name,
        },
    )


def score_columns(changed: dict[str, float]) -> dict[str, list[float]]:
    columns: dict[str, list[float]] = {}
    for quantity, _ in SERIES:
        _, sd, bias, difference = STATE[quantity]
        noise, whole, error = ERRORS[quantity]
        row = {
            "months": 18.0,
            "bias": bias,
            "bias_low": bias - 1.96 * error,
            "bias_high": bias + 1.96 * error,
            "mean_difference": difference,
            "mean_difference_error": whole,
            "mean_hidden": bias - difference,
            "observation_noise": noise,
            "array_sd": sd,
            "sd_ratio": 0.9,
            "sd_ratio_low": 0.8,
            "sd_ratio_high": 1.0,
            "correlation": 0.95,
            "correlation_low": 0.9,
            "correlation_high": 0.98,
        } | changed
        for name, value in row.items():
            columns.setdefault(name, []).append(value)
    return columns


def together(*models: xr.Dataset) -> xr.Dataset:
    joined = xr.concat(models, dim="model", coords="minimal", compat="override", data_vars="all")
    return joined.assign_attrs(isotherm=20.0)


@pytest.fixture(scope="module")
def one() -> xr.Dataset:
    return together(one_model("alpha"))


@pytest.fixture(scope="module")
def three() -> xr.Dataset:
    short = one_model("gamma <b>$x$")
    months = xr.DataArray(np.arange(MONTHS.size) < 9, dims="time")
    short = short.assign({name: data.where(months) for name, data in short.items() if "time" in data.dims})
    return together(one_model("alpha"), one_model("beta", correlation=-0.4, correlation_low=-0.7), short)


# --------------------------------------------------------------------------------------------------------------
# Findings


def found(changed: dict[str, float], quantity: str = "thermocline_slope") -> object:
    findings = model_findings(one_model("alpha", **changed))
    return next(finding for finding in findings if finding.quantity == quantity)


def test_the_difference_is_split_into_what_is_the_models_and_what_is_hidden(one: xr.Dataset) -> None:
    tilt, volume, *_ = model_findings(one.isel(model=0))
    # As seen 1.0, whole 1.5 with a half-width of 1.96 x 0.4: two thirds are the model's as seen, 0.5 is hidden.
    assert (tilt.bias, tilt.difference, tilt.hidden) == (1.0, 1.5, -0.5)
    assert tilt.share == pytest.approx(2.0 / 3.0)
    assert in_words(tilt) == [
        "tilt: +1.00 m per 1000 km (+0.51 to +1.49): flatter than the array",
        "full model less map +1.50 ± 0.78: +1.00 where the array looked, +0.50 hidden by the sampling; "
        "67 % of it seen by the array",
    ]
    # In 1e14 m3: as seen 0.1 with 1.96 x 0.1, whole 0.2 with 1.96 x 0.3: neither can be told, and no share is given.
    assert np.isnan(volume.share)
    assert in_words(volume) == [
        "warm water volume: +0.10 10^14 m3 (-0.10 to +0.30): smaller than the observation can tell",
        "full model less map +0.20 ± 0.59: +0.10 where the array looked, +0.10 hidden by the sampling; "
        "smaller than the map can tell",
    ]


@pytest.mark.parametrize(
    ("quantity", "low", "high", "verdict"),
    [
        ("thermocline_slope", 0.1, 1.9, "flatter"),
        ("thermocline_slope", -1.9, -0.1, "steeper"),
        ("thermocline_slope", -0.1, 1.9, "smaller than the observation can tell"),
        ("thermocline_slope", 0.0, 1.9, "smaller than the observation can tell"),
        ("thermocline_slope", np.nan, np.nan, "too few independent months to say"),
        ("warm_water_volume", 1e12, 2e13, "larger"),
        ("warm_water_volume", -2e13, -1e12, "smaller"),
        ("isotherm_depth", 1.0, 9.0, "deeper"),
        ("isotherm_depth", -9.0, -1.0, "shallower"),
    ],
)
def test_the_verdict_is_a_direction_only_where_the_interval_leaves_out_zero(
    quantity: str, low: float, high: float, verdict: str
) -> None:
    assert found({"bias_low": low, "bias_high": high}, quantity).verdict == verdict


def test_a_thermocline_that_deepens_eastward_is_steeper_with_more_slope() -> None:
    reversed_tilt = one_model("alpha", bias_low=0.1, bias_high=1.9)
    names = ["array_thermocline_slope", "seen_thermocline_slope"]
    reversed_tilt = reversed_tilt.assign({name: reversed_tilt[name] + 24.0 for name in names})
    assert model_findings(reversed_tilt)[0].verdict == "steeper"


def test_an_interval_of_sampling_is_said_to_be_one(one: xr.Dataset) -> None:
    depth, steepest = model_findings(one.isel(model=0))[-2:]
    assert in_words(depth) == ["isotherm depth: +5.0 m (+3.0 to +7.0): deeper than the array"]
    assert in_words(steepest) == [
        "depth of the steepest gradient: +5.0 m (-0.9 to +10.9, of sampling): smaller than the observation can tell"
    ]


def test_no_minus_stands_before_a_zero() -> None:
    assert "+0.00 hidden" in in_words(found({"mean_hidden": 0.001}))[1]


def test_readings_give_the_months_of_both(three: xr.Dataset) -> None:
    assert readings(three.isel(model=2)).startswith("2031-01 to 2031-09; potential temperature, K, salinity atlas")


# --------------------------------------------------------------------------------------------------------------
# Figures


@pytest.mark.parametrize("draw", FIGURES.values(), ids=FIGURES)
def test_figures_of_one_and_of_several_models_are_drawn_without_warning(
    draw: object, one: xr.Dataset, three: xr.Dataset
) -> None:
    for comparison in (one, three):
        figure = draw(comparison)  # type: ignore[operator]
        assert figure.axes


def test_a_model_of_too_few_months_leaves_the_diagram_empty_and_is_not_judged() -> None:
    few = together(one_model("alpha", **dict.fromkeys(score_columns({}), np.nan) | {"months": 3.0}))
    assert in_words(model_findings(few.isel(model=0))[0]) == ["tilt: too few independent months to say (3 months)"]
    for draw in FIGURES.values():
        assert draw(few).axes


def test_the_same_comparison_gives_the_same_bytes(one: xr.Dataset, tmp_path: Path) -> None:
    made = []
    for name in ("first", "again"):
        (tmp_path / name).mkdir()
        made.append({key: path.read_bytes() for key, path in write_model_figures(tmp_path / name, one).items()})
    assert list(made[0]) == list(FIGURES)
    assert made[0] == made[1]


def test_a_place_in_the_diagram_is_the_centred_rms_away_from_the_array() -> None:
    # Taylor (2001), equation 5, in units of the array's sd: E^2 = 1 + s^2 - 2 s R.
    for ratio, correlation in ((0.9, 0.95), (1.3, 0.2), (0.5, -0.6), (1.0, 1.0)):
        across, up = place_of(ratio, correlation)
        assert (across - 1.0) ** 2 + up**2 == pytest.approx(1.0 + ratio**2 - 2.0 * ratio * correlation, abs=1e-12)
        assert np.hypot(across, up) == pytest.approx(ratio)


def test_the_diagram_has_a_mark_a_model_and_quantity_and_the_arrays_own_error(three: xr.Dataset) -> None:
    whole, near = pattern_diagram(three).axes
    for axis in (whole, near):
        marks = [line for line in axis.lines if line.get_marker() in {mark for *_, mark, _ in PATTERNS}]
        assert {line.get_color() for line in marks} == set(COLOURS[:3])
        assert len(marks) == 3 * len(PATTERNS)
        # 1.0 / 10, 0.2 / 2 and 1e13 / 1e14: the noise of a month over the array's sd.
        discs = [patch.radius for patch in axis.patches if isinstance(patch, Circle) and patch.get_fill()]
        assert discs == pytest.approx([0.1, 0.1, 0.1])
    # A model of negative correlation opens the other half of the plane.
    assert whole.get_xlim()[0] < 0.0


def test_an_array_that_hardly_varies_does_not_break_the_diagram() -> None:
    # Noise of 1 m over an sd of 1e-9 m: the circle is cut to a size that can be drawn.
    still = together(one_model("alpha", array_sd=1e-9, sd_ratio=40.0, sd_ratio_low=30.0, sd_ratio_high=50.0))
    figure = pattern_diagram(still)
    discs = [patch.radius for patch in figure.axes[0].patches if isinstance(patch, Circle) and patch.get_fill()]
    assert max(discs) <= 5.0
    assert len(figure.axes[0].lines) < 100


def test_the_diagram_without_a_negative_correlation_is_a_quadrant(one: xr.Dataset) -> None:
    assert pattern_diagram(one).axes[0].get_xlim()[0] == 0.0


def bands(axis: object) -> list[tuple[float, float]]:
    """Vertical extent of each band of the axes."""
    return [
        (float(path.vertices[:, 1].min()), float(path.vertices[:, 1].max()))
        for collection in axis.collections  # type: ignore[attr-defined]
        if isinstance(collection, PolyCollection)
        for path in collection.get_paths()
    ]


def test_bands_are_95_percent_of_the_map_and_of_measurement(one: xr.Dataset) -> None:
    below, above = model_tilt(one).axes
    (mapped, measured) = bands(below)
    assert mapped == pytest.approx((-1.96 * 0.4, 1.96 * 0.4), abs=1e-3)
    assert measured == pytest.approx((-1.96 * 0.2, 1.96 * 0.2), abs=1e-3)
    ((low, high),) = bands(above)
    # The array swings by 2 about -12.
    assert (low, high) == pytest.approx((-14.0 - 1.96 * 0.4, -10.0 + 1.96 * 0.4), abs=0.05)


def test_volume_is_of_the_whole_box_in_1e14_cubic_metres(one: xr.Dataset) -> None:
    below, above = model_volume(one).axes
    assert "10$^{14}$ m$^{3}$" in above.get_ylabel()
    differences = [float(np.asarray(line.get_ydata())[0]) for line in below.lines]
    assert 0.2 in [pytest.approx(value) for value in differences]
    assert 0.1 in [pytest.approx(value) for value in differences]


def test_depth_is_drawn_downward_and_the_lines_of_moorings_with_their_intervals(one: xr.Dataset) -> None:
    below, above = model_section(one).axes
    assert above.yaxis_inverted()
    assert not below.yaxis_inverted()
    (container,) = below.containers
    assert np.asarray(container.lines[0].get_xdata()).tolist() == [175.0]
    (bar,) = container.lines[2][0].get_segments()
    np.testing.assert_allclose(bar[:, 1], [5.0 - 1.96, 5.0 + 1.96])


def test_a_model_is_hatched_where_the_array_cannot_tell_it_from_the_ocean(one: xr.Dataset) -> None:
    def hatched(comparison: xr.Dataset) -> int:
        axis = model_time_longitude(comparison).axes[2]
        return sum(
            len(part.get_paths()) for part in axis.collections if isinstance(part, PolyCollection) and part.get_hatch()
        )

    # 8 m with a half-width of 1.96 x 4.0 = 7.84 m can be told; with 1.96 x 4.2 = 8.23 m it cannot, in any month.
    assert hatched(one) == 0
    vague = one.assign(
        equatorial_isotherm_depth_difference_error=one["equatorial_isotherm_depth_difference_error"] + 0.2
    )
    assert hatched(vague) == MONTHS.size


# --------------------------------------------------------------------------------------------------------------
# The page


def test_the_page_holds_findings_figures_and_the_caution_and_escapes_names(three: xr.Dataset, tmp_path: Path) -> None:
    figures = write_model_figures(tmp_path, three)
    write_model_page(tmp_path / "page.html", three, figures, array="Array <i>")
    page = (tmp_path / "page.html").read_text(encoding="utf-8")
    assert page.count("data:image/png;base64,") == len(FIGURES)
    assert page.count(CAUTION) == 2
    assert "<h1>Models against Array &lt;i&gt;</h1>" in page
    assert "<h3>gamma &lt;b&gt;$x$</h3>" in page
    assert page.count("<td>flatter</td>") == 3
    assert "<td>smaller than the observation can tell</td>" in page
    assert "1.00 (0.51 to 1.49)" in page
    assert 'src="http' not in page


def test_every_figure_has_its_caption() -> None:
    assert list(CAPTIONS) == list(FIGURES)
