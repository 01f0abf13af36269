"""Reference noise in whole scenarios: what it adds to sigma, by hand and by simulated campaigns."""

from __future__ import annotations

import numpy as np
import pytest

from pvfeas.compiler import problem_of
from pvfeas.nominal import nominal_draws
from pvfeas.options import Options
from pvfeas.patterns import jumps, timing
from pvfeas.questions.assess import assess
from pvfeas.realisation import Realisation, realise
from pvfeas.results import ScenarioResult
from pvfeas.studyfile import load_study

DAY = 86400.0
STUDY = """
[goal]
kind = "detect"
significance = 5
power = 0.9
within = "20 d"
[scenario.x]
splitting = {{ value = "50 mHz", of = "difference" }}
switching = {{ {switching} }}
{line}
[scenario.x.technique]
kind = "ramsey"
free_time = "{free_time}"
idle_time = "{idle_time}"
contrast = 0.8
molecules = 1e6
[scenario.x.reference]
{reference}
"""
AB = 'pattern = "AB", dwell = "20 s"'
ABBA = 'pattern = "ABBA", dwell = "20 s"'
WHITE = 'laser = { kind = "white", allan = "3 Hz", at = "1 s" }'
FLICKER = 'cavity = { kind = "flicker", allan = "0.4 Hz" }'
WALK = 'room = { kind = "random-walk", allan = "0.2 Hz", at = "100 s" }'
DRIFT = 'slow = { kind = "drift", rate = "2 mHz/s" }'


def study(reference: str, switching: str = AB, line: str = "", free_time: str = "1 s", idle_time: str = "0 s") -> str:
    return STUDY.format(reference=reference, switching=switching, line=line, free_time=free_time, idle_time=idle_time)


def real(text: str) -> Realisation:
    problem = problem_of(load_study(text))
    return realise(problem.scenarios[0], nominal_draws(problem.inputs))


def reference_variance(text: str, wall: float) -> float:
    averaging = real(text).averaging
    parts = averaging.parts(np.asarray(wall))
    return float(sum(np.sum(part) for name, part in parts.items() if name.startswith("reference")))


def answer(text: str) -> ScenarioResult:
    return assess(problem_of(load_study(text)), Options(tolerance=10.0)).scenarios[0]


def test_white_noise() -> None:
    """h0 = 2 × 9: 2 h0/t; with dead time 2 h0/live; half of the wall time on schedule doubles it."""
    assert reference_variance(study(WHITE), 20 * DAY) == pytest.approx(36.0 / (20 * DAY), rel=1e-9)
    dead = study(WHITE, switching=f'{AB}, dead_time = "5 s"')
    assert reference_variance(dead, 20 * DAY) == pytest.approx(36.0 / (20 * DAY * 40 / 50), rel=1e-9)
    half = study(WHITE, line="schedule = { hours_per_day = 12 }")
    assert reference_variance(half, 20 * DAY) == pytest.approx(36.0 / (10 * DAY), rel=1e-9)


def test_flicker_noise_is_no_floor() -> None:
    """3.410227 h-1 tau/t for AB, twice that for ABBA (28 zeta(3)/pi^2), h-1 = 0.16/(2 ln 2)."""
    level = 0.16 / (2.0 * np.log(2.0))
    expected = 28.0 * 1.2020569031595942 / np.pi**2 * level * 20.0 / (200 * DAY)
    assert reference_variance(study(FLICKER), 200 * DAY) == pytest.approx(expected, rel=1e-4)  # few patterns, 1/N
    assert reference_variance(study(FLICKER, ABBA), 200 * DAY) == pytest.approx(2.0 * expected, rel=1e-4)


def test_random_walk_noise() -> None:
    """8 pi^2/3 h-2 tau^2/t for both patterns, h-2 = 3 × 0.04/(2 pi^2 × 100)."""
    level = 3.0 * 0.04 / (2.0 * np.pi**2 * 100.0)
    expected = 8.0 * np.pi**2 / 3.0 * level * 400.0 / (20 * DAY)
    for pattern in (AB, ABBA):
        assert reference_variance(study(WALK, pattern), 20 * DAY) == pytest.approx(expected, rel=1e-9)


def test_drift_biases_ab_and_not_abba() -> None:
    """drift × (dwell + dead time), however long it runs; detrending and ABBA are free of it."""
    dead = study(DRIFT, switching=f'{AB}, dead_time = "5 s"')
    for wall in (DAY, 100 * DAY):
        assert reference_variance(dead, wall) == pytest.approx((2e-3 * 25.0) ** 2, rel=1e-9)
    assert reference_variance(study(DRIFT, ABBA), 20 * DAY) == pytest.approx(0.0, abs=1e-20)
    assert reference_variance(study(DRIFT, f"{AB}, detrend = true"), 20 * DAY) == 0.0


def test_detrending_costs_noise_early() -> None:
    """1 + 3/(N^2 - 1) over N dwells: 2 for the first pair, nothing later."""
    plain, fitted = study(WHITE), study(WHITE, f"{AB}, detrend = true")
    assert reference_variance(fitted, 40.0) == pytest.approx(2.0 * reference_variance(plain, 40.0), rel=1e-9)
    assert reference_variance(fitted, 20 * DAY) == pytest.approx(reference_variance(plain, 20 * DAY), rel=1e-8)


def test_both_at_once() -> None:
    """Allan variance at t over rejection^2: h0/(2 t), 2 ln 2 h-1, (2 pi^2/3) h-2 t."""
    both = 'mode = "simultaneous", rejection = 30'
    t = 20 * DAY
    assert reference_variance(study(WHITE, both), t) == pytest.approx(9.0 / t / 900.0, rel=1e-9)
    assert reference_variance(study(FLICKER, both), t) == pytest.approx(0.16 / 900.0, rel=1e-9)
    assert reference_variance(study(WALK, both), t) == pytest.approx(0.04 / 100.0 * t / 900.0, rel=1e-9)


def test_a_random_walk_of_both_sets_a_best_time() -> None:
    """A/t + B t is least at sqrt(A/B): a campaign stops there, and more time is no better."""
    text = study(WALK, 'mode = "simultaneous", rejection = 3')
    averaging = real(text).averaging
    assert float(averaging.best_time(np.asarray(1e9)).item()) < 1e9
    assert float(averaging.best_variance(np.asarray(1e9)).item()) <= float(
        averaging.best_variance(np.asarray(1e8)).item()
    )


def test_laser_noise_counts_photons_times() -> None:
    two = study(WHITE, line='line = { frequency = "30 THz", photons = 2 }')
    assert reference_variance(two, 20 * DAY) == pytest.approx(
        4.0 * reference_variance(study(WHITE), 20 * DAY), rel=1e-12
    )
    molecule = study(WHITE.replace("}", ', of = "molecule" }'), line='line = { frequency = "30 THz", photons = 2 }')
    assert reference_variance(molecule, 20 * DAY) == pytest.approx(
        reference_variance(study(WHITE), 20 * DAY), rel=1e-12
    )


def test_a_table_is_its_levels() -> None:
    """White noise of 3 Hz at 1 s written as deviations."""
    table = 'laser = { kind = "table", table = [["1 s", "3 Hz"], ["9 s", "1 Hz"], ["100 s", "0.3 Hz"]] }'
    assert reference_variance(study(table), 20 * DAY) == pytest.approx(
        reference_variance(study(WHITE), 20 * DAY), rel=1e-9
    )


def test_at_least_one_whole_pattern() -> None:
    text = study(WHITE, switching=f'{ABBA}, dead_time = "5 s"')
    assert float(real(text).averaging.first.item()) == pytest.approx(4 * 20.0 + 2 * 5.0)


def test_idle_time_is_dearer_for_white_noise_by_cycle_over_free_time() -> None:
    text = study(WHITE, free_time="0.4 s", idle_time="0.6 s")
    assert reference_variance(text, 20 * DAY) == pytest.approx(
        2.5 * reference_variance(study(WHITE), 20 * DAY), rel=1e-9
    )


@pytest.mark.parametrize("free_time", [0.3, 0.7])
def test_simulated_idle_time(free_time: float) -> None:
    """Flicker noise seen for part of each second through AB with dwells of ten cycles; 12 000 runs of two patterns.

    Standard error of sigma 0.65 %; bound three of them and 1 % for the grid and for cycles that begin dwells.
    """
    count, grid, longer = 12_000, 20, 8
    random = np.random.default_rng(5)
    total, dt = 40 * grid, 1.0 / grid
    frequencies = np.fft.rfftfreq(longer * total, dt)
    size = np.zeros_like(frequencies)
    size[1:] = 1.0 / frequencies[1:]
    both = random.standard_normal((2, count, frequencies.size), dtype=np.float32)
    spectrum = (both[0] + 1j * both[1]) * np.sqrt(size / 4.0 * longer * total / dt).astype(np.float32)
    noise = np.fft.irfft(spectrum, axis=1)[:, :total]
    found = timing("AB", np.asarray(10.0), np.asarray(0.0), np.asarray(0.5))
    places, sizes = jumps(found)
    middle = (np.arange(20 * grid) + 0.5) * dt
    envelope = (np.heaviside(middle[None] - places[:, None] * 20.0, 0.5) * sizes[:, None]).sum(axis=0)
    weight = np.tile(envelope * np.where(middle % 1.0 < free_time, 1.0 / free_time, 0.0), 2)
    simulated = (noise * weight).mean(axis=1)
    text = study(
        FLICKER, 'pattern = "AB", dwell = "10 s"', free_time=f"{free_time} s", idle_time=f"{1.0 - free_time:.1f} s"
    )
    predicted = np.sqrt(reference_variance(text, 40.0) * 2.0 * np.log(2.0) / 0.16)
    ratio = float(np.sqrt(np.mean(simulated**2))) / predicted
    bound = 3.0 / np.sqrt(2.0 * count) + 0.01
    assert abs(ratio - 1.0) < bound
    assert abs(ratio / 1.05 - 1.0) > bound - 0.01


def test_an_answer_carries_it() -> None:
    """In the answer: reference part of sigma, its share, and the sensitivity with it."""
    with_noise, without = answer(study(f"{WHITE}\n{FLICKER}")), answer(study(WHITE.replace("3 Hz", "1 nHz")))
    assert with_noise.sigma.reference.nominal == pytest.approx(
        np.sqrt(reference_variance(study(f"{WHITE}\n{FLICKER}"), 20 * DAY)), rel=1e-9
    )
    assert set(with_noise.sigma.shares) >= {"statistics", "reference.laser", "reference.cavity"}
    assert sum(with_noise.sigma.shares.values()) == pytest.approx(1.0)
    assert with_noise.limiting.name == "reference"
    assert with_noise.sensitivity is not None
    assert without.sensitivity is not None
    assert (with_noise.sensitivity.q50 or 0.0) > 10.0 * (without.sensitivity.q50 or 0.0)
    total = with_noise.sigma.total.nominal
    assert total is not None
    assert with_noise.sensitivity.nominal == pytest.approx(total * np.sqrt(20 * DAY), rel=1e-9)


def test_variance_is_the_sum_of_its_parts() -> None:
    text = study("\n".join((WHITE, FLICKER, WALK, DRIFT)), f'{AB}, dead_time = "2 s"')
    averaging = real(text).averaging
    for wall in (50.0, 333.0, 5e4, 1e7):
        parts = averaging.parts(np.asarray(wall))
        assert float(averaging.variance(np.asarray(wall)).item()) == pytest.approx(
            sum(float(np.sum(p)) for p in parts.values()), rel=1e-12
        )


def test_drawn_timing() -> None:
    """A dwell that is uncertain: the same as each dwell by itself."""
    text = study(FLICKER, 'pattern = "AB", dwell = "20 s ×/ 1.3", dead_time = "2 s"')
    problem = problem_of(load_study(text))
    draws = {**nominal_draws(problem.inputs), "x.switching.dwell": np.array([[10.0, 20.0, 31.0]])}
    found = realise(problem.scenarios[0], draws).averaging.variance(np.asarray(700.0))
    single = [
        reference_variance(study(FLICKER, f'pattern = "AB", dwell = "{dwell} s", dead_time = "2 s"'), 700.0)
        for dwell in (10, 20, 31)
    ]
    statistics = realise(problem.scenarios[0], draws).averaging.parts(np.asarray(700.0))["statistics"]
    assert (found - statistics).ravel() == pytest.approx(single, rel=1e-9)


def test_a_fitted_trend_leaves_a_fifth_of_the_bias_of_a_random_walk() -> None:
    """AB: (8 pi^2/3 - 4/5 × 2 pi^2) h-2 tau^2/t, against least squares with a trend on 60 dwells of a simulated walk.

    8 000 walks: standard error of sigma 0.8 %; bound three of them and 1.5 % for 60 dwells.
    """
    random, dwells, steps = np.random.default_rng(6), 60, 20
    walk = np.cumsum(random.standard_normal((8_000, dwells * steps)), axis=1) / np.sqrt(steps)  # variance 1 a dwell
    mean = walk.reshape(8_000, dwells, steps).mean(axis=-1)
    design = np.stack(
        [np.where(np.arange(dwells) % 2 == 0, 0.5, -0.5), np.ones(dwells), np.arange(dwells) - dwells / 2.0]
    )
    estimator = np.linalg.inv(design @ design.T) @ design
    found = float(np.std(mean @ estimator[0]))
    level = 1.0 / (2.0 * np.pi**2)  # a walk of variance 1 a dwell
    expected = np.sqrt((8.0 / 3.0 - 8.0 / 5.0) * np.pi**2 * level / dwells)
    assert found / expected == pytest.approx(1.0, abs=3 * 0.008 + 0.015)
    plain = reference_variance(study(WALK), 20 * DAY)
    fitted = reference_variance(study(WALK, f"{AB}, detrend = true"), 20 * DAY)
    assert fitted / plain == pytest.approx((8.0 / 3.0 - 8.0 / 5.0) / (8.0 / 3.0), rel=1e-6)
