"""Whole answers against closed forms: where every input is lognormal, ln(required time) is normal."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import integrate, special, stats

from pvfeas.compiler import problem_of
from pvfeas.options import Options
from pvfeas.questions.assess import assess
from pvfeas.questions.compare import compare
from pvfeas.results import ScenarioResult
from pvfeas.studyfile import load_study

DAY = 86400.0
PROBABILITIES = {"q05": 0.05, "q16": 0.16, "q50": 0.5, "q84": 0.84, "q95": 0.95}
Z90 = 1.2815515655446004  # normal table
Z95 = 1.959963984540054
DETECT = '[goal]\nkind = "detect"\nsignificance = 5\npower = 0.9\nwithin = "20 d"\n'


def answer(text: str, tolerance: float = 0.2) -> ScenarioResult:
    return assess(problem_of(load_study(text)), Options(tolerance=tolerance)).scenarios[0]


def check(found: ScenarioResult, median_time: float, width: float, relative: float = 1e-3) -> None:
    """Quantiles of a lognormal time: inside 1.25 × the stated error (95 %) + 1e-6, and within `relative`."""
    times = found.required_time
    for name, p in PROBABILITIES.items():
        exact = median_time * np.exp(width * special.ndtri(p))
        value, error = getattr(times, name), times.error[name]
        assert error is not None
        assert abs(value - exact) <= 1.25 * error + 1e-6 * exact, name
        assert value == pytest.approx(exact, rel=relative), name
    in_time = special.ndtr(np.log(20 * DAY / median_time) / width)
    assert times.in_time == pytest.approx(in_time, abs=3e-4)
    assert times.reachable == 1.0
    assert times.nominal == pytest.approx(median_time, rel=min(relative, 1e-6))


def test_quoted() -> None:
    """t = after ((k + z) u/d)^2; ln t has width 2 sqrt(ln^2 2 + ln^2 1.3)."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "50 mHz ×/ 2", of = "difference" }\n'
    study += 'technique = { kind = "quoted", uncertainty = "0.04 Hz ×/ 1.3", after = "1 d" }\n'
    median = DAY * ((5 + Z90) * 0.04 / 0.05) ** 2
    check(answer(study), median, 2.0 * np.hypot(np.log(2.0), np.log(1.3)))


def test_ramsey() -> None:
    """4 S^2/t, S^2 = cycle/(4 N (pi C T)^2): t = 4 (k + z)^2 cycle/(4 N (pi C T d)^2)."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "1 mHz ×/ 1.8", of = "difference" }\n'
    study += 'technique = { kind = "ramsey", free_time = "0.2 s", contrast = 0.7, molecules = "150 ×/ 1.6",'
    study += ' idle_time = "0.1 s" }\n'
    median = 4.0 * (5 + Z90) ** 2 * 0.3 / (4.0 * 150 * (np.pi * 0.7 * 0.2 * 1e-3) ** 2)
    check(answer(study), median, np.hypot(2.0 * np.log(1.8), np.log(1.6)))


def test_ramsey_with_coherence_and_one_state() -> None:
    """C = contrast exp(-T/coherence), sqrt(1/(2 N))/(pi C T) per cycle; simultaneous arms: 2 S^2/t."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "1 mHz ×/ 1.8", of = "difference" }\n'
    study += 'switching = { mode = "simultaneous" }\n[scenario.x.technique]\nkind = "ramsey"\nfree_time = "0.2 s"\n'
    study += 'contrast = 0.7\nmolecules = "150 ×/ 1.6"\ncoherence_time = "0.5 s"\nreadout = "one state"\n'
    contrast = 0.7 * np.exp(-0.4)
    median = 2.0 * (5 + Z90) ** 2 * 0.2 / (2.0 * 150 * (np.pi * contrast * 0.2 * 1e-3) ** 2)
    check(answer(study), median, np.hypot(2.0 * np.log(1.8), np.log(1.6)))


def test_scan() -> None:
    """kappa = sqrt(2/pi) for a Lorentzian over 200 FWHM; sigma^2 = kappa^2 FWHM spacing/SNR^2 per scan of 3 s.

    1.5e-3: the finite span moves kappa by 1e-5 and the spacing of FWHM/10 by nothing that matters.
    """
    study = DETECT + '[scenario.x]\nsplitting = { value = "2 Hz ×/ 1.5", of = "difference" }\n'
    study += 'line = { profile = "lorentzian", fwhm = "60 kHz ×/ 1.2" }\n'
    study += (
        'technique = { kind = "scan", snr = "40 ×/ 1.4", points = 2000, span = "200 FWHM", time = "3 s", free = [] }\n'
    )
    sigma2 = (2.0 / np.pi) * 60e3**2 / 10.0 / 40.0**2
    median = 4.0 * (5 + Z90) ** 2 * sigma2 * 3.0 / 2.0**2
    width = 2.0 * np.sqrt(np.log(1.5) ** 2 + np.log(1.2) ** 2 + np.log(1.4) ** 2)
    check(answer(study), median, width, relative=1.5e-3)


def test_normal_splitting_of_both_signs() -> None:
    """Required time falls as 1/d^2: its p quantile belongs to |d| at 1 - p of a folded normal law."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "0.1(2) Hz", of = "difference" }\n'
    study += 'technique = { kind = "quoted", uncertainty = "0.04 Hz", after = "1 d" }\n'
    found = answer(study)
    law = stats.foldnorm(c=0.1 / 0.2, scale=0.2)
    for name, p in PROBABILITIES.items():
        exact = DAY * ((5 + Z90) * 0.04 / law.isf(p)) ** 2
        assert getattr(found.required_time, name) == pytest.approx(exact, rel=1e-6), name  # nothing is drawn
    splitting = stats.norm(0.1, 0.2)
    assert [getattr(found.splitting, name) for name in PROBABILITIES] == pytest.approx(
        [splitting.ppf(p) for p in PROBABILITIES.values()], rel=1e-6
    )


def test_chance_by_quadrature() -> None:
    """Phi((s - k sigma)/sigma) + Phi((-s - k sigma)/sigma) over a lognormal splitting, sigma exact."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "50 mHz ×/ 2", of = "difference" }\n'
    study += 'technique = { kind = "quoted", uncertainty = "0.04 Hz", after = "1 d" }\n'
    sigma = 0.04 / np.sqrt(20.0)

    def chance(z: float) -> float:
        s = 0.05 * 2.0**z / sigma
        return float((special.ndtr(s - 5.0) + special.ndtr(-s - 5.0)) * stats.norm.pdf(z))

    exact = integrate.quad(chance, -9.0, 9.0, epsabs=1e-12, limit=200)[0]
    found = answer(study).chance
    assert abs(found.value - exact) <= 1.25 * found.error + 1e-6


def test_goals_scale_the_needed_signal() -> None:
    """sign: k + z; measure r: 1/r; exclude: z + Phi^-1((1 + power)/2), bounded: z + z_power; detect at power 1/2: k."""
    body = '[scenario.x]\nsplitting = { value = "50 mHz", of = "difference" }\n'
    body += 'technique = { kind = "quoted", uncertainty = "0.04 Hz", after = "1 d" }\n'
    goals = {
        'kind = "sign"\nsignificance = 3\npower = 0.9': 3 + Z90,
        'kind = "measure"\nrelative_uncertainty = 0.1': 10.0,
        'kind = "exclude"\npower = 0.9': Z95 + special.ndtri(0.95),
        'kind = "exclude"\npower = 0.9\nsides = 1': Z95 + Z90,
        'kind = "detect"\nsignificance = 4\npower = 0.5': 4.0,
    }
    for goal, size in goals.items():
        found = answer(f'[goal]\n{goal}\nwithin = "20 d"\n{body}')
        assert found.required_time.q50 == pytest.approx(DAY * (size * 0.04 / 0.05) ** 2, rel=1e-9), goal
        assert found.required_time.q05 == found.required_time.q95


def test_purity_schedule_and_supply() -> None:
    """F = (0.9 + 0.5)/2; duty 10/24 × 5/7 × 0.8 × 0.9; the sample ends after mass/(consumption/2) of live time.

    Reachable: (k + z) u/(F d) <= sqrt(live/1 d) at the end; ln of everything is normal, P exact.
    """
    study = DETECT + '[scenario.x]\nsplitting = { value = "0.3 Hz ×/ 1.5", of = "difference" }\n'
    study += 'technique = { kind = "quoted", uncertainty = "0.1 Hz ×/ 1.2", after = "1 d" }\n'
    study += 'samples = { ee_a = 0.9, ee_b = 0.5, mass = "2 g ×/ 1.3", consumption = "6 mg/h" }\n'
    study += "schedule = { hours_per_day = 10, days_per_week = 5, calibration_fraction = 0.2, uptime = 0.9 }\n"
    found = answer(study)
    needed_live = ((5 + Z90) * 0.1 / (0.7 * 0.3)) ** 2  # d, nominal
    duty = 10 / 24 * 5 / 7 * 0.8 * 0.9
    assert found.required_time.nominal == pytest.approx(needed_live * DAY / duty, rel=1e-9)
    end = 2.0 / (6e-3 * 24 / 2)  # d of live time
    width = np.sqrt(4 * np.log(1.5) ** 2 + 4 * np.log(1.2) ** 2 + np.log(1.3) ** 2)
    exact = special.ndtr(np.log(end / needed_live) / width)
    assert abs(found.required_time.reachable - exact) <= 1.25 * (found.required_time.error["reachable"] or 0.0)
    assert found.required_time.reachable == pytest.approx(exact, abs=3e-4)
    live = found.required_live_time
    assert live.q50 == pytest.approx((found.required_time.q50 or 0.0) * duty, rel=1e-12)  # one number scales


def test_reach_sensitivity_and_centre() -> None:
    """reach = (k + z) sigma/F; sensitivity = 2 S; centre = sqrt(1/(4 N))/(pi C T): lognormal in N."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "1 mHz ×/ 1.8", of = "difference" }\n'
    study += 'technique = { kind = "ramsey", free_time = "0.2 s", contrast = 0.7, molecules = "150 ×/ 1.6" }\n'
    found, width = answer(study), np.log(1.6) / 2.0
    centre = np.sqrt(1.0 / 600.0) / (np.pi * 0.7 * 0.2)
    sensitivity = 2.0 * centre * np.sqrt(0.2)
    reach = (5 + Z90) * sensitivity / np.sqrt(20 * DAY)
    for got, median in ((found.centre_uncertainty, centre), (found.sensitivity, sensitivity), (found.reach, reach)):
        assert got is not None
        for name, p in PROBABILITIES.items():
            exact = median * np.exp(width * special.ndtri(p))
            assert getattr(got, name) == pytest.approx(exact, rel=1e-6)  # the one input is integrated


def test_an_exact_splitting_integrates_the_input_that_matters() -> None:
    """With the splitting exact nothing is left to chance but lognormal molecules."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "1 mHz", of = "difference" }\n'
    study += 'technique = { kind = "ramsey", free_time = "0.2 s", contrast = 0.7, molecules = "150 ×/ 1.6" }\n'
    median = 4.0 * (5 + Z90) ** 2 * 0.2 / (4.0 * 150 * (np.pi * 0.7 * 0.2 * 1e-3) ** 2)
    check(answer(study), median, np.log(1.6), relative=1e-6)


def test_systematic_floor_makes_a_share_unreachable() -> None:
    """d/f > k + z is needed: P = Phi(ln(d/((k + z) f))/width)."""
    study = DETECT + '[scenario.x]\nsplitting = { value = "50 mHz ×/ 2", of = "difference" }\n'
    study += 'technique = { kind = "quoted", uncertainty = "0.04 Hz", after = "1 d" }\n'
    study += '[scenario.x.systematics]\nfloor = { size = "5 mHz ×/ 1.5", averages = "never" }\n'
    found = answer(study).required_time
    exact = special.ndtr(np.log(0.05 / ((5 + Z90) * 0.005)) / np.hypot(np.log(2.0), np.log(1.5)))
    assert abs(found.reachable - exact) <= 1.25 * (found.error["reachable"] or 0.0) + 1e-9


@pytest.mark.parametrize("within", [3.0, 5.0])
def test_reach_where_the_first_usable_time_is_uncertain(within: float) -> None:
    """Infinite where two cycles do not fit: by quadrature over the free time, molecules in closed form.

    1e-3: crossings interpolated between nodes; quantiles above P(usable) are null.
    """
    study = (
        DETECT.replace("20 d", f"{within} s")
        + '[scenario.x]\nsplitting = { value = "1 mHz ×/ 3", of = "difference" }\n'
    )
    study += 'technique = { kind = "ramsey", free_time = "1 s ×/ 1.5", contrast = 0.8, molecules = "1e3 ×/ 1.4" }\n'
    last = np.log(within / 2.0) / np.log(1.5)

    def reach(z: float) -> float:
        free_time = 1.5**z
        return float((5 + Z90) * 2.0 * np.sqrt(free_time / 4e3) / (np.pi * 0.8 * free_time) / np.sqrt(within))

    def below(value: float) -> float:
        def part(z: float) -> float:
            return float(stats.norm.pdf(z) * special.ndtr(np.log(value / reach(z)) / (np.log(1.4) / 2.0)))

        return float(integrate.quad(part, -9.0, last, epsabs=1e-13)[0])

    found = answer(study, tolerance=0.3).reach
    for name, p in PROBABILITIES.items():
        value = getattr(found, name)
        if p > special.ndtr(last):
            assert value is None
        else:
            assert value is not None
            assert below(value) == pytest.approx(p, abs=1e-3)


def test_nothing_to_see_and_nothing_left() -> None:
    """Both unreachable: a splitting of exactly zero, and a sample that ends before one cycle."""
    base = DETECT.replace("20 d", "1 s") + '[scenario.zero]\nsplitting = { value = "0 Hz", of = "difference" }\n'
    base += 'technique = { kind = "ramsey", free_time = "0.1 s", contrast = 0.8, molecules = "20 ×/ 1.5" }\n'
    base += '[scenario.used_up]\nbased_on = "zero"\nsplitting = { value = "1 uHz ×/ 2", of = "difference" }\n'
    base += 'samples = { mass = "1 mg", consumption = "5 kg/h" }\n'
    odds = compare(problem_of(load_study(base))).odds[0]
    assert (odds.first_sooner, odds.second_sooner, odds.neither) == (0.0, 0.0, 1.0)
