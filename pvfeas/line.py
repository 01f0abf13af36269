"""The line that is measured: its width as given or composed, its shape."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from pvfeas.keys import choice, integer, positive, quantity
from pvfeas.laws import Array
from pvfeas.widths import doppler_width, natural_width, power_broadened, transit_width, voigt_width

GIVEN = ("fwhm", "hwhm")
VOIGT = ("lorentzian", "gaussian")
HOMOGENEOUS = ("natural", "lifetime", "pressure_coefficient", "pressure_half_coefficient")
COMPOSED = (
    *HOMOGENEOUS, "pressure", "saturation", "laser", "beam_radius", "speed", "temperature", "mass",
)  # fmt: skip
TOGETHER = (("beam_radius", "speed"), ("temperature", "mass"))


@dataclass(frozen=True)
class Line:
    """The line that is measured; every width is a full width at half maximum."""

    frequency: Array | None = positive("Hz", "frequency of the line", example="29.1 THz")
    profile: str = choice(
        "shape of the line; composed widths bring their own", "lorentzian", "gaussian", "voigt", default="lorentzian"
    )
    fwhm: Array | None = positive("Hz", "full width at half maximum", example="12(2) kHz")
    lorentzian: Array | None = positive("Hz", "full width of the Lorentzian part of a Voigt line")
    gaussian: Array | None = positive("Hz", "full width of the Gaussian part of a Voigt line")
    natural: Array | None = positive("Hz", "natural full width; 1/(2 pi lifetime)")
    lifetime: Array | None = positive("s", "lifetime of the population, instead of natural")
    pressure: Array | None = positive("Pa", "pressure of the gas")
    pressure_coefficient: Array | None = positive("Hz/Pa", "FULL width per pressure")
    pressure_half_coefficient: Array | None = positive("Hz/Pa", "half width per pressure, as in line lists; doubled")
    saturation: Array | None = quantity("1", "S = I/I_sat: sqrt(1 + S) of the homogeneous width", lower=0.0)
    laser: Array | None = positive("Hz", "full width of the laser, Gaussian; counts photons-fold")
    beam_radius: Array | None = positive("m", "1/e^2 intensity RADIUS of the beam that the molecules cross")
    speed: Array | None = positive("m/s", "speed of the molecules across the beam")
    temperature: Array | None = positive("K", "temperature of the gas along the beam: Doppler width")
    mass: Array | None = positive("kg", "mass of one molecule")
    photons: int = integer("photons of the transition: laser quantities count that often", lower=1, upper=20, default=1)

    @classmethod
    def rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        """One way to give the width; what belongs together; a shape that agrees with its parts."""
        ways = [[key for key in way if key in given] for way in (GIVEN, VOIGT, COMPOSED)]
        used = [way for way in ways if way]
        if len(ways[0]) == 2:
            yield "hwhm", "both fwhm and hwhm", "give one of them"
            return
        if len(used) > 1:
            right = "give the whole width, or its two Voigt parts, or what it is made of"
            yield used[1][0], f"{used[1][0]} beside {used[0][0]}", right
            return
        for first, second in TOGETHER:
            for one, other in ((first, second), (second, first)):
                if one in given and other not in given:
                    yield one, f"{one} without {other}", f"the width needs both {first} and {second}"
        yield from cls._pressure_rules(given)
        if "temperature" in given and "mass" in given and "frequency" not in given:
            yield "temperature", "a Doppler width without a frequency", 'write frequency = "29.1 THz" too'
        shape, written = shape_of(set(given)), given.get("profile")
        if shape and isinstance(written, str) and written != shape:
            yield "profile", f"{written!r} for a line that is made {shape}", "drop it: the parts say the shape"
        if written == "voigt" and not shape:
            right = 'give its parts: lorentzian = "3 kHz", gaussian = "5 kHz"'
            yield "profile", "profile = 'voigt' with one width", right

    @classmethod
    def _pressure_rules(cls, given: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
        coefficients = [key for key in ("pressure_coefficient", "pressure_half_coefficient") if key in given]
        if len(coefficients) == 2:
            yield coefficients[1], "both a full and a half coefficient", "give one of them"
        if coefficients and "pressure" not in given:
            yield coefficients[0], f"{coefficients[0]} without pressure", 'write pressure = "0.5 Pa" too'
        if "pressure" in given and not coefficients and set(given) & {"natural", "lifetime", "saturation", "laser"}:
            yield (
                "pressure",
                "pressure without a coefficient",
                'write pressure_coefficient = "80 kHz/Pa" (full width) too',
            )
        if {"natural", "lifetime"} <= set(given):
            yield "lifetime", "both natural and lifetime", "give one of them"
        if "saturation" in given and not set(given) & set(HOMOGENEOUS):
            yield "saturation", "saturation of no homogeneous width", "write natural, lifetime or a pressure width too"

    def parts(self) -> dict[str, tuple[str, Array]]:
        """Each contribution to a composed width: its kind (lorentzian or gaussian) and full width in Hz."""
        found: dict[str, tuple[str, Array]] = {}
        if self.natural is not None:
            found["natural"] = ("lorentzian", self.natural)
        if self.lifetime is not None:
            found["natural"] = ("lorentzian", natural_width(self.lifetime))
        if self.pressure is not None and self.pressure_coefficient is not None:
            found["pressure"] = ("lorentzian", np.asarray(self.pressure_coefficient * self.pressure))
        if self.pressure is not None and self.pressure_half_coefficient is not None:
            found["pressure"] = ("lorentzian", np.asarray(2.0 * self.pressure_half_coefficient * self.pressure))
        if self.saturation is not None:
            bare = sum((width for _, width in found.values()), np.zeros(()))
            found["power"] = ("lorentzian", np.asarray(power_broadened(bare, self.saturation) - bare))
        if self.laser is not None:
            found["laser"] = ("gaussian", np.asarray(self.photons * self.laser))
        if self.beam_radius is not None and self.speed is not None:
            found["transit"] = ("gaussian", transit_width(self.speed, self.beam_radius, self.photons))
        if self.temperature is not None and self.mass is not None and self.frequency is not None:
            found["Doppler"] = ("gaussian", doppler_width(self.frequency, self.temperature, self.mass))
        return found

    @cached_property
    def lorentzian_width(self) -> Array | None:
        """Sum of the Lorentzian parts; None where there is none."""
        if self.lorentzian is not None:
            return self.lorentzian
        widths = [width for kind, width in self.parts().values() if kind == "lorentzian"]
        return np.asarray(sum(widths, np.zeros(()))) if widths else None

    @cached_property
    def gaussian_width(self) -> Array | None:
        """Root of the sum of squares of the Gaussian parts; None where there is none."""
        if self.gaussian is not None:
            return self.gaussian
        widths = [width for kind, width in self.parts().values() if kind == "gaussian"]
        return np.asarray(np.sqrt(sum((width**2 for width in widths), np.zeros(())))) if widths else None

    @cached_property
    def width(self) -> Array | None:
        """Full width of the whole line; None where nothing says it."""
        if self.fwhm is not None:
            return self.fwhm
        low, high = self.lorentzian_width, self.gaussian_width
        if low is None or high is None:
            return high if low is None else low
        return voigt_width(low, high)

    @property
    def lorentzian_share(self) -> Array | None:
        """fL/(fL + fG) of a Voigt line; None for another shape."""
        if self.lorentzian_width is None or self.gaussian_width is None:
            return None
        return np.asarray(self.lorentzian_width / (self.lorentzian_width + self.gaussian_width))

    @property
    def shape(self) -> str:
        """lorentzian, gaussian or voigt."""
        low, high = self.lorentzian_width, self.gaussian_width
        if low is None and high is None:
            return self.profile
        return "voigt" if low is not None and high is not None else "gaussian" if low is None else "lorentzian"


def shape_of(given: set[str]) -> str:
    """The shape that the written parts make; empty where only a whole width is given."""
    low = bool(given & {"lorentzian", "natural", "lifetime", "pressure_coefficient", "pressure_half_coefficient"})
    high = bool(given & {"gaussian", "laser", "beam_radius", "temperature"})
    return "voigt" if low and high else "lorentzian" if low else "gaussian" if high else ""
