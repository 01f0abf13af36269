"""Noisy spectra and Ramsey counts, fitted by least squares, scatter as predicted.

Each case makes FITS data sets; the ratio of scatters then has a standard error of 0.7 %
(1/sqrt(2 FITS)), and prediction and scatter must agree within three of them. A prediction wrong by
5 % must not.
"""

from __future__ import annotations

from itertools import product
from typing import Any

import numpy as np
import pytest
from scipy import special

from pvfeas.centre_bounds import FREE
from pvfeas.tables import Line
from pvfeas.techniques.ramsey import Ramsey
from pvfeas.techniques.scan import Scan

FITS = 10_000
FWHM, PEAK = 2e3, 3.0  # Hz; in the units of the detector
EVEN = ("amplitude", "width", "baseline")
SETS = ((), ("amplitude",), EVEN, (*EVEN, "slope"), (*EVEN, "asymmetry"), FREE)
ROOT_LN2 = np.sqrt(np.log(2.0))


def agrees(predicted: float, simulated: float, count: int) -> bool:
    """Whether a scatter found from count data sets is the predicted one within three standard errors."""
    return bool(abs(simulated / predicted - 1.0) < 3.0 / np.sqrt(2.0 * count))


def agree_and_would_notice(predicted: float, simulated: float) -> None:
    """The prediction agrees; the same prediction 5 % larger or smaller does not."""
    assert agrees(predicted, simulated, FITS), simulated / predicted
    assert not agrees(1.05 * predicted, simulated, FITS)
    assert not agrees(predicted / 1.05, simulated, FITS)


def number(value: float) -> Any:
    return np.asarray(float(value))


# --- spectra ---------------------------------------------------------------------------------------


def model(profile: str, nu: np.ndarray, theta: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Spectra (fits, points) and their derivatives (parameters, fits, points) at theta (parameters, fits).

    Parameters: centre, amplitude, width, baseline, slope, asymmetry.
    """
    centre, amplitude, width, baseline, slope, asymmetry = theta[:, :, None]
    u = 2.0 * (nu - centre) / width
    if profile == "lorentzian":
        line, partner = 1.0 / (1.0 + u**2), u / (1.0 + u**2)
        line_u, partner_u = -2.0 * u * line**2, (1.0 - u**2) * line**2
    else:
        line, partner = np.exp(-((ROOT_LN2 * u) ** 2)), 2.0 / np.sqrt(np.pi) * special.dawsn(ROOT_LN2 * u)
        # Dawson's function F has F' = 1 - 2 z F
        line_u = -2.0 * ROOT_LN2**2 * u * line
        partner_u = ROOT_LN2 * (2.0 / np.sqrt(np.pi) - 2.0 * ROOT_LN2 * u * partner)
    along = amplitude * (line_u + asymmetry * partner_u)
    derivatives = [
        -2.0 / width * along, line + asymmetry * partner, -u / width * along, np.ones_like(u),
        np.broadcast_to(nu / FWHM, u.shape), amplitude * partner,
    ]  # fmt: skip
    return amplitude * (line + asymmetry * partner) + baseline + slope * nu / FWHM, np.stack(derivatives)


def fitted_centres(
    profile: str, nu: np.ndarray, data: np.ndarray, free: tuple[str, ...], truth: np.ndarray, counting: bool
) -> np.ndarray:
    """Centres by Gauss–Newton from the truth until no centre moves by 1e-6 of the FWHM.

    counting: weights 1/(fitted counts), iterated: the likelihood fit of Poisson counts.
    """
    chosen = [0, *(FREE.index(name) + 1 for name in free)]
    scale = np.array([FWHM, truth[1], FWHM, truth[1], truth[1], 1.0])[chosen]
    theta = np.repeat(truth[:, None], len(data), axis=1)
    for _ in range(30):
        value, every = model(profile, nu, theta)
        jacobian = (every[chosen] * scale[:, None, None]).transpose(1, 0, 2)
        weighted = jacobian / value[:, None, :] if counting else jacobian
        normal = weighted @ jacobian.transpose(0, 2, 1)
        right = weighted @ (data - value)[:, :, None]
        step = np.linalg.solve(normal, right)[:, :, 0].T * scale[:, None]
        theta[chosen] += step
        if np.max(np.abs(step[0])) < 1e-6 * FWHM:
            return np.asarray(theta[0])
    raise AssertionError("the fits do not converge")


def simulated_and_predicted(
    profile: str, free: tuple[str, ...], shot: bool, offset: float, seed: int, points: int = 36, span: float = 4.0
) -> tuple[float, float]:
    """Scatter of fitted centres and what Scan predicts, Hz; offset and span in FWHM."""
    random = np.random.default_rng(seed)
    nu = FWHM * (offset + span * ((np.arange(points) + 0.5) / points - 0.5))
    background, snr, counts = 0.15, 250.0, 40_000.0
    given: dict[str, Any] = {
        "points": number(points), "span": number(span * FWHM), "time": number(2.0), "free": free,
        "centre_offset": number(offset * FWHM), "background": number(0.0), "excess_noise": number(1.0),
    }  # fmt: skip
    height = counts if shot else PEAK
    truth = np.array([0.0, height, FWHM, background * height, 0.0, 0.0])
    clean = model(profile, nu, truth[:, None])[0][0]
    if shot:
        data = random.poisson(clean, (FITS, points)).astype(float)
        given |= {"noise": "shot", "counts": number(counts), "background": number(background)}
    else:
        # the rms is that of one point of 2 s/points; the quoted snr belongs to four times that
        data = clean + PEAK / snr * random.standard_normal((FITS, points))
        given |= {"snr": number(2.0 * snr), "snr_time": number(4.0 * 2.0 / points)}
    centres = fitted_centres(profile, nu, data, free, truth, shot)
    variance = Scan(**given).centre_variance(Line(profile=profile, fwhm=number(FWHM)))
    return float(np.sqrt(np.mean(centres**2))), float(np.sqrt(variance))


CASES = list(product(("lorentzian", "gaussian"), SETS, (False, True), (0.0, 0.6)))


NAMES = [f"{profile}-{len(free)}free-{'shot' if shot else 'white'}-{offset}" for profile, free, shot, offset in CASES]


@pytest.mark.parametrize("case", range(len(CASES)), ids=NAMES)
def test_fitted_spectra_scatter_as_predicted(case: int) -> None:
    simulated, predicted = simulated_and_predicted(*CASES[case], seed=case)
    agree_and_would_notice(predicted, simulated)


def test_many_points_and_few_points() -> None:
    # 100 points: the integral; 8 points 0.4 FWHM apart: their sum
    for points, span, free in ((100, 6.0, (*EVEN, "slope")), (8, 3.2, EVEN)):
        for shot in (False, True):
            simulated, predicted = simulated_and_predicted("lorentzian", free, shot, 0.2, 77, points, span)
            agree_and_would_notice(predicted, simulated)


# --- Ramsey counts ---------------------------------------------------------------------------------


def simulated_ramsey(technique: Ramsey, seed: int) -> float:
    """Scatter of the frequency from single cycles, Hz: molecules one by one, read at mid-fringe.

    A molecule that has lost its phase goes up or down like a coin. The least-squares frequency of one cycle
    is that at which the fringe has the counted height.
    """
    random = np.random.default_rng(seed)
    free_time, contrast = float(technique.free_time), float(technique.contrast)
    mean = float(technique.molecules_per_cycle())
    assert mean == pytest.approx(round(mean)), "choose a whole number"
    kept = 1.0 if technique.coherence_time is None else float(np.exp(-free_time / technique.coherence_time))
    detuning = 0.02 / free_time * np.where(np.arange(FITS) % 2, 1.0, -1.0)  # near mid-fringe, on both sides
    phase = 2.0 * np.pi * free_time * detuning
    molecules = np.full(FITS, round(mean))
    if technique.readout == "one state":
        molecules = random.poisson(mean, FITS)
    coherent = random.binomial(molecules, kept)
    excited = random.binomial(coherent, 0.5 * (1.0 + contrast * np.sin(phase)))
    excited = excited + random.binomial(molecules - coherent, 0.5)
    counted = excited + float(technique.readout_noise) * random.standard_normal(FITS)
    # both states: the number is known from the sum; one state: only its mean is
    fraction = counted / (molecules if technique.readout == "both states" else mean)
    found = np.arcsin((2.0 * fraction - 1.0) / (contrast * kept)) / (2.0 * np.pi * free_time)
    return float(np.sqrt(np.mean((found - detuning) ** 2)))


RAMSEY: list[dict[str, Any]] = [
    {"molecules": 4000.0},
    {"molecules": 4000.0, "coherence_time": 0.3},
    {"molecules": 4000.0, "readout_noise": 40.0},
    {"molecules": 20000.0, "coherence_time": 0.2, "readout_noise": 100.0, "idle_time": 0.05},
    {"rate": 25000.0, "idle_time": 0.06},
    {"rate": 25000.0, "idle_time": 0.04, "coherence_time": 0.5, "readout_noise": 60.0},
]


@pytest.mark.parametrize("readout", ["both states", "one state"])
@pytest.mark.parametrize("case", range(len(RAMSEY)))
def test_ramsey_counts_scatter_as_predicted(case: int, readout: str) -> None:
    given = {"free_time": 0.2, "contrast": 0.9, "readout_noise": 0.0, "idle_time": 0.0, "excess_noise": 1.0}
    technique = Ramsey(**{name: number(value) for name, value in (given | RAMSEY[case]).items()}, readout=readout)
    simulated = simulated_ramsey(technique, 100 + case)
    agree_and_would_notice(float(np.sqrt(technique.centre_variance(Line()))), simulated)


def test_the_comparison_itself() -> None:
    assert agrees(1.0, 1.02, FITS)
    assert not agrees(1.0, 1.022, FITS)
    assert not agrees(1.0, 0.978, FITS)
