"""Writing: a regular file is replaced whole or not at all; devices and pipes are written through."""

from __future__ import annotations

import contextlib
import os
import stat
import sys
import tempfile
from pathlib import Path

from pvfeas.errors import UsageError


def write_bytes(target: str, data: bytes) -> None:
    """Write to a file or, with "-", to standard output. UsageError where that is not possible."""
    if target == "-":
        _to_standard_output(data)
        return
    path = Path(target)
    try:
        if path.exists() and not stat.S_ISREG(path.stat().st_mode):
            with path.open("wb") as stream:
                stream.write(data)
            return
        _replace(Path(os.path.realpath(path)), data)
    except OSError as error:
        raise UsageError(f"{target} cannot be written: {(error.strerror or 'unknown reason').lower()}") from None


def _to_standard_output(data: bytes) -> None:
    """Write and flush; a reader that has gone is no error."""
    try:
        sys.stdout.buffer.write(data)
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _replace(path: Path, data: bytes) -> None:
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        Path(name).chmod(_mode(path))
        Path(name).replace(path)
    except BaseException:
        with contextlib.suppress(OSError):
            Path(name).unlink()
        raise


def _mode(path: Path) -> int:
    """The mode of the file that is replaced, or what the process's mask leaves."""
    if path.exists():
        return stat.S_IMODE(path.stat().st_mode)
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask
