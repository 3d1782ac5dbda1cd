"""Check what the demo run wrote against its truth; print a line per check, and leave with 1 where one fails."""

import json
import sys
from pathlib import Path

import numpy as np
import xarray as xr

out, truth = Path(sys.argv[1]), Path("data_demo/truth")
account = json.loads((out / "run.json").read_text())
volume, section, true = (xr.open_dataset(path) for path in (out / "volume.nc", out / "section.nc", truth / "array.nc"))
page = (out / "report.html").read_text(encoding="utf-8")
rows = account["rows"]
region = volume.sel(region="total")
half_width = 1.96 * region["warm_water_volume_error"] / region["warm_water_volume"]


def share_inside(estimate: xr.DataArray, error: xr.DataArray, known: xr.DataArray) -> float:
    """Return the share of months whose 95 % interval holds the truth."""
    return float(np.mean(np.abs(estimate.values - known.values) <= 1.96 * error.values))


checks = {
    "all 40 moorings are used": len(account["moorings"]) == 40 and not account["problems"],
    "rows read = kept + quarantined": rows["rows_read"] == rows["rows_kept"] + rows["rows_quarantined"] > 350_000,
    "chains and columns of every mooring": len(list(out.glob("c*/TB-*.nc"))) == 80,
    "the volume's half-width stays under 5 %": bool((half_width < 0.05).all()),
    "the volume's interval holds the truth in 4 of 5 months or more": share_inside(
        region["warm_water_volume"], region["warm_water_volume_error"], true["warm_water_volume"].sel(region="total")
    )
    >= 0.8,
    "the slope's interval holds the truth in 4 of 5 months or more": share_inside(
        section["thermocline_slope"], section["thermocline_slope_error"], true["thermocline_slope"]
    )
    >= 0.8,
    "the thermocline shoals eastward": bool((section["thermocline_slope"] < 0).all()),
    "the report needs nothing else": "http://" not in page and "https://" not in page and page.count("<img") > 40,
}
for claim, holds in checks.items():
    print(f"{'ok ' if holds else 'NOT'} {claim}")
sys.exit(0 if all(checks.values()) else 1)
