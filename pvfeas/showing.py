"""Numbers as people read them: times in human units, frequencies with a prefix."""

from __future__ import annotations

import math

STEPS = (("s", 1.0, 120.0), ("min", 60.0, 7200.0), ("h", 3600.0, 86400.0), ("d", 86400.0, 63115200.0))
YEAR = 31557600.0
PREFIXES = {
    -24: "y",
    -21: "z",
    -18: "a",
    -15: "f",
    -12: "p",
    -9: "n",
    -6: "µ",
    -3: "m",
    0: "",
    3: "k",
    6: "M",
    9: "G",
    12: "T",
    15: "P",
}


def digits(value: float, count: int = 3) -> str:
    """A number with so many significant digits, trailing zeros kept, no exponent where avoidable."""
    if value == 0.0:
        return "0"
    if not math.isfinite(value):
        return "inf" if value > 0 else "-inf"
    rounded = float(f"{value:.{count - 1}e}")
    power = math.floor(math.log10(abs(rounded)))
    if -4 <= power < 7:
        return f"{rounded:.{max(count - 1 - power, 0)}f}"
    return f"{rounded:.{count - 1}e}"


def time_text(seconds: float | None, count: int = 3) -> str:
    """A time in s, min, h, d or yr."""
    if seconds is None:
        return "never"
    size = abs(seconds)
    if size < 0.1 and size > 0.0:
        return prefixed(seconds, "s", count)
    for unit, factor, end in STEPS:
        if size < end:
            return f"{digits(seconds / factor, count)} {unit}"
    return f"{digits(seconds / YEAR, count)} yr"


def prefixed(value: float, unit: str, count: int = 3) -> str:
    """A value with the prefix that leaves one to three digits before the point."""
    if value == 0.0 or not math.isfinite(value):
        return f"{digits(value, count)} {unit}"
    rounded = float(f"{value:.{count - 1}e}")
    power = 3 * math.floor(math.log10(abs(rounded)) / 3)
    power = min(max(power, -24), 15)
    return f"{digits(rounded / 10.0**power, count)} {PREFIXES[power]}{unit}"


def value_text(value: float | None, unit: str, count: int = 3) -> str:
    """A number with its unit, as tables and messages show it."""
    if value is None:
        return "-"
    if unit == "s":
        return time_text(value, count)
    if unit == "1":
        return digits(value, count)
    if unit == "kg":
        return prefixed(value * 1000.0, "g", count)
    if unit == "kg/s":
        return f"{prefixed(value * 1000.0 * 3600.0, 'g', count)}/h"
    if unit == "Hz s^0.5":
        return f"{prefixed(value, 'Hz', count)} s^0.5"
    return prefixed(value, unit, count)
