"""A delivery that the configuration lists, read as it says; or why that is not possible."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiles.config import Config, Mooring
from profiles.config import Delivery as Listed
from profiles.errors import DataError, MachineError, RequestError, ThermotiltError

if TYPE_CHECKING:
    from profiles.ingest import Delivery


def read_listed(config: Config, mooring: Mooring, listed: Listed) -> Delivery | str:
    """Return one of a mooring's deliveries, or the message that says why it cannot be used.

    A fault of ours is raised.
    """
    from profiles.ingest import read

    try:
        return read(
            config.resolve(listed.path),
            config.resolve(listed.layout),
            mooring=mooring.id,
            latitude=mooring.latitude,
            longitude=mooring.longitude,
            sensor_accuracy=mooring.sensor_accuracy or config.column.sensor_accuracy,
        )
    except (RequestError, DataError, MachineError) as error:
        return _message(error, config, listed)


def _message(error: ThermotiltError, config: Config, listed: Listed) -> str:
    """Return the error's text with paths as the configuration gives them: the same bytes wherever it lies."""
    text = str(error)
    for path in (listed.path, listed.layout):
        text = text.replace(str(config.resolve(path)), path.as_posix())
    return text
