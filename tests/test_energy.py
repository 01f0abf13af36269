"""Energy equivalents against the exact SI ratios and CODATA, and published worked examples."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from pvfeas.constants import HARTREE_HZ, RYDBERG_PER_METRE
from pvfeas.energy import convert, difference, doppler_energy, number_density
from pvfeas.units import unit_factor

CHECKS = json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
UNITS = [one for one in CHECKS if one["id"].startswith("units.")]
HARTREES = [one for one in CHECKS if one["id"].startswith("hartree.2022")]
NAMES = {"cm1": "cm^-1", "Hz": "Hz", "J": "J", "K": "K", "cm-1": "cm^-1"}


@pytest.mark.parametrize("check", UNITS, ids=lambda one: one["id"])
def test_exact_equivalents_to_fifteen_digits(check: dict) -> None:
    """Ratios of the exact SI constants (2019), 18 digits printed; the source stands in the file."""
    ((unit, amount),) = check["inputs"].items()
    target = check["id"].split("_to_")[1]
    found = float(convert(f"{amount} {NAMES.get(unit, unit)}", NAMES.get(target, target), 18).value)
    assert found == pytest.approx(float(check["expected"]), abs=0.0, **check["tolerance"])


@pytest.mark.parametrize("check", HARTREES, ids=lambda one: one["id"])
def test_hartree(check: dict) -> None:
    """CODATA 2022."""
    target = NAMES[check["id"].rpartition(".")[2]]
    found = convert("1 E_h", target, 18)
    assert float(found.value) == pytest.approx(check["expected"], abs=0.0, **check["tolerance"])


def test_constants() -> None:
    """CODATA 2018 and 2022 as listed."""
    listed = {one["id"]: one["expected"] for one in CHECKS}
    assert float(HARTREE_HZ["2018"][0]) == listed["hartree.2018.Hz"]
    assert float(RYDBERG_PER_METRE["2022"][0]) == listed["rydberg.2022"]


def test_worked_examples_of_the_literature() -> None:
    """Printed values: dithiine lines, alanine, CDBrClF, the iron complex, the O2 self-shift."""
    for wavenumber, printed in (("231.952319", 6.95375559), ("232.579861", 6.97256882), ("233.962001", 7.014004336)):
        # printed to nine or ten digits
        assert float(convert(f"{wavenumber} cm^-1", "THz").value) == pytest.approx(printed, abs=6e-9)
    assert float(convert("6.2 aeV", "J/mol").value) == pytest.approx(5.98e-13, rel=1e-3, abs=0.0)
    assert float(convert("1.76e-12 cm^-1", "Hz").value) == pytest.approx(52.8e-3, rel=1e-3)
    assert doppler_energy("14.4125 keV", 0.004e-3) == pytest.approx(46.50e3, rel=1e-4)
    # -9.381e-21 GHz cm^3 per molecule at 296 K is -2.30 kHz/Pa
    assert -9.381e-21 * 1e9 * 1e-6 * number_density(1.0, 296.0) == pytest.approx(-2.30e3, rel=2e-3)


def test_difference_keeps_what_floats_lose() -> None:
    """Twenty-four digits subtracted: 1.23456789e-16 cm^-1 is 3.7011414e-6 Hz."""
    found = difference("1000.000000000000000123456789 cm^-1", "1000 cm^-1", "Hz", 12)
    assert float(found.value) == pytest.approx(1.23456789e-16 * 29979245800.0, rel=1e-11, abs=0.0)


def test_pressure_coefficient() -> None:
    """1 cm^-1/atm is 295.87215 kHz/Pa."""
    assert unit_factor("cm^-1/atm", "Hz/Pa") == pytest.approx(295872.15, rel=1e-8)
