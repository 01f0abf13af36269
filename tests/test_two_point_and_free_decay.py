"""two-point and free-decay: tables, closed forms, simulated data. Values from tests/data/checks.json, groups side and tone."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import integrate

from pvfeas.profiles import PROFILES, Voigt
from pvfeas.tables import Line
from pvfeas.techniques.free_decay import FreeDecay, decay_penalty, record_sensitivity, tone_variance
from pvfeas.techniques.two_point import (
    TwoPoint,
    best_depth,
    projection_pair_variance,
    shot_pair_variance,
    white_pair_variance,
)

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
LORENTZIAN, GAUSSIAN = PROFILES["lorentzian"], PROFILES["gaussian"]
ONE = np.ones((1,))


def n(value: float) -> Any:
    return np.asarray(float(value))


def line(profile: str = "lorentzian", fwhm: float = 1.0) -> Line:
    return Line(profile=profile, fwhm=n(fwhm))


@pytest.mark.parametrize(
    ("profile", "depth", "size"),
    [
        (LORENTZIAN, 1 / (2 * np.sqrt(3)), 4 / (3 * np.sqrt(3))),
        (GAUSSIAN, 1 / np.sqrt(8 * np.log(2)), np.exp(0.5) / np.sqrt(8 * np.log(2))),
    ],
)
def test_white_noise_closed_forms(profile: Any, depth: float, size: float) -> None:
    """sigma = K FWHM/(SNR sqrt n) with n = 2 samples; the depth of a flat optimum is found to 1e-7."""
    found = best_depth(lambda m: white_pair_variance(profile, m, ONE), (1,))
    assert found[0] == pytest.approx(depth, rel=1e-6)
    assert np.sqrt(2.0 * white_pair_variance(profile, found, ONE)[0]) == pytest.approx(size, rel=1e-12)


@pytest.mark.parametrize(("name", "profile"), [("side.poisson.lorentz", LORENTZIAN), ("side.poisson.gauss", GAUSSIAN)])
def test_shot_noise_closed_forms(name: str, profile: Any) -> None:
    check = CHECKS[name]
    found = best_depth(lambda m: shot_pair_variance(profile, m, ONE, 0.0 * ONE), (1,))
    assert found[0] == pytest.approx(check["expected"][0], rel=1e-6)
    size = np.sqrt(2.0 * shot_pair_variance(profile, found, ONE, 0.0 * ONE)[0])
    assert size == pytest.approx(check["expected"][1], rel=check["tolerance"]["rel"])


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("side.dip")])
def test_projection_noise_table(name: str) -> None:
    """K/sqrt N for both profiles; at contrast 1 the optimum is the smallest depth that is tried."""
    check = CHECKS[name]
    contrast = check["inputs"]["contrast"] * ONE
    for profile, place in ((LORENTZIAN, 1), (GAUSSIAN, 3)):
        found = best_depth(lambda m, p=profile: projection_pair_variance(p, m, ONE, contrast), (1,))
        size = np.sqrt(projection_pair_variance(profile, found, ONE, contrast)[0])
        assert size == pytest.approx(check["expected"][place], rel=check["tolerance"]["rel"])


def test_pair_at_the_best_depth() -> None:
    """0.5443 FWHM/SNR per pair; combo.twopoint: 769.8 Hz at one second of 1 Hz-bandwidth samples, T of the whole."""
    technique = TwoPoint(snr=n(100), time=n(1), excess_noise=n(1), background=n(0), contrast=n(1))
    sigma = float(np.sqrt(technique.centre_variance(line(fwhm=1e5))))
    assert sigma == pytest.approx(4 / (3 * np.sqrt(3)) / np.sqrt(2) * 1e5 / 100, rel=1e-9)
    check = CHECKS["combo.twopoint"]  # snr 100 for all samples of one second, half of them on each side
    assert sigma * np.sqrt(2.0) == pytest.approx(check["expected"][0], rel=check["tolerance"]["rel"])
    assert (2.0 * 3.0 * sigma * np.sqrt(2.0) / 1e-3) ** 2 == pytest.approx(
        check["expected"][1], rel=check["tolerance"]["rel"]
    )


def test_a_written_depth_and_a_voigt_line() -> None:
    best = TwoPoint(snr=n(100), time=n(1), excess_noise=n(1), background=n(0), contrast=n(1))
    written = TwoPoint(snr=n(100), depth=n(2e4), time=n(1), excess_noise=n(1), background=n(0), contrast=n(1))
    voigt = Line(lorentzian=n(5e4), gaussian=n(5e4))
    for each in (line(fwhm=1e5), voigt):
        assert float(best.centre_variance(each)) <= float(written.centre_variance(each))
    share, width = np.array([[0.5]]), float(np.asarray(voigt.width))
    slope = float(Voigt(share).slope(np.array([[2e4 / width]]))[0, 0])
    assert float(written.centre_variance(voigt)) == pytest.approx(0.5 * (width / (100 * slope)) ** 2, rel=1e-9)


@pytest.mark.parametrize("noise", ["white", "shot", "projection"])
@pytest.mark.parametrize("profile", ["lorentzian", "gaussian"])
def test_simulated_pairs(noise: str, profile: str) -> None:
    """40 000 pairs, centre = difference over slope: standard error of sigma 0.35 %; bound three of them and 0.3 % for

    the discreteness of counts; 5 % more would not pass."""
    random, count, fwhm = np.random.default_rng(9), 40_000, 7e3
    common = {"time": n(0.1), "excess_noise": n(1), "background": n(0.2), "contrast": n(0.8), "depth": n(2.4e3)}
    technique = {
        "white": TwoPoint(snr=n(30), **common),
        "shot": TwoPoint(noise="shot", counts=n(5000), **common),
        "projection": TwoPoint(noise="projection", molecules=n(4000), **common),
    }[noise]
    shape = PROFILES[profile]
    height, slope = float(shape.value(n(2.4e3 / fwhm))), abs(float(shape.slope(n(2.4e3 / fwhm)))) / fwhm
    if noise == "white":
        sides = height + random.standard_normal((2, count)) / 30.0
        difference, gain = sides[1] - sides[0], 2.0 * slope
    elif noise == "shot":
        sides = random.poisson(5000 * (height + 0.2), (2, count))
        difference, gain = sides[1] - sides[0], 2.0 * 5000 * slope
    else:
        sides = random.binomial(2000, 0.8 * height, (2, count))
        difference, gain = sides[1] - sides[0], 2.0 * 2000 * 0.8 * slope
    ratio = float(np.std(difference / gain)) / float(np.sqrt(technique.centre_variance(line(profile, fwhm))))
    bound = 3.0 / np.sqrt(2.0 * count) + 0.003
    assert abs(ratio - 1.0) < bound
    assert abs(ratio / 1.05 - 1.0) > bound


# --- free decay --------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("tone.damped.C")])
def test_penalty_table(name: str) -> None:
    check = CHECKS[name]
    ratio = check["inputs"]["T_over_T2"]
    assert float(decay_penalty(n(ratio), n(1))) == pytest.approx(check["expected"][0], rel=check["tolerance"]["rel"])


@pytest.mark.parametrize("ratio", [1e-9, 1e-4, 0.1, 0.2499, 0.2501, 1.0, 30.0])
def test_penalty_by_quadrature(ratio: float) -> None:
    """C = T^3/12 over ∫ (t - m)^2 e^-2t dt with m the weighted middle, T in decay times; the seam at z = 0.5 too."""

    def moment(power: int) -> float:
        return float(integrate.quad(lambda u: u**power * np.exp(-2.0 * ratio * u), 0.0, 1.0, epsabs=0, epsrel=1e-12)[0])

    middle = moment(1) / moment(0)
    spread = float(integrate.quad(lambda u: (u - middle) ** 2 * np.exp(-2.0 * ratio * u), 0.0, 1.0, epsrel=1e-12)[0])
    assert float(decay_penalty(n(ratio), n(1))) == pytest.approx(1.0 / (12.0 * spread), rel=1e-9)


def test_tone_variances() -> None:
    """No damping, 1000 samples: 12 and 24 sigma^2/(A^2 dt^2 N^3) in angular frequency; N(N^2 - 1) differs by 1e-6."""
    for name, quadrature in (("tone.complex.varomega", True), ("tone.real.varomega", False)):
        check = CHECKS[name]
        found = float(tone_variance(n(1000), n(1e9), n(1), n(1), quadrature)) * (2.0 * np.pi) ** 2
        assert found == pytest.approx(check["expected"], rel=max(check["tolerance"]["rel"], 2e-6))


def test_long_records() -> None:
    """0.450158 sqrt(S1)/(A T2^1.5), S1 = 2 sigma^2 dt one-sided."""
    check = CHECKS["tone.damped.inf"]
    found = np.sqrt(float(tone_variance(n(40), n(1), n(1), n(0.5), quadrature=False)))  # S1 = 1
    assert found == pytest.approx(check["expected"][0], rel=1e-12)


def test_best_record_with_dead_time() -> None:
    """Ten decay times of dead time: the record of least variance × cycle, and that value."""
    check = CHECKS["tone.damped.Topt.d10"]
    record = np.linspace(3.0, 4.0, 100_001)
    size = tone_variance(record, n(1), n(1), n(0.5), quadrature=False) * (2.0 * np.pi) ** 2 * (record + 10.0)
    best = int(np.argmin(size))
    assert [record[best], size[best]] == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])


@pytest.mark.parametrize("quadrature", [False, True])
@pytest.mark.parametrize(("record", "decay"), [(0.08, 0.04), (0.02, 0.04)])
def test_simulated_records(quadrature: bool, record: float, decay: float) -> None:
    """10 000 least-squares fits of frequency, amplitude and phase (one Gauss–Newton step from the truth, exact to

    second order at this SNR): standard error of sigma 0.7 %; bound three of them and 0.3 % for 400 samples."""
    random, count, dt = np.random.default_rng(11), 10_000, record / 400.0
    time = np.arange(400) * dt + dt / 2.0
    nu, snr = 61.7 / record, 40.0
    envelope, phase = np.exp(-time / decay), 2.0 * np.pi * nu * time + 0.3

    def derivatives(shift: float) -> list[np.ndarray]:
        wave, quarter = np.cos(phase + shift), -np.sin(phase + shift)
        return [envelope * quarter * 2.0 * np.pi * time, envelope * quarter, envelope * wave, -envelope * wave * time]

    shifts = (0.0, -np.pi / 2.0) if quadrature else (0.0,)  # the decay rate is fitted too: it costs nothing
    matrix = np.hstack([np.array(derivatives(one)) for one in shifts])
    estimator = np.linalg.inv(matrix @ matrix.T) @ matrix
    found = (random.standard_normal((count, matrix.shape[1])) / snr) @ estimator[0]
    predicted = np.sqrt(float(tone_variance(n(record), n(decay), n(snr), n(dt), quadrature)))
    ratio = float(np.std(found)) / predicted
    bound = 3.0 / np.sqrt(2.0 * count) + 0.003
    assert abs(ratio - 1.0) < bound
    assert abs(ratio / 1.05 - 1.0) > bound


def test_sensitivity_along_the_record() -> None:
    """Least squares follows a slow change of frequency with this weight: compared with a fit to a phase that was bent."""
    record, decay, count = 0.08, 0.05, 4000
    time = (np.arange(count) + 0.5) * record / count
    weights = np.exp(-2.0 * time / decay)
    bump = np.exp(-(((time - 0.03) / 0.004) ** 2))  # a change of frequency around 30 ms
    bent = 2.0 * np.pi * np.cumsum(bump) * record / count
    middle = (weights * time).sum() / weights.sum()
    fitted = (weights * (time - middle) * bent).sum() / (weights * (time - middle) ** 2).sum() / (2.0 * np.pi)
    shape = record_sensitivity(time, n(record), n(decay))
    assert (shape * bump).sum() / shape.sum() == pytest.approx(fitted, rel=2e-3)  # the grid


@pytest.mark.parametrize(("record", "idle"), [(0.08, 0.02), (2e-4, 0.1), (0.05, 0.0)])
def test_idle_time_lets_noise_in(record: float, idle: float) -> None:
    """White noise: (<s^2>/<s>^2 - 1)/2 over the cycle by quadrature; 2e-3: 64 bins a record."""
    technique = FreeDecay(
        decay_time=n(0.05), record=n(record), snr=n(5), sample_interval=n(1e-5), idle_time=n(idle), excess_noise=n(1)
    )

    def moment(power: int) -> float:
        def part(at: float) -> float:
            return float(record_sensitivity(n(at), n(record), n(0.05))) ** power

        return float(integrate.quad(part, 0.0, record, epsrel=1e-10)[0]) / (record + idle)

    found = float(technique.aliased_noise(line(), n(1), n(0), n(0)))
    assert found == pytest.approx((moment(2) / moment(1) ** 2 - 1.0) / 2.0, rel=2e-3)
    assert technique.interrogation_width(line()) == pytest.approx(1.0 / (np.pi * 0.05))
