"""Line profiles: peak, half height, derivatives and Hilbert partners, each by another route."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
import pytest
from scipy import integrate, optimize

from pvfeas.profiles import PROFILES, Profile

PLACES = np.array([-7.3, -2.0, -0.5, -0.11, 0.0, 0.03, 0.5, 0.9, 3.3])
BOTH = pytest.mark.parametrize("profile", PROFILES.values(), ids=list(PROFILES))


@BOTH
def test_unit_peak_and_half_height_at_half_the_width(profile: Profile) -> None:
    assert profile.value(np.array([0.0])) == 1.0
    np.testing.assert_allclose(profile.value(np.array([-0.5, 0.5])), 0.5, rtol=1e-14)  # rounding of exp


def test_values_against_their_definitions() -> None:
    # (Gamma/2)^2/((nu - nu0)^2 + (Gamma/2)^2) and exp(-(nu - nu0)^2/(2 sigma^2)) with Gamma = 2.354820 sigma
    np.testing.assert_allclose(PROFILES["lorentzian"].value(PLACES), 0.25 / (PLACES**2 + 0.25), rtol=1e-14)
    sigma = 1.0 / np.sqrt(8.0 * np.log(2.0))
    np.testing.assert_allclose(PROFILES["gaussian"].value(PLACES), np.exp(-(PLACES**2) / (2.0 * sigma**2)), rtol=1e-12)


MP_VALUES: dict[str, Callable[[Any], Any]] = {
    "lorentzian": lambda x: 1 / (1 + 4 * x**2),
    "gaussian": lambda x: mpmath.exp(-4 * mpmath.log(2) * x**2),
}


@BOTH
def test_slope_is_the_derivative(profile: Profile) -> None:
    expected = [float(mpmath.diff(MP_VALUES[profile.name], mpmath.mpf(x))) for x in PLACES]
    np.testing.assert_allclose(profile.slope(PLACES), expected, rtol=1e-12, atol=1e-15)
    np.testing.assert_array_equal(profile.slope(PLACES), profile.slope_from(PLACES, profile.value(PLACES)))


@BOTH
def test_width_derivative_is_that_of_the_width(profile: Profile) -> None:
    value = MP_VALUES[profile.name]
    expected = [float(mpmath.diff(lambda width, x=x: value(mpmath.mpf(x) / width), 1)) for x in PLACES]
    np.testing.assert_allclose(profile.width_derivative(PLACES), expected, rtol=1e-12, atol=1e-15)


@BOTH
@pytest.mark.parametrize("x", [-2.4, 0.0, 0.3, 0.5, 1.7])
def test_partner_is_the_hilbert_transform(profile: Profile, x: float) -> None:
    # (1/pi) PV integral of g(t)/(x - t) dt, folded about t = x
    def folded(s: float) -> float:
        return float((profile.value(np.asarray(x - s)) - profile.value(np.asarray(x + s))) / s)

    parts = [integrate.quad(folded, low, high, epsabs=1e-12, limit=200)[0] for low, high in ((1e-12, 4), (4, np.inf))]
    assert profile.partner(np.asarray(x)) == pytest.approx(sum(parts) / np.pi, abs=1e-9)


# Where the partner peaks, and kappa of a dispersion signal with SNR counted at half peak-to-peak:
# 1/sqrt(2 pi) for the Lorentzian (derived); 0.422606811 and ±0.5550 for Dawson's function (derived).
@pytest.mark.parametrize(
    ("name", "peak_at", "peak_tolerance", "kappa"),
    [("lorentzian", 0.5, 1e-7, 1.0 / np.sqrt(2.0 * np.pi)), ("gaussian", 0.5550, 5e-5, 0.422606811)],
)
def test_partner_peaks_and_its_own_bound(name: str, peak_at: float, peak_tolerance: float, kappa: float) -> None:
    partner = PROFILES[name].partner
    found = optimize.minimize_scalar(
        lambda x: -float(partner(np.asarray(x))), bounds=(0.1, 2.0), method="bounded", options={"xatol": 1e-10}
    )
    assert found.x == pytest.approx(peak_at, abs=peak_tolerance)

    def squared_slope(x: float) -> float:
        step = 1e-5
        ends = partner(np.array([x + step, x - step])) / -found.fun
        return float(((ends[0] - ends[1]) / (2.0 * step)) ** 2)

    information = 2.0 * integrate.quad(squared_slope, 0.0, np.inf, limit=200)[0]
    assert 1.0 / np.sqrt(information) == pytest.approx(kappa, rel=1e-7)  # central differences: 1e-9


def test_extremes_of_the_slopes() -> None:
    # ±Gamma/(2 sqrt 3) and ±Gamma/sqrt(8 ln 2) (derived)
    for name, place in (("lorentzian", 0.5 / np.sqrt(3.0)), ("gaussian", 1.0 / np.sqrt(8.0 * np.log(2.0)))):
        x = np.linspace(0.2, 0.6, 400001)
        steepest = x[np.argmin(PROFILES[name].slope(x))]
        assert steepest == pytest.approx(place, abs=2e-6)
