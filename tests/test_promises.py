"""Odds with a known answer, the same bytes everywhere, exit codes, nothing half-written."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
from workload_w import STUDY

from pvfeas import Options, assess, compare, load_study, problem_of
from pvfeas.output.json import assessment_content, to_json

ODDS = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "30 d"
[scenario.one]
splitting = { value = "1.3 Hz ×/ 1.6", of = "difference" }
technique = { kind = "quoted", uncertainty = "1 Hz", after = "1 h" }
[scenario.two]
based_on = "one"
splitting = { value = "1 Hz ×/ 1.6", of = "difference" }
"""


def test_odds_of_independent_compounds() -> None:
    """Phi(ln 1.3/(sqrt 2 ln 1.6)) = 0.6535 for two quantities written twice, hence independent."""
    found = compare(problem_of(load_study(ODDS)), options=Options(maximum_points=4096)).odds[0]
    assert found.first_sooner == pytest.approx(0.65347, abs=max(2 * found.error, 1e-3))


def test_the_same_input_ties() -> None:
    """Through one shared input the larger compound always wins."""
    shared = ODDS.replace("[scenario.one]", '[shared]\ntheory = "1 ×/ 1.6"\n[scenario.one]')
    shared = shared.replace('"1.3 Hz ×/ 1.6"', '"1.3 Hz", times = ["@theory"]').replace(
        '"1 Hz ×/ 1.6"', '"1 Hz", times = ["@theory"]'
    )
    assert compare(problem_of(load_study(shared))).odds[0].first_sooner == 1.0


def _answer(study: str) -> str:
    return to_json(assessment_content(assess(problem_of(load_study(study)), Options(tolerance=4.0))))


def test_same_bytes_alone_in_another_order_and_in_another_process() -> None:
    studies = [STUDY, STUDY.replace("30 ×/ 1.2", "45 ×/ 1.2"), STUDY.replace("60(5) kHz", "90(5) kHz")]
    forward = [_answer(one) for one in studies]
    backward = [_answer(one) for one in reversed(studies)][::-1]
    assert forward == backward
    code = (
        "import sys; sys.path.insert(0, 'tests'); from test_promises import _answer; from workload_w import STUDY;"
        "sys.stdout.write(_answer(STUDY))"
    )
    root = Path(__file__).resolve().parent.parent
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=root, encoding="utf-8"
    )
    assert done.stdout == forward[0]


def _run(*arguments: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "pvfeas", *arguments], capture_output=True, text=True, encoding="utf-8"
    )


def test_exit_codes_and_messages(tmp_path: Path) -> None:
    study = tmp_path / "study.toml"
    study.write_text(ODDS, encoding="utf-8")
    assert _run("check", str(study)).returncode == 0
    low = _run("assess", str(study), "--fail-under", "0.999999", "--tolerance", "10")
    assert low.returncode in (0, 3)
    study.write_text(ODDS.replace("1 h", "1 kg"), encoding="utf-8")
    wrong = _run("assess", str(study), "-o", str(tmp_path / "answer.json"))
    assert wrong.returncode == 2
    assert "one.technique.after" in wrong.stderr
    assert "Traceback" not in wrong.stderr
    assert not (tmp_path / "answer.json").exists()
    assert _run("asses", str(study)).returncode == 2


@pytest.mark.parametrize("suffix", [".pdf", ".svg", ".png"])
def test_figures_are_the_same_bytes_each_time(tmp_path: Path, suffix: str) -> None:
    from pvfeas.output.provenance import metadata
    from pvfeas.plots.saving import figure_bytes
    from pvfeas.plots.sheet import sheet
    from pvfeas.questions.curves import curves

    found = curves(problem_of(load_study(ODDS)), options=Options(tolerance=10.0))
    told = metadata("x", {"name": "assess", "seed": 1}, "0")
    first, second = (figure_bytes(sheet(found), f"a{suffix}", told) for _ in range(2))
    assert first == second
    if suffix == ".pdf":
        assert b"/Type3" not in first
