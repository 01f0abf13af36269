"""quoted, ramsey and scan: the shared exam, published values, and what each adds."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from exam import FWHM, LINE, exam, nominal
from scipy import optimize

from pvfeas.centre_bounds import MOST_SUMMED, WING, dense_nodes, nearest_nodes
from pvfeas.keys import keys_of
from pvfeas.tables import Line
from pvfeas.techniques import TECHNIQUES
from pvfeas.techniques.quoted import Quoted
from pvfeas.techniques.ramsey import Ramsey, both_states_uncertainty, fringe_contrast, one_state_uncertainty
from pvfeas.techniques.scan import Scan

CHECKS = {entry["id"]: entry for entry in json.loads((Path(__file__).parent / "data" / "checks.json").read_text())}
NO_LINE = Line()


def number(value: float) -> Any:
    return np.asarray(float(value))


@pytest.mark.parametrize("kind", TECHNIQUES)
def test_exam_at_the_values_shown(kind: str) -> None:
    assert TECHNIQUES[kind].kind == kind
    exam(TECHNIQUES[kind])


@pytest.mark.parametrize(
    ("kind", "changed"),
    [
        ("quoted", {"of": "one enantiomer"}),
        ("ramsey", {"readout": "one state", "readout_noise": number(5)}),
        ("ramsey", {"molecules": None, "rate": number(900), "coherence_time": None}),
        ("scan", {"snr_time": number(0.01), "centre_offset": number(3e3), "free": ()}),
        ("scan", {"noise": "shot", "snr": None, "counts": number(4000), "background": number(0.2)}),
        ("scan", {"free": ("amplitude", "width", "baseline", "slope", "asymmetry"), "points": number(400)}),
    ],
)
def test_exam_with_other_options(kind: str, changed: dict[str, Any]) -> None:
    exam(TECHNIQUES[kind], **changed)


# --- quoted ----------------------------------------------------------------------------------------


def test_quoted_is_what_was_quoted() -> None:
    quoted = Quoted(uncertainty=number(0.5), after=number(3600), excess_noise=number(1))
    assert quoted.states_splitting
    assert quoted.cycle_time(NO_LINE) == 3600
    assert quoted.centre_variance(NO_LINE) == 0.25
    assert quoted.interrogation_width(NO_LINE) is None
    assert not nominal(Quoted, of="one enantiomer").states_splitting
    assert not Quoted.has_cycles


# --- ramsey ----------------------------------------------------------------------------------------


def ramsey(**changed: Any) -> Ramsey:
    given = {
        "free_time": 0.01, "contrast": 0.8, "molecules": 1e4, "idle_time": 0.01, "readout_noise": 0.0,
        "excess_noise": 1.0,
    } | changed  # fmt: skip
    return Ramsey(**{name: number(v) if isinstance(v, float) else v for name, v in given.items()})


def per_root_second(technique: Any) -> float:
    return float(np.sqrt(technique.centre_variance(NO_LINE) * technique.cycle_time(NO_LINE)))


def test_ramsey_worked_example() -> None:
    # T 10 ms, C 0.8, N 1e4, cycle 20 ms: 0.0281349 Hz at 1 s (derived, six digits)
    assert per_root_second(ramsey()) == pytest.approx(0.0281349, rel=2e-6)
    # 1/(2 pi C T sqrt N), Itano et al. 1993 (from memory)
    expected = 1.0 / (2.0 * np.pi * 0.8 * 0.01 * 100.0)
    assert np.sqrt(ramsey().centre_variance(NO_LINE)) == pytest.approx(expected, rel=1e-14)
    assert ramsey().interrogation_width(NO_LINE) == pytest.approx(50.0)  # 1/(2 T)
    # the same in widths: Gamma_R/(pi C sqrt N)
    assert expected == pytest.approx(50.0 / (np.pi * 0.8 * 100.0), rel=1e-14)


def test_read_out_noise_as_large_as_projection_noise_costs_root_two() -> None:
    # counts of one state: rms sqrt(N)/2 = 50 from projection at mid-fringe
    for readout, equal in (("both states", 50.0), ("one state", np.sqrt(5000.0))):
        quiet, noisy = ramsey(readout=readout), ramsey(readout=readout, readout_noise=float(equal))
        assert noisy.centre_variance(NO_LINE) == pytest.approx(2.0 * quiet.centre_variance(NO_LINE), rel=1e-13)


def test_one_state_of_an_unknown_number_costs_root_two() -> None:
    entry = CHECKS["ramsey.poisson.penalty"]
    given = [number(value) for value in (0.7, 0.1, 300, 0)]  # contrast, free time, molecules, read-out noise
    ratio = one_state_uncertainty(*given) / both_states_uncertainty(*given)
    assert ratio == pytest.approx(entry["expected"], rel=entry["tolerance"]["rel"])


def test_rate_counts_the_idle_time_too() -> None:
    by_rate = ramsey(molecules=None, rate=5e5)
    assert by_rate.molecules_per_cycle() == pytest.approx(1e4)
    assert by_rate.centre_variance(NO_LINE) == pytest.approx(ramsey().centre_variance(NO_LINE), rel=1e-14)


def best_free_time(uncertainty: Any) -> tuple[float, float]:
    """T_opt/T2 and F of sigma_omega = F/sqrt(N T2 tau), T2 = N = 1, by numeric minimisation."""
    found = optimize.minimize_scalar(uncertainty, bounds=(0.05, 3.0), method="bounded", options={"xatol": 1e-9})
    return float(found.x), float(found.fun)


# dead times beside those of checks.json: derived, six decimals; F at zero: Huelga et al. 1997 (from memory), sqrt(2 e)
BEST = {0.0: (0.5, 2.331644), 0.5: (0.707107, 3.151232), 2.0: (0.850781, 4.646796)} | {
    entry["inputs"]["Tdead_over_T2"]: entry["expected"]
    for name, entry in CHECKS.items()
    if name.startswith("ramsey.deadtime")
}


@pytest.mark.parametrize("dead", BEST)
def test_best_free_time_with_dead_time(dead: float) -> None:
    def per_root_time(free: float) -> float:
        one = ramsey(free_time=float(free), contrast=1.0, coherence_time=1.0, molecules=1.0, idle_time=float(dead))
        return 2.0 * np.pi * per_root_second(one)

    free_time, constant = best_free_time(per_root_time)
    assert free_time == pytest.approx(BEST[dead][0], abs=1e-6)  # flat minimum: half the digits of F
    assert constant == pytest.approx(BEST[dead][1], rel=1e-9 if dead in (0.1, 1, 5, 10) else 4e-7)


def test_best_free_time_with_gaussian_decay() -> None:
    expected = CHECKS["ramsey.gaussdecay"]["expected"]
    for power, (free_time, constant) in ((1.0, expected[:2]), (0.5, expected[2:])):

        def per_root_time(t: float, power: float = power) -> float:
            contrast = np.asarray(np.exp(-power * t * t))
            one = both_states_uncertainty(contrast, number(t), number(1), number(0))
            return float(2.0 * np.pi * one * np.sqrt(t))

        found = best_free_time(per_root_time)
        assert found[0] == pytest.approx(free_time, abs=1e-6)
        assert found[1] == pytest.approx(constant, rel=1e-9)


def test_contrast_decays_over_the_coherence_time() -> None:
    assert fringe_contrast(number(0.8), number(2), number(2)) == pytest.approx(0.8 / np.e)
    assert fringe_contrast(number(0.8), number(2), None) == 0.8


# --- scan ------------------------------------------------------------------------------------------


def scan(**changed: Any) -> Scan:
    given = {
        "snr": 50.0, "points": 200.0, "span": 10e6, "time": 2.0, "centre_offset": 0.0, "background": 0.0,
        "excess_noise": 1.0,
    } | changed  # fmt: skip
    return Scan(**{name: number(v) if isinstance(v, float) else v for name, v in given.items()})


MEGAHERTZ = Line(profile="gaussian", fwhm=number(1e6))


def test_scan_worked_example() -> None:
    # Gamma 1 MHz, spacing 50 kHz, SNR 50, Gaussian: 3095.73 Hz (derived; Landman et al. 1982 from memory)
    assert np.sqrt(scan().centre_variance(MEGAHERTZ)) == pytest.approx(3095.73, rel=2e-6)
    lorentzian = Line(profile="lorentzian", fwhm=number(1e6))
    # sqrt(2/pi) sqrt(FWHM × spacing)/SNR for an infinite span; 10 FWHM cost 1e-5, the points themselves nothing
    expected = np.sqrt(2.0 / np.pi) * np.sqrt(1e6 * 5e4) / 50.0
    assert np.sqrt(scan().centre_variance(lorentzian)) == pytest.approx(expected, rel=2e-5)


def test_snr_belongs_to_a_point_time() -> None:
    usual = scan()
    assert usual.point_snr() == 50.0
    assert scan(snr_time=0.01).point_snr() == pytest.approx(50.0)  # time/points is 10 ms
    assert scan(snr_time=0.0025).point_snr() == pytest.approx(100.0)
    # with a given snr_time twice the points in the same time are worth the same
    finer = scan(snr_time=0.01, points=400.0)
    assert finer.centre_variance(MEGAHERTZ) == pytest.approx(usual.centre_variance(MEGAHERTZ), rel=1e-9)


def test_shot_noise_of_a_scan() -> None:
    # kappa_P = 0.411601 without background, 0.60577 at 0.3 (derived; Bobroff 1986 from memory)
    for background, kappa, allowed in ((0.0, 0.411601, 2e-6), (0.3, 0.60577, 1e-5)):
        shot = scan(noise="shot", snr=None, counts=2500.0, background=background)
        expected = kappa * np.sqrt(1e6 * 5e4 / 2500.0)
        assert np.sqrt(shot.centre_variance(MEGAHERTZ)) == pytest.approx(expected, rel=allowed)


def test_white_noise_ignores_the_background() -> None:
    assert scan(background=0.5).centre_variance(MEGAHERTZ) == scan().centre_variance(MEGAHERTZ)


def test_scan_warns_of_coarse_and_of_too_few_points() -> None:
    assert scan().warnings(MEGAHERTZ) == ()
    assert [code for code, _ in scan(points=19.0).warnings(MEGAHERTZ)] == ["coarse scan"]
    assert scan(points=20.0).warnings(MEGAHERTZ) == ()
    few = scan(points=3.0, span=1e6)
    assert [code for code, _ in few.warnings(MEGAHERTZ)] == ["too few points"]
    assert few.centre_variance(MEGAHERTZ) == np.inf
    assert scan(points=3.0, span=1e6, free=("width",)).warnings(MEGAHERTZ) == ()


def test_cost_of_a_draw_does_not_depend_on_the_points() -> None:
    span, offset = np.array([300.0, 40.0]), np.array([0.1, 0.2])
    for points in (1e3, 1e6, 1e9):
        x, weights = nearest_nodes(span, offset, np.full(2, points))
        assert x.shape == weights.shape == (2, MOST_SUMMED + 2 * WING)
        # every bin is counted once
        np.testing.assert_allclose(weights.sum(axis=-1), span, rtol=1e-6)
    assert dense_nodes(span, offset, False)[0].shape == (2, MOST_SUMMED)


def test_line_distances_may_be_written_in_widths_and_shapes_are_refused_by_choices() -> None:
    keys = keys_of(Scan)
    assert [name for name, key in keys.items() if key.along_line] == ["span", "centre_offset"]
    assert keys["detection"].choices == ("direct", "dispersion", "first-derivative")
    assert keys["free"].default == ("amplitude", "width", "baseline")
    assert keys_of(Ramsey)["readout"].choices == ("both states", "one state")
    assert LINE.fwhm == FWHM
