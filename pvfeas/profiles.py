"""Line profiles of unit peak against x, the distance from the centre in full widths at half maximum.

Each has its slope dg/dx, its width derivative and its Hilbert partner (dispersion), which is what
an admixed asymmetry looks like.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy import special

from pvfeas.laws import Array
from pvfeas.widths import voigt_width

LN2 = float(np.log(2.0))
ROOT_LN2 = float(np.sqrt(LN2))


def lorentzian(x: Array) -> Array:
    """g = 1/(1 + 4 x^2)."""
    return np.asarray(1.0 / (1.0 + 4.0 * x * x))


def lorentzian_slope(x: Array) -> Array:
    """dg/dx = -8 x/(1 + 4 x^2)^2."""
    return lorentzian_slope_from(x, lorentzian(x))


def lorentzian_slope_from(x: Array, value: Array) -> Array:
    """dg/dx = -8 x g^2, from g."""
    return np.asarray(-8.0 * x * value * value)


def lorentzian_partner(x: Array) -> Array:
    """Dispersion 2 x/(1 + 4 x^2), the Hilbert partner of g; extremes ±1/2 at x = ±1/2."""
    return np.asarray(2.0 * x / (1.0 + 4.0 * x * x))


def gaussian(x: Array) -> Array:
    """g = exp(-4 ln2 x^2)."""
    return np.asarray(np.exp(-4.0 * LN2 * x * x))


def gaussian_slope(x: Array) -> Array:
    """dg/dx = -8 ln2 x exp(-4 ln2 x^2)."""
    return gaussian_slope_from(x, gaussian(x))


def gaussian_slope_from(x: Array, value: Array) -> Array:
    """dg/dx = -8 ln2 x g, from g."""
    return np.asarray(-8.0 * LN2 * x * value)


def gaussian_partner(x: Array) -> Array:
    """(2/sqrt pi) × Dawson's function of 2 sqrt(ln2) x, the Hilbert partner of g; extremes at x = ±0.5550."""
    return np.asarray(2.0 / np.sqrt(np.pi) * special.dawsn(2.0 * ROOT_LN2 * x))


Wave = Callable[[Array], Array]


@dataclass(frozen=True)
class Profile:
    """A profile with what a fit needs of it."""

    name: str
    value: Callable[[Array], Array]
    slope: Callable[[Array], Array]
    slope_from: Callable[[Array, Array], Array]  # the slope where the value is known already
    partner: Callable[[Array], Array]

    def widths(self, x: Array, value: Array, slope: Array) -> list[Array]:
        """Derivatives by the free widths at fixed peak, up to factors: x dg/dx."""
        return [x * slope]

    def width_derivative(self, x: Array) -> Array:
        """FWHM × dg/dFWHM at a fixed frequency: -x dg/dx."""
        return np.asarray(-x * self.slope(x))


# What is recorded in other ways, half of its peak-to-peak height taken as 1; the width is that of the parent line.

LORENTZIAN_STEEPEST = 3.0 * float(np.sqrt(3.0)) / 4.0  # |dg/dx| at x = 1/(2 sqrt 3)
GAUSSIAN_STEEPEST = float(np.sqrt(8.0 * LN2) * np.exp(-0.5))  # at x = 1/sqrt(8 ln 2)
DAWSON_PEAK = (
    0.5410442246351817  # of Dawson's function, at 0.9241388730 (Abramowitz & Stegun 1964, 7.1.17; from memory)
)


def lorentzian_dispersion(x: Array) -> Array:
    """4 x/(1 + 4 x^2), extremes ±1 at x = ±1/2."""
    return np.asarray(4.0 * x / (1.0 + 4.0 * x * x))


def lorentzian_dispersion_slope(x: Array) -> Array:
    """4 (1 - 4 x^2)/(1 + 4 x^2)^2."""
    value = lorentzian(x)
    return np.asarray(4.0 * (1.0 - 4.0 * x * x) * value * value)


def gaussian_dispersion(x: Array) -> Array:
    """Dawson's function of 2 sqrt(ln2) x over its peak, extremes ±1 at x = ±0.5550."""
    return np.asarray(special.dawsn(2.0 * ROOT_LN2 * x) / DAWSON_PEAK)


def gaussian_dispersion_slope(x: Array) -> Array:
    """2 sqrt(ln2) (1 - 2 t D(t))/D_peak, t = 2 sqrt(ln2) x."""
    t = 2.0 * ROOT_LN2 * x
    return np.asarray(2.0 * ROOT_LN2 * (1.0 - 2.0 * t * special.dawsn(t)) / DAWSON_PEAK)


def lorentzian_derivative(x: Array) -> Array:
    """dg/dx over its largest value, 3 sqrt 3/4."""
    return lorentzian_slope(x) / LORENTZIAN_STEEPEST


def lorentzian_derivative_slope(x: Array) -> Array:
    """(128 x^2 g^3 - 8 g^2)/(3 sqrt 3/4)."""
    value = lorentzian(x)
    square = value * value
    return np.asarray((128.0 * x * x * value - 8.0) * square / LORENTZIAN_STEEPEST)


def gaussian_derivative(x: Array) -> Array:
    """dg/dx over its largest value, sqrt(8 ln2/e)."""
    return gaussian_slope(x) / GAUSSIAN_STEEPEST


def gaussian_derivative_slope(x: Array) -> Array:
    """(64 ln2^2 x^2 - 8 ln2) g/sqrt(8 ln2/e)."""
    return np.asarray((64.0 * LN2 * LN2 * x * x - 8.0 * LN2) * gaussian(x) / GAUSSIAN_STEEPEST)


def _recorded(name: str, value: Wave, slope: Wave, partner: Wave) -> Profile:
    return Profile(name, value, slope, lambda x, _: slope(x), partner)


# A line with less of a Gaussian part is taken with so much: its shape changes by 1e-6, while the derivatives of w
# would lose digits as the square of the ratio of the parts.
LEAST_GAUSSIAN = 1e-3


class Voigt(Profile):
    """The Voigt profile of unit peak against x in its own full widths, for shares fL/(fL + fG) of shape (rows, 1).

    g = Re w(z)/Re w(i y), z = (nu + i fL/2) sqrt(4 ln 2)/fG, w the Faddeeva function; the Hilbert partner is
    Im w(z)/Re w(i y), w' = 2 i/sqrt(pi) - 2 z w. Free widths are both, the Lorentzian and the Gaussian one.
    """

    def __init__(self, share: Array) -> None:
        super().__init__("voigt", self._value, self._slope, self._slope_from, self._partner)
        share = np.minimum(share, 1.0 - LEAST_GAUSSIAN)
        gaussian_part = 1.0 - share
        object.__setattr__(self, "_stretch", 2.0 * ROOT_LN2 * voigt_width(share, gaussian_part) / gaussian_part)
        object.__setattr__(self, "_y", ROOT_LN2 * share / gaussian_part)
        object.__setattr__(self, "_peak", special.erfcx(self._y))
        object.__setattr__(self, "_last", (None, None, None))

    _stretch: Array
    _y: Array
    _peak: Array
    _last: tuple[Any, Any, Any]

    def _waves(self, x: Array) -> tuple[Any, Any]:
        """z and w(z); kept while x is the same array."""
        if self._last[0] is not x:
            z = self._stretch * x + 1j * self._y
            object.__setattr__(self, "_last", (x, z, special.wofz(z)))
        return self._last[1], self._last[2]

    def _value(self, x: Array) -> Array:
        return np.asarray(self._waves(x)[1].real / self._peak)

    def _slope(self, x: Array) -> Array:
        z, w = self._waves(x)
        return np.asarray((-2.0 * z * w).real * self._stretch / self._peak)

    def _slope_from(self, x: Array, value: Array) -> Array:
        return self._slope(x)

    def _partner(self, x: Array) -> Array:
        return np.asarray(self._waves(x)[1].imag / self._peak)

    def widths(self, x: Array, value: Array, slope: Array) -> list[Array]:
        """By the Lorentzian and by the Gaussian width at fixed peak, up to factors."""
        z, w = self._waves(x)
        change = 2j / np.sqrt(np.pi) - 2.0 * z * w
        at_peak = 2.0 / np.sqrt(np.pi) - 2.0 * self._y * self._peak  # Im w'(i y)
        by_lorentzian = (-change.imag + value * at_peak) / self._peak
        by_gaussian = (-(change * z).real - value * self._y * at_peak) / self._peak
        return [np.asarray(by_lorentzian), np.asarray(by_gaussian)]


PROFILES: dict[str, Profile] = {
    "lorentzian": Profile("lorentzian", lorentzian, lorentzian_slope, lorentzian_slope_from, lorentzian_partner),
    "gaussian": Profile("gaussian", gaussian, gaussian_slope, gaussian_slope_from, gaussian_partner),
}


RECORDED: dict[tuple[str, str], Profile] = {
    ("lorentzian", "dispersion"): _recorded(
        "lorentzian", lorentzian_dispersion, lorentzian_dispersion_slope, lorentzian
    ),
    ("gaussian", "dispersion"): _recorded("gaussian", gaussian_dispersion, gaussian_dispersion_slope, gaussian),
    ("lorentzian", "first-derivative"): _recorded(
        "lorentzian", lorentzian_derivative, lorentzian_derivative_slope, lorentzian_dispersion_slope
    ),
    ("gaussian", "first-derivative"): _recorded(
        "gaussian", gaussian_derivative, gaussian_derivative_slope, gaussian_dispersion_slope
    ),
}


def profile_of(name: str, share: Array | None = None, detection: str = "direct") -> Profile:
    """What is recorded of a line; a Voigt one needs its share fL/(fL + fG) of shape (rows, 1).

    Raises KeyError for a Voigt line that is not detected directly.
    """
    if detection != "direct":
        return RECORDED[name, detection]
    return Voigt(np.asarray(share)) if name == "voigt" else PROFILES[name]
