"""Constants: exact SI values (9th SI brochure, 2019) and CODATA recommended values."""

from __future__ import annotations

from decimal import Decimal

PLANCK = Decimal("6.62607015e-34")  # J s, exact
ELEMENTARY_CHARGE = Decimal("1.602176634e-19")  # C, exact
BOLTZMANN = Decimal("1.380649e-23")  # J/K, exact
AVOGADRO = Decimal("6.02214076e23")  # 1/mol, exact
SPEED_OF_LIGHT = Decimal("299792458")  # m/s, exact
CALORIE = Decimal("4.184")  # J, thermochemical, exact by definition

# CODATA 2022 and 2018: value, standard uncertainty
HARTREE_HZ = {
    "2022": (Decimal("6.5796839204999e15"), Decimal("7.2e3")),
    "2018": (Decimal("6.579683920502e15"), Decimal("1.3e4")),
}
RYDBERG_PER_METRE = {
    "2022": (Decimal("10973731.568157"), Decimal("1.2e-5")),
    "2018": (Decimal("10973731.568160"), Decimal("2.1e-5")),
}
ATOMIC_MASS_KG = {
    "2022": (Decimal("1.66053906892e-27"), Decimal("5.2e-37")),
    "2018": (Decimal("1.66053906660e-27"), Decimal("5.0e-37")),
}
