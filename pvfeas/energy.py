"""Energy equivalents and differences at full precision (mpmath)."""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal
from typing import Any

import mpmath

from pvfeas.constants import BOLTZMANN, ELEMENTARY_CHARGE, HARTREE_HZ, PLANCK, SPEED_OF_LIGHT
from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Lognormal, Normal
from pvfeas.quantity import SINGLE, parse
from pvfeas.suggestions import did_you_mean
from pvfeas.units import TABLES, tidy

DIGITS = 60
TARGETS = ("Hz", "cm^-1", "eV", "J", "K", "J/mol", "kJ/mol", "kcal/mol", "E_h")


@dataclass(frozen=True)
class Converted:
    """A value in another unit, as decimal text, with its standard uncertainty where it has one."""

    value: str
    unit: str
    uncertainty: str | None = None

    def __str__(self) -> str:
        spread = "" if self.uncertainty is None else f" ± {self.uncertainty}"
        return f"{self.value}{spread} {self.unit}"


def factor(unit: str) -> Any:
    """Hz per unit, at 60 digits. QuantityError for what is no frequency or energy."""
    symbol = tidy(unit)
    if symbol not in TABLES["Hz"]:
        near = did_you_mean(symbol, TABLES["Hz"])
        raise QuantityError(f"{unit!r} is no unit of frequency or energy", near or f"use one of {', '.join(TARGETS)}")
    return _exact_factor(symbol)


def _exact_factor(symbol: str) -> Any:
    """The factors with divisions carried out at 60 digits, not at those of the table."""
    table = TABLES["Hz"]
    with mpmath.workdps(DIGITS):
        planck = mpmath.mpf(str(PLANCK))
        for stem, numerator in (("eV", ELEMENTARY_CHARGE), ("J", Decimal(1)), ("K", BOLTZMANN)):
            if symbol.endswith(stem) and "/" not in symbol:
                exact = mpmath.mpf(str(numerator)) / planck
                scale = table[symbol] / table[stem]
                return exact * mpmath.power(10, round(float(scale.log10())))
        if "/mol" in symbol:
            base = {"J/mol": 1, "kJ/mol": 1000, "kcal/mol": 4184}[symbol]
            return base / (planck * mpmath.mpf("6.02214076e23"))
        return mpmath.mpf(str(table[symbol]))


def convert(text: str, to: str, digits: int = 18) -> Converted:
    """A frequency or energy in another unit; a spread written with it is carried.

    E_h carries the uncertainty of CODATA 2022 (1.1e-12 relative) in combination.
    """
    target = factor(to)
    match = SINGLE.fullmatch(tidy(text))
    with mpmath.workdps(DIGITS):
        if match is not None and match["unit"]:
            hertz = mpmath.mpf(match["value"]) * factor(match["unit"])
            spread = mpmath.mpf(0)
            units = (match["unit"], to)
        else:
            law = parse(text, "Hz").law
            if isinstance(law, Normal):
                hertz, spread = mpmath.mpf(law.mean), mpmath.mpf(law.sd)
            elif isinstance(law, Exact):
                hertz, spread = mpmath.mpf(law.value), mpmath.mpf(0)
            else:
                what = "a factor" if isinstance(law, Lognormal) else "a range"
                raise QuantityError(
                    f'"{text}" has {what} for a spread', "convert a value, or a value ± its uncertainty"
                )
            units = ("", to)
        if any(one in ("E_h", "Eh", "hartree") for one in units) and tidy(units[0]) != tidy(to):
            value, sd = HARTREE_HZ["2022"]
            spread = mpmath.sqrt(spread**2 + (hertz * mpmath.mpf(str(sd / value))) ** 2)
        return _written(hertz / target, spread / abs(target), to, digits)


def difference(first: str, second: str, to: str, digits: int = 18) -> Converted:
    """first − second in a unit, at full precision: for values whose first twenty digits agree."""
    with mpmath.workdps(DIGITS):
        values = []
        for text in (first, second):
            match = SINGLE.fullmatch(tidy(text))
            if match is None:
                raise QuantityError(f'"{text}" cannot be subtracted', "an exact number with its unit is needed")
            values.append(mpmath.mpf(match["value"]) * factor(match["unit"]))
        return _written((values[0] - values[1]) / factor(to), mpmath.mpf(0), to, digits)


def _written(value: Any, spread: Any, unit: str, digits: int) -> Converted:
    text = mpmath.nstr(value, digits, min_fixed=-5, max_fixed=18, strip_zeros=True)
    return Converted(text, unit, mpmath.nstr(spread, 2, min_fixed=-5, max_fixed=18) if spread else None)


def doppler_energy(energy: str, velocity: float) -> float:
    """Energy shift E v/c in Hz of a source moving at a velocity in m/s (first-order Doppler effect)."""
    with mpmath.workdps(DIGITS):
        match = SINGLE.fullmatch(tidy(energy))
        if match is None:
            raise QuantityError(f'"{energy}"', "an exact energy is needed")
        return float(
            mpmath.mpf(match["value"]) * factor(match["unit"]) * mpmath.mpf(velocity) / mpmath.mpf(str(SPEED_OF_LIGHT))
        )


def number_density(pressure: float, temperature: float) -> float:
    """Ideal-gas number density p/(k T) in 1/m^3 from Pa and K."""
    return pressure / (float(BOLTZMANN) * temperature)
