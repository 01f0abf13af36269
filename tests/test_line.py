"""Widths: what makes them, how they add, what a Voigt line costs. Values from tests/data/checks.json and mpmath."""

from __future__ import annotations

import json
from pathlib import Path

import mpmath
import numpy as np
import pytest
from scipy import constants, special

from pvfeas.centre_bounds import kappa
from pvfeas.compiler import problem_of
from pvfeas.nominal import nominal_draws
from pvfeas.options import Options
from pvfeas.profiles import PROFILES, Voigt
from pvfeas.questions.assess import assess
from pvfeas.realisation import realise
from pvfeas.studyfile import load_study
from pvfeas.tables import Line
from pvfeas.understanding import understood
from pvfeas.widths import doppler_width, natural_width, power_broadened, transit_width, voigt_start, voigt_width

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("voigt.fwhm")])
def test_voigt_widths(name: str) -> None:
    """Exact and by the approximation of Olivero & Longbothum."""
    inputs, (exact, rough) = CHECKS[name]["inputs"], CHECKS[name]["expected"]
    low, high = np.asarray(float(inputs["fL"])), np.asarray(float(inputs["fG"]))
    assert float(voigt_width(low, high)) == pytest.approx(exact, rel=CHECKS[name]["tolerance"]["rel"])
    assert float(voigt_start(low, high)) == pytest.approx(rough, rel=CHECKS[name]["tolerance"]["rel"])


@pytest.mark.parametrize("ratio", [1e-9, 1e-7, 1e-5, 1e-3, 0.05, 1.0, 40.0, 900.0, 1100.0, 1e5, 1e9])
def test_voigt_widths_from_one_end_to_the_other(ratio: float) -> None:
    """Half height of the convolution by mpmath's quadrature; 2e-9: the limits beyond 1e3 and 1e7."""

    def height(nu: mpmath.mpf) -> mpmath.mpf:
        def convolved(t: mpmath.mpf) -> mpmath.mpf:
            return mpmath.exp(-4 * mpmath.log(2) * t * t) / (1 + 4 * (nu - t) ** 2 / mpmath.mpf(ratio) ** 2)

        marks = sorted(
            {-8, 8, 0, *(m for m in (nu - ratio, nu, nu + ratio, nu - 30 * ratio, nu + 30 * ratio) if abs(m) < 8)}
        )
        return mpmath.quad(convolved, marks)

    start = float(voigt_start(np.asarray(ratio), np.asarray(1.0)))
    exact = 2.0 * float(mpmath.findroot(lambda nu: height(nu) / height(0) - 0.5, start / 2.0))
    assert float(voigt_width(np.asarray(ratio), np.asarray(1.0))) == pytest.approx(exact, rel=2e-9)


def test_a_part_that_is_not_there() -> None:
    assert voigt_width(np.array([0.0, 3.0]), np.array([2.0, 0.0])) == pytest.approx([2.0, 3.0], rel=1e-15)


def test_doppler() -> None:
    """CODATA 2022 coefficient and a worked example with 2022 constants: 1e-9."""
    check = CHECKS["doppler.const.2022"]
    unit = float(check["inputs"]["u"])
    found = float(doppler_width(np.asarray(1.0), np.asarray(1.0), np.asarray(unit)))
    assert found == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])
    again = float(doppler_width(np.asarray(30e12), np.asarray(300.0), np.asarray(112 * constants.atomic_mass)))
    assert again == pytest.approx(CHECKS["doppler.example"]["expected"], rel=2e-9)  # u of 2018 or 2022


def test_transit_and_others() -> None:
    """Transit by the Fourier transform of the field that a molecule sees, numerically; natural, power, pressure by hand."""
    check = CHECKS["transit.gauss1ph"]
    found = float(transit_width(np.asarray(1.0), np.asarray(1.0)))
    assert found == pytest.approx(check["expected"][0], rel=check["tolerance"]["rel"])
    time = np.linspace(-12.0, 12.0, 24001)

    def power(nu: float) -> float:
        return float(np.trapezoid(np.exp(-(time**2)) * np.cos(2.0 * np.pi * nu * time), time)) ** 2

    assert power(found / 2.0) / power(0.0) == pytest.approx(0.5, rel=1e-9)
    assert float(natural_width(np.asarray(1e-6))) == pytest.approx(1.0 / (2.0 * np.pi * 1e-6))
    broadened = CHECKS["power.broadening"]
    saturation = 2.0 * broadened["inputs"]["Omega"] ** 2
    assert float(power_broadened(np.asarray(1.0), np.asarray(saturation))) == pytest.approx(
        broadened["expected"], rel=1e-9
    )


def composed(**parts: float) -> Line:
    return Line(**{name: np.asarray(value) for name, value in parts.items()})  # type: ignore[arg-type]


def test_composition() -> None:
    """Lorentzian parts add, Gaussian parts in squares, saturation broadens the homogeneous part."""
    line = composed(natural=1e3, pressure=2.0, pressure_coefficient=500.0, saturation=3.0)
    assert line.shape == "lorentzian"
    assert float(np.asarray(line.width)) == pytest.approx((1e3 + 1e3) * 2.0)
    half = composed(natural=1e3, pressure=2.0, pressure_half_coefficient=250.0, saturation=3.0)
    assert float(np.asarray(half.width)) == pytest.approx(4e3)
    wide = Line(laser=np.asarray(3e3), beam_radius=np.asarray(5e-3), speed=np.asarray(50.0), photons=2)
    transit = np.sqrt(2.0) * 0.3747812502585552 * 50.0 / 5e-3
    assert wide.shape == "gaussian"
    assert float(np.asarray(wide.width)) == pytest.approx(np.hypot(6e3, transit), rel=1e-9)
    both = composed(lorentzian=2e3, gaussian=1e3)
    assert both.shape == "voigt"
    assert float(np.asarray(both.width)) == pytest.approx(2.4357306557e3, rel=1e-9)  # table of exact Voigt widths
    assert float(np.asarray(both.lorentzian_share)) == pytest.approx(2.0 / 3.0)


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("crb.voigt")])
def test_bounds_of_voigt_centres(name: str) -> None:
    """Infinite span (200 FWHM), only the centre free; 1e-4: span and nodes."""
    check = CHECKS[name]
    ratio = float(name.rsplit("r", 1)[1])
    share = np.asarray(ratio / (1.0 + ratio))
    expected = check["expected"] if isinstance(check["expected"], float) else check["expected"][0]
    one = np.ones(())
    assert float(kappa("voigt", (), 200.0 * one, 0.0 * one, 1e6 * one, None, share)) == pytest.approx(
        expected, rel=1e-4
    )


def direct(share: float, free: tuple[str, ...], span: float, offset: float, points: int) -> float:
    """kappa from numerical derivatives of the convolution and a matrix inverse: none of the code under test."""
    fl, fg = share, 1.0 - share
    full = float(voigt_width(np.asarray(fl), np.asarray(fg)))
    nu = (offset + span * ((np.arange(points) + 0.5) / points - 0.5)) * full

    def line(
        amplitude: float, centre: float, low: float, high: float, base: float, slope: float, odd: float
    ) -> np.ndarray:
        scale = np.sqrt(4.0 * np.log(2.0)) / high
        w = special.wofz((nu - centre + 0.5j * low) * scale)
        peak = special.erfcx(0.5 * low * scale)
        return amplitude * (w.real + odd * w.imag) / peak + base + slope * nu / full

    start = np.array([1.0, 0.0, fl, fg, 0.0, 0.0, 0.0])
    picked = {"amplitude": [0], "width": [2, 3], "baseline": [4], "slope": [5], "asymmetry": [6]}
    order = [1, *(i for name in free for i in picked[name])]
    columns = []
    for i in order:
        step = np.zeros(7)
        step[i] = 1e-5
        columns.append((line(*(start + step)) - line(*(start - step))) / 2e-5)
    matrix = np.array(columns) @ np.array(columns).T * span * full / points
    return float(np.sqrt(np.linalg.inv(matrix)[0, 0] / full))


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9])
@pytest.mark.parametrize(
    "free",
    [
        ("amplitude",),
        ("amplitude", "width", "baseline"),
        ("amplitude", "width", "baseline", "slope"),
        ("amplitude", "width", "baseline", "slope", "asymmetry"),
        ("width",),
    ],
)
@pytest.mark.parametrize(("span", "offset", "points"), [(4.0, 0.0, 40), (6.0, 0.5, 50), (8.0, 0.3, 400)])
def test_nuisance_sets_of_voigt_lines(
    share: float, free: tuple[str, ...], span: float, offset: float, points: int
) -> None:
    """1e-4: numerical derivatives, and the integral in place of 400 points."""
    args = (np.asarray(span), np.asarray(offset), np.asarray(float(points)))
    found = float(kappa("voigt", free, *args, None, np.asarray(share)))
    assert found == pytest.approx(direct(share, free, span, offset, points), rel=3e-4)


def test_a_voigt_line_goes_over_into_its_limits() -> None:
    """With next to nothing of the other part; widths fixed."""
    one, free = np.ones(()), ("amplitude", "baseline")
    for share, name in ((1e-6, "gaussian"), (1.0 - 1e-6, "lorentzian")):
        found = float(kappa("voigt", free, 5.0 * one, 0.2 * one, 60.0 * one, None, np.asarray(share)))
        assert found == pytest.approx(float(kappa(name, free, 5.0 * one, 0.2 * one, 60.0 * one)), rel=1e-4)


@pytest.mark.parametrize("ratio", [1e3, 1e5, 1e7, 1e9])
def test_next_to_no_gaussian_part(ratio: float) -> None:
    """A narrow laser beside a wide line: that of the Lorentzian line; 1e-4, as its Gaussian part has no size that matters."""
    one, share = np.ones(()), np.asarray(ratio / (1.0 + ratio))
    args = (5.0 * one, 0.2 * one, 60.0 * one)
    assert float(kappa("voigt", (), *args, None, share)) == pytest.approx(
        float(kappa("lorentzian", (), *args)), rel=1e-4
    )


def test_voigt_profile_against_scipy() -> None:
    """scipy.special.voigt_profile (unit area) scaled to its peak; slope and partner by differences and Hilbert's pair."""
    x, share = np.linspace(-3.0, 3.0, 31)[None], np.array([[0.4]])
    profile = Voigt(share)
    full = float(voigt_width(np.asarray(0.4), np.asarray(0.6)))
    sigma, gamma = 0.6 / np.sqrt(8.0 * np.log(2.0)), 0.2
    expected = special.voigt_profile(x * full, sigma, gamma) / special.voigt_profile(0.0, sigma, gamma)
    assert profile.value(x) == pytest.approx(expected, rel=1e-12)
    step = 1e-5
    slope = (Voigt(share).value(x + step) - Voigt(share).value(x - step)) / (2.0 * step)
    assert profile.slope(x) == pytest.approx(slope, abs=1e-9)
    assert PROFILES["gaussian"].value(np.array(0.5)) == pytest.approx(0.5)


STUDY = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"
[scenario.v]
splitting = {{ value = "1 Hz ×/ 1.5", of = "difference" }}
technique = {{ kind = "scan", snr = "80", points = 60, span = "5 FWHM", time = "2 s" }}
line = {{ {line} }}
"""


def test_distances_in_fwhm_of_a_composed_line() -> None:
    line = 'frequency = "30 THz", natural = "2 kHz", gaussian = "1 kHz"'
    with pytest.raises(Exception, match="beside"):
        load_study(STUDY.format(line=line))
    problem = problem_of(load_study(STUDY.format(line='lorentzian = "2(1) kHz", gaussian = "1 kHz"')))
    draws = {**nominal_draws(problem.inputs), "v.line.lorentzian": np.array([[1e3, 2e3, 3e3]])}
    found = realise(problem.scenarios[0], draws)
    width = np.asarray(found.line.width)
    assert np.asarray(found.technique_a.span) == pytest.approx(5.0 * width)  # type: ignore[attr-defined]
    assert width.ravel() == pytest.approx(
        [float(voigt_width(np.asarray(low), np.asarray(1e3))) for low in (1e3, 2e3, 3e3)]
    )


def test_voigt_required_time_by_hand() -> None:
    """4 kappa^2 FWHM × spacing/SNR^2 × 2 s × (k + z)^2/d^2, kappa by the direct route; 5e-4 in kappa squared."""
    text = STUDY.format(line='lorentzian = "2 kHz", gaussian = "1 kHz"')
    nominal = assess(problem_of(load_study(text)), Options(tolerance=10.0)).scenarios[0].required_time.nominal
    full = 2.4357306557e3
    factor = direct(2.0 / 3.0, ("amplitude", "width", "baseline"), 5.0, 0.0, 60)
    expected = 4.0 * factor**2 * full * (5.0 * full / 60.0) / 80.0**2 * 2.0 * (5.0 + 1.2815515655446004) ** 2
    assert nominal == pytest.approx(expected, rel=6e-4)


def test_check_says_what_dominates() -> None:
    line = 'frequency = "30 THz", natural = "1 kHz", laser = "3 kHz"'
    said = understood(load_study(STUDY.format(line=line))).widths
    assert len(said) == 1
    assert "laser dominates" in said[0]
    assert "(voigt)" in said[0]
