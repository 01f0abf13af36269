"""The grammar of quantities: every form against laws of scipy.stats or numbers worked out by hand."""

from __future__ import annotations

import math
import time
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Law, Lognormal, LogUniform, Normal, TwoPiece, Uniform
from pvfeas.quantity import Quantity, parse
from pvfeas.quantity_table import KEYS, exact_difference

PROBABILITIES = np.array([0.001, 0.025, 0.16, 0.5, 0.84, 0.975, 0.999])
ROUNDED = 4e-16  # relative: two roundings to double precision
PHI_1 = 0.15865525393145705  # Phi(-1), Abramowitz & Stegun 1964, table 26.1


def close(value: Any, rel: float = ROUNDED) -> Any:
    """Relative only: pytest.approx alone would let everything below 1e-12 pass."""
    return pytest.approx(value, rel=rel, abs=0.0)


def law_of(written: Any, unit: str = "Hz", **more: Any) -> Law:
    law = parse(written, unit, **more).law
    assert law is not None
    return law


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("60 kHz", "Hz", 60e3),
        ("60kHz", "Hz", 60e3),
        ("+60 kHz", "Hz", 60e3),
        ("-1.5e-3 Hz", "Hz", -1.5e-3),
        ("−1.5e−3 Hz", "Hz", -1.5e-3),
        ("  .5   Hz ", "Hz", 0.5),
        ("5. Hz", "Hz", 5.0),
        ("5E3 Hz", "Hz", 5e3),
        ("1 eV", "Hz", 2.417989242084918e14),  # e/h, CODATA 2022
        ("1E_h", "Hz", 6.5796839204999e15),
        ("0 Hz", "Hz", 0.0),
        ("0e-999 Hz", "Hz", 0.0),
        ("80", "1", 80.0),
        ("80 %", "1", 0.8),
        ("5 ppm", "1", 5e-6),
        ("5 1/s", "1/s", 5.0),
        ("5/s", "1/s", 5.0),
        ("36 mg/h", "kg/s", 1e-8),
        (80, "1", 80.0),
        (0.5, "1", 0.5),
        (10**30, "1", 1e30),
    ],
)
def test_exact(text: Any, unit: str, value: float) -> None:
    law = law_of(text, unit)
    assert isinstance(law, Exact)
    assert law.value == close(value)


@pytest.mark.parametrize(
    ("text", "unit", "mean", "sd"),
    [
        ("60(5) kHz", "Hz", 60e3, 5e3),
        ("1.23(4)", "1", 1.23, 0.04),
        ("1.23(4) Hz", "Hz", 1.23, 0.04),
        ("100(3) Hz", "Hz", 100.0, 3.0),
        ("12.3(1.2)", "1", 12.3, 1.2),
        ("1.23(.04)", "1", 1.23, 0.04),
        ("1.23(14)", "1", 1.23, 0.14),
        ("1.230(4)e3 Hz", "Hz", 1230.0, 4.0),
        ("1.23(4)e-3 Hz", "Hz", 1.23e-3, 4e-5),
        ("-0.9(1)", "1", -0.9, 0.1),
        ("98(1) %", "1", 0.98, 0.01),
        ("60 ± 5 kHz", "Hz", 60e3, 5e3),
        ("60±5kHz", "Hz", 60e3, 5e3),
        ("60 +/- 5 kHz", "Hz", 60e3, 5e3),
        ("60 +- 5 kHz", "Hz", 60e3, 5e3),
        ("60 kHz ± 5", "Hz", 60e3, 5e3),
        ("60 kHz ± 500 Hz", "Hz", 60e3, 500.0),
        ("−60 ± 5 kHz", "Hz", -60e3, 5e3),
        ("0 ± 5 Hz", "Hz", 0.0, 5.0),
        ("60\u2009±\u00a05 kHz", "Hz", 60e3, 5e3),
        ("5 % ± 1 %", "1", 0.05, 0.01),
        ("60 kHz ± 8 %", "Hz", 60e3, 4.8e3),
        ("−60 kHz ± 8 %", "Hz", -60e3, 4.8e3),
        ("5 ppm ± 10 %", "1", 5e-6, 5e-7),
    ],
)
def test_normal(text: str, unit: str, mean: float, sd: float) -> None:
    law = law_of(text, unit)
    assert isinstance(law, Normal)
    assert (law.mean, law.sd) == close((mean, sd))
    assert law.relative == ("%" in text and (unit == "Hz" or "ppm" in text))
    assert law.quantile(PROBABILITIES) == close(stats.norm(mean, sd).ppf(PROBABILITIES), 1e-13)  # ndtri


def test_two_piece() -> None:
    """2.0 is the median; 16 and 84 % (exactly Phi(±1)) lie at 1.3 and 3.5; two half normals of scipy."""
    law = law_of("2.0 +1.5/-0.7 Hz")
    assert isinstance(law, TwoPiece)
    assert law.median == 2.0
    assert law.below([1.3, 2.0, 3.5]) == close([PHI_1, 0.5, 1 - PHI_1], 1e-15)
    low, high = stats.norm(2.0, 0.7), stats.norm(2.0, 1.5)
    expected = np.where(PROBABILITIES < 0.5, low.ppf(PROBABILITIES), high.ppf(PROBABILITIES))
    assert law.quantile(PROBABILITIES) == close(expected, 1e-13)
    assert law_of("2.0 + 1.5 / − 0.7 kHz") == TwoPiece(2e3, 700.0, 1500.0)


@pytest.mark.parametrize(
    ("text", "law", "expected"),
    [
        ("2 Hz ×/ 1.5", Lognormal, stats.lognorm(np.log(1.5), scale=2.0)),
        ("2 kHz x/ 1.5", Lognormal, stats.lognorm(np.log(1.5), scale=2e3)),
        ("2 mHz */ 10", Lognormal, stats.lognorm(np.log(10.0), scale=2e-3)),
        ("1 .. 5 Hz", Uniform, stats.uniform(1.0, 4.0)),
        ("1..5 Hz", Uniform, stats.uniform(1.0, 4.0)),
        ("500 Hz .. 5 kHz", Uniform, stats.uniform(500.0, 4500.0)),
        ("-5 .. −1 kHz", Uniform, stats.uniform(-5e3, 4e3)),
        ("1 .. 5 Hz log", LogUniform, stats.loguniform(1.0, 5.0)),
        ("1. .. .5e1 Hz log", LogUniform, stats.loguniform(1.0, 5.0)),
        ("0.1 Hz .. 5 kHz log", LogUniform, stats.loguniform(0.1, 5e3)),
    ],
)
def test_other_laws(text: str, law: type, expected: Any) -> None:
    found = law_of(text)
    assert isinstance(found, law)
    assert found.quantile(PROBABILITIES) == close(expected.ppf(PROBABILITIES), 1e-12)
    values = expected.ppf([0.1, 0.7])
    assert found.below(values) == close([0.1, 0.7], 1e-12)
    assert found.above(values) == close([0.9, 0.3], 1e-12)


def test_a_plain_number_may_be_log_uniform_too() -> None:
    assert law_of("30 .. 100 log", "1") == LogUniform(30.0, 100.0)
    assert law_of("1 .. 5 % log", "1") == LogUniform(0.01, 0.05)


def test_a_negative_median_is_mirrored() -> None:
    law = law_of("-2 Hz ×/ 1.5")
    mirrored = -stats.lognorm(np.log(1.5), scale=2.0).ppf(1.0 - PROBABILITIES)
    assert law.quantile(PROBABILITIES) == close(mirrored, 1e-12)


@pytest.mark.parametrize(
    "name", ["theory", "beam.line.fwhm", "4K.technique.snr", "_x", "a-b.c_d", "beam.systematics.p-1.size"]
)
def test_references(name: str) -> None:
    for text in (f"@{name}", f"  @{name} "):
        found = parse(text, "Hz")
        assert (found.reference, found.law) == (name, None)


def test_fwhm_counts_in_widths_where_it_may() -> None:
    for written in ("5(1) FWHM", {"value": "5 ± 1 fwhm"}, {"value": "5(1)", "unit": "FWHM"}):
        found = parse(written, "Hz", along_line=True)
        assert found.along_line
        assert isinstance(found.law, Normal)
        assert (found.law.mean, found.law.sd) == close((5.0, 1.0), 1e-15)
    assert parse({"values": {"A": "3 FWHM", "B": "4 FWHM"}}, "Hz", along_line=True).along_line
    assert parse({"p16": "4 FWHM", "p84": "6 FWHM"}, "Hz", along_line=True).along_line
    assert not parse("5 kHz", "Hz", along_line=True).along_line
    with pytest.raises(QuantityError, match="FWHM"):
        parse("5 FWHM", "Hz")


Z = {"p05": 1.6448536269514722, "p10": 1.2815515655446004, "p16": 0.994457883209753, "p025": 1.959963984540054}


@pytest.mark.parametrize("pair", [("p05", "p95"), ("p10", "p90"), ("p16", "p84"), ("p025", "p975")])
def test_percentiles(pair: tuple[str, str]) -> None:
    """The law has the percentiles that were written; its parameters by hand from tabulated z."""
    low, high = pair
    ends = [float(f"0.{low[1:]}"), float(f"0.{high[1:]}")]
    lognormal = law_of({low: "2 Hz", high: "8 Hz"})
    normal = law_of({low: "2", high: "8", "unit": "Hz", "law": "normal"})
    through_zero = law_of({low: "-2 Hz", high: "8 Hz"})
    assert isinstance(lognormal, Lognormal)
    assert isinstance(normal, Normal)
    assert isinstance(through_zero, Normal)
    assert lognormal.median == close(4.0, 1e-15)
    assert math.log(lognormal.factor) == close(math.log(2.0) / Z[low], 1e-13)  # printed digits of z
    assert (normal.mean, normal.sd) == close((5.0, 3.0 / Z[low]), 1e-13)
    for law, values in ((lognormal, [2.0, 8.0]), (normal, [2.0, 8.0]), (through_zero, [-2.0, 8.0])):
        assert law.below(values) == close(ends, 1e-12)


def test_a_table_keeps_what_it_says() -> None:
    written = {
        "value": "60(5)", "unit": "kHz", "source": "somebody 2020", "note": "cold", "status": "measured",
        "demonstrated": "80",
    }  # fmt: skip
    found = parse(written, "Hz")
    assert found.law == Normal(60e3, 5e3)
    assert (found.source, found.note, found.status) == ("somebody 2020", "cold", "measured")
    assert found.demonstrated is not None
    assert found.demonstrated.law == Exact(80e3)
    assert found.text == "60(5) kHz"


@pytest.mark.parametrize(
    ("value", "apart", "together"),
    [
        ("60 ± 8 %", "kHz", "60 kHz ± 8 %"),
        ("2 ×/ 1.5", "kHz", "2 kHz ×/ 1.5"),
        ("1 .. 5 log", "kHz", "1 .. 5 kHz log"),
        ("2 +1/-0.5", "kHz", "2 +1/-0.5 kHz"),
        ("1.2(3)e3", "µHz", "1.2(3)e3 µHz"),
        (5, "Hz", "5 Hz"),
        (2.5e-7, "cm^-1", "2.5e-7 cm^-1"),
    ],
)
def test_a_unit_apart_from_its_value(value: Any, apart: str, together: str) -> None:
    assert law_of({"value": value, "unit": apart}) == law_of(together)
    assert parse({"values": {"A": value}, "unit": apart}, "Hz").members[0][1].law == law_of(together)


def test_ensembles() -> None:
    found = parse(
        {"values": {"HF": "1 Hz", "DFT": "3(1) Hz"}, "weights": [1, 3], "group": "method", "discrepancy": "1 ×/ 1.3"},
        "Hz",
    )
    assert found.members == (("HF", parse("1 Hz", "Hz")), ("DFT", parse("3(1) Hz", "Hz")))
    assert (found.weights, found.group) == ((0.25, 0.75), "method")
    assert found.discrepancy is not None
    assert found.discrepancy.law == Lognormal(1.0, 1.3)
    by_name = parse({"values": {"HF": "1", "DFT": "3"}, "unit": "Hz", "weights": {"DFT": 3, "HF": 1}}, "Hz")
    assert by_name.weights == (0.25, 0.75)
    assert parse({"values": {"A": "1 Hz", "B": "2 Hz", "C": "4 Hz"}}, "Hz").weights == close([1 / 3] * 3, 1e-15)


@pytest.mark.parametrize(
    ("first", "second", "hertz"),
    [
        ("1000.000000000000000123456789 cm^-1", "1000 cm^-1", Fraction(123456789, 10**24) * 29979245800),
        ("500000000000000.000000000123 Hz", "500000000000000 Hz", Fraction(123, 10**12)),
        ("1 THz", "999999999999.9999999 Hz", Fraction(1, 10**7)),
        ("5 Hz", "5 Hz", Fraction(0)),
    ],
)
def test_differences_keep_every_digit(first: str, second: str, hertz: Fraction) -> None:
    assert exact_difference(first, second, "Hz") == close(float(hertz))
    assert law_of({"difference": [first, second]}) == Exact(exact_difference(first, second, "Hz"))
    assert exact_difference(second, first, "Hz") == -exact_difference(first, second, "Hz")


WRONG: list[tuple[Any, str, str]] = [
    ("", "Hz", "empty"),
    ("Hz", "Hz", "begins with a number"),
    ("60", "Hz", "no unit"),
    (60, "Hz", "no unit"),
    ("1,5 kHz", "Hz", "comma"),
    ("1 000 kHz", "Hz", "write for example"),
    ("1_000 kHz", "Hz", "no unit that is known"),
    ("nan Hz", "Hz", "finite"),
    ("60 ± 8 %", "1", "two ways"),
    ("60 ± 8 % kHz", "Hz", "% kHz"),
    ("5 % kHz", "Hz", "% kHz"),
    ("60 ± 0 kHz", "Hz", "not positive"),
    ("60 ± -5 kHz", "Hz", "not positive"),
    ("60(0) kHz", "Hz", "not positive"),
    ("60(5)(5) kHz", "Hz", "no unit|cannot be read"),
    ("60(5", "Hz", "no unit|cannot be read"),
    ("2 Hz ×/ 0.5", "Hz", "above 1"),
    ("2 Hz ×/ 1", "Hz", "above 1"),
    ("0 Hz ×/ 2", "Hz", "zero"),
    ("5 .. 1 Hz", "Hz", "does not rise"),
    ("0 .. 1 Hz log", "Hz", "touches zero"),
    ("0...5 Hz", "Hz", "no unit"),
    ("2.0 +1.5 Hz", "Hz", "no unit|cannot be read"),
    ("1e-400 Hz", "Hz", "out of any range"),
    ("1e300 THz", "Hz", "out of any range"),
    ("1e-300 qHz", "Hz", "out of any range"),
    ("0(5)e999 Hz", "Hz", "out of any range"),
    ("1e9999 Hz", "Hz", "1e300"),
    ("@", "Hz", "reference"),
    ("@a b", "Hz", "reference"),
    ("0.1 FWHM .. 5 kHz", "Hz", "one kind"),
    ("5 kHz ± 0.1 FWHM", "Hz", "one kind"),
    ("1 kHz ± 5 Pa", "*", "one kind"),
    ("1 Hz .. 5 s", "*", "one kind"),
    (True, "1", "true"),
    (math.inf, "1", "finite"),
    (math.nan, "1", "finite"),
    (10**5000, "1", "1e300"),
    (10**5000, "Hz", "1e300"),
    ({"value": 10**5000, "unit": "Hz"}, "Hz", "1e300"),
    ({}, "Hz", "no value"),
    ({"value": "1 Hz", "p05": "1 Hz"}, "Hz", "exactly one"),
    ({"value": "1 kHz", "unit": "kHz"}, "Hz", "once"),
    ({"value": "1 kHz", "unit": "kHz"}, "*", "once"),
    ({"value": "@x", "unit": "kHz"}, "Hz", "drop unit"),
    ({"value": "60 ± 8 %", "unit": "%"}, "1", "two ways"),
    ({"value": "5(1) Hz", "law": "lognormal"}, "Hz", "percentiles"),
    ({"difference": ["2 Hz", "1 Hz"], "unit": "Hz"}, "Hz", "own unit"),
    ({"difference": ["1e999 Hz", "1 Hz"]}, "Hz", "difference"),
    ({"p05": "1 s", "p95": "2 Hz"}, "*", "one kind"),
    ({"p05": "1(1) Hz", "p95": "2 Hz"}, "Hz", "not exact"),
    ({"p05": "1 FWHM", "p95": "2 Hz"}, "Hz", "one kind"),
    ({"p05": "-1 Hz", "p95": "2 Hz", "law": "lognormal"}, "Hz", "positive"),
    ({"p05": "1 Hz", "p84": "2 Hz"}, "Hz", "pair"),
    ({"values": {"A": "3 Hz", "B": "4 s"}}, "*", "one kind"),
    ({"values": {"A": "@x"}}, "Hz", "written out"),
    ({"value": "1 Hz", "relative": True}, "Hz", "splitting"),
    ({"value": "1 Hz", "times": ["5 Hz", "x"]}, "Hz", "cannot be read"),
    ({"value": "1 Hz", "scale": [{"with": "@p", "from": "0 Pa", "exponent": "1"}]}, "Hz", "not positive"),
    ({"value": "1 Hz", "scale": [{"with": "@p"}]}, "Hz", "exponent"),
    ([1], "1", "quantity"),
]


@pytest.mark.parametrize(("written", "unit", "words"), WRONG, ids=map(str, range(len(WRONG))))
def test_refused(written: Any, unit: str, words: str) -> None:
    with pytest.raises(QuantityError, match=words) as caught:
        parse(written, unit, along_line=True)
    assert caught.value.found
    assert caught.value.wanted


# round trips of known numbers

FACTORS = {"Hz": 0, "kHz": 3, "µHz": -6, "μHz": -6, "THz": 12, "aHz": -18}  # powers of ten; both micro signs
SPACES = st.sampled_from(["", " ", "  ", "\u2009", "\u00a0"])
MINUS = st.sampled_from(["-", "−"])
NUMBERS = st.tuples(st.integers(-(10**9), 10**9), st.integers(0, 12))  # digits and decimals


def decimal(digits: int, decimals: int, minus: str = "-") -> str:
    """The text of digits × 10^-decimals, made from the digits alone."""
    text = str(abs(digits)).rjust(decimals + 1, "0")
    text = text[: len(text) - decimals] + ("." + text[len(text) - decimals :] if decimals else "")
    return (minus if digits < 0 else "") + text


def exactly(digits: int, power: int) -> float:
    return float(Fraction(digits) * Fraction(10) ** power)


@given(NUMBERS, st.integers(1, 10**6), st.integers(-30, 30), st.sampled_from(sorted(FACTORS)), SPACES, MINUS)
def test_brackets_read_back(
    number: tuple[int, int], spread: int, power: int, unit: str, space: str, minus: str
) -> None:
    digits, decimals = number
    exponent = f"e{power}".replace("-", minus) if power else ""
    law = law_of(f"{decimal(digits, decimals, minus)}({spread}){exponent}{space}{unit}")
    shift = power - decimals + FACTORS[unit]
    assert isinstance(law, Normal)
    # three roundings: the number, the factor of the unit, their product
    assert law.mean == close(exactly(digits, shift), 6e-16)
    assert law.sd == close(exactly(spread, shift), 6e-16)


@given(
    NUMBERS,
    st.integers(1, 10**6),
    st.integers(0, 8),
    st.sampled_from(["±", "+/-", "+-"]),
    st.sampled_from(sorted(FACTORS)),
    SPACES,
    MINUS,
)
def test_plus_minus_reads_back(
    number: tuple[int, int], spread: int, places: int, sign: str, unit: str, space: str, minus: str
) -> None:
    digits, decimals = number
    value, wide = decimal(digits, decimals, minus), decimal(spread, places)
    expected = Normal(exactly(digits, FACTORS[unit] - decimals), exactly(spread, FACTORS[unit] - places))
    for text in (
        f"{value}{space}{sign}{space}{wide}{space}{unit}",
        f"{value}{space}{unit}{space}{sign}{space}{wide}{space}{unit}",
    ):
        law = law_of(text)
        assert isinstance(law, Normal)
        assert (law.mean, law.sd) == close((expected.mean, expected.sd), 6e-16)


@given(NUMBERS, NUMBERS, st.sampled_from(sorted(FACTORS)), SPACES, MINUS)
def test_ranges_read_back(one: tuple[int, int], other: tuple[int, int], unit: str, space: str, minus: str) -> None:
    low, high = sorted((one, other), key=lambda n: Fraction(n[0], 10 ** n[1]))
    ends = [exactly(digits, FACTORS[unit] - decimals) for digits, decimals in (low, high)]
    text = f"{decimal(*low, minus)}{space}..{space}{decimal(*high, minus)}{space}{unit}"
    if ends[0] >= ends[1]:
        with pytest.raises(QuantityError, match="rise"):
            parse(text, "Hz")
        return
    law = law_of(text)
    assert (law.lower, law.upper) == close(tuple(ends), 6e-16)
    if low[0] > 0:
        logarithmic = law_of(text + " log")
        assert isinstance(logarithmic, LogUniform)
        assert (logarithmic.lower, logarithmic.upper) == (law.lower, law.upper)


@given(st.integers(1, 10**9), st.integers(0, 9), st.integers(1001, 10**5), st.sampled_from(["×/", "x/", "*/"]), SPACES)
def test_factors_read_back(digits: int, decimals: int, thousandths: int, sign: str, space: str) -> None:
    law = law_of(f"{decimal(digits, decimals)}{space}kHz{space}{sign}{space}{decimal(thousandths, 3)}")
    assert isinstance(law, Lognormal)
    assert (law.median, law.factor) == close((exactly(digits, 3 - decimals), thousandths / 1000), 6e-16)


# hostile input

SIGNS = st.text(alphabet="0123456789.eE+-−±×x/*()%‰ @logHzkPacmsradFWµ^·,_\n\t'\"{}[]", max_size=60)
UNITS = st.sampled_from(["*", "Hz", "1", "s", "kg/s", "Hz/Pa", "1/s"])
SCALARS = SIGNS | st.text(max_size=30) | st.floats() | st.integers() | st.booleans() | st.none()


def harmless(quantity: Quantity) -> None:
    """Every number that came out is finite."""
    for one in [quantity, *quantity.times, *(member for _, member in quantity.members)]:
        if one.law is not None:
            assert all(math.isfinite(number) for number in vars(one.law).values())


@settings(max_examples=600, deadline=None)
@given(SIGNS | st.text(max_size=200), UNITS, st.booleans())
def test_no_text_breaks_the_reader(text: str, unit: str, along: bool) -> None:
    try:
        harmless(parse(text, unit, along))
    except QuantityError as error:
        assert error.found  # noqa: PT017  # the only error there may be
        assert error.wanted  # noqa: PT017


@settings(max_examples=400, deadline=None)
@given(
    st.dictionaries(
        st.sampled_from([*KEYS, "of", "x"]),
        SCALARS | st.lists(SCALARS, max_size=3) | st.dictionaries(st.text(max_size=5), SCALARS, max_size=3),
        max_size=5,
    ),
    UNITS,
    st.booleans(),
)
def test_no_table_breaks_the_reader(table: dict[str, Any], unit: str, splitting: bool) -> None:
    try:
        harmless(parse(table, unit, splitting=splitting))
    except QuantityError as error:
        assert error.found  # noqa: PT017
        assert error.wanted  # noqa: PT017


HOSTILE = [
    "1" * 300 + "a" + " " * 600 + "\n!",
    "1" * 250 + "b" + " " * 250 + "±" + " " * 250 + "1" * 240 + "\n",
    "1" * 200 + "a" + ("±" + "1" * 10 + "b") * 60 + "\nb",
    "1" * 240 + "a" + " " * 240 + ".." + " " * 240 + "1" * 240 + "\nb",
    "1" * 300 + " " * 300 + "a" + " " * 300 + "\nb",
    "1" * 1000, "1" * 400 + "(" + "1" * 500, "(" * 900, "5 " + "(" * 450 + ")" * 450, "5 " + "Hz*" * 300,
    "5 Hz" + "^9" * 400, "5e" + "9" * 900, "5e-" + "9" * 900 + " Hz", "5" + "." * 900, "5(" * 450, "1 .. " * 190,
    "1±" * 450, "5 " + "+/-" * 300, "5 Hz" + " log" * 200, "5 EHz^9*EHz^9*EHz^9", "9" * 10**6, "5 a" * 10**6,
]  # fmt: skip


def test_hostile_texts_are_refused_at_once() -> None:
    """Bound: 60 ms a text; a pattern that tries every split needs seconds for the first of them."""
    started = time.process_time()
    for text in HOSTILE:
        for unit in ("Hz", "*"):
            with pytest.raises(QuantityError):
                parse(text, unit)
    assert time.process_time() - started < 0.06 * 2 * len(HOSTILE)
