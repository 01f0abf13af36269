"""README shows what the program does: its study is read and its output is printed."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from pvfeas import assess, load_study, problem_of
from pvfeas.output.table import assessment_text

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


BLOCKS = re.findall(r"^```(\w*)\n(.*?)^```$", README, re.S | re.M)


def block(language: str) -> str:
    """The first block of that language."""
    return next(text for name, text in BLOCKS if name == language)


def test_the_study_prints_what_readme_shows() -> None:
    """Exact text; numbers are shown with three digits, so that other library versions agree."""
    study = block("toml")
    assert len(study.splitlines()) <= 15
    assert assessment_text(assess(problem_of(load_study(study)))) == block("")


def test_the_python_lines_run(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "study.toml").write_text(block("toml"), encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    exec(block("python"), {})  # the lines of README as a reader runs them
    assert 0.0 < float(capsys.readouterr().out) < 1.0


def test_every_file_that_is_named_is_there() -> None:
    for name in re.findall(r"\]\((data/[^)]+)\)|`(data/[^`]+)`", README):
        assert (ROOT / "".join(name)).exists()
