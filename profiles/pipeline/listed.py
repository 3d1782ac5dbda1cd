"""The deliveries that the configuration lists of a mooring, read and joined as it says; or why that is not possible."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from profiles.config import Config, Mooring, SeriesFile
from profiles.config import Delivery as Listed
from profiles.errors import DataError, MachineError, RequestError, ThermotiltError

if TYPE_CHECKING:
    from profiles.ingest import Delivery
    from profiles.ingest.recovery_log import Service


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
            clock=listed.clock,
            deployment=listed.deployment or mooring.deliveries.index(listed) + 1,
        )
    except (RequestError, DataError, MachineError) as error:
        return message_of(error, config, [listed])


def join_listed(config: Config, mooring: Mooring, deliveries: Sequence[Delivery]) -> Delivery | str:
    """Return a mooring's usable deliveries, given by precedence, as one, or why they do not go together."""
    from profiles.ingest import join

    try:
        joined = join(deliveries)
    except (RequestError, DataError) as error:
        return message_of(error, config, mooring.deliveries)
    log = read_log(config)
    return joined if log is None else joined.with_service(log.get(mooring.id))


def read_log(config: Config) -> Mapping[str, Service] | None:
    """Return the recovery log that a configuration names, if it does; see :func:`profiles.ingest.read_recovery_log`."""
    from profiles.ingest import read_recovery_log

    return None if config.recovery_log is None else read_recovery_log(config.resolve(config.recovery_log))


def message_of(error: ThermotiltError, config: Config, listed: Sequence[Listed | SeriesFile]) -> str:
    """Return the error's text with paths as the configuration gives them: the same bytes wherever it lies."""
    text = str(error)
    for path in (path for delivery in listed for path in (delivery.path, delivery.layout)):
        text = text.replace(str(config.resolve(path)), path.as_posix())
    return text
