"""Allan estimators against published numbers; with them, the levels of simulated noise against the formulas.

The estimators are test code: they judge pvfeas.frequency_noise and the simulated noise that judges the patterns.
"""

from __future__ import annotations

import json
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate

from pvfeas.frequency_noise import allan_variance, level_of_deviation

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}


def phase(frequency: np.ndarray) -> np.ndarray:
    return np.concatenate([np.zeros((*frequency.shape[:-1], 1)), np.cumsum(frequency, axis=-1)], axis=-1)


def root_mean(squares: np.ndarray, factor: float) -> float:
    return float(np.sqrt(np.mean(squares) / factor))


def second(x: np.ndarray, m: int) -> np.ndarray:
    return x[..., 2 * m :] - 2.0 * x[..., m:-m] + x[..., : -2 * m]


def third(x: np.ndarray, m: int) -> np.ndarray:
    return x[..., 3 * m :] - 3.0 * x[..., 2 * m : -m] + 3.0 * x[..., m : -2 * m] - x[..., : -3 * m]


def adev(frequency: np.ndarray, m: int) -> float:
    return root_mean(second(phase(frequency)[..., ::m], 1) ** 2, 2.0 * m**2)


def oadev(frequency: np.ndarray, m: int) -> float:
    return root_mean(second(phase(frequency), m) ** 2, 2.0 * m**2)


def mdev(frequency: np.ndarray, m: int) -> float:
    moving = np.convolve(second(phase(frequency), m), np.ones(m) / m, mode="valid")
    return root_mean(moving**2, 2.0 * m**2)


def tdev(frequency: np.ndarray, m: int) -> float:
    return m / np.sqrt(3.0) * mdev(frequency, m)


def hdev(frequency: np.ndarray, m: int) -> float:
    return root_mean(third(phase(frequency)[..., ::m], 1) ** 2, 6.0 * m**2)


def ohdev(frequency: np.ndarray, m: int) -> float:
    return root_mean(third(phase(frequency), m) ** 2, 6.0 * m**2)


def totdev(frequency: np.ndarray, m: int) -> float:
    x = phase(frequency)
    longer = np.concatenate([2.0 * x[0] - x[-2:0:-1], x, 2.0 * x[-1] - x[-2:0:-1]])
    inner = np.arange(1, x.size - 1) + x.size - 2
    return root_mean((longer[inner - m] - 2.0 * longer[inner] + longer[inner + m]) ** 2, 2.0 * m**2)


def deviation(frequency: np.ndarray, m: int) -> float:
    whole = frequency.size // m
    return float(np.std(frequency[: whole * m].reshape(whole, m).mean(axis=1), ddof=1))


ESTIMATORS = {
    "adev": adev, "oadev": oadev, "mdev": mdev, "tdev": tdev, "hdev": hdev, "ohdev": ohdev, "totdev": totdev, "std": deviation,
}  # fmt: skip
NINE = np.array([892.0, 809, 823, 798, 671, 644, 883, 903, 677])
# NIST SP 1065, Tables 29 to 32, pp. 107 to 109, as quoted in PHYSICS section 6, for m = 1, 2 and m = 1, 10, 100;
# hdev of the nine at m = 1 is printed 70.80608, exact rounding gives ...07
NIST = {
    "adev": ((91.22945, 115.8082), (2.922319e-1, 9.965736e-2, 3.897804e-2)),
    "oadev": ((91.22945, 85.95287), (2.922319e-1, 9.159953e-2, 3.241343e-2)),
    "mdev": ((91.22945, 74.78849), (2.922319e-1, 6.172376e-2, 2.170921e-2)),
    "tdev": ((52.67135, 86.35831), (1.687202e-1, 3.563623e-1, 1.253382)),
    "hdev": ((70.80607, 116.7980), (2.943883e-1, 1.052754e-1, 3.910860e-2)),
    "ohdev": ((70.80607, 85.61487), (2.943883e-1, 9.581083e-2, 3.237638e-2)),
    "totdev": ((91.22945, 93.90379), (2.922319e-1, 9.134743e-2, 3.406530e-2)),
    "std": ((100.9770, 102.6039), (2.884664e-1, 9.296352e-2, 3.206656e-2)),
}  # fmt: skip


def thousand() -> np.ndarray:
    """The 1000 points of SP 1065: n' = 16807 n mod 2147483647, over 2147483647."""
    numbers = [1234567890]
    while len(numbers) < 1000:
        numbers.append(16807 * numbers[-1] % 2147483647)
    assert numbers[1:4] == [395529916, 1209410747, 633705974]
    return np.array(numbers) / 2147483647.0


@pytest.mark.parametrize("name", NIST)
def test_published_deviations(name: str) -> None:
    """Seven printed digits: half a unit of the last is 2e-7 to 5e-7."""
    nine, many = NIST[name]
    assert [ESTIMATORS[name](NINE, m) for m in (1, 2)] == pytest.approx(nine, rel=5e-7)
    points = thousand()
    assert [ESTIMATORS[name](points, m) for m in (1, 10, 100)] == pytest.approx(many, rel=5e-7)


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("sp1065")])
def test_published_deviations_in_checks(name: str) -> None:
    check = CHECKS[name]
    estimator = ESTIMATORS[name.rsplit(".", 1)[1]]
    frequency = np.array(check["inputs"]["freq"]) if "freq" in check["inputs"] else thousand()
    found = [estimator(frequency, m) for m in check["inputs"]["m"]]
    assert found == pytest.approx(check["expected"], rel=check["tolerance"]["rel"])


def test_a_drift_and_a_sampled_walk() -> None:
    """Linear drift a: a t/sqrt 2, Hadamard nothing. A walk sampled once a step: q (2 m^2 + 1)/(6 m), q/2 at m = 1, not q/3."""
    rising = 0.3 * np.arange(64.0)
    assert adev(rising, 4) == pytest.approx(0.3 * 4 / np.sqrt(2.0), rel=1e-12)
    assert hdev(rising, 4) == pytest.approx(0.0, abs=1e-9)
    walks = np.cumsum(np.random.default_rng(4).standard_normal((20_000, 64)), axis=1)
    for m in (1, 4):
        expected = np.sqrt((2.0 * m**2 + 1.0) / (6.0 * m))
        assert oadev(walks, m) == pytest.approx(expected, rel=0.01)  # 20 000 walks: standard error below 0.3 %


@pytest.mark.parametrize("kind", ["white", "flicker", "random-walk"])
def test_allan_variance_is_its_integral(kind: str) -> None:
    """2 ∫ S sin^4(pi f t)/(pi f t)^2 df to 200/t; beyond, sin^4 averages to 3/8 and the integral is closed; 1e-5 of its ripple."""
    power, tau = {"white": 0, "flicker": -1, "random-walk": -2}[kind], 1.7

    def gain(f: float) -> float:
        return float(2.0 * f**power * np.sin(np.pi * f * tau) ** 4 / (np.pi * f * tau) ** 2)

    edges = np.concatenate([[1e-9], np.arange(1, 401) / (2.0 * tau)])
    total = sum(integrate.quad(gain, low, high, epsabs=0.0, epsrel=1e-9)[0] for low, high in pairwise(edges))
    total += 0.75 / (np.pi * tau) ** 2 * edges[-1] ** (power - 1) / (1 - power)
    levels = [np.asarray(float(kind == one)) for one in ("white", "flicker", "random-walk")]
    assert float(allan_variance(*levels, np.asarray(tau))) == pytest.approx(total, rel=1e-5)


def noise(kind: str, level: float, dt: float, count: int, length: int, seed: int) -> np.ndarray:
    """Frequency noise as means over steps of dt: white; a random walk; flicker by its spectrum, eight times too long."""
    random = np.random.default_rng(seed)
    if kind == "white":
        return np.asarray(random.standard_normal((count, length)) * np.sqrt(level / (2.0 * dt)))
    if kind == "random-walk":
        size = np.sqrt(2.0 * np.pi**2 * level * dt)  # the mean over a step: half of it, and a part that stays within
        inner, outer = random.standard_normal((2, count, length))
        return np.asarray(size * (np.cumsum(outer, axis=1) - outer / 2.0 + inner / np.sqrt(12.0)))
    frequencies = np.fft.rfftfreq(8 * length, dt)
    power = np.zeros_like(frequencies)
    power[1:] = level / frequencies[1:]
    both = random.standard_normal((2, count, frequencies.size))
    spectrum = (both[0] + 1j * both[1]) * np.sqrt(power / 4.0 * 8 * length / dt)
    return np.asarray(np.fft.irfft(spectrum, axis=1)[:, :length])


@pytest.mark.parametrize("kind", ["white", "flicker", "random-walk"])
def test_levels_of_simulated_noise(kind: str) -> None:
    """A level from an Allan deviation of 0.7 Hz at 20 s, simulated, has that deviation there; at another time the formula's.

    4000 series of 10 independent pairs at 20 s: standard error of the deviation 0.4 % (white); bound three of them,
    and 1 % for the flicker noise that the grid of 1 s leaves out at high frequency.
    """
    level = float(level_of_deviation(kind, np.asarray(0.7), np.asarray(20.0)))
    series = noise(kind, level, 1.0, 4000, 200, 11)
    levels = [np.asarray(level * (kind == one)) for one in ("white", "flicker", "random-walk")]
    for m in (10, 20, 50):
        expected = float(np.sqrt(allan_variance(*levels, np.asarray(float(m)))))
        assert oadev(series, m) == pytest.approx(expected, rel=0.022 if kind == "flicker" else 0.012)
    assert oadev(series, 20) == pytest.approx(0.7, rel=0.022 if kind == "flicker" else 0.012)
