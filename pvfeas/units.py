"""Units of the trade, as factors to the units that the numbers use: Hz, s, kg, m, K, Pa, 1.

Energies count as frequencies (E/h). Plain symbols come from a table; compound text goes to a
unit registry of our own that knows the trade's units only.
"""

from __future__ import annotations

import re
from decimal import Decimal
from functools import lru_cache
from typing import Any

from pvfeas.constants import (
    ATOMIC_MASS_KG,
    AVOGADRO,
    BOLTZMANN,
    CALORIE,
    ELEMENTARY_CHARGE,
    HARTREE_HZ,
    PLANCK,
    SPEED_OF_LIGHT,
)
from pvfeas.errors import QuantityError
from pvfeas.suggestions import did_you_mean

PREFIXES = {
    "": 0, "q": -30, "r": -27, "y": -24, "z": -21, "a": -18, "f": -15, "p": -12, "n": -9, "µ": -6, "u": -6, "m": -3,
    "k": 3, "M": 6, "G": 9, "T": 12, "P": 15, "E": 18,
}  # fmt: skip
MINUTE, HOUR, DAY, WEEK = 60, 3600, 86400, 604800
YEAR = 31557600  # Julian year, 365.25 d


def _prefixed(symbol: str, factor: Decimal) -> dict[str, Decimal]:
    return {prefix + symbol: factor.scaleb(power) for prefix, power in PREFIXES.items()}


def _energies() -> dict[str, Decimal]:
    joule, per_mole = 1 / PLANCK, 1 / (PLANCK * AVOGADRO)
    wavenumber = SPEED_OF_LIGHT * 100
    table = _prefixed("Hz", Decimal(1)) | _prefixed("eV", ELEMENTARY_CHARGE / PLANCK) | _prefixed("J", joule)
    table |= {"K": BOLTZMANN / PLANCK, "mK": BOLTZMANN / PLANCK / 1000, "µK": BOLTZMANN / PLANCK / 1000000}
    table |= {"J/mol": per_mole, "kJ/mol": per_mole * 1000, "kcal/mol": per_mole * 1000 * CALORIE}
    table |= dict.fromkeys(("cm^-1", "cm-1", "1/cm", "cm⁻¹"), wavenumber)
    return table | dict.fromkeys(("E_h", "Eh", "hartree"), HARTREE_HZ["2022"][0])


def _times() -> dict[str, Decimal]:
    table = {prefix + "s": Decimal(1).scaleb(PREFIXES[prefix]) for prefix in ("", "m", "µ", "u", "n", "p")}
    longer = {"min": MINUTE, "h": HOUR, "d": DAY, "wk": WEEK, "month": YEAR / 12, "yr": YEAR, "a": YEAR}
    return table | {symbol: Decimal(factor) for symbol, factor in longer.items()}


TABLES: dict[str, dict[str, Decimal]] = {
    "Hz": _energies(),
    "s": _times(),
    "kg": _prefixed("g", Decimal("1e-3")) | {"u": ATOMIC_MASS_KG["2022"][0], "Da": ATOMIC_MASS_KG["2022"][0]},
    "m": _prefixed("m", Decimal(1)) | {"cm": Decimal("0.01")},
    "K": _prefixed("K", Decimal(1)),
    "Pa": _prefixed("Pa", Decimal(1))
    | {"bar": Decimal(100000), "mbar": Decimal(100), "Torr": Decimal(101325) / 760, "mTorr": Decimal("101.325") / 760}
    | {"atm": Decimal(101325)},
    "1": {"": Decimal(1), "1": Decimal(1), "%": Decimal("0.01"), "‰": Decimal("0.001"), "ppm": Decimal("1e-6")},
    "1/s": {"1/s": Decimal(1), "/s": Decimal(1), "s^-1": Decimal(1), "1/ms": Decimal(1000), "/ms": Decimal(1000)}
    | {"1/min": 1 / Decimal(MINUTE), "/min": 1 / Decimal(MINUTE), "1/h": 1 / Decimal(HOUR), "/h": 1 / Decimal(HOUR)},
}  # fmt: skip
EXAMPLES = {
    "Hz": "Hz, kHz, cm^-1 or eV", "s": "s, ms, h or d", "kg": "mg or g", "m": "mm", "K": "K", "Pa": "Pa or mbar",
    "1": "no unit, or %", "1/s": "1/s", "kg/s": "mg/h", "Hz/Pa": "kHz/Pa", "m/s": "m/s", "Hz/s": "Hz/s",
}  # fmt: skip
NAMES = {
    "Hz": "a frequency", "s": "a time", "kg": "a mass", "m": "a length", "K": "a temperature", "Pa": "a pressure",
    "1": "a plain number", "1/s": "a rate", "kg/s": "a mass per time", "Hz/Pa": "a frequency per pressure",
    "m/s": "a speed", "Hz/s": "a frequency per time",
}  # fmt: skip


NO_UNIT = "there is no unit"


def wanted(canonical: str) -> str:
    """What would be right, in words."""
    name = NAMES.get(canonical, f"a quantity in {canonical}")
    return f"{name} is needed here, in {EXAMPLES.get(canonical, canonical)}"


def tidy(unit: str) -> str:
    """One spelling of the micro sign and of minus; outer spaces gone."""
    return unit.strip().replace("\u03bc", "µ").replace("\u2212", "-")


@lru_cache(maxsize=4096)
def unit_factor(unit: str, canonical: str) -> float:
    """How many canonical units one unit is. QuantityError for a wrong or unknown unit."""
    symbol = tidy(unit)
    table = TABLES.get(canonical, {})
    if symbol in table:
        return float(table[symbol])
    (above, _, below), (top, _, bottom) = symbol.partition("/"), canonical.partition("/")
    if bottom and above in TABLES.get(top, {}) and below in TABLES.get(bottom, {}):
        return float(TABLES[top][above] / TABLES[bottom][below])
    _refuse_ambiguous(symbol, canonical)
    if not any(sign in symbol for sign in "/*·^ ()"):
        raise QuantityError(_found(symbol, canonical), _hint(symbol, canonical))
    factor, dimension = compound(symbol, canonical)
    if dimension != dimension_of(canonical):
        raise QuantityError(f"{symbol!r} has another dimension", wanted(canonical))
    return factor


def _found(symbol: str, canonical: str) -> str:
    known = any(symbol in table for table in TABLES.values())
    if symbol == "":
        return NO_UNIT
    return f"{symbol!r} is {_owner(symbol)}" if known else f"{symbol!r} is no unit that is known here"


def _owner(symbol: str) -> str:
    return next(f"the unit of {NAMES[canonical]}" for canonical, table in TABLES.items() if symbol in table)


def _hint(symbol: str, canonical: str) -> str:
    if any(symbol in table for table in TABLES.values()) or symbol == "":
        return wanted(canonical)
    near = did_you_mean(symbol, TABLES.get(canonical, {}))
    return f"{near} ({wanted(canonical)})" if near else wanted(canonical)


def _refuse_ambiguous(symbol: str, canonical: str) -> None:
    if symbol.startswith("rad") and canonical in ("Hz", "1/s"):
        raise QuantityError(
            f"{symbol!r} is an angular frequency",
            "divide by 2 pi (6.283185…) yourself and write Hz: nothing is assumed",
        )
    if symbol in ("ppb", "ppt", "ppq"):
        raise QuantityError(f"{symbol!r} means different things to different people", "write 1e-9 or 1e-12 instead")
    if symbol in ("a.u.", "au"):
        raise QuantityError(f"{symbol!r} may be many units", "write E_h for hartree, u for the atomic mass unit")
    if canonical == "1/s" and symbol in TABLES["Hz"]:
        raise QuantityError(f"{symbol!r} is a unit of frequency", "a rate of counts is written in 1/s")


DEFINITIONS = """
second = [time] = s
minute = 60 * second = min
hour = 3600 * second = h
day = 86400 * second = d
week = 604800 * second = wk
month = 2629800 * second
year = 31557600 * second = yr
hertz = 1 / second = Hz
meter = [length] = m
gram = [mass] = g
dalton = 1.66053906892e-24 * gram = u = Da
kelvin = [temperature] = K
mole = [substance] = mol
pascal = 1000 * gram / meter / second ** 2 = Pa
bar = 1e5 * pascal
torr = 133.32236842105263 * pascal = Torr
atmosphere = 101325 * pascal = atm
molecule = []
joule = 1.5091901796421518e33 * hertz = J
electronvolt = 2.4179892420849183e14 * hertz = eV
wavenumber = 29979245800 * hertz
percent = 0.01
"""


WORD = r"(?:[A-Za-zµ_]{1,12}(?:\*\*\(?-?(?:[1-9]|0\.5)\)?)?|1)"
GROUP = rf"(?:{WORD}|\({WORD}(?:[*/]{WORD}){{0,3}}\))"
WAVENUMBER = re.compile(r"(?<![A-Za-zµ_])cm(?:(?:\*\*)?-1|⁻¹)(?!\d)|(?<![\w/*])1/cm(?![\w*])")
PLAIN_COMPOUND = re.compile(rf"/?{GROUP}(?:[*/]{GROUP}){{0,5}}")


@lru_cache(maxsize=1)
def _registry() -> Any:
    import pint

    registry: Any = pint.UnitRegistry(None, cache_folder=None, on_redefinition="raise")
    lines = [f"{name}- = 1e{power}" for name, power in PREFIXES.items() if name and name != "µ"]
    registry.load_definitions([*lines, "µ- = 1e-6", *(line for line in DEFINITIONS.splitlines() if line)])
    return registry


def _plain(symbol: str) -> str:
    """A compound unit in the notation of the registry; what stays apart by spaces alone stays so and is refused."""
    text = re.sub(r"\s*([*/·()^])\s*", r"\1", "1" + symbol if symbol.startswith("/") else symbol)
    text = text.replace("%", "percent").replace("·", "*").replace("sqrt(Hz)", "Hz**0.5").replace("^", "**")
    return WAVENUMBER.sub("wavenumber", text)


def compound(symbol: str, canonical: str = "") -> tuple[float, tuple[tuple[str, float], ...]]:
    """Factor and dimension of a compound unit such as kHz/Pa, through the registry."""
    import pint

    text = _plain(symbol)
    if "rad" in text:
        raise QuantityError(f"{symbol!r} has radians in it", "divide by 2 pi yourself and write Hz: nothing is assumed")
    right = wanted(canonical) if canonical else "a known unit is needed"
    if not PLAIN_COMPOUND.fullmatch(text):
        raise QuantityError(f"{symbol[:60]!r} is no unit that is known here", right)
    try:
        quantity = _registry().Quantity(1.0, text).to_base_units()
        in_range = 1e-300 <= float(quantity.magnitude) <= 1e300
    except (pint.errors.PintError, ValueError):
        raise QuantityError(f"{symbol!r} is no unit that is known here", right) from None
    except OverflowError:
        in_range = False
    if not in_range:
        raise QuantityError(f"{symbol!r} is out of any range", right)
    dimension = tuple(sorted((str(name), float(power)) for name, power in quantity.dimensionality.items()))
    # base units of the registry are g, m, s: masses come out in g
    grams = sum(power for name, power in dimension if name == "[mass]")
    return float(quantity.magnitude) * 1e-3**grams, dimension


@lru_cache(maxsize=64)
def dimension_of(canonical: str) -> tuple[tuple[str, float], ...]:
    """The dimension of a canonical unit, without loading the registry for the plain ones."""
    plain: dict[str, tuple[tuple[str, float], ...]] = {
        "1": (), "s": (("[time]", 1.0),), "Hz": (("[time]", -1.0),), "1/s": (("[time]", -1.0),),
        "kg": (("[mass]", 1.0),), "m": (("[length]", 1.0),), "K": (("[temperature]", 1.0),),
        "Pa": (("[length]", -1.0), ("[mass]", 1.0), ("[time]", -2.0)),
    }  # fmt: skip
    return plain[canonical] if canonical in plain else compound(canonical)[1]


def any_unit(unit: str) -> tuple[float, tuple[tuple[str, float], ...]]:
    """Factor and dimension of any unit of the trade, for products whose whole must fit."""
    symbol = tidy(unit)
    for canonical in ("1", "Hz", "s", "kg", "m", "Pa", "1/s"):
        if symbol in TABLES[canonical]:
            return float(TABLES[canonical][symbol]), dimension_of(canonical)
    for canonical in ("Hz", "1"):
        _refuse_ambiguous(symbol, canonical)
    return compound(symbol)
