"""The example studies: invented and said so, with sources and status, and answers worth looking at."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from pvfeas import Options, assess, load_study, problem_of, resolve
from pvfeas.laws import Law
from pvfeas.problem import Ensemble
from pvfeas.results import Assessment

FOLDER = Path(__file__).resolve().parent.parent / "data" / "studies"
PATHS = sorted(FOLDER.glob("*.toml"))
NAMES = [path.stem for path in PATHS]
DAY = 86400.0


@pytest.fixture(scope="module")
def answers() -> dict[str, Assessment]:
    return {path.stem: assess(problem_of(load_study(path)), Options(tolerance=5.0)) for path in PATHS}


def test_there_are_four() -> None:
    assert NAMES == ["beam-line-scan", "fast-or-slow-switching", "three-compounds", "trapped-ions-ramsey"]


@pytest.mark.parametrize("path", PATHS, ids=NAMES)
def test_said_to_be_invented(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert text.splitlines()[0].startswith("# Invented for this example")
    assert "invented" in tomllib.loads(text)["title"]


def sourced(content: Any) -> Iterator[dict[str, Any]]:
    if isinstance(content, dict):
        if "source" in content:
            yield content
        for inner in content.values():
            yield from sourced(inner)


@pytest.mark.parametrize("path", PATHS, ids=NAMES)
def test_sources_and_status_are_filled_in(path: Path) -> None:
    tables = list(sourced(tomllib.loads(path.read_text(encoding="utf-8"))))
    assert len(tables) >= 8
    for table in tables:
        assert table["source"].startswith("invented")
        assert table["status"] in ("measured", "demonstrated", "extrapolated", "assumed")
    assert any("demonstrated" in table for table in tables)
    assert {table["status"] for table in tables} >= {"measured", "extrapolated", "assumed"}


@pytest.mark.parametrize("path", PATHS, ids=NAMES)
def test_loads_without_doubts_and_reads_back(path: Path) -> None:
    study = load_study(path)
    problem = problem_of(study)
    assert problem.warnings == ()
    again = problem_of(load_study(resolve(study)))
    assert again.inputs == problem.inputs
    medians = {one.address: np.asarray(median(one.law)) for one in problem.inputs}
    for mine, read in zip(problem.scenarios, again.scenarios, strict=True):
        for part in ("line", "technique_a", "technique_b", "switching", "samples_a", "samples_b", "schedule"):
            assert repr(getattr(mine, part).at(medians)) == repr(getattr(read, part).at(medians)), part
        assert [repr(one.at(medians)) for one in mine.systematics] == [
            repr(one.at(medians)) for one in read.systematics
        ]
        assert repr(mine.splitting) == repr(read.splitting)


def median(law: Law | Ensemble) -> float:
    return median(law.laws[0]) if isinstance(law, Ensemble) else float(law.median)


def test_every_answer_lies_between_hopeless_and_certain(answers: dict[str, Assessment]) -> None:
    for name, answer in answers.items():
        for scenario in answer.scenarios:
            assert 0.1 < scenario.chance.value < 0.97, (name, scenario.name)
        chances = [scenario.chance.value for scenario in answer.scenarios]
        assert max(chances) - min(chances) > 0.2, "the choice matters"


def test_the_beam_of_today_ends_with_its_sample(answers: dict[str, Assessment]) -> None:
    today, colder = answers["beam-line-scan"].scenarios
    assert today.status == "unreachable"
    assert "supply" in today.reason
    assert colder.status == "reachable"
    assert colder.chance.value > 3 * today.chance.value


def test_the_trap_meets_its_floor(answers: dict[str, Assessment]) -> None:
    trap, cold = answers["trapped-ions-ramsey"].scenarios
    assert trap.limiting.name == cold.limiting.name == "systematics"
    assert cold.chance.value > trap.chance.value


def test_three_compounds_are_tied_by_method(answers: dict[str, Assessment]) -> None:
    problem = problem_of(load_study(FOLDER / "three-compounds.toml"))
    groups = [one.law.group for one in problem.inputs if isinstance(one.law, Ensemble)]
    assert groups == ["method"] * 3
    for scenario in answers["three-compounds"].scenarios:
        assert set(scenario.chance.per_calculation or ()) == {"HF", "B3LYP", "PBE0", "CCSD"}


def discrete_sigma(fwhm: float, points: int, span: float, snr: float, gaussian: bool, slope: bool) -> float:
    """Centre uncertainty of one scan by the explicit Fisher sum over its points (independent of the package)."""
    x = (np.arange(points) + 0.5) / points * span - span / 2

    def shape(position: Any, width: float) -> Any:
        u = 2 * position / width
        return np.exp(-np.log(2) * u**2) if gaussian else 1 / (1 + u**2)

    step = 1e-4 * fwhm
    centre = (shape(x - step, fwhm) - shape(x + step, fwhm)) / (2 * step)
    width = (shape(x, fwhm + step) - shape(x, fwhm - step)) / (2 * step) * fwhm
    columns = [centre * fwhm, shape(x, fwhm), width, np.ones_like(x)] + ([x / fwhm] if slope else [])
    design = np.stack(columns, axis=1) * snr
    return float(np.sqrt(np.linalg.inv(design.T @ design)[0, 0]) * fwhm)


def test_nominal_sigma_of_the_beam_by_hand(answers: dict[str, Assessment]) -> None:
    """sigma^2 = 4 s^2 t_scan/t_live + floors, every input at its median; the sample lasts beyond 180 d."""
    one = discrete_sigma(38e3, 60, 5 * 38e3, 42.0, gaussian=False, slope=True) * 1.3
    live = 180 * DAY * (10 / 24) * (5 / 7) * 0.8 * 0.85
    resets = 180 * 5 / 7  # days on which the beam runs
    floors = 0.30**2 / resets + (2e-6 * 38e3) ** 2 + 0.04**2
    expected = np.sqrt(4 * one**2 * 3.0 / live + floors)
    # nominal uptime is the median of a beta law of mean 0.85, 0.4 % above it; continuous bound within 1 %
    assert answers["beam-line-scan"].scenarios[0].sigma.total.nominal == pytest.approx(expected, rel=0.01)


def test_nominal_sigma_of_the_trap_by_hand(answers: dict[str, Assessment]) -> None:
    """sqrt(1/(4 N) + (r/N)^2)/(pi C T) per cycle of T + idle, four times its variance for two arms, and the floors."""
    cycle = 0.15 + 0.35
    ions = 45 * cycle
    contrast = 0.55 * np.exp(-0.15 / 0.4)
    one = np.sqrt(0.25 / ions + (1.0 / ions) ** 2) / (np.pi * contrast * 0.15)
    live = 90 * DAY * (16 / 24) * (6 / 7) * 0.75 * 0.8
    resets = 90 * 6 / 7
    floors = 2.5e-3**2 + 2 * 2e-3**2 + 9e-3**2 / resets
    expected = np.sqrt(4 * one**2 * cycle / live + floors)
    # statistics is a small part; medians of beta laws differ from their means by under 2 %
    assert answers["trapped-ions-ramsey"].scenarios[0].sigma.total.nominal == pytest.approx(expected, rel=0.003)


def test_no_published_system_is_named() -> None:
    for path in PATHS:
        text = path.read_text(encoding="utf-8")
        assert not re.search(r"CHFClBr|CHDBrI|AsHBrF|SeOClI|CDBrClF|HfF", text)
