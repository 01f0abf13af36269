"""Files are replaced whole or not at all; devices, pipes and links stay what they are."""

from __future__ import annotations

import os
import threading
from pathlib import Path

import pytest

from pvfeas.errors import UsageError
from pvfeas.output.writing import write_bytes

OLD, NEW = b"old and whole", b"new and whole"
ROOT = os.geteuid() == 0


def test_a_new_file(tmp_path: Path) -> None:
    target = tmp_path / "out.json"
    write_bytes(str(target), NEW)
    assert target.read_bytes() == NEW
    assert [one.name for one in tmp_path.iterdir()] == ["out.json"]


@pytest.mark.parametrize("failing", ["fsync", "replace", "write"])
def test_a_failure_leaves_the_old_file_and_nothing_else(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, failing: str
) -> None:
    target = tmp_path / "out.json"
    target.write_bytes(OLD)

    def refuse(*_: object, **__: object) -> None:
        raise OSError(28, "No space left on device")

    if failing == "fsync":
        monkeypatch.setattr(os, "fsync", refuse)
    elif failing == "replace":
        monkeypatch.setattr(Path, "replace", refuse)
    else:
        monkeypatch.setattr(os, "fdopen", refuse)
    with pytest.raises(UsageError, match="no space left"):
        write_bytes(str(target), NEW)
    assert target.read_bytes() == OLD
    assert [one.name for one in tmp_path.iterdir()] == ["out.json"]


def test_an_interruption_leaves_nothing_behind(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupt(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", interrupt)
    with pytest.raises(KeyboardInterrupt):
        write_bytes(str(tmp_path / "out.json"), NEW)
    assert list(tmp_path.iterdir()) == []


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    target, link = tmp_path / "real.json", tmp_path / "link.json"
    target.write_bytes(OLD)
    link.symlink_to(target)
    write_bytes(str(link), NEW)
    assert link.is_symlink()
    assert target.read_bytes() == NEW


def test_mode_is_kept(tmp_path: Path) -> None:
    target = tmp_path / "out.json"
    target.write_bytes(OLD)
    target.chmod(0o640)
    write_bytes(str(target), NEW)
    assert target.stat().st_mode & 0o777 == 0o640


def test_a_new_file_has_the_mode_of_the_mask(tmp_path: Path) -> None:
    before = os.umask(0o027)
    try:
        write_bytes(str(tmp_path / "out.json"), NEW)
    finally:
        os.umask(before)
    assert (tmp_path / "out.json").stat().st_mode & 0o777 == 0o640


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes on this system")
def test_a_pipe_is_written_through(tmp_path: Path) -> None:
    pipe, read = tmp_path / "pipe", []
    os.mkfifo(pipe)
    reader = threading.Thread(target=lambda: read.append(pipe.read_bytes()))
    reader.start()
    write_bytes(str(pipe), NEW)
    reader.join(10)
    assert read == [NEW]
    assert not pipe.is_file()


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no full device on this system")
def test_a_full_device_is_one_message() -> None:
    with pytest.raises(UsageError, match="/dev/full cannot be written: no space left"):
        write_bytes("/dev/full", NEW)


def test_targets_that_cannot_be(tmp_path: Path) -> None:
    for target in (tmp_path, tmp_path / "missing" / "out.json"):
        with pytest.raises(UsageError, match="cannot be written"):
            write_bytes(str(target), NEW)


@pytest.mark.skipif(ROOT, reason="the superuser may write anywhere")
def test_a_folder_that_may_not_be_written(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    try:
        with pytest.raises(UsageError, match="permission denied"):
            write_bytes(str(tmp_path / "out.json"), NEW)
    finally:
        tmp_path.chmod(0o700)
