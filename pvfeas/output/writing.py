"""Writing: a regular file is replaced whole or not at all; devices and pipes are written through."""

from __future__ import annotations

import contextlib
import os
import stat
import sys
import tempfile
from collections.abc import Sequence
from pathlib import Path
from typing import TextIO

from pvfeas.errors import UsageError


def write_bytes(target: str, data: bytes) -> None:
    """Write to a file or, with "-", to standard output. UsageError where that is not possible."""
    if target == "-":
        _to_standard_output(data)
        return
    if target.endswith(("/", os.sep)):
        raise UsageError(f"{target} cannot be written: it names a directory")
    path = Path(target)
    try:
        if path.exists() and not stat.S_ISREG(path.stat().st_mode):
            with path.open("wb") as stream:
                stream.write(data)
            return
        real = Path(os.path.realpath(path))
        if real.is_symlink():
            raise UsageError(f"{target} cannot be written: a circle of links")
        _replace(real, data)
    except OSError as error:
        raise UsageError(f"{target} cannot be written: {_why(error)}") from None


def apart(targets: Sequence[tuple[str, str]], source: str = "-") -> None:
    """Refuse targets, as (option, target), that would overwrite each other or the file that is read.

    UsageError says which. Devices and pipes may be written several times; standard output may not.
    """
    taken = {} if source == "-" else {_place(source): "the study"}
    for option, target in targets:
        if not target:
            raise UsageError(f"{option}: no file is named")
        if target != "-" and Path(target).exists() and not Path(target).is_file():
            continue
        before = taken.setdefault(_place(target), option)
        if before != option:
            named = "standard output" if target == "-" else target
            role = before if before == "the study" else f"the target of {before}"
            raise UsageError(f"{option}: {named} is {role} already")


def _place(target: str) -> str:
    return target if target == "-" else os.path.realpath(target)


def silenced(stream: TextIO) -> None:
    """Send what a broken standard stream still holds nowhere, so that leaving the program is no error."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)


def _to_standard_output(data: bytes) -> None:
    """Write and flush; a reader that has gone is no error."""
    if sys.stdout is None:  # closed by who started the program
        raise UsageError("standard output cannot be written: it is closed")
    left = memoryview(data)
    try:
        while left:  # an unbuffered stream may take a part only
            left = left[sys.stdout.buffer.write(left) or len(left) :]
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        silenced(sys.stdout)
    except OSError as error:
        silenced(sys.stdout)
        raise UsageError(f"standard output cannot be written: {_why(error)}") from None


def _why(error: OSError) -> str:
    return (error.strerror or "unknown reason").lower()


def _replace(path: Path, data: bytes) -> None:
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=".pvfeas-")
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
