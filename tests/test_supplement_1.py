"""The worked examples of JCGM 101:2008 on the machinery that propagates pvfeas's inputs.

Values and tolerances from tests/data/checks.json, groups s1 and gum; each entry says its source.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy import special

from pvfeas.laws import Normal, Uniform
from pvfeas.linear import combine, numerical_tolerance, uncertainty_in_scores
from pvfeas.points import draw
from pvfeas.problem import Correlation, Input
from pvfeas.quantiles import pooled

CHECKS = {
    one["id"]: one for one in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
EXPONENT = 16  # 16 × 65536 points
ROOT3 = np.sqrt(3.0)
SQUARES = [name for name in CHECKS if name.startswith("s1.9.4.x")]
EXACT = [name for name in CHECKS if name.startswith("s1.9.4.exact")]


def summed(inputs: list[Input]) -> np.ndarray:
    sample = draw(inputs, [], 1, EXPONENT)
    return np.asarray(sum(sample.draws[one.address] for one in inputs))


def rectangular(u: float) -> Uniform:
    return Uniform(-ROOT3 * u, ROOT3 * u)


def interval(values: np.ndarray) -> list[float]:
    return pooled(values, np.ones_like(values), [0.025, 0.975])


@pytest.mark.parametrize(
    ("name", "laws"),
    [
        ("s1.9.2.2", [Normal(0.0, 1.0)] * 4),
        ("s1.9.2.4", [rectangular(1.0)] * 3 + [rectangular(10.0)]),
    ],
)
def test_additive_models(name: str, laws: list[Any]) -> None:
    """u exactly by the linear law; ends of the 95 % interval on lattice points to 0.002 u (their own error)."""
    inputs = [Input(f"x{i}", law) for i, law in enumerate(laws)]
    u, low_level, guf = (
        (CHECKS[name]["expected"][1], CHECKS[name]["expected"][2], CHECKS[name]["expected"][2])
        if name.endswith("2.2")
        else CHECKS[name]["expected"]
    )
    sizes = [law.sd if isinstance(law, Normal) else (law.upper - law.lower) / np.sqrt(12.0) for law in laws]
    found = combine(sizes, [one.address for one in inputs], [])
    assert found == pytest.approx(u, rel=1e-8)
    assert found * 1.959963984540054 == pytest.approx(guf, rel=1e-8, abs=CHECKS[name]["tolerance"].get("abs", 0.0))
    low, high = interval(summed(inputs))
    tolerance = CHECKS[name]["tolerance"].get("abs", 0.0) + 0.002 * u
    assert (low, high) == pytest.approx((-low_level, low_level), abs=tolerance)


def test_four_rectangular_laws() -> None:
    """9.2.3: ends at 2 sqrt 3 (2 - (3/5)^(1/4)) = 3.8794 exactly (derived), printed as 3.88."""
    low, high = interval(summed([Input(f"x{i}", rectangular(1.0)) for i in range(4)]))
    exact = 2.0 * ROOT3 * (2.0 - 0.6**0.25)
    assert (low, high) == pytest.approx((-exact, exact), abs=0.002)  # error of the points
    assert exact == pytest.approx(3.88, abs=0.005)


def squares(name: str) -> np.ndarray:
    """X1^2 + X2^2 in 1e-6, both normal with u = 0.005, correlated by r."""
    x1, r = CHECKS[name]["inputs"]["x1"], CHECKS[name]["inputs"]["r"]
    inputs = [Input("x1", Normal(x1, 0.005)), Input("x2", Normal(0.0, 0.005))]
    sample = draw(inputs, [Correlation(("x1", "x2"), r)] if r else [], 1, EXPONENT)
    values = np.broadcast_to(sample.draws["x1"] ** 2 + sample.draws["x2"] ** 2, sample.shape)
    return np.asarray(values) * 1e6


def shortest(values: np.ndarray) -> tuple[float, float]:
    """The shortest interval that holds 95 % (JCGM 101, 5.3.4): the vertex of a parabola through the widths near it."""
    ordered = np.sort(values.ravel())
    held = int(0.95 * ordered.size)
    width = ordered[held:] - ordered[:-held]
    near = np.flatnonzero(width <= 1.003 * width.min())
    curve = np.polynomial.Polynomial.fit(near, width[near], 3)
    start = int(near[np.argmin(curve(near))])
    return float(ordered[start]), float(ordered[start + held])


@pytest.mark.parametrize("name", SQUARES)
def test_comparison_loss(name: str) -> None:
    """9.4: printed estimate, uncertainty and shortest interval; its ends carry noise, hence the file's tolerance."""
    values = squares(name)
    found = [values.mean(), values.std(ddof=1), *shortest(values)]
    assert found == pytest.approx(CHECKS[name]["expected"], abs=CHECKS[name]["tolerance"]["abs"])


@pytest.mark.parametrize("name", EXACT)
def test_comparison_loss_moments(name: str) -> None:
    """Mean and standard deviation in closed form; 2e-4: error of 10^6 lattice points. First order: y(x), |2 x1| u."""
    values, expected = squares(name), CHECKS[name]["expected"]
    assert [values.mean(), values.std(ddof=1)] == pytest.approx(expected[:2], rel=2e-4)
    x1 = CHECKS[name]["inputs"]["x1"]
    assert 1e6 * x1**2 == pytest.approx(expected[2], rel=1e-9)
    correlations = [Correlation(("x1", "x2"), CHECKS[name]["inputs"]["r"])] if CHECKS[name]["inputs"]["r"] else []
    assert combine([2e6 * x1 * 0.005, 0.0], ["x1", "x2"], correlations) == pytest.approx(expected[3], rel=1e-9)


def test_numerical_tolerance() -> None:
    inputs = CHECKS["s1.delta"]["inputs"]
    found = [numerical_tolerance(u, digits) for u, digits in zip(inputs["u"], inputs["n_dig"], strict=True)]
    assert found == pytest.approx(CHECKS["s1.delta"]["expected"], rel=1e-9)


def test_scores_of_a_rectangular_law() -> None:
    """u over the slope at the median: (w/sqrt 12)/(w phi(0)) = sqrt(2 pi/12); 1e-6: the table it is summed on."""
    assert uncertainty_in_scores(Uniform(2.0, 5.0)) == pytest.approx(np.sqrt(2.0 * np.pi / 12.0), rel=1e-6)
    assert float(special.ndtr(0.0)) == 0.5
