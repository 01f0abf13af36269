"""Units against a stock registry and CODATA."""

from __future__ import annotations

from functools import cache
from typing import Any

import pytest
from scipy import constants

from pvfeas.errors import QuantityError
from pvfeas.units import PREFIXES, TABLES, unit_factor

# name of ours: name in the stock registry, where they differ
STOCK = {"u": "dalton", "Da": "dalton", "wk": "week", "yr": "julian_year", "a": "julian_year",
         "Torr": "torr", "mTorr": "millitorr", "%": "percent", "d": "day", "‰": "permille"}  # fmt: skip
BASE = {"s": "s", "kg": "kg", "m": "m", "Pa": "Pa", "1": ""}


@cache
def stock() -> Any:
    import pint

    return pint.UnitRegistry()


@pytest.mark.parametrize("canonical", BASE)
def test_plain_units_against_a_stock_registry(canonical: str) -> None:
    """1e-9: the digits of the stock registry's own CODATA values."""
    for symbol, factor in TABLES[canonical].items():
        if symbol in ("", "1", "month"):  # a month is a twelfth of a year, below
            continue
        base = next((name for name in STOCK if symbol.endswith(name) and symbol[: -len(name)] in PREFIXES), None)
        spelt = symbol if base is None or symbol in ("min",) else symbol[: -len(base)] + STOCK[base]
        if symbol[-1:] == "a" and base == "a" and symbol != "a":
            spelt = symbol  # Pa, mPa, Da …
        spelt = STOCK.get(symbol, spelt)
        expected = (
            stock().Quantity(1.0, spelt).to(BASE[canonical]).magnitude if BASE[canonical] else stock()(spelt).to("").m
        )
        assert float(factor) == pytest.approx(expected, rel=1e-9), symbol


def test_a_month_is_a_twelfth_of_a_year() -> None:
    assert unit_factor("month", "s") * 12 == unit_factor("yr", "s") == 365.25 * 86400


def test_energy_equivalents_against_codata() -> None:
    """The equivalents in hertz that scipy tabulates."""
    value = constants.physical_constants
    expected = {
        "eV": value["electron volt-hertz relationship"][0],
        "J": value["joule-hertz relationship"][0],
        "K": value["kelvin-hertz relationship"][0],
        "cm^-1": value["inverse meter-hertz relationship"][0] * 100,
        "J/mol": value["joule-hertz relationship"][0] / constants.N_A,
        "E_h": value["hartree-hertz relationship"][0],
    }
    for symbol, hertz in expected.items():
        assert unit_factor(symbol, "Hz") == pytest.approx(hertz, rel=2e-10), symbol  # ten printed digits; E_h 2018/2022


@pytest.mark.parametrize(
    ("text", "canonical", "spelt", "base"),
    [
        ("kHz/Pa", "Hz/Pa", "kHz/Pa", "Hz/Pa"), ("MHz/Torr", "Hz/Pa", "MHz/torr", "Hz/Pa"), ("mg/h", "kg/s", "mg/hour", "kg/s"),
        ("GHz/atm", "Hz/Pa", "GHz/atm", "Hz/Pa"), ("µm/ms", "m/s", "µm/ms", "m/s"), ("mHz/d", "Hz/s", "mHz/day", "Hz/s"),
        ("g/wk", "kg/s", "g/week", "kg/s"),
    ],
)  # fmt: skip
def test_compound_units_against_a_stock_registry(text: str, canonical: str, spelt: str, base: str) -> None:
    expected = stock().Quantity(1.0, spelt).to(base).magnitude
    assert unit_factor(text, canonical) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "canonical", "word"),
    [
        ("rad/s", "Hz", "2 pi"), ("krad/s", "Hz", "2 pi"), ("ppb", "1", "1e-9"), ("ppt", "1", "1e-12"), ("a.u.", "Hz", "E_h"),
        ("Hz", "s", "time"), ("KHz", "Hz", "kHz"), ("hz", "Hz", "Hz"), ("Hz", "1/s", "1/s"), ("mg/m", "kg/s", "mg/h"),
        ("kHz/bar/s", "Hz/Pa", "kHz/Pa"), ("torrs", "Pa", "Torr"),
    ],
)  # fmt: skip
def test_what_a_unit_cannot_be(text: str, canonical: str, word: str) -> None:
    with pytest.raises(QuantityError) as caught:
        unit_factor(text, canonical)
    assert word in f"{caught.value.found}; {caught.value.wanted}"


def test_wavenumbers_are_not_centimetres_minus_one() -> None:
    assert unit_factor("cm-1", "Hz") == unit_factor("cm^-1", "Hz") == unit_factor("1/cm", "Hz") == 29979245800.0
