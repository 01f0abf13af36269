"""Line profiles of unit peak against x, the distance from the centre in full widths at half maximum.

Each has its slope dg/dx, its width derivative and its Hilbert partner (dispersion), which is what
an admixed asymmetry looks like.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy import special

from pvfeas.laws import Array

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

    def width_derivative(self, x: Array) -> Array:
        """FWHM × dg/dFWHM at a fixed frequency: -x dg/dx."""
        return np.asarray(-x * self.slope(x))


PROFILES: dict[str, Profile] = {
    "lorentzian": Profile("lorentzian", lorentzian, lorentzian_slope, lorentzian_slope_from, lorentzian_partner),
    "gaussian": Profile("gaussian", gaussian, gaussian_slope, gaussian_slope_from, gaussian_partner),
}


def slope(profile: str, x: Array) -> Array:
    """dg/dx of a profile by name."""
    return np.asarray(PROFILES[profile].slope(x))
