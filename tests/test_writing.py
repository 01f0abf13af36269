"""Files are replaced whole or not at all; devices, pipes and links stay what they are."""

from __future__ import annotations

import os
import threading
from pathlib import Path

import pytest

from pvfeas.cli import run
from pvfeas.errors import UsageError
from pvfeas.output.writing import apart, write_bytes

STUDY = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "20 d"
[scenario.cell]
splitting = { value = "30 mHz ×/ 2", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.05 Hz ×/ 1.3", after = "1 h" }
"""
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


@pytest.mark.parametrize("name", ["a" * 250 + ".json", "ä" * 120 + ".json", ".hidden", " blank "])
def test_any_name_that_the_system_takes(tmp_path: Path, name: str) -> None:
    """255 bytes is what most file systems take; the temporary name beside it must not be longer."""
    for data in (OLD, NEW):
        write_bytes(str(tmp_path / name), data)
    assert [one.name for one in tmp_path.iterdir()] == [name]
    assert (tmp_path / name).read_bytes() == NEW


def test_a_link_to_nothing_and_a_link_elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The temporary file stands beside the target, not beside the link: a rename works within one file system only."""
    (tmp_path / "there").mkdir()
    link = tmp_path / "link.json"
    link.symlink_to(Path("there") / "real.json")
    monkeypatch.chdir(tmp_path)
    for data in (OLD, NEW):  # created, then replaced
        write_bytes("link.json", data)
        assert link.is_symlink()
        assert (tmp_path / "there" / "real.json").read_bytes() == data
    assert sorted(one.name for one in tmp_path.rglob("*")) == ["link.json", "real.json", "there"]


def test_a_circle_of_links_is_one_message(tmp_path: Path) -> None:
    link = tmp_path / "link"
    link.symlink_to(link)
    with pytest.raises(UsageError, match="cannot be written"):
        write_bytes(str(link), NEW)
    assert link.is_symlink()


def test_a_directory_is_no_file(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="names a directory"):
        write_bytes(f"{tmp_path}/new.json/", NEW)
    assert list(tmp_path.iterdir()) == []


def test_a_folder_that_refuses(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """As a read-only folder does, for the superuser too: no temporary file can be made."""
    import tempfile

    (tmp_path / "out.json").write_bytes(OLD)

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(tempfile, "mkstemp", refuse)
    with pytest.raises(UsageError, match="permission denied"):
        write_bytes(str(tmp_path / "out.json"), NEW)
    assert (tmp_path / "out.json").read_bytes() == OLD


def test_data_is_on_the_disk_before_the_name_changes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    target, order = tmp_path / "out.json", []
    target.write_bytes(OLD)
    fsync, replace = os.fsync, Path.replace

    def watched_fsync(handle: int) -> None:
        assert os.fstat(handle).st_size == len(NEW)
        order.append("fsync")
        fsync(handle)

    def watched_replace(self: Path, other: Path) -> Path:
        assert target.read_bytes() == OLD
        assert self.parent == tmp_path
        order.append("replace")
        return replace(self, other)

    monkeypatch.setattr(os, "fsync", watched_fsync)
    monkeypatch.setattr(Path, "replace", watched_replace)
    write_bytes(str(target), NEW)
    assert order == ["fsync", "replace"]
    assert target.read_bytes() == NEW


@pytest.mark.parametrize(
    ("targets", "words"),
    [
        ([("--output", "a.json"), ("--figure", "b.pdf"), ("--figure-data", "-")], None),
        ([("--output", "/dev/null"), ("--figure-data", "/dev/null")], None),
        (
            [("--output", "-"), ("--figure-data", "-")],
            "--figure-data: standard output is the target of --output already",
        ),
        (
            [("--output", "a.csv"), ("--figure-data", "./a.csv")],
            "--figure-data: ./a.csv is the target of --output already",
        ),
        ([("--output", "link.toml")], "--output: link.toml is the study already"),
        ([("--figure", "")], "--figure: no file is named"),
    ],
)
def test_targets_keep_apart(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, targets: list[tuple[str, str]], words: str | None
) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "study.toml").write_text(STUDY, encoding="utf-8")
    (tmp_path / "link.toml").symlink_to("study.toml")
    if words is None:
        apart(targets, "study.toml")
    else:
        with pytest.raises(UsageError) as found:
            apart(targets, "study.toml")
        assert str(found.value) == words


@pytest.mark.parametrize(
    ("more", "written"),
    [
        (["--figure", "a.svg", "--figure-data", "missing/b.csv"], ["a.svg"]),
        (["--figure", "missing/a.svg", "--figure-data", "b.csv"], []),
        (["--figure", "a.gif", "--figure-data", "b.csv"], []),
        (["--figure", "a.svg", "--figure-data", "a.svg"], []),
        (["--figure", "a.svg", "--figure-data", "study.toml"], []),
        (["--figure", "a.svg", "-o", "missing/c.json"], ["a.svg"]),
    ],
)
def test_one_file_after_the_other(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    more: list[str],
    written: list[str],
) -> None:
    """What was written before the one that fails is whole; nothing after it, no temporary file, the study untouched."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "study.toml").write_text(STUDY, encoding="utf-8")
    assert run(["assess", "study.toml", "--tolerance", "30", *more]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert len(said.err.splitlines()) == 1
    assert sorted(one.name for one in tmp_path.iterdir()) == sorted([*written, "study.toml"])
    assert (tmp_path / "study.toml").read_text(encoding="utf-8") == STUDY
    for name in written:
        assert (tmp_path / name).read_text(encoding="utf-8").rstrip().endswith("</svg>")
