"""Every unit against a stock pint registry, CODATA through scipy.constants, and the traps of unit libraries."""

from __future__ import annotations

import itertools
import json
import subprocess
import sys
from functools import lru_cache
from pathlib import Path
from typing import Any

import pint
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants

from pvfeas.constants import ATOMIC_MASS_KG, HARTREE_HZ, PLANCK, RYDBERG_PER_METRE
from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Normal
from pvfeas.quantity import parse
from pvfeas.units import DEFINITIONS, TABLES, any_unit, compound, dimension_of, unit_factor

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
PREFIXES = {  # SI brochure, 9th edition, table 7, as far as this trade goes
    "": "", "q": "quecto", "r": "ronto", "y": "yocto", "z": "zepto", "a": "atto", "f": "femto", "p": "pico", "n": "nano",
    "µ": "micro", "u": "micro", "m": "milli", "k": "kilo", "M": "mega", "G": "giga", "T": "tera", "P": "peta", "E": "exa",
}  # fmt: skip
SI = {"s": "s", "kg": "kg", "m": "m", "K": "K", "Pa": "Pa", "1": "", "1/s": "1/s"}


def prefixed(symbol: str, name: str) -> dict[str, str]:
    return {short + symbol: long + name for short, long in PREFIXES.items()}


CLOCK = {"min": "minute", "h": "hour", "d": "day", "wk": "week", "month": "month", "yr": "year", "a": "year"}
SPELLED: dict[str, dict[str, str]] = {  # what pint calls them
    "Hz": prefixed("Hz", "hertz") | prefixed("eV", "electron_volt") | prefixed("J", "joule")
    | {"K": "kelvin", "mK": "millikelvin", "µK": "microkelvin"}
    | {"J/mol": "joule/mole", "kJ/mol": "kilojoule/mole", "kcal/mol": "kilocalorie/mole"}
    | dict.fromkeys(("cm^-1", "cm-1", "1/cm", "cm⁻¹"), "1/centimeter") | dict.fromkeys(("E_h", "Eh", "hartree"), "hartree"),
    "s": {short + "s": PREFIXES[short] + "second" for short in ("", "m", "µ", "u", "n", "p")} | CLOCK,
    "kg": prefixed("g", "gram") | dict.fromkeys(("u", "Da"), "dalton"),
    "m": prefixed("m", "meter") | {"cm": "centimeter"},
    "K": prefixed("K", "kelvin"),
    "Pa": prefixed("Pa", "pascal") | {"bar": "bar", "mbar": "millibar", "Torr": "torr", "mTorr": "millitorr", "atm": "atmosphere"},
    "1": {"": "dimensionless", "1": "dimensionless", "%": "percent", "‰": "permille", "ppm": "ppm"},
    "1/s": dict.fromkeys(("1/s", "/s", "s^-1"), "1/second") | dict.fromkeys(("1/ms", "/ms"), "1/millisecond")
    | dict.fromkeys(("1/min", "/min"), "1/minute") | dict.fromkeys(("1/h", "/h"), "1/hour"),
}  # fmt: skip
ALL = [(canonical, symbol) for canonical, table in TABLES.items() for symbol in table]
# two exact decimals, one division: four roundings to double precision in either library
ROUNDED = 1e-15


def close(value: float, rel: float = ROUNDED) -> Any:
    """Relative only: pytest.approx alone would let everything below 1e-12 pass."""
    return pytest.approx(value, rel=rel, abs=0.0)


@lru_cache(maxsize=1)
def stock() -> Any:
    return pint.UnitRegistry()


def in_hertz(quantity: Any) -> float:
    """E/h, h c times a wavenumber, k T/h, energy of a mole over the Avogadro constant: scipy's exact constants."""
    base = quantity.to_base_units()
    value, dimension = float(base.magnitude), {str(name): power for name, power in base.dimensionality.items()}
    energy = {"[mass]": 1, "[length]": 2, "[time]": -2}
    if dimension == {"[time]": -1}:
        return value
    if dimension == {"[length]": -1}:
        return value * constants.c
    if dimension == {"[temperature]": 1}:
        return value * constants.k / constants.h
    if dimension == energy | {"[substance]": -1}:
        return value / constants.N_A / constants.h
    assert dimension == energy
    return value / constants.h


def expected_factor(canonical: str, symbol: str) -> float:
    quantity = stock().Quantity(1.0, SPELLED[canonical][symbol])
    return in_hertz(quantity) if canonical == "Hz" else float(quantity.to(SI[canonical]).magnitude)


def test_every_unit_is_tried() -> None:
    """The symbols of the registry and those spelled out here are the same."""
    assert {canonical: set(table) for canonical, table in TABLES.items()} == {
        canonical: set(table) for canonical, table in SPELLED.items()
    }


MEASURED = {"u": "dalton", "Da": "dalton", "E_h": "hartree", "Eh": "hartree", "hartree": "hartree"}


@pytest.mark.parametrize(("canonical", "symbol"), [pair for pair in ALL if pair[1] not in MEASURED])
def test_every_unit_against_a_stock_registry(canonical: str, symbol: str) -> None:
    assert unit_factor(symbol, canonical) == close(expected_factor(canonical, symbol))
    assert float(TABLES[canonical][symbol]) == unit_factor(symbol, canonical)


@pytest.mark.parametrize(("canonical", "symbol"), [pair for pair in ALL if pair[1] in MEASURED])
def test_measured_units(canonical: str, symbol: str) -> None:
    """Within three standard uncertainties of whichever CODATA adjustment scipy carries; pint's may be older."""
    name = {"Hz": "hartree-hertz relationship", "kg": "atomic mass constant"}[canonical]
    value, _, uncertainty = constants.physical_constants[name]
    found = unit_factor(symbol, canonical)
    assert found == pytest.approx(value, rel=0.0, abs=3 * uncertainty)
    assert found == close(expected_factor(canonical, symbol), 1e-9)  # adjustments since 2010 differ by less


def test_codata_2022_as_printed() -> None:
    """Mohr et al. 2025, Rev. Mod. Phys. 97, 025002: the digits of the recommended values."""
    assert unit_factor("u", "kg") == 1.66053906892e-27
    assert unit_factor("E_h", "Hz") == 6.5796839204999e15


# energy equivalents


@pytest.mark.parametrize(
    "check", [one for name, one in CHECKS.items() if name.startswith("units.")], ids=lambda one: one["id"]
)
def test_the_factors_that_studies_use(check: dict[str, Any]) -> None:
    """The same exact SI ratios as convert() is tested with, here of the plain factors."""
    ((source, amount),) = check["inputs"].items()
    target = check["id"].split("_to_")[1]
    found = amount * unit_factor(source, "Hz") / unit_factor(target, "Hz")
    assert found == close(float(check["expected"]), check["tolerance"]["rel"])


@pytest.mark.parametrize(
    "check", [one for name, one in CHECKS.items() if name.startswith("hartree.")], ids=lambda one: one["id"]
)
def test_hartree_of_both_adjustments(check: dict[str, Any]) -> None:
    """Printed J, Hz, cm^-1 and K of CODATA 2018 and 2022 agree through the exact constants, within their digits."""
    _, year, target = check["id"].split(".")
    hertz = float(HARTREE_HZ[year][0])
    unit = {"cm1": "cm^-1"}.get(target, target)
    assert hertz / unit_factor(unit, "Hz") == close(check["expected"], check["tolerance"]["rel"])
    uncertainty = float(HARTREE_HZ[year][1]) / unit_factor(unit, "Hz")
    assert uncertainty == close(check["inputs"]["std_unc"], 0.03)  # printed to two digits


def test_hartree_is_two_rydberg() -> None:
    """E_h/h = 2 R c, within half the last printed digits: 500 or 50 Hz, and 5e-7 1/m, which is 300 Hz."""
    for year, digits in (("2018", 500.0), ("2022", 50.0)):
        found = float(HARTREE_HZ[year][0]) - 2 * float(RYDBERG_PER_METRE[year][0]) * constants.c
        assert abs(found) <= digits + 300.0
    assert float(RYDBERG_PER_METRE["2022"][0]) == CHECKS["rydberg.2022"]["expected"]
    assert float(PLANCK) == constants.h
    assert float(ATOMIC_MASS_KG["2018"][0]) == 1.66053906660e-27


# compound units


COMPOUND = [
    ("kHz/Pa", "Hz/Pa", "kilohertz/pascal"),
    ("MHz/Torr", "Hz/Pa", "megahertz/torr"),
    ("Hz/mbar", "Hz/Pa", "hertz/millibar"),
    ("kHz / Pa", "Hz/Pa", "kilohertz/pascal"),
    ("kHz·Pa^-1", "Hz/Pa", "kilohertz/pascal"),
    ("GHz/atm", "Hz/Pa", "gigahertz/atmosphere"),
    ("1/(Pa*s)", "Hz/Pa", "1/pascal/second"),
    ("mg/h", "kg/s", "milligram/hour"),
    ("µg/d", "kg/s", "microgram/day"),
    ("ug/min", "kg/s", "microgram/minute"),
    ("g/wk", "kg/s", "gram/week"),
    ("kg/yr", "kg/s", "kilogram/year"),
    ("m/s", "m/s", "meter/second"),
    ("mm/µs", "m/s", "millimeter/microsecond"),
    ("µm*kHz", "m/s", "micrometer*kilohertz"),
    ("mHz/s", "Hz/s", "millihertz/second"),
    ("kHz/d", "Hz/s", "kilohertz/day"),
    ("Hz/sqrt(Hz)", "Hz^0.5", "hertz**0.5"),
    ("mHz/sqrt(Hz)", "Hz^0.5", "millihertz/hertz**0.5"),
    ("Hz*s^0.5", "Hz^0.5", "hertz*second**0.5"),
    ("%/h", "1/s", "percent/hour"),
    ("1/d", "1/s", "1/day"),
    ("1/s", "Hz", "hertz"),
]


@pytest.mark.parametrize(("text", "canonical", "spelled"), COMPOUND)
def test_compound_units(text: str, canonical: str, spelled: str) -> None:
    quantity = stock().Quantity(1.0, spelled).to_base_units()
    assert unit_factor(text, canonical) == close(float(quantity.magnitude), 2e-15)  # up to six factors
    assert any_unit(text) == (unit_factor(text, canonical), dimension_of(canonical))
    assert dict(dimension_of(canonical)) == {str(name): float(power) for name, power in quantity.dimensionality.items()}


@pytest.mark.parametrize("wavenumber", ["cm^-1", "cm-1", "cm⁻¹"])
def test_wavenumbers_in_compounds(wavenumber: str) -> None:
    """1 cm^-1/atm is c/(0.01 m)/101325 Pa; never a centimetre minus one."""
    assert unit_factor(f"{wavenumber}/atm", "Hz/Pa") == close(constants.c * 100 / constants.atm)


WORDS = {
    "second": "second", "s": "second", "minute": "minute", "min": "minute", "hour": "hour", "h": "hour", "day": "day",
    "d": "day", "week": "week", "wk": "week", "month": "month", "year": "year", "yr": "year", "hertz": "hertz",
    "Hz": "hertz", "meter": "meter", "m": "meter", "gram": "gram", "g": "gram", "dalton": "dalton", "u": "dalton",
    "Da": "dalton", "kelvin": "kelvin", "K": "kelvin", "mole": "mole", "mol": "mole", "pascal": "pascal", "Pa": "pascal",
    "bar": "bar", "torr": "torr", "Torr": "torr", "atmosphere": "atmosphere", "atm": "atmosphere", "molecule": "count",
    "joule": "joule", "J": "joule", "electronvolt": "electron_volt", "eV": "electron_volt",
    "wavenumber": "1/centimeter", "percent": "percent",
}  # fmt: skip
ENERGIES = ("joule", "electron_volt", "1/centimeter")


def test_every_word_of_the_compound_registry_is_tried() -> None:
    """Names stand before and after the equals signs of the definitions."""
    names = set()
    for line in DEFINITIONS.split("\n"):
        first, _, *aliases = [part.strip() for part in line.split("=")] if line else ["", ""]
        names |= {first, *aliases} - {""}
    assert names == set(WORDS)


@pytest.mark.parametrize("word", sorted(WORDS))
def test_every_word_of_the_compound_registry(word: str) -> None:
    quantity = stock().Quantity(1.0, WORDS[word])
    factor, dimension = compound(word)
    rel = 1e-9 if WORDS[word] == "dalton" else ROUNDED  # measured: pint's may be of an older adjustment
    if WORDS[word] in ENERGIES:
        assert (factor, dimension) == (close(in_hertz(quantity)), (("[time]", -1.0),))
        return
    base = quantity.to_base_units()
    assert factor == close(float(base.magnitude), rel)
    assert dict(dimension) == {str(name): float(power) for name, power in base.dimensionality.items()}


@settings(deadline=None)
@given(st.sampled_from(sorted(PREFIXES)), st.sampled_from(sorted(PREFIXES)))
def test_prefixes_in_compounds(first: str, second: str) -> None:
    quantity = stock().Quantity(1.0, f"{PREFIXES[first]}hertz/{PREFIXES[second]}pascal").to_base_units()
    assert unit_factor(f"{first}Hz/{second}Pa", "Hz/Pa") == close(float(quantity.magnitude))


# what is refused


@pytest.mark.parametrize(
    ("owner", "canonical"),
    [pair for pair in itertools.permutations(TABLES, 2) if set(pair) not in ({"Hz", "1/s"}, {"Hz", "K"})],
)
def test_units_of_another_dimension_are_refused(owner: str, canonical: str) -> None:
    for symbol in TABLES[owner]:
        if symbol in TABLES[canonical] or (symbol == "" and canonical == "1"):
            assert canonical in ("Hz", "K", "kg", "s"), symbol  # K is an energy too; no symbol means two things else
            continue
        with pytest.raises(QuantityError) as caught:
            unit_factor(symbol, canonical)
        assert caught.value.wanted


def test_no_symbol_has_two_values() -> None:
    """But the kelvin, which is a temperature and an energy."""
    owners: dict[str, set[str]] = {}
    for canonical, symbol in ALL:
        owners.setdefault(symbol, set()).add(canonical)
    assert {symbol for symbol, several in owners.items() if len(several) > 1} == {"K", "mK", "µK"}


@pytest.mark.parametrize(
    "text", ["rad/s", "rad s^-1", "krad/s", "1 rad/s", "Mrad/s", "rad", "2*rad/s", "radian/second"]
)
@pytest.mark.parametrize("canonical", ["Hz", "1/s", "*"])
def test_an_angular_frequency_is_never_a_frequency(text: str, canonical: str) -> None:
    unit = text.removeprefix("1 ")
    with pytest.raises(QuantityError) as caught:
        parse(f"5 {unit}", canonical)
    if unit[0] != "2":
        assert "2 pi" in str(caught.value)


TRAPS = [
    ("ppb", "1", "1e-9"),
    ("ppt", "1", "1e-9"),
    ("ppb", "*", "1e-9"),
    ("a.u.", "Hz", "E_h"),
    ("au", "kg", "atomic mass"),
    ("a.u.", "*", "E_h"),
    ("kHz Pa", "Hz/Pa", "known"),
    ("% kHz", "Hz", "known"),
    ("k Hz", "Hz", "known"),
    ("cm - 1", "Hz", "known"),
    ("1/cm^3", "*", "known"),
    ("cm^-12", "Hz", "known"),
    ("Hz**99", "*", "known"),
    ("Hz^(9^9)", "*", "known"),
    ("EHz^9*EHz^9", "*", "range"),
    ("qHz^9*qHz^9", "*", "range"),
    ("Hz+Hz", "Hz", "known"),
    ("__class__", "*", "known"),
    ("Hz.magnitude", "*", "known"),
    ("[time]", "*", "known"),
    ("kHz/Pa", "Hz", "dimension"),
    ("Hz", "1/s", "1/s"),
    ("Hz", "s", "a frequency"),
    ("FWHM", "s", "known"),
]


@pytest.mark.parametrize(("unit", "canonical", "words"), TRAPS)
def test_traps(unit: str, canonical: str, words: str) -> None:
    with pytest.raises(QuantityError) as caught:
        any_unit(unit) if canonical == "*" else unit_factor(unit, canonical)
    assert words in str(caught.value)
    assert caught.value.wanted


@pytest.mark.parametrize(
    ("typo", "canonical", "meant"),
    [("khz", "Hz", "kHz"), ("KHz", "Hz", "kHz"), ("Mhz", "Hz", "Hz"), ("hz", "Hz", "Hz"), ("ev", "Hz", "eV"), ("torr", "Pa", "Torr"),
     ("mins", "s", "min"), ("hartrees", "Hz", "hartree"), ("MBar", "Pa", "mbar")],
)  # fmt: skip
def test_typos_get_a_suggestion(typo: str, canonical: str, meant: str) -> None:
    with pytest.raises(QuantityError) as caught:
        unit_factor(typo, canonical)
    assert "did you mean" in caught.value.wanted
    assert meant in caught.value.wanted


def test_values_that_unit_libraries_misread() -> None:
    """Own point or last digits, both micro signs, minus signs, wavenumbers: never as stock pint reads them."""
    assert parse("1.23(4) Hz", "Hz").law == Normal(1.23, 0.04)
    assert parse("100(3) Hz", "Hz").law == Normal(100.0, 3.0)
    assert parse("5 cm-1", "Hz").law == Exact(5 * 29979245800.0)
    assert parse("5 \u00b5Hz", "Hz").law == parse("5 \u03bcHz", "Hz").law == parse("5 uHz", "Hz").law
    assert parse("5 cm\u22121", "Hz").law == parse("5 cm^-1", "Hz").law
    assert parse("1.23 Hz", "Hz").law == Exact(1.23)


def test_plain_symbols_need_no_registry() -> None:
    """pint takes 0.3 s to import."""
    code = (
        "import sys; from pvfeas.units import TABLES, unit_factor, any_unit;"
        "[unit_factor(s, c) for c, t in TABLES.items() for s in t]; any_unit('kHz'); print('pint' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
