"""Several models against one array in one dataset."""

from __future__ import annotations

import json
from collections.abc import Sequence

import numpy as np
import xarray as xr

from profiles.errors import RequestError
from profiles.validation.wording import worded
from profiles.vocabulary import CAUTION

#: What does not depend on the model.
_OF_ARRAY = ("latitude_of_mooring", "longitude_of_mooring", "quantity", "place", "kind", "units")


def side_by_side(comparisons: Sequence[xr.Dataset]) -> xr.Dataset:
    """Join what :func:`profiles.compare_model` returned for several models along ``model``.

    Months that a model does not cover are missing. The array's own series have the dimension too: they hold the months
    and sensors that both sides have, which differ from model to model. ``understood`` (model) says how each was read.

    Raises
    ------
    RequestError
        Where there is no comparison, or two have one name.
    """
    names = [str(one["model"].item()) for one in comparisons]
    if not names or len(set(names)) < len(names):
        raise RequestError(
            "the models cannot stand side by side",
            where="models",
            expected="one or more, each with a name of its own",
            found=", ".join(names) or "none",
        )
    months = np.unique(np.concatenate([one["time"].values for one in comparisons]))
    parts = [one.drop_vars([*_OF_ARRAY, "model"]).reindex(time=months) for one in comparisons]
    joined = xr.concat(parts, dim="model", join="exact", combine_attrs="drop_conflicts").assign_coords(model=names)
    first = comparisons[0].drop_vars("model")
    joined = joined.assign({name: first[name] for name in _OF_ARRAY[:2]})
    joined = joined.assign_coords({name: first[name] for name in _OF_ARRAY[2:]})
    joined["understood"] = ("model", np.array([json.dumps(understood(one)) for one in comparisons], dtype=object))
    joined.attrs = {
        "title": f"{', '.join(names)}: models against the array, like for like",
        "comment": CAUTION,
        "isotherm": first.attrs["isotherm"],
    }
    return worded(joined)


def understood(comparison: xr.Dataset) -> dict[str, str]:
    """Return how a model was understood, by subject."""
    subjects = ("temperature", "salinity", "grid", "levels", "times")
    notes = {subject: str(comparison.attrs[f"model_{subject}"]) for subject in subjects}
    return notes | {"averaging": str(comparison.attrs["averaging"])}
