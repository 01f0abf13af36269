"""Dispersion and first-derivative detection of a scan: tables, direct Fisher matrices, simulated fits."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special

from pvfeas.centre_bounds import kappa
from pvfeas.compiler import problem_of
from pvfeas.errors import StudyError
from pvfeas.options import Options
from pvfeas.profiles import RECORDED, profile_of
from pvfeas.questions.assess import assess
from pvfeas.studyfile import load_study

LN2 = np.log(2.0)
ONE = np.ones(())
EVERY = ("amplitude", "width", "baseline", "slope", "asymmetry")
BOTH = pytest.mark.parametrize(("name", "detection"), RECORDED)


def complex_line(name: str, x: np.ndarray) -> np.ndarray:
    """g + i times its Hilbert partner: 1/(1 - 2 i x), or the Faddeeva function of a real argument."""
    return 1.0 / (1.0 - 2j * x) if name == "lorentzian" else special.wofz(2.0 * np.sqrt(LN2) * x)


def recorded(name: str, detection: str, x: np.ndarray) -> np.ndarray:
    """What is recorded, by differences of the complex line, scaled to half of peak-to-peak found on a fine grid."""

    def raw(at: np.ndarray) -> np.ndarray:
        if detection == "dispersion":
            return complex_line(name, at).imag
        return (complex_line(name, at + 1e-4).real - complex_line(name, at - 1e-4).real) / 2e-4

    return np.asarray(raw(x) / np.max(np.abs(raw(np.linspace(-2.0, 2.0, 400_001)))))


@BOTH
def test_signals(name: str, detection: str) -> None:
    """1e-7: the differences. The slope by differences of the signal."""
    x = np.linspace(-3.0, 3.0, 41)
    found = profile_of(name, None, detection)
    sign = np.sign(found.value(np.array(0.3)) * recorded(name, detection, np.array([0.3]))[0])
    assert found.value(x) == pytest.approx(sign * recorded(name, detection, x), abs=1e-7)
    assert found.slope(x) == pytest.approx((found.value(x + 1e-5) - found.value(x - 1e-5)) / 2e-5, abs=1e-8)


@pytest.mark.parametrize(
    ("name", "detection", "expected"),
    [
        ("lorentzian", "dispersion", 0.398942280), ("gaussian", "dispersion", 0.422606811),
        ("lorentzian", "first-derivative", 0.299206710), ("gaussian", "first-derivative", 0.342811827),
    ],
)  # fmt: skip
def test_infinite_span(name: str, detection: str, expected: float) -> None:
    """1/sqrt(2 pi), 3 sqrt 2/(8 sqrt pi) and two integrals (derived twice; 9 printed digits); 1e-4: span and nodes."""
    args = (200.0 * ONE, 0.0 * ONE, 1e6 * ONE)
    assert float(kappa(name, (), *args, detection=detection)) == pytest.approx(expected, rel=1e-4)


def direct(name: str, detection: str, free: tuple[str, ...], span: float, offset: float, points: int) -> float:
    """kappa from numerical derivatives of the model and a matrix inverse."""
    x = offset + span * ((np.arange(points) + 0.5) / points - 0.5)
    scale = 1.0

    def quadrature(at: np.ndarray) -> np.ndarray:
        if detection == "dispersion":
            return complex_line(name, at).real
        return (complex_line(name, at + 1e-4).imag - complex_line(name, at - 1e-4).imag) / 2e-4

    def model(p: np.ndarray) -> np.ndarray:
        at = (x - p[1]) / p[2]
        return p[0] * recorded(name, detection, at) * scale + p[3] + p[4] * x + p[5] * quadrature(at)

    start, picked = (
        np.array([1.0, 0, 1, 0, 0, 0]),
        {"amplitude": 0, "width": 2, "baseline": 3, "slope": 4, "asymmetry": 5},
    )
    columns = []
    for i in [1, *(picked[one] for one in free)]:
        step = np.zeros(6)
        step[i] = 1e-4
        columns.append((model(start + step) - model(start - step)) / 2e-4)
    matrix = np.array(columns) @ np.array(columns).T * span / points
    return float(np.sqrt(np.linalg.inv(matrix)[0, 0]))


@BOTH
@pytest.mark.parametrize("free", [(), ("amplitude", "width", "baseline"), ("amplitude", "baseline", "slope"), EVERY])
@pytest.mark.parametrize(
    ("span", "offset", "points"), [(5.0, 0.0, 40), (5.0, 0.0, 41), (6.0, 0.4, 50), (8.0, 0.3, 400)]
)
def test_nuisance_sets(
    name: str, detection: str, free: tuple[str, ...], span: float, offset: float, points: int
) -> None:
    """3e-4: numerical derivatives, and the integral in place of 400 points."""
    args = (np.asarray(span), np.asarray(offset), np.asarray(float(points)))
    found = float(kappa(name, free, *args, detection=detection))
    assert found == pytest.approx(direct(name, detection, free, span, offset, points), rel=3e-4)


@BOTH
def test_simulated_scans(name: str, detection: str) -> None:
    """40 000 scans, centre, amplitude, width and baseline by least squares to first order in the noise (SNR 200):

    standard error of sigma 0.35 %; bound three of them; 5 % more would not pass."""
    random, count, points, span = np.random.default_rng(4), 40_000, 60, 5.0
    x = span * ((np.arange(points) + 0.5) / points - 0.5)

    def model(p: np.ndarray) -> np.ndarray:
        return p[0] * recorded(name, detection, (x - p[1]) / p[2]) + p[3]

    start = np.array([1.0, 0.0, 1.0, 0.0])
    jacobian = np.array([(model(start + h) - model(start - h)) / 2e-4 for h in np.eye(4) * 1e-4])
    estimator = np.linalg.inv(jacobian @ jacobian.T) @ jacobian
    centres = (random.standard_normal((count, points)) / 200.0) @ estimator[1]
    args = (span * ONE, 0.0 * ONE, float(points) * ONE)
    predicted = (
        float(kappa(name, ("amplitude", "width", "baseline"), *args, detection=detection))
        * np.sqrt(span / points)
        / 200.0
    )
    ratio = float(np.std(centres)) / predicted
    bound = 3.0 / np.sqrt(2.0 * count)
    assert abs(ratio - 1.0) < bound
    assert abs(ratio / 1.05 - 1.0) > bound


STUDY = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"
[scenario.v]
splitting = {{ value = "1 Hz", of = "difference" }}
line = {{ {line} }}
[scenario.v.technique]
kind = "scan"
snr = 80
points = 60
span = "5 FWHM"
time = "2 s"
detection = "{detection}"
"""


def test_in_a_study() -> None:
    """Required time goes with kappa squared."""
    found = {}
    for detection in ("direct", "dispersion", "first-derivative"):
        text = STUDY.format(line='fwhm = "12 kHz"', detection=detection)
        found[detection] = (
            assess(problem_of(load_study(text)), Options(tolerance=10.0)).scenarios[0].required_time.nominal
        )
    args = (5.0 * ONE, 0.0 * ONE, 60.0 * ONE)
    sizes = {one: float(kappa("lorentzian", ("amplitude", "width", "baseline"), *args, detection=one)) for one in found}
    for one, time in found.items():
        assert time is not None
        assert found["direct"] is not None
        assert time / found["direct"] == pytest.approx((sizes[one] / sizes["direct"]) ** 2, rel=1e-9)


def test_a_voigt_line_is_seen_directly_only() -> None:
    with pytest.raises(StudyError, match="Voigt"):
        load_study(STUDY.format(line='lorentzian = "5 kHz", gaussian = "5 kHz"', detection="dispersion"))
