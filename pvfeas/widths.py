"""Widths of a line: what makes them, how they add. Every width is a full width at half maximum in Hz."""

from __future__ import annotations

import numpy as np
from scipy import special

from pvfeas.constants import BOLTZMANN, SPEED_OF_LIGHT
from pvfeas.laws import Array

LN2 = float(np.log(2.0))
# FWHM of the Fourier-limited line of a Gaussian beam crossed at speed v, over v/w, w the 1/e^2 intensity radius:
# the field exp(-(v t/w)^2) has the power spectrum exp(-(2 pi nu w/v)^2/2), FWHM sqrt(2 ln 2)/pi (derived).
TRANSIT = float(np.sqrt(2.0 * LN2)) / np.pi
K_OVER_C2 = float(BOLTZMANN) / float(SPEED_OF_LIGHT) ** 2
NEWTON = 8  # steps to the width of a Voigt line; the start is good to 2.4e-4


def natural_width(lifetime: Array) -> Array:
    """1/(2 pi tau), tau the lifetime of the upper level's population in s."""
    return np.asarray(1.0 / (2.0 * np.pi * lifetime))


def power_broadened(width: Array, saturation: Array) -> Array:
    """width × sqrt(1 + S) of a homogeneous line, S = I/I_sat = 2 Omega^2/Gamma^2 (Citron et al. 1977; from memory)."""
    return np.asarray(width * np.sqrt(1.0 + saturation))


def doppler_width(frequency: Array, temperature: Array, mass: Array) -> Array:
    """frequency × sqrt(8 ln 2 k T/(m c^2)): thermal gas at T (K), molecules of mass m (kg); frequency in Hz."""
    return np.asarray(frequency * np.sqrt(8.0 * LN2 * K_OVER_C2 * temperature / mass))


def transit_width(speed: Array, beam_radius: Array, photons: int = 1) -> Array:
    """sqrt(photons) × sqrt(2 ln 2)/pi × v/w in the molecule's frequency, w the 1/e^2 intensity radius (m), v in m/s."""
    return np.asarray(np.sqrt(photons) * TRANSIT * speed / beam_radius)


def voigt_start(lorentzian: Array, gaussian: Array) -> Array:
    """0.5346 fL + sqrt(0.2166 fL^2 + fG^2), good to 2.4e-4 (Olivero & Longbothum 1977, J. Quant. Spectrosc. Radiat.
    Transf. 17, 233; from memory)."""
    return np.asarray(0.5346 * lorentzian + np.sqrt(0.2166 * lorentzian**2 + gaussian**2))


def voigt_width(lorentzian: Array, gaussian: Array) -> Array:
    """Full width of the convolution of a Lorentzian and a Gaussian line, by the Faddeeva function.

    Newton steps on ln Re w(z) = ln(Re w(z0)/2), z = (nu + i fL/2) sqrt(4 ln 2)/fG. lorentzian, gaussian: full widths of
    at least 0. Where they differ by more than 1e3 or 1e7 the limits are taken, good to 1e-9.
    """
    low, high = np.broadcast_arrays(np.asarray(lorentzian, dtype=float), np.asarray(gaussian, dtype=float))
    start = voigt_start(low, high)
    ratio = np.where(high > 0, low / np.where(high > 0, high, 1.0), np.inf)
    both = (ratio > 1e-7) & (ratio < 1e3)
    scale = np.sqrt(4.0 * LN2) / np.where(both, high, 1.0)
    y = np.where(both, low, 1.0) / 2.0 * scale
    wanted = np.log(special.erfcx(y) / 2.0)
    x = np.where(both, start, 1.0) / 2.0 * scale
    for _ in range(NEWTON):
        z = x + 1j * y
        w = special.wofz(z)
        slope = np.real(-2.0 * z * w + 2j / np.sqrt(np.pi))
        x = x - (np.log(w.real) - wanted) * w.real / slope
    # beyond a ratio of 1e3 the Gaussian part adds c fG^2/fL: from ln of the convolution to second order, c = 3/(4 ln 2)
    wide = low + np.where(low > 0, high**2 / np.where(low > 0, low, 1.0), 0.0) * 3.0 / (4.0 * LN2)
    narrow = high + 0.5346 * low
    return np.asarray(np.where(both, 2.0 * x / scale, np.where(ratio >= 1e3, wide, narrow)))
