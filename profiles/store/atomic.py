"""Files that appear whole or not at all: temporary name, close, reopen and verify, flush to disk, rename."""

from __future__ import annotations

import errno
import hashlib
import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from profiles.errors import MachineError

_FULL = 1_000_000  # bytes; HDF5 writes a chunk at once, so less than two chunks of a chain may be left
_LEFTOVER = ".part-"  # a name that starts so is an unfinished file of a run that was cut off


@contextmanager
def replacing(path: Path, *, verify: Callable[[Path], object] | None = None) -> Iterator[Path]:
    """Yield a temporary path beside ``path`` that takes its place when the block ends well.

    Parameters
    ----------
    path : Path
        The file to create or replace. Its folder must exist.
    verify : callable, optional
        Called with the finished temporary file before it is renamed; what it raises stops the replacement.

    Raises
    ------
    MachineError
        Where the file cannot be written, flushed or renamed. The temporary file is gone then.
    """
    temporary = path.with_name(f"{_LEFTOVER}{os.getpid()}-{path.name}")
    try:
        with translated(path):
            yield temporary
            if verify is not None:
                verify(temporary)
            _flush(temporary)
            temporary.replace(path)
            _flush(path.parent)
    finally:
        if temporary.exists():
            temporary.unlink()


@contextmanager
def translated(path: Path) -> Iterator[None]:
    """Turn what the operating system or the HDF5 library raise while writing ``path`` into a MachineError."""
    try:
        yield
    except OSError as error:
        raise MachineError(
            "cannot be written",
            where=str(path),
            found=_REASONS.get(error.errno or 0, error.strerror or str(error)),
            advice="free some space or choose another folder, then run again: what was finished is kept",
        ) from error
    except RuntimeError as error:
        # netCDF4 reports a failed write (a full disk, say) as a bare RuntimeError that names its library.
        if "NetCDF" not in str(error):
            raise
        raise MachineError(
            "cannot be written",
            where=str(path),
            found=_REASONS[errno.ENOSPC] if _is_full(path) else str(error),
            advice="free some space or choose another folder, then run again: what was finished is kept",
        ) from error


_REASONS = {
    errno.ENOSPC: "the disk is full",
    errno.EACCES: "no permission to write there",
    errno.EPERM: "no permission to write there",
    errno.EROFS: "a read-only file system",
    errno.EDQUOT: "the disk quota is used up",
}


def _is_full(path: Path) -> bool:
    """Tell whether the disk is full, while the unfinished file still stands on it."""
    try:
        status = os.statvfs(path.parent)
    except OSError:
        return False
    return status.f_bavail * status.f_frsize < _FULL


def _flush(path: Path) -> None:
    descriptor = os.open(path, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def make_folder(path: Path) -> Path:
    """Create ``path`` and its parents; raise MachineError where that is not possible."""
    try:
        path.mkdir(parents=True, exist_ok=True)
    except FileExistsError as error:
        raise MachineError(
            "cannot be used as a folder",
            where=str(path),
            expected="a folder, or nothing there yet",
            found="a file",
            advice="name another output folder",
        ) from error
    except OSError as error:
        raise MachineError(
            "the folder cannot be made",
            where=str(path),
            found=_REASONS.get(error.errno or 0, error.strerror or str(error)),
            advice="name another output folder, or ask for the permission",
        ) from error
    return path


def clear_leftovers(folder: Path) -> None:
    """Remove the unfinished files of a run that was cut off, below ``folder``."""
    for leftover in list(folder.rglob(f"{_LEFTOVER}*")):
        leftover.unlink(missing_ok=True)


def checksum(path: Path) -> str:
    """Return the SHA-256 of a file's bytes, as hexadecimal digits."""
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()
