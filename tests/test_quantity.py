"""The grammar of quantities: what is written is what is meant."""

from __future__ import annotations

import math
import time
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Law, Lognormal, LogUniform, Normal, TwoPiece, Uniform
from pvfeas.quantity import parse


def law(written: Any, unit: str = "Hz") -> Law:
    found = parse(written, unit).law
    assert found is not None
    return found


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("60 kHz", Exact(60e3)),
        ("-3.5e-2 Hz", Exact(-0.035)),
        ("60(5) kHz", Normal(60e3, 5e3)),
        ("1.23(4) Hz", Normal(1.23, 0.04)),
        ("12.3(1.2) Hz", Normal(12.3, 1.2)),
        ("100(3) Hz", Normal(100.0, 3.0)),
        ("0.5(12) Hz", Normal(0.5, 1.2)),
        ("1.23(4)e3 Hz", Normal(1230.0, 40.0)),
        ("60 ± 5 kHz", Normal(60e3, 5e3)),
        ("60 +/- 5 kHz", Normal(60e3, 5e3)),
        ("60 +- 5 kHz", Normal(60e3, 5e3)),
        ("60 kHz ± 500 Hz", Normal(60e3, 500.0)),
        ("60 kHz ± 8 %", Normal(60e3, 4.8e3)),
        ("\u22122.0 ± 0.1 Hz", Normal(-2.0, 0.1)),
        ("2.0 +1.5/-0.7 Hz", TwoPiece(2.0, 0.7, 1.5)),
        ("2.0 +1.5/\u22120.7 Hz", TwoPiece(2.0, 0.7, 1.5)),
        ("2 Hz ×/ 1.5", Lognormal(2.0, 1.5)),
        ("2 Hz x/ 1.5", Lognormal(2.0, 1.5)),
        ("1 .. 5 Hz", Uniform(1.0, 5.0)),
        ("1 Hz .. 5 kHz", Uniform(1.0, 5e3)),
        ("1 .. 5 Hz log", LogUniform(1.0, 5.0)),
        ("3 \u00b5Hz", Exact(3e-6)),
        ("3 \u03bcHz", Exact(3e-6)),
    ],
)
def test_texts(text: str, expected: Law) -> None:
    found = law(text)
    assert type(found) is type(expected)
    for name, value in vars(expected).items():
        if name != "relative":  # how it was written, not what it is
            assert getattr(found, name) == pytest.approx(value, rel=1e-12)  # rounding of the unit's factor


@pytest.mark.parametrize(
    "text",
    [
        "", "Hz", "60", "60 kHzz", "60 rad/s", "1,5 Hz", "60 (5) kHz", "60(5 kHz", "5 .. 1 Hz", "0 .. 5 Hz log", "2 Hz ×/ 0.5",
        "2 Hz ×/ 1", "60 ± -5 kHz", "60 ± 5", "nan Hz", "inf Hz", "1e999 Hz", "@", "@ x", "@a b", "60 s",
        "1.5 ppb", "60 kHz ± 8 Pa", "2.0 +1.5/0.7 Hz", "1 .. 5 .. 7 Hz", "60(5)(5) kHz",
    ],
)  # fmt: skip
def test_nonsense_is_refused_with_both_halves_of_a_message(text: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse(text, "Hz")
    assert caught.value.found
    assert caught.value.wanted


@pytest.mark.parametrize("unit", ["Hz", "s", "kg", "m", "K", "Pa", "1", "kg/s", "Hz/Pa"])
@given(text=st.text(max_size=60))
@settings(max_examples=150, deadline=None)
def test_any_text_is_read_or_refused(unit: str, text: str) -> None:
    try:
        found = parse(text, unit)
    except QuantityError:
        return
    assert found.reference or found.law is not None


GRAMMAR = "0123456789.()e+-/±×x*% @kMmHzs²^{}[]log"


@given(text=st.text(alphabet=GRAMMAR, min_size=1, max_size=40))
@settings(max_examples=600, deadline=None)
def test_what_looks_like_a_quantity_is_read_or_refused(text: str) -> None:
    try:
        found = parse(text, "Hz")
    except QuantityError:
        return
    if found.law is not None:
        assert math.isfinite(found.law.median)


@pytest.mark.parametrize(
    "text",
    [
        "9" * 900 + " Hz",
        "1" + "e1" * 300 + " Hz",
        "(" * 500,
        "60(" + "5" * 400 + ") kHz",
        "1e308 .. 1e309 Hz",
        "± " * 300,
    ]
    + ["1 " + "Hz/" * 200, "1 a**9**9**9", "1 " + "(" * 100 + "Hz" + ")" * 100, "1 .. " * 150 + "Hz", " " * 900 + "x"],
)
def test_hostile_texts_end_soon(text: str) -> None:
    """A second is a thousand times what any honest quantity takes."""
    start = time.perf_counter()
    with pytest.raises(QuantityError):
        parse(text, "Hz")
    assert time.perf_counter() - start < 1.0


FINITE = st.floats(1e-6, 1e6)


@given(mean=FINITE, spread=st.floats(1e-3, 0.9))
@settings(max_examples=200, deadline=None)
def test_plus_minus_round_trip(mean: float, spread: float) -> None:
    found = law(f"{mean!r} ± {mean * spread!r} Hz")
    assert isinstance(found, Normal)
    assert (found.mean, found.sd) == pytest.approx((mean, mean * spread), rel=1e-15)


@given(digits=st.integers(1, 99999), places=st.integers(0, 5), spread=st.integers(1, 99))
@settings(max_examples=200, deadline=None)
def test_brackets_count_in_last_digits(digits: int, places: int, spread: int) -> None:
    text = f"{digits / 10**places:.{places}f}({spread}) Hz"
    found = law(text)
    assert isinstance(found, Normal)
    assert found.mean == pytest.approx(digits / 10**places, rel=1e-12)
    assert found.sd == pytest.approx(spread / 10**places, rel=1e-12)


@given(median=FINITE, factor=st.floats(1.001, 50.0))
@settings(max_examples=100, deadline=None)
def test_factor_round_trip(median: float, factor: float) -> None:
    assert law(f"{median!r} Hz ×/ {factor!r}") == Lognormal(median, factor)


def test_percentiles_fix_a_normal_law() -> None:
    """mean and width from the two quantiles of scipy's normal law."""
    oracle = stats.norm(5.0, 0.7)
    found = law({"p05": f"{oracle.ppf(0.05)} Hz", "p95": f"{oracle.ppf(0.95)} Hz", "law": "normal"})
    assert isinstance(found, Normal)
    assert (found.mean, found.sd) == pytest.approx((5.0, 0.7), rel=1e-9)


def test_percentiles_fix_a_lognormal_law() -> None:
    oracle = stats.lognorm(math.log(1.8), scale=3.0)
    found = law({"p16": f"{oracle.ppf(0.16)} Hz", "p84": f"{oracle.ppf(0.84)} Hz", "law": "lognormal"})
    assert isinstance(found, Lognormal)
    assert (found.median, found.factor) == pytest.approx((3.0, 1.8), rel=1e-9)


def test_tables_carry_where_a_number_comes_from() -> None:
    found = parse(
        {"value": "60(5) kHz", "source": "a scan", "status": "measured", "note": "x", "demonstrated": "55 kHz"}, "Hz"
    )
    assert found.law == Normal(60e3, 5e3)
    assert (found.source, found.status, found.note) == ("a scan", "measured", "x")
    assert found.demonstrated is not None
    assert found.demonstrated.law == Exact(55e3)


def test_rival_calculations() -> None:
    found = parse({"values": {"HF": "1 Hz", "CC": "2(1) Hz"}, "weights": [1, 3], "group": "method"}, "Hz")
    assert [name for name, _ in found.members] == ["HF", "CC"]
    assert found.weights == pytest.approx((0.25, 0.75))
    assert found.group == "method"


def test_a_difference_of_long_numbers_keeps_every_digit() -> None:
    """28 decimals that differ by one in the last: 1e-27 E_h in Hz by CODATA 2022, worked out by hand."""
    first, second = "-2345.678901234567890123456789002 E_h", "-2345.678901234567890123456789001 E_h"
    found = parse({"difference": [first, second], "of": "difference"}, "Hz", splitting=True).law
    assert isinstance(found, Exact)
    assert found.value == pytest.approx(-1e-27 * 6.5796839204999e15, rel=1e-12)


def test_weights_add_to_one() -> None:
    found = parse({"values": {"HF": "1 Hz", "CC": "2(1) Hz"}, "weights": {"CC": 3, "HF": 1}}, "Hz")
    assert found.weights == pytest.approx((0.25, 0.75))
