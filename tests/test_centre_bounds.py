"""Cramér–Rao bounds of the centre: published and derived values, an independent discrete Fisher sum, bytes."""

from __future__ import annotations

import json
from collections.abc import Iterable
from itertools import combinations, pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import optimize, special

from pvfeas.centre_bounds import (
    FREE,
    MOST_SUMMED,
    centre_information,
    columns,
    information_matrix,
    kappa,
    legendre,
    stretched_nodes,
)
from pvfeas.profiles import PROFILES

CHECKS = {entry["id"]: entry for entry in json.loads((Path(__file__).parent / "data" / "checks.json").read_text())}
DENSE = np.asarray(1e7)  # points; their sum is the integral
NOTHING: tuple[str, ...] = ()
EVEN = ("amplitude", "width", "baseline")
COLUMNS = (EVEN, (*EVEN, "slope"), (*EVEN, "asymmetry"), (*EVEN, "slope", "asymmetry"))
NAMES = {"gauss": "gaussian", "lorentz": "lorentzian"}
BOTH = pytest.mark.parametrize("profile", ["gaussian", "lorentzian"])
ALL_SETS = [chosen for size in range(6) for chosen in combinations(FREE, size)]

# Left out, for they belong to profiles that are not offered yet: crb.voigt.kappa.*, crb.deriv1.lorentz.kappa.


def one(
    profile: str, free: Iterable[str], span: float, offset: float = 0.0, points: Any = DENSE, background: Any = None
) -> float:
    behind = None if background is None else np.asarray(background)
    return float(kappa(profile, tuple(free), np.asarray(span), np.asarray(offset), np.asarray(points), behind))


# --- published and derived values ---------------------------------------------------------------


def test_infinite_span() -> None:
    # Landman, Roussel-Dupré & Tanigawa 1982: Gaussian 0.69 (from memory), closed forms (derived)
    entry = CHECKS["crb.gauss.kappa"]
    assert one("gaussian", NOTHING, 12.0) == pytest.approx(entry["expected"], rel=entry["tolerance"]["rel"])
    assert one("gaussian", NOTHING, 12.0) == pytest.approx((2.0 * np.pi * np.log(2.0)) ** -0.25, rel=1e-12)
    # what lies beyond 50 FWHM on either side carries 32/3 × 50^-5/... < 1e-7 of the information
    assert one("lorentzian", NOTHING, 100.0) == pytest.approx(np.sqrt(2.0 / np.pi), rel=1e-7)


@pytest.mark.parametrize("profile", ["gauss", "lorentz"])
def test_amplitude_and_width_jointly(profile: str) -> None:
    entry = CHECKS[f"crb.{profile}.sigmaA_sigmaGamma"]
    # the rest of an infinite span beyond W: 1/W^3 of the information for the Lorentzian
    span = 12.0 if profile == "gauss" else 2000.0
    x, weights = _dense(span)
    vectors = {name: columns(PROFILES[NAMES[profile]], x, (name,))[0] for name in ("amplitude", "width")}
    found = [
        1.0 / np.sqrt(centre_information(information_matrix([vectors[other], vectors[name]], weights))[0])
        for name, other in (("amplitude", "width"), ("width", "amplitude"))
    ]
    assert found == pytest.approx(entry["expected"], rel=entry["tolerance"]["rel"] if profile == "gauss" else 1e-8)


def _dense(span: float) -> tuple[np.ndarray, np.ndarray]:
    """Many panels of the public nodes side by side."""
    edges = np.sinh(np.linspace(-np.arcsinh(span), np.arcsinh(span), 21)) / 2.0
    nodes = [stretched_nodes(np.array([a]), np.array([b]), legendre(24)) for a, b in pairwise(edges)]
    return np.concatenate([n[0] for n in nodes], axis=1), np.concatenate([n[1] for n in nodes], axis=1)


@pytest.mark.parametrize("name", [name for name in CHECKS if name.startswith("crb.span.")])
def test_finite_span_checks(name: str) -> None:
    entry = CHECKS[name]
    profile, span = NAMES[entry["inputs"]["profile"]], entry["inputs"]["W_over_Gamma"]
    found = [one(profile, free, span) for free in (NOTHING, *COLUMNS)]
    assert found == pytest.approx(entry["expected"], rel=entry["tolerance"]["rel"])


# Derived by Gauss–Legendre quadrature, confirmed by midpoint sums, to the digits given.
FINITE_SPANS = {
    1.0: ((0.91530, 4.98426, 13.41312, 257.972), (0.94545, 2.66023, 5.12667, 29.4562)),
    1.5: ((0.72990, 1.83711, 4.47695, 38.6301), (0.83845, 1.48020, 2.76219, 9.50336)),
    2.0: ((0.69615, 1.12186, 2.50250, 12.3276), (0.81169, 1.14129, 2.06448, 5.32699)),
    3.0: ((0.69223, 0.79325, 1.59525, 3.92788), (0.80037, 0.92818, 1.59537, 3.03003)),
    4.0: ((0.69223, 0.73040, 1.40067, 2.49498), (0.79855, 0.86220, 1.42849, 2.31506)),
    6.0: ((0.69223, 0.70291, 1.28500, 1.78893), (0.79798, 0.82074, 1.29851, 1.79176)),
    10.0: ((0.69223, 0.69449, 1.22027, 1.46080), (0.79789, 0.80369, 1.21749, 1.47624)),
    20.0: ((0.69223, 0.69251, 1.18140, 1.28565), (0.79788, 0.79871, 1.16845, 1.28619)),
}


@pytest.mark.parametrize("span", FINITE_SPANS)
def test_finite_span_table(span: float) -> None:
    for profile, expected in zip(("gaussian", "lorentzian"), FINITE_SPANS[span], strict=True):
        found = [one(profile, free, span) for free in COLUMNS]
        assert found == pytest.approx(expected, rel=7.3e-6)  # half of the fifth decimal of 0.69


def test_an_unknown_admixture_costs_root_two_on_a_lorentzian_however_wide_the_scan() -> None:
    # sqrt 2 (Lorentzian), 1/sqrt(1 - 2/pi) (Gaussian), derived; the rest at span W falls as 1/W
    for profile, factor in (("lorentzian", np.sqrt(2.0)), ("gaussian", 1.0 / np.sqrt(1.0 - 2.0 / np.pi))):
        found = [one(profile, ("asymmetry",), span) / one(profile, NOTHING, span) for span in (50, 100, 200)]
        ratios = [one / factor - 1.0 for one in found]
        assert 0 < ratios[2] < 0.51 * ratios[1] < 0.51**2 * ratios[0] < 0.51**2 * 0.03


@pytest.mark.parametrize(("offset", "expected"), [(0.5, (0.69461, 0.80879)), (1.0, (0.85776, 0.90516))])
def test_off_centre_table(offset: float, expected: tuple[float, float]) -> None:
    # span 3 FWHM; amplitude, width and baseline free (derived, five digits)
    for profile, value in zip(("gaussian", "lorentzian"), expected, strict=True):
        assert one(profile, EVEN, 3.0, offset) == pytest.approx(value, rel=8e-6)
        assert one(profile, EVEN, 3.0, -offset) == pytest.approx(value, rel=8e-6)


# Best span for a given number of points, sigma = K FWHM/(SNR sqrt n): derived to the digits given.
@pytest.mark.parametrize(
    ("profile", "free", "span", "constant"),
    [
        ("gaussian", EVEN, 1.2835, 0.88030), ("gaussian", (*EVEN, "slope"), 2.902, 1.37275),
        ("lorentzian", EVEN, 0.9403, 0.94390), ("lorentzian", (*EVEN, "slope"), 2.452, 1.58059),
        ("gaussian", FREE, *CHECKS["crb.optspan.gauss.cAwbsD"]["expected"]),
        ("lorentzian", FREE, *CHECKS["crb.optspan.lorentz.cAwbsD"]["expected"]),
    ],
)  # fmt: skip
def test_best_span(profile: str, free: tuple[str, ...], span: float, constant: float) -> None:
    found = optimize.minimize_scalar(
        lambda w: one(profile, free, w) * np.sqrt(w), bounds=(0.5, 12.0), method="bounded", options={"xatol": 1e-7}
    )
    assert found.x == pytest.approx(span, rel=4e-4)  # four digits, and a flat minimum
    assert found.fun == pytest.approx(constant, rel=2e-5)


SHOT = {
    0.0: (0.41160, 0.56419), 0.01: (0.42887, 0.57366), 0.1: (0.50231, 0.63665), 0.3: (0.60577, 0.74159),
    1.0: (0.84933, 1.00731), 3.0: (1.30020, 1.51634), 10.0: (2.24722, 2.60024),
}  # fmt: skip


@pytest.mark.parametrize("background", SHOT)
def test_shot_noise_table(background: float) -> None:
    # derived; Bobroff 1986 for the Gaussian without background (from memory)
    for profile, span, expected in zip(("gaussian", "lorentzian"), (12.0, 400.0), SHOT[background], strict=True):
        # five digits; 1e-5 is the rest of a Lorentzian beyond the span
        assert one(profile, NOTHING, span, background=background) == pytest.approx(expected, rel=2e-5)


def test_shot_noise_without_background() -> None:
    entry = CHECKS["crb.poisson.gauss"]
    per_peak, per_total = entry["expected"]
    found = one("gaussian", NOTHING, 12.0, background=0.0)
    assert found == pytest.approx(per_peak, rel=entry["tolerance"]["rel"])
    area = np.sqrt(np.pi / (4.0 * np.log(2.0)))  # of the unit-peak profile, in FWHM: total counts × spacing/peak counts
    assert found * np.sqrt(area) == pytest.approx(per_total, rel=entry["tolerance"]["rel"])
    assert one("lorentzian", NOTHING, 400.0, background=0.0) == pytest.approx(1.0 / np.sqrt(np.pi), rel=1e-6)


@BOTH
def test_much_background_is_white_noise(profile: str) -> None:
    ratio = one(profile, FREE, 5.0, 0.4, background=1e6) / one(profile, FREE, 5.0, 0.4)
    assert ratio == pytest.approx(1e3, rel=1e-6)  # sqrt(background); the line adds 1e-6 to the variance at most


# --- an independent sum over the points -----------------------------------------------------------


def spectrum(profile: str, nu: np.ndarray, theta: list[complex]) -> np.ndarray:
    """A (g + asymmetry × partner) + baseline + slope × nu, from the definitions, for complex arguments too."""
    centre, amplitude, width, baseline, slope, asymmetry = theta
    u = 2.0 * (nu - centre) / width
    if profile == "lorentzian":
        line, partner = 1.0 / (1.0 + u * u), u / (1.0 + u * u)
    else:
        root = np.sqrt(np.log(2.0))
        line, partner = np.exp(-((root * u) ** 2)), 2.0 / np.sqrt(np.pi) * special.dawsn(root * u)
    return np.asarray(amplitude * (line + asymmetry * partner) + baseline + slope * nu)


def summed_kappa(
    profile: str, free: tuple[str, ...], span: float, offset: float, points: int, background: float | None
) -> float:
    """kappa from the Fisher matrix over the points, derivatives by complex steps, inverted by LAPACK in 53 bits."""
    nu = offset + span * ((np.arange(points) + 0.5) / points - 0.5)
    truth: list[complex] = [0.0, 1.0, 1.0, 0.0, 0.0, 0.0]
    chosen = [0, *(FREE.index(name) + 1 for name in free)]
    rows = []
    for k in chosen:
        moved = [value + (1e-30j if i == k else 0.0) for i, value in enumerate(truth)]
        rows.append(spectrum(profile, nu, moved).imag / 1e-30)
    jacobian = np.array(rows)
    if background is not None:
        jacobian = jacobian / np.sqrt(spectrum(profile, nu, truth).real + background)
    jacobian = jacobian / np.linalg.norm(jacobian, axis=1)[:, None] * (first := np.linalg.norm(jacobian[0]))
    singular = np.linalg.svd(jacobian, compute_uv=False)
    if singular[-1] < 1e-5 * singular[0]:
        return np.nan  # too near to singular for either side to be judged
    inverse = np.linalg.pinv(jacobian)
    assert first > 0
    return float(np.linalg.norm(inverse[:, 0]) / np.sqrt(span / points))


@settings(max_examples=400, deadline=None, derandomize=True)
@given(
    profile=st.sampled_from(["gaussian", "lorentzian"]),
    free=st.sampled_from(ALL_SETS),
    span=st.floats(0.6, 80.0),
    place=st.floats(-0.5, 0.5),
    finer=st.floats(1.0, 40.0),
    background=st.none() | st.floats(0.02, 5.0),
)
def test_within_one_per_cent_of_the_sum_over_the_points(
    profile: str, free: tuple[str, ...], span: float, place: float, finer: float, background: float | None
) -> None:
    points = max(int(np.ceil(3.0 * span * finer)), len(free) + 2)  # spacing at most a third of the FWHM
    offset = place * min(span, 3.0)
    expected = summed_kappa(profile, free, span, offset, points, background)
    found = one(profile, free, span, offset, float(points), background)
    allowed = 1e-6 if points <= MOST_SUMMED else 0.01  # rounding, at a loss of thousands
    hopeless = expected > 1000.0 * summed_kappa(profile, NOTHING, span, offset, points, background)
    assert not np.isfinite(expected) or (hopeless and found == np.inf) or found == pytest.approx(expected, rel=allowed)


@BOTH
@pytest.mark.parametrize("free", [EVEN, FREE])
@pytest.mark.parametrize("offset", [0.0, 0.4])
@pytest.mark.parametrize("background", [None, 0.1])
def test_worst_case_just_above_the_summed_points(
    profile: str, free: tuple[str, ...], offset: float, background: float | None
) -> None:
    # the narrower the span, the more the bound feels that the points stop short of its ends
    points = MOST_SUMMED + 1
    for span in (0.9, 1.2, 2.0, 4.0, 8.0, 12.9, 13.1, 16.0, 21.0):
        expected = summed_kappa(profile, free, span, offset, points, background)
        if np.isfinite(expected):
            assert one(profile, free, span, offset, points, background) == pytest.approx(expected, rel=0.01)


@BOTH
@pytest.mark.parametrize(("span", "allowed"), [(20.0, 5e-4), (200.0, 5e-4), (2000.0, 0.01)])
def test_wide_scans(profile: str, span: float, allowed: float) -> None:
    for finer in (2.0, 4.9, 5.1, 20.0):  # points per FWHM, on either side of where the integral takes over
        for background in (None, 0.1, 2.0):
            points = round(finer * span)
            expected = summed_kappa(profile, FREE, span, 0.3, points, background)
            # a Lorentzian sum ripples by 3e-4 at a spacing of a fifth; at 2000 FWHM the nodes grow sparse
            assert one(profile, FREE, span, 0.3, points, background) == pytest.approx(expected, rel=allowed)


@BOTH
@pytest.mark.parametrize("points", [2, 3, 4, 5, 8, 31, 64])
def test_few_points_are_summed_exactly(profile: str, points: int) -> None:
    for free in ALL_SETS:
        if points > len(free):
            for offset in (0.0, 0.37):
                expected = summed_kappa(profile, free, 2.5, offset, points, 0.3)
                if np.isfinite(expected):
                    assert one(profile, free, 2.5, offset, points, 0.3) == pytest.approx(expected, rel=1e-7)


# --- what must hold whatever the numbers -----------------------------------------------------------


def test_fewer_points_than_parameters_give_no_centre() -> None:
    assert one("gaussian", EVEN, 2.0, 0.1, 3) == np.inf
    assert one("gaussian", EVEN, 2.0, 0.0, 3) == np.inf
    assert np.isfinite(one("gaussian", EVEN, 2.0, 0.1, 4))


def test_a_scan_beside_the_line_gives_no_centre() -> None:
    assert one("gaussian", EVEN, 1.0, 200.0) == np.inf
    assert one("gaussian", EVEN, 1.0, 200.0, 20) == np.inf


@settings(max_examples=60, deadline=None, derandomize=True)
@given(
    profile=st.sampled_from(["gaussian", "lorentzian"]), free=st.sampled_from(ALL_SETS), more=st.sampled_from(FREE),
    span=st.floats(1.0, 50.0), offset=st.floats(-1.0, 1.0), points=st.sampled_from([9, 20, 64, 65, 5000]),
    background=st.none() | st.floats(0.0, 3.0),
)  # fmt: skip
def test_another_free_parameter_never_helps(
    profile: str, free: tuple[str, ...], more: str, span: float, offset: float, points: int, background: float | None
) -> None:
    before = one(profile, free, span, offset, points, background)
    after = one(profile, (*free, more), span, offset, points, background)
    # LEAST_LEFT lets rounding take all but three digits
    assert after >= before * (1.0 - 1e-3)
    mirrored = one(profile, free, span, -offset, points, background)
    assert mirrored == pytest.approx(before, rel=1e-3)


def test_the_order_in_which_parameters_are_named_does_not_matter() -> None:
    assert one("gaussian", FREE, 4.0, 0.2) == one("gaussian", FREE[::-1], 4.0, 0.2)


def _draws() -> tuple[np.ndarray, ...]:
    random = np.random.default_rng(7)
    shape = (4, 300)
    span = 4.0 * np.exp(0.3 * random.standard_normal(shape))
    offset = np.where(random.random(shape) < 0.3, 0.0, 0.3 * random.standard_normal(shape))
    points = random.choice([5.0, 20.0, 20.5, 64.0, 65.0, 400.0], shape)
    return span, offset, points, np.exp(random.standard_normal(shape))


@BOTH
@pytest.mark.parametrize("shot", [False, True])
def test_an_element_does_not_depend_on_its_block(profile: str, shot: bool) -> None:
    span, offset, points, background = _draws()
    whole = kappa(profile, (*EVEN, "slope"), span, offset, points, background if shot else None)
    assert whole.shape == span.shape
    row, column = (slice(1, 2), slice(None)), (slice(None), slice(7, 8))
    for index in (row, column, (2, slice(None, None, -1)), (3, 3), (3, slice(40, 47))):
        behind = background[index] if shot else None
        alone = kappa(profile, (*EVEN, "slope"), span[index], offset[index], points[index], behind)
        assert alone.tobytes() == np.ascontiguousarray(whole[index]).tobytes()


def test_one_number_for_all_draws_is_broadcast_to_the_same_bytes() -> None:
    span, offset, _, _ = _draws()
    sixty = np.asarray(60.0)
    drawn = kappa("lorentzian", FREE, span, np.where(offset == 0, 0.2, offset), sixty)
    alone = kappa("lorentzian", FREE, np.full((3, 5), span[1, 2]), np.where(offset == 0, 0.2, offset)[1, 2], sixty)
    assert alone.shape == (3, 5)
    assert set(alone.ravel().tolist()) == {drawn[1, 2]}
    assert kappa("lorentzian", FREE, np.empty((0, 3)), np.asarray(0.0), sixty).shape == (0, 3)


def test_a_span_in_widths_is_the_same_for_any_width() -> None:
    width = np.exp(np.random.default_rng(3).standard_normal(1000))
    found = kappa("gaussian", EVEN, (5.3 * width) / width, np.asarray(0.1), np.asarray(60.0))
    assert len(set(found.tolist())) == 1
