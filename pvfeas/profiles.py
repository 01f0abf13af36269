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


class Voigt(Profile):
    """The Voigt profile of unit peak against x in its own full widths, for shares fL/(fL + fG) of shape (rows, 1).

    g = Re w(z)/Re w(i y), z = (nu + i fL/2) sqrt(4 ln 2)/fG, w the Faddeeva function; the Hilbert partner is
    Im w(z)/Re w(i y), w' = 2 i/sqrt(pi) - 2 z w. Free widths are both, the Lorentzian and the Gaussian one.
    """

    def __init__(self, share: Array) -> None:
        super().__init__("voigt", self._value, self._slope, self._slope_from, self._partner)
        gaussian_part = np.maximum(1.0 - share, 1e-9)
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


def profile_of(name: str, share: Array | None = None) -> Profile:
    """A profile by name; a Voigt one needs its share fL/(fL + fG) of shape (rows, 1)."""
    return Voigt(np.asarray(share)) if name == "voigt" else PROFILES[name]
