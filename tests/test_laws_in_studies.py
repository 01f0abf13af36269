"""What a study makes of its quantities: bounds of the fields, products, scales, ensembles, relative splittings."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import stats

from pvfeas import Options, StudyError, assess, compare, problem_of
from pvfeas.bounds import Bounds, fitted
from pvfeas.laws import Beta, Exact, Law, Lognormal, Normal, Truncated
from pvfeas.problem import Ensemble, Problem
from pvfeas.quantity import parse
from pvfeas.study import Study

PROBABILITIES = np.array([0.001, 0.025, 0.16, 0.5, 0.84, 0.975, 0.999])
POSITIVE = Bounds(lower=0.0, lower_open=True)
FRACTION = Bounds(lower=0.0, upper=1.0)


def a_study(splitting: str = '"1 Hz"', width: str = '"12 kHz"', snr: str = '"80"', more: str = "") -> Problem:
    return problem_of(
        Study.from_toml(
            f"""
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "60 d"
[shared]
pressure = "2 Pa"
theory = "1 ×/ 1.5"
[scenario.one]
splitting = {{ value = {splitting}, of = "difference" }}
line = {{ frequency = "29.1 THz", fwhm = {width} }}
technique = {{ kind = "scan", snr = {snr}, points = 60, span = "5 FWHM", time = "2 s" }}
{more}
"""
        )
    )


def law(problem: Problem, address: str) -> Any:
    return next(one.law for one in problem.inputs if one.address == address)


def at(problem: Problem, **scores: float) -> dict[str, np.ndarray]:
    """Every input at its score (named by the last words of its address, 0 if not named)."""
    draws = {}
    for one in problem.inputs:
        assert not isinstance(one.law, Ensemble)
        score = next((z for name, z in scores.items() if one.address.endswith(name)), 0.0)
        draws[one.address] = one.law.from_score(np.array([score]))
    return draws


def law_of(text: str, unit: str = "1") -> Law:
    found = parse(text, unit).law
    assert found is not None
    return found


# bounds


@pytest.mark.parametrize(
    ("text", "bounds", "a", "b"),
    [
        ("0.98(1)", FRACTION, 191.1, 3.9),  # m (1 - m)/s^2 - 1 = 195
        ("0.5(1)", FRACTION, 12.0, 12.0),  # 24
        ("60(20) %", FRACTION, 3.0, 2.0),  # 5
        ("0.9(1)", Bounds(lower=-1.0, upper=1.0), 17.1, 0.9),  # on [-1, 1]: m = 0.95, s = 0.05, 18
    ],
)
def test_a_fraction_with_a_spread_is_the_beta_law(text: str, bounds: Bounds, a: float, b: float) -> None:
    written = law_of(text)
    assert isinstance(written, Normal)
    found, cut = fitted(written, bounds, text)
    expected = stats.beta(a, b, loc=bounds.lower, scale=bounds.upper - bounds.lower)
    assert isinstance(found, Beta)
    assert cut == 0.0
    assert (expected.mean(), expected.std()) == pytest.approx((written.mean, written.sd), rel=1e-12)
    # the shapes are known to 1e-13 and the quantiles of a tail amplify that
    assert found.quantile(PROBABILITIES) == pytest.approx(expected.ppf(PROBABILITIES), rel=1e-9)
    assert found.from_score(stats.norm.ppf(PROBABILITIES)) == pytest.approx(
        expected.ppf(PROBABILITIES), abs=2e-9
    )  # table
    assert found.above(0.95) == pytest.approx(expected.sf(0.95), rel=1e-9, abs=1e-30)


@pytest.mark.parametrize(
    ("sd", "refused", "warned"),
    [  # mean 10; z = 10/sd against 1.64485 (5 %) and 3.09023 (0.1 %)
        (2.0, False, False),
        (3.23, False, False),
        (3.24, False, True),
        (6.07, False, True),
        (6.09, True, False),
    ],
)
def test_five_percent_and_one_in_a_thousand(sd: float, refused: bool, warned: bool) -> None:
    width = f'"10 ± {sd} kHz"'
    if refused:
        with pytest.raises(StudyError) as caught:
            a_study(width=width)
        (fault,) = caught.value.faults
        assert fault.address == "one.line.fwhm"
        assert f"{100 * stats.norm.cdf(-10 / sd):.2g} %" in fault.found
        assert "below 0" in fault.found
        assert "above 0" in fault.wanted
        assert "lognormal" in fault.wanted
        return
    problem = a_study(width=width)
    said = [one for one in problem.warnings if one[0] == "truncated"]
    assert bool(said) == warned
    for _, address, message in said:
        assert address == "one.line.fwhm"
        assert f"{100 * stats.norm.cdf(-10 / sd):.2g} %" in message
    found = law(problem, "one.line.fwhm")
    expected = stats.truncnorm(-10 / sd, np.inf, loc=10e3, scale=1e3 * sd)
    assert isinstance(found, Truncated)
    assert found.quantile(PROBABILITIES) == pytest.approx(expected.ppf(PROBABILITIES), rel=1e-9)  # scipy's truncnorm
    assert found.median == pytest.approx(expected.median(), rel=1e-9)


def test_a_tail_above_is_cut_and_named_too() -> None:
    """0.9 ×/ 1.05 in [0, 1]: Phi(-ln(1/0.9)/ln 1.05) = 1.54 % lie above 1."""
    base = stats.lognorm(np.log(1.05), scale=0.9)
    found, cut = fitted(law_of("0.9 ×/ 1.05"), FRACTION, "0.9 ×/ 1.05")
    assert cut == pytest.approx(base.sf(1.0), rel=1e-12)
    expected = base.ppf(PROBABILITIES * base.cdf(1.0))
    assert found.quantile(PROBABILITIES) == pytest.approx(expected, rel=1e-10)
    with pytest.raises(ValueError, match=r"above 1"):
        fitted(law_of("0.9 ×/ 1.2"), FRACTION, "0.9 ×/ 1.2")
    with pytest.raises(ValueError, match=r"at least 0 and at most 1"):
        fitted(law_of("0.5 .. 1.5"), FRACTION, "0.5 .. 1.5")


def test_what_fits_is_left_alone() -> None:
    for text in ("5(1) Hz", "2 Hz ×/ 3", "0 .. 5 Hz", "1 .. 5 Hz log", "5 Hz"):
        assert fitted(law_of(text, "Hz"), Bounds(), text) == (law_of(text, "Hz"), 0.0)
    for text in ("2 Hz ×/ 3", "0 .. 5 Hz", "1 .. 5 Hz log", "5 Hz"):
        assert fitted(law_of(text, "Hz"), POSITIVE, text) == (law_of(text, "Hz"), 0.0)


def test_the_largest_spread_of_a_fraction() -> None:
    """sqrt(m (1 - m)): 9.95 % for a mean of 1 %."""
    assert fitted(law_of("1 % ± 9.94 %"), FRACTION, "x")[1] == 0.0
    with pytest.raises(ValueError, match="standard deviation"):
        fitted(law_of("1 % ± 9.96 %"), FRACTION, "x")


@pytest.mark.parametrize("text", ["1.1(1)", "0.5(5)", "0(1)"])
def test_no_beta_law_has_this_mean_and_spread(text: str) -> None:
    with pytest.raises(ValueError, match=r"mean|standard deviation"):
        fitted(law_of(text), FRACTION, text)


def test_exact_values_at_their_bounds() -> None:
    for value, bounds in ((0.0, FRACTION), (1.0, FRACTION), (1e-9, POSITIVE)):
        assert fitted(Exact(value), bounds, "x") == (Exact(value), 0.0)
    for value, bounds in ((0.0, POSITIVE), (-1e-9, FRACTION), (1.0000001, FRACTION)):
        with pytest.raises(ValueError, match="out of bounds"):
            fitted(Exact(value), bounds, "x")


def test_a_shared_quantity_keeps_the_bounds_of_all_its_uses() -> None:
    """ee lies in [-1, 1], uptime in (0, 1]: together 0.9(1) is the beta law on [0, 1] (m (1 - m)/s^2 - 1 = 8)."""
    problem = problem_of(
        Study.from_toml("""
[goal]
kind = "exclude"
power = 0.5
within = "9 d"
[shared]
x = "0.9(1)"
[scenario.one]
splitting = { value = "1 Hz", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.5 Hz", after = "1 h" }
samples = { ee_a = "@x" }
schedule = { uptime = "@x" }
""")
    )
    found = law(problem, "shared.x")
    assert found.quantile(PROBABILITIES) == pytest.approx(stats.beta(7.2, 0.8).ppf(PROBABILITIES), rel=1e-9)


# products and scales


def test_a_product_is_the_product_of_its_draws() -> None:
    """1.5(1) kHz/Pa × 4.0(1) Pa; at scores 1 and -1: 1.6 kHz/Pa × 3.9 Pa = 6.24 kHz."""
    problem = a_study(width='{ value = "1.5(1) kHz/Pa", times = ["4.0(1) Pa"] }')
    line = problem.scenarios[0].line
    assert line.at(at(problem)).fwhm == pytest.approx(6e3, rel=1e-14)
    assert line.at(at(problem, **{"fwhm": 1.0, "times[0]": -1.0})).fwhm == pytest.approx(6240.0, rel=1e-14)
    exact = a_study(width='{ value = "1.5 kHz/Pa", times = ["4 Pa", "50 %", "@theory"] }')
    assert exact.scenarios[0].line.at(at(exact, theory=1.0)).fwhm == pytest.approx(1500 * 4 * 0.5 * 1.5, rel=1e-14)


@pytest.mark.parametrize(
    ("width", "words"),
    [
        ('{ value = "1.5 kHz/Pa", times = ["4 s"] }', "frequency is needed"),
        ('{ value = "1.5 kHz/Pa" }', "dimension"),
        ('{ value = "3", times = ["@pressure"] }', "frequency is needed"),
        ('"@pressure"', "frequency is needed"),
        ('"@one.technique.span"', "FWHM"),
        ('{ value = "2", times = ["@one.technique.span"] }', "FWHM"),
        ('{ p05 = "1 s", p95 = "2 s", times = ["1 Hz"] }', "frequency is needed"),
        ('{ value = "12 kHz", scale = [{ with = "@pressure", from = "1 Hz", exponent = "1" }] }', "one dimension"),
        ('{ value = "12 kHz", scale = [{ with = "1(1) Pa", from = "1 Pa", exponent = "0.5" }] }', "below 0"),
        ('{ value = "12 kHz", scale = [{ with = "@pressure", from = "-1 Pa", exponent = "1" }] }', "not positive"),
        ('{ value = "12 kHz", times = ["@one.line.fwhm"] }', "circle"),
    ],
)
def test_products_that_cannot_be(width: str, words: str) -> None:
    with pytest.raises(StudyError) as caught:
        a_study(width=width)
    (fault,) = caught.value.faults
    assert words in str(fault)
    assert fault.address.startswith("one.line.fwhm")


def test_scales() -> None:
    """20 × (2 Pa/0.5 Pa)^0.5 = 40; two scales multiply; an uncertain exponent follows its draw."""
    scale = '{ with = "@pressure", from = "0.5 Pa", exponent = "0.5" }'
    problem = a_study(snr=f'{{ value = "20", scale = [{scale}] }}')
    assert problem.scenarios[0].technique_a.at(at(problem)).snr == pytest.approx(40.0, rel=1e-14)
    both = a_study(
        snr=f'{{ value = "20 ×/ 1.5", scale = [{scale}, {{ with = "30 kHz", from = "10 kHz", exponent = "-1.0(5)" }}] }}'
    )
    numbers = both.scenarios[0].technique_a.at(at(both, exponent=2.0, snr=1.0))  # exponents 0.5 and 0
    assert numbers.snr == pytest.approx(20 * 1.5 * 2.0, rel=1e-14)


def test_a_pressure_may_come_in_other_units() -> None:
    """(2 Pa/15 mTorr)^1 with 1 Torr = 101325/760 Pa."""
    problem = a_study(snr='{ value = "20", scale = [{ with = "@pressure", from = "15 mTorr", exponent = "1" }] }')
    expected = 20 * 2.0 / (0.015 * 101325 / 760)
    assert problem.scenarios[0].technique_a.at(at(problem)).snr == pytest.approx(expected, rel=1e-14)


def test_relative_splittings() -> None:
    """4e-14 of 29.1 THz is 1.164 Hz."""
    problem = a_study(splitting='"4e-14", relative = true')
    assert problem.scenarios[0].splitting.at(at(problem)) == pytest.approx(1.164, rel=1e-14)
    uncertain = a_study(splitting='"4(1)e-14", relative = true, times = ["@theory"]')
    draws = at(uncertain, splitting=1.0, theory=-1.0)
    assert uncertain.scenarios[0].splitting.at(draws) == pytest.approx(5e-14 / 1.5 * 29.1e12, rel=1e-14)


# ensembles


def test_an_ensemble_in_a_study() -> None:
    written = '{ A = "1.0(2) Hz", B = "3 Hz" }, weights = [1, 3], discrepancy = "1 ×/ 1.3"'
    problem = problem_of(Study.from_toml(ENSEMBLE % ("", written, "", written)))
    found = law(problem, "k.splitting")
    assert isinstance(found, Ensemble)
    assert found.members == ("A", "B")
    assert found.weights == (0.25, 0.75)
    assert found.laws == (Normal(1.0, 0.2), Exact(3.0))
    assert law(problem, "k.splitting.discrepancy") == Lognormal(1.0, 1.3)


ENSEMBLE = """
[goal]
kind = "exclude"
power = 0.5
within = "30 d"
[scenario.k]
splitting = { %svalues = %s, of = "difference" }
technique = { kind = "quoted", uncertainty = "0.05 Hz", after = "1 h" }
[scenario.l]
based_on = "k"
splitting = { %svalues = %s, of = "difference" }
"""


def test_ensembles_of_one_group_are_one_calculation() -> None:
    """A: 1 and 2 Hz, B: 3 and 4 Hz. Tied, l is always the larger; apart, k is for one pair in four (3 > 2)."""
    k, other = '{ A = "1 Hz", B = "3 Hz" }', '{ A = "2 Hz", B = "4 Hz" }'
    for group, expected in (('group = "method", ', 0.0), ("", 0.25)):
        problem = problem_of(Study.from_toml(ENSEMBLE % (group, k, group, other)))
        odds = compare(problem, options=Options(maximum_points=256)).odds[0]
        assert (odds.first, odds.second) == ("k", "l")
        # enumerated, not sampled: exact but for the sum of weights
        assert odds.first_sooner == pytest.approx(expected, abs=1e-12)


def test_a_bounded_product_beside_an_ensemble() -> None:
    """A product that the members do not touch is judged once for all of them: 0.5 % of it below zero is cut."""
    text = """
[goal]
kind = "exclude"
power = 0.5
within = "9 d"
[scenario.one]
splitting = { values = { A = "1 Hz", B = "2 Hz" }, weights = [1, 3], of = "difference" }
technique = { kind = "quoted", uncertainty = { value = "0.5 Hz", times = ["1.0(4)"] }, after = { value = "1 h", times = ["2"] } }
"""
    problem = problem_of(Study.from_toml(text))
    assert isinstance(law(problem, "one.splitting"), Ensemble)
    assert [address for code, address, _ in problem.warnings if code == "truncated"] == [
        "one.technique.uncertainty.times[0]"
    ]


def test_a_scenario_without_an_ensemble_beside_one_with() -> None:
    """5 sigma after the hour is 2.5 Hz, the median of one splitting, and between the two calculations of the other."""
    alone = """
[goal]
kind = "detect"
significance = 5
power = 0.5
within = "1 h"
[scenario.l]
splitting = { value = "2.5 Hz ×/ 1.5", of = "difference" }
technique = { kind = "quoted", uncertainty = "0.5 Hz", after = "1 h" }
"""
    beside = '[scenario.k]\nbased_on = "l"\nsplitting = { values = { A = "1.0(2) Hz", B = "3 Hz" }, weights = [3, 1], of = "difference" }\n'
    for text in (alone, alone + beside):
        found = [
            one.required_time.in_time
            for one in assess(problem_of(Study.from_toml(text)), Options(maximum_points=1024)).scenarios
        ]
        assert found == pytest.approx([0.5, 0.25][: len(found)], abs=1e-9)  # closed in the splitting, no sampling
