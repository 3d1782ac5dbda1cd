"""What each stage does for one mooring or for the array: read, call the room, write."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import pandas as pd
import xarray as xr

from profiles import store
from profiles.config import Config, Mooring
from profiles.errors import DataError
from profiles.pipeline.attributes import global_attributes
from profiles.pipeline.listed import join_listed, read_listed
from profiles.pipeline.paths import CHAIN, DAYS, MONTHS, Folder
from profiles.pipeline.task import Report, Task
from profiles.vocabulary import ColumnSource, MeanStatus

#: Tables of the whole array, by the stage whose tasks write their parts.
TABLES = {"ingest": ("deliveries", "quarantine"), "qc": ("data_return", "faults", "gaps")}
MONTHLY_TABLE = "volume_and_tilt"
_DELIVERIES = ("mooring", "file", "rows_read", "rows_kept", "rows_quarantined", "rows_reordered", "outcome", "problem")
_QUARANTINE = ("file", "line", "reason", "text")


# --------------------------------------------------------------------------------------------------------------
# Ingest


def ingest_task(config: Config, mooring: Mooring, folder: Folder) -> Task:
    """Deliveries of one mooring to one chain."""
    files = [config.resolve(path) for delivery in mooring.deliveries for path in (delivery.path, delivery.layout)]
    if config.recovery_log is not None:
        files.append(config.resolve(config.recovery_log))
    return Task(
        stage="ingest",
        name=mooring.id,
        work=ingest,
        arguments=(config, mooring, folder),
        inputs=tuple(files),
        outputs=(folder.delivered(mooring.id), *(folder.part(table, mooring.id) for table in TABLES["ingest"])),
        settings=mooring.model_dump(mode="json") | {"default_accuracy": config.column.sensor_accuracy},
    )


def ingest(config: Config, mooring: Mooring, folder: Folder) -> Report:
    """Read a mooring's deliveries; one that cannot be used is reported, and the others still are."""
    account: list[dict[str, Any]] = []
    quarantine: list[pd.DataFrame] = []
    usable: list[Any] = []
    for listed in mooring.by_precedence:
        delivery = read_listed(config, mooring, listed)
        if isinstance(delivery, str):
            account.append(_account(mooring, listed.path, problem=delivery))
            continue
        usable.append(delivery)
        account.append(_account(mooring, listed.path, delivery))
        quarantine.append(delivery.quarantine.assign(file=listed.path.as_posix()))
    joined = join_listed(config, mooring, usable) if usable else ""
    if isinstance(joined, str):
        folder.delivered(mooring.id).unlink(missing_ok=True)
        account = [row if row["problem"] else _account(mooring, Path(row["file"]), problem=joined) for row in account]
        quarantine = []
    else:
        _count_losses(account, quarantine, joined, usable)
        store.write_blocks(folder.delivered(mooring.id), joined.blocks(), {})
    store.write_table(folder.part("deliveries", mooring.id), pd.DataFrame(account, columns=_DELIVERIES))
    rejected = pd.concat(quarantine) if quarantine else pd.DataFrame(columns=_QUARANTINE)
    store.write_table(folder.part("quarantine", mooring.id), rejected)
    return {"usable": not isinstance(joined, str), "deliveries": account}


def _account(mooring: Mooring, path: Path, delivery: Any = None, problem: str = "") -> dict[str, Any]:
    counts = ("rows_read", "rows_kept", "rows_quarantined", "rows_reordered")
    return {
        "mooring": mooring.id,
        "file": path.as_posix(),
        **{name: getattr(delivery, name) if delivery is not None else 0 for name in counts},
        "outcome": "used" if delivery is not None else "not used",
        "problem": problem,
    }


def _count_losses(
    account: list[dict[str, Any]], quarantine: list[pd.DataFrame], joined: Any, parts: Sequence[Any]
) -> None:
    """Move what the join of overlapping deliveries lost from kept to quarantined, in the account and the table."""
    if len(parts) == 1:
        return
    used = [row for row in account if row["outcome"] == "used"]
    names = {str(part.sources[0].path): row["file"] for part, row in zip(parts, used, strict=True)}
    lost = joined.quarantine.assign(file=joined.quarantine["file"].map(lambda name: names.get(name, name)))
    for row in used:
        moved = int((lost["file"] == row["file"]).sum()) - row["rows_quarantined"]
        row["rows_kept"] -= moved
        row["rows_quarantined"] += moved
    quarantine[:] = [lost]


# --------------------------------------------------------------------------------------------------------------
# Quality control


def qc_task(config: Config, mooring: Mooring, folder: Folder) -> Task:
    """A chain to a flagged chain and its summaries."""
    return Task(
        stage="qc",
        name=mooring.id,
        work=flag,
        arguments=(config, mooring, folder),
        inputs=(folder.delivered(mooring.id),),
        outputs=(folder.chain(mooring.id), *(folder.part(table, mooring.id) for table in TABLES["qc"])),
        settings=config.qc.model_dump(mode="json")
        | {"array": config.array.model_dump(mode="json"), "created": _created(config, [mooring])},
    )


def flag(config: Config, mooring: Mooring, folder: Folder) -> Report:
    """Flag a chain block by block."""
    from profiles.qc import data_return, fault_list, flag_blocks, gap_list

    with store.open_dataset(folder.delivered(mooring.id)) as chain:
        attributes = global_attributes(
            config,
            chain,
            name=f"chain-{mooring.id}",
            title=f"temperature at {mooring.id}, flagged",
            summary="In situ temperature of a moored thermistor chain with quality flags and the tests behind them.",
            level="quality-controlled",
            created=_created(config, [mooring]),
            settings={"qc": config.qc},
            feature="timeSeriesProfile",
        )
        store.write_blocks(folder.chain(mooring.id), flag_blocks(chain, config.qc), attributes)
    with store.open_dataset(folder.chain(mooring.id)) as flagged:
        returned = data_return(flagged)
        store.write_table(folder.part("data_return", mooring.id), returned)
        faults = fault_list(flagged)
        store.write_table(folder.part("faults", mooring.id), faults)
        store.write_table(folder.part("gaps", mooring.id), gap_list(flagged, config.qc))
    return {"values": int(returned["samples"].sum()), "faults": len(faults)}


# --------------------------------------------------------------------------------------------------------------
# Columns


def column_task(config: Config, mooring: Mooring, folder: Folder, sources: Sequence[str]) -> Task:
    """A flagged chain, or series from elsewhere, to columns and their daily and monthly means."""
    return Task(
        stage="column",
        name=mooring.id,
        work=reduce_to_columns,
        arguments=(config, mooring, folder, tuple(sources)),
        inputs=tuple(
            folder.chain(mooring.id) if source == CHAIN else folder.series(mooring.id, source) for source in sources
        ),
        outputs=(
            *_column_files(mooring, folder, sources),
            folder.means(mooring.id, "daily"),
            folder.means(mooring.id, "monthly"),
        ),
        settings={
            "sources": list(sources),
            "series": len(config.series),
            "column": config.column.model_dump(mode="json"),
            "means": config.section.means.model_dump(mode="json"),
            "array": config.array.model_dump(mode="json"),
            "created": _created(config, [mooring], sources),
        },
    )


def _column_files(mooring: Mooring, folder: Folder, sources: Sequence[str]) -> list[Path]:
    """Return where the columns from each source go: those from the first have the mooring's name."""
    return [folder.columns(mooring.id, source if place else "") for place, source in enumerate(sources)]


def reduce_to_columns(config: Config, mooring: Mooring, folder: Folder, sources: Sequence[str]) -> Report:
    """Read off the columns of a chain, take over those of series, and average them; the first source wins."""
    from profiles.section import first_given, without_days

    parts = []
    for source, path in zip(sources, _column_files(mooring, folder, sources), strict=True):
        reduce = _reduce_chain if source == CHAIN else _reduce_series
        origin = ColumnSource.CHAIN if source == CHAIN else ColumnSource.SERIES
        parts.append((origin, *reduce(config, mooring, folder, source, path)))
    daily, monthly = parts[0][1:] if not config.series else first_given(parts)
    daily = without_days(monthly) if daily is None else daily
    for step, means in (("daily", daily), ("monthly", monthly)):
        store.write_dataset(folder.means(mooring.id, step), means, {})
    return {"months": _months_by_source(monthly)}


def _months_by_source(monthly: xr.Dataset) -> dict[str, int]:
    """Count the monthly means of the isotherm by where they come from."""
    given = monthly["isotherm_mean_status"].values == int(MeanStatus.GIVEN)
    if "column_source" not in monthly:
        return {ColumnSource.CHAIN.name.lower(): int(given.sum())}
    source = monthly["column_source"].values
    return {kind.name.lower(): int((given & (source == kind)).sum()) for kind in ColumnSource if kind}


def _reduce_series(
    config: Config, mooring: Mooring, folder: Folder, source: str, path: Path
) -> tuple[xr.Dataset | None, xr.Dataset]:
    """Write the columns of a series; return their daily means, where it has days, and their monthly means."""
    from profiles.column import columns_of_series
    from profiles.section import daily_means, monthly_means, monthly_means_delivered, over_days

    means = config.section.means
    with store.open_dataset(folder.series(mooring.id, source)) as stored:
        series = stored.load()
    columns = columns_of_series(series, config.column)
    attributes = global_attributes(
        config,
        columns,
        name=f"columns-{path.stem}",
        title=f"isotherm depth and mixed layer at {mooring.id}, computed elsewhere",
        summary=f"Isotherm depth, mixed layer depth and mean temperature as somebody else computed them, of {source}.",
        level="derived",
        created=_created(config, [mooring], [source]),
        settings={"column": config.column},
        feature="timeSeries",
    )
    store.make_folder(path.parent)
    store.write_dataset(path, columns, attributes)
    if source == MONTHS:
        return None, monthly_means_delivered(columns, means)
    daily = daily_means(over_days(columns, series["mean_hours"].values), means)
    return daily, monthly_means(daily, means)


def _reduce_chain(
    config: Config, mooring: Mooring, folder: Folder, source: str, path: Path
) -> tuple[xr.Dataset, xr.Dataset]:
    """Read off the columns block by block and write them; return their daily and monthly means."""
    from profiles.column import column_blocks
    from profiles.section import daily_means, monthly_means

    with store.open_dataset(folder.chain(mooring.id)) as chain:
        attributes = global_attributes(
            config,
            chain.drop_dims("depth"),
            name=f"columns-{mooring.id}",
            title=f"isotherm depth and mixed layer at {mooring.id}",
            summary="One number per temperature profile: isotherm depth, mixed layer depth, mean temperature.",
            level="derived",
            created=_created(config, [mooring]),
            settings={"column": config.column},
            feature="timeSeries",
        )
        store.write_blocks(path, column_blocks(chain, config.column), attributes)
    with store.open_dataset(path) as columns:
        daily = daily_means(columns.load(), config.section.means)
    return daily, monthly_means(daily, config.section.means)


# --------------------------------------------------------------------------------------------------------------
# Section


def section_task(config: Config, moorings: Sequence[Mooring], folder: Folder) -> Task:
    """Monthly means of the array to map, tilt and volume."""
    parts = [folder.means(mooring.id, step) for mooring in moorings for step in ("daily", "monthly")]
    return Task(
        stage="section",
        name="array",
        work=build_array,
        arguments=(config, tuple(moorings), folder),
        inputs=tuple(parts),
        outputs=(folder.daily, folder.monthly, folder.section, folder.volume, folder.table(MONTHLY_TABLE)),
        settings={
            "section": config.section.model_dump(mode="json"),
            "column": config.column.model_dump(mode="json"),
            "array": config.array.model_dump(mode="json"),
            "created": _created(config, moorings, _ALL),
        },
    )


def build_array(config: Config, moorings: Sequence[Mooring], folder: Folder) -> Report:
    """Join the means, map them, read off tilt and volume."""
    from profiles.section import build_section, join_moorings

    created = _created(config, moorings, _ALL)
    used = {"column": config.column, "section": config.section}
    means = {}
    for step, path in (("daily", folder.daily), ("monthly", folder.monthly)):
        parts = {mooring.id: store.open_dataset(folder.means(mooring.id, step)).load() for mooring in moorings}
        means[step] = join_moorings(parts)
        if not means[step].sizes["time"]:
            path.unlink(missing_ok=True)  # series of months alone have no days
            continue
        attributes = global_attributes(
            config,
            means[step],
            name=f"columns-{step}",
            title=f"{step} mean isotherm depth and mixed layer of all moorings",
            summary=f"{step.capitalize()} means of the columns, given only where enough of the time is covered.",
            level="derived",
            created=created,
            settings=used,
            feature="timeSeries",
        )
        store.write_dataset(path, means[step], attributes)
    built = build_section(means["monthly"], config.section, isotherm=config.column.isotherm)
    for name, path, dataset, title, summary in (
        ("section", folder.section, built.section, *_SECTION_TEXT),
        ("volume", folder.volume, built.volume, *_VOLUME_TEXT),
    ):
        attributes = global_attributes(
            config, dataset, name=name, title=title, summary=summary, level="mapped", created=created, settings=used
        )
        store.write_dataset(path, dataset, attributes | dict(dataset.attrs) | {"leave_one_out": built.leave_one_out})
    store.write_table(folder.table(MONTHLY_TABLE), _monthly_table(built.section, built.volume))
    return {"latest": _latest(built.section, built.volume)}


_SECTION_TEXT = (
    "isotherm depth along the equator and its tilt",
    "Objective map of monthly isotherm-depth anomalies in 5S-5N, 120E-80W, the equatorial section and the "
    "thermocline's slope, with standard errors from the covariance of the map and of the climatology.",
)
_VOLUME_TEXT = (
    "warm water volume",
    "Volume of water above the isotherm in 5S-5N, 120E-80W, whole, west and east of 155W, with standard errors.",
)


def _monthly_table(section: xr.Dataset, volume: xr.Dataset) -> pd.DataFrame:
    """Return a row per month: slopes in m per 1000 km and volumes in m3, each with its standard error."""
    columns: dict[str, Any] = {"month": pd.DatetimeIndex(section["time"].values).strftime("%Y-%m")}
    for name in ("thermocline_slope", "thermocline_slope_anomaly"):
        columns |= {name: section[name].values, f"{name}_error": section[f"{name}_error"].values}
    for region in volume["region"].values:
        for name in ("warm_water_volume", "warm_water_volume_anomaly"):
            part = volume.sel(region=region)
            columns |= {f"{name}_{region}": part[name].values, f"{name}_error_{region}": part[f"{name}_error"].values}
    return pd.DataFrame(columns)


def _latest(section: xr.Dataset, volume: xr.Dataset) -> dict[str, Any]:
    """Return the last month's tilt and total volume."""
    last, total = section.isel(time=-1), volume.isel(time=-1).sel(region="total")
    names = ("thermocline_slope", "thermocline_slope_error", "warm_water_volume", "warm_water_volume_error")
    values = {name: float((last if name in last else total)[name]) for name in names}
    return {"month": pd.Timestamp(last["time"].item()).strftime("%Y-%m")} | values


# --------------------------------------------------------------------------------------------------------------
# Report


def report_tasks(
    config: Config, moorings: Sequence[Mooring], folder: Folder, chained: Sequence[Mooring]
) -> tuple[list[Task], list[Task]]:
    """Return the figures, which do not need one another, and the page, which needs them all.

    ``chained`` are the moorings with a chain; the others have columns alone.
    """
    from profiles.report.captions import CAPTIONS

    array_figures = [folder.figure(name) for name in CAPTIONS]
    mooring_figures = [folder.figure(f"mooring_{mooring.id}") for mooring in moorings]
    shown = {"column": config.column.model_dump(mode="json")}
    figures = [
        Task(
            stage="report",
            name="array",
            work=draw_array,
            arguments=(config, folder),
            inputs=(folder.monthly, folder.section, folder.volume, folder.table("data_return")),
            outputs=tuple(array_figures),
            settings=shown,
        ),
        *(
            Task(
                stage="report",
                name=mooring.id,
                work=draw_mooring,
                arguments=(config, mooring, folder, mooring in chained),
                inputs=(*([folder.chain(mooring.id)] if mooring in chained else []), folder.columns(mooring.id)),
                outputs=(figure,),
                settings=shown,
            )
            for mooring, figure in zip(moorings, mooring_figures, strict=True)
        ),
    ]
    tables = [folder.table(name) for names in TABLES.values() for name in names]
    page = [
        Task(
            stage="report",
            name="page",
            work=write_report,
            arguments=(config, tuple(moorings), folder),
            inputs=(folder.section, folder.volume, folder.precursor_section, *array_figures, *mooring_figures, *tables),
            outputs=(folder.page,),
            settings=config.model_dump(mode="json", exclude={"file"}) | {"created": _created(config, moorings, _ALL)},
        )
    ]
    return figures, page


def draw_mooring(config: Config, mooring: Mooring, folder: Folder, has_chain: bool) -> Report:
    """Draw one mooring's record."""
    from profiles.report import write_column_figure, write_mooring_figure

    figure = folder.figure(f"mooring_{mooring.id}")
    if not has_chain:
        with store.open_dataset(folder.columns(mooring.id)) as columns:
            write_column_figure(figure, columns.load(), config.column)
        return {}
    with (
        store.open_dataset(folder.chain(mooring.id)) as chain,
        store.open_dataset(folder.columns(mooring.id)) as columns,
    ):
        write_mooring_figure(figure, chain.load(), columns.load(), config.column)
    return {}


def draw_array(config: Config, folder: Folder) -> Report:
    """Draw the figures of the array."""
    from profiles.report import write_array_figures

    with (
        store.open_dataset(folder.monthly) as monthly,
        store.open_dataset(folder.section) as section,
        store.open_dataset(folder.volume) as volume,
    ):
        write_array_figures(
            folder.figure("").parent,
            monthly=monthly.load(),
            data_return=store.read_table(folder.table("data_return")),
            section=section.load(),
            volume=volume.load(),
            isotherm=config.column.isotherm,
        )
    return {}


def write_report(config: Config, moorings: Sequence[Mooring], folder: Folder) -> Report:
    """Write the page."""
    from profiles.pipeline.precursor_report import kept_section
    from profiles.report import Facts, write_page
    from profiles.report.captions import CAPTIONS

    with store.open_dataset(folder.section) as section, store.open_dataset(folder.volume) as volume:
        write_page(
            folder.page,
            facts=Facts(
                config=config,
                date=_created(config, moorings, _ALL),
                versions=versions(),
                input_count=len(delivered_files(config)),
                leave_one_out=float(section.attrs["leave_one_out"]),
            ),
            section=section.load(),
            volume=volume.load(),
            figures={name: folder.figure(name) for name in CAPTIONS},
            mooring_figures={mooring.id: folder.figure(f"mooring_{mooring.id}") for mooring in moorings},
            tables={name: store.read_table(folder.table(name)) for names in TABLES.values() for name in names},
            precursor=kept_section(folder),
        )
    return {}


# --------------------------------------------------------------------------------------------------------------
# Shared


def gather_task(stage: str, names: Sequence[str], folder: Folder) -> Task:
    """The parts of a stage's tables, by the names of their tasks, to the tables of the array."""
    parts = {table: [folder.part(table, name) for name in names] for table in TABLES[stage]}
    return Task(
        stage=stage,
        name="tables",
        work=gather,
        arguments=(parts, {table: folder.table(table) for table in parts}),
        inputs=tuple(path for paths in parts.values() for path in paths),
        outputs=tuple(folder.table(table) for table in parts),
    )


def gather(parts: Mapping[str, Sequence[Path]], tables: Mapping[str, Path]) -> Report:
    """Put the parts of tables below one another; without a part there is a head alone."""
    from profiles.qc import SUMMARY_COLUMNS

    for name, paths in parts.items():
        read = [store.read_table(path) for path in paths] or [pd.DataFrame(columns=SUMMARY_COLUMNS[name])]
        filled = [part for part in read if len(part)] or read[:1]
        store.write_table(tables[name], pd.concat(filled, ignore_index=True))
    return {}


def delivered_files(
    config: Config, moorings: Sequence[Mooring] | None = None, sources: Sequence[str] | None = None
) -> list[Path]:
    """Return the delivery files that exist, of some moorings and some sources, or of all."""
    sources = _ALL if sources is None else sources
    listed: list[Any] = []
    if CHAIN in sources:
        listed += [delivery for mooring in moorings or config.moorings for delivery in mooring.deliveries]
    if {DAYS, MONTHS} & {*sources}:
        listed += config.series
    return [path for path in (config.resolve(delivery.path) for delivery in listed) if path.is_file()]


_ALL = (CHAIN, DAYS, MONTHS)


def _created(config: Config, moorings: Sequence[Mooring], sources: Sequence[str] = (CHAIN,)) -> str:
    return store.date_of(delivered_files(config, moorings, sources))


def versions() -> dict[str, str]:
    """Return the versions of what computes, by name."""
    from importlib.metadata import version

    names = ("thermotilt", "numpy", "scipy", "xarray", "pandas", "numba", "netCDF4", "gsw", "matplotlib")
    return {name: version(name) for name in names}


def check_usable(reports: Mapping[str, Report], problems: Sequence[str]) -> None:
    """Raise DataError where nothing is left to go on with."""
    if any(report["usable"] for report in reports.values()):
        return
    raise DataError(
        "no delivery could be used",
        expected="at least one mooring with a delivery that can be read",
        found="\n  - ".join(["", *problems[:5]]) + (f"\n  - and {len(problems) - 5} more" if len(problems) > 5 else ""),
        advice="correct the paths, the layouts or the files; `thermotilt check` lists everything that is wrong",
    )
