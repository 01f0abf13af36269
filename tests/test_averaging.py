"""Two arms, systematics and schedule put together: variance against wall time."""

from __future__ import annotations

import json
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import Any, ClassVar

import numpy as np
import pytest

from pvfeas.averaging import (
    Averaging,
    averaging_of,
    first_live_time,
    purity,
    splitting_noise,
)
from pvfeas.laws import Array
from pvfeas.systematics import resets_per_second
from pvfeas.tables import Line, Samples, Schedule, Switching, Systematic
from pvfeas.techniques.base import Technique
from pvfeas.techniques.quoted import Quoted
from pvfeas.techniques.ramsey import Ramsey

CHECKS = {
    check["id"]: check
    for check in json.loads((Path(__file__).parent / "data" / "checks.json").read_text(encoding="utf-8"))
}
DAY = 86400.0


def number(value: float) -> Array:
    return np.asarray(float(value))


@dataclass(frozen=True)
class Plain(Technique):
    """A technique with a given scatter and cycle."""

    kind: ClassVar[str] = "plain"
    summary: ClassVar[str] = "for tests"

    scatter: Array | None = None
    cycle: Array | None = None

    def cycle_time(self, line: Line) -> Array:
        return np.asarray(self.cycle)

    def centre_variance(self, line: Line) -> Array:
        return np.asarray(self.scatter) ** 2

    def interrogation_width(self, line: Line) -> Array | None:
        return line.fwhm


def plain(scatter: float, cycle: float) -> Plain:
    return Plain(excess_noise=number(1), scatter=number(scatter), cycle=number(cycle))


LINE = Line(frequency=number(29.1e12), fwhm=number(12e3))
ROUND_THE_CLOCK = Schedule(number(24), number(7), number(0), number(1))
OFFICE = Schedule(number(12), number(3.5), number(0), number(1))  # a quarter of the calendar


def switching(mode: str = "alternating", live_fraction: float = 0.5) -> Switching:
    return Switching(mode=mode, live_fraction=number(live_fraction))


def quoted(of: str) -> Quoted:
    return Quoted(excess_noise=number(1), uncertainty=number(0.5), after=number(7200), of=of)


def systematic(name: str, size: Any, averages: str, **more: Any) -> Systematic:
    for key in ("every", "after", "dof"):
        if key in more:
            more[key] = np.asarray(more[key], dtype=float)
    return Systematic(name=name, size=np.asarray(size, dtype=float), averages=averages, **more)


def scenario(
    *systematics: Systematic, schedule: Schedule = ROUND_THE_CLOCK, samples: Samples | None = None
) -> Averaging:
    supply = samples or Samples()
    arm = plain(2.0, 3.0)
    return averaging_of(arm, arm, LINE, switching(), supply, supply, schedule, systematics)


def test_factors_of_two_of_equal_arms() -> None:
    """S^2 = 12 Hz^2 s: alternating 4 S^2, simultaneous 2 S^2."""
    arm = plain(2.0, 3.0)
    assert splitting_noise(arm, arm, LINE, switching()) == pytest.approx(48.0, rel=1e-15)
    assert splitting_noise(arm, arm, LINE, switching("simultaneous")) == pytest.approx(24.0, rel=1e-15)


def test_quoted_factors() -> None:
    """A quoted splitting brings its own; one enantiomer is quoted for the live time on that one."""
    assert splitting_noise(quoted("splitting"), quoted("splitting"), LINE, switching()) == pytest.approx(1800.0)
    one = quoted("one enantiomer")
    assert splitting_noise(one, one, LINE, switching()) == pytest.approx(4 * 1800.0)
    assert splitting_noise(one, one, LINE, switching("simultaneous")) == pytest.approx(2 * 1800.0)


@pytest.mark.parametrize("mode", ["alternating", "simultaneous"])
def test_campaigns_of_single_cycles(mode: str) -> None:
    """Draw every cycle of unequal arms with unequal shares; the difference of the means has the variance stated."""
    arm_a, arm_b, fraction, live = plain(2.0, 3.0), plain(0.7, 5.0), 0.25, 480.0
    shares = (1.0, 1.0) if mode == "simultaneous" else (fraction, 1.0 - fraction)
    generator, campaigns = np.random.default_rng(23), 20_000
    means = []
    for arm, share in zip((arm_a, arm_b), shares, strict=True):
        cycles = round(live * share / float(arm.cycle))
        assert cycles * float(arm.cycle) == pytest.approx(live * share)  # whole cycles
        means.append(generator.normal(0.0, float(arm.scatter), size=(campaigns, cycles)).mean(axis=1))
    expected = float(splitting_noise(arm_a, arm_b, LINE, switching(mode, fraction))) / live
    assert np.var(means[0] - means[1]) == pytest.approx(expected, rel=4 * np.sqrt(2 / campaigns))


@pytest.mark.parametrize(("ratio", "penalty"), [(1.5, 1.04), (2, 1.111), (3, 1.25), (5, 1.444), (10, 1.669)])
def test_equal_split_costs_what_neyman_says(ratio: float, penalty: float) -> None:
    """Best split t_a/t_b = s_a/s_b (Neyman 1934, J. R. Stat. Soc. 97, 558; from memory); penalty of an equal one."""
    arm_a, arm_b = plain(ratio, 1.0), plain(1.0, 1.0)
    best = splitting_noise(arm_a, arm_b, LINE, switching(live_fraction=ratio / (1.0 + ratio)))
    assert best == pytest.approx((ratio + 1.0) ** 2, rel=1e-14)
    equal = splitting_noise(arm_a, arm_b, LINE, switching())
    assert equal / best == pytest.approx(penalty, abs=6e-4)
    fractions = np.linspace(0.05, 0.95, 19)
    assert np.all([splitting_noise(arm_a, arm_b, LINE, switching(live_fraction=f)) >= best for f in fractions])


def test_trapped_ions_by_hand() -> None:
    """Ramsey, 10 ms, contrast 0.8, 1e4 molecules, cycle 20 ms: 0.0281349 Hz and 0.0562698 Hz at 1 s."""
    ramsey = Ramsey(
        excess_noise=number(1), free_time=number(0.01), contrast=number(0.8), molecules=number(1e4),
        readout_noise=number(0), idle_time=number(0.01),
    )  # fmt: skip
    found = np.sqrt(splitting_noise(ramsey, ramsey, LINE, switching()))
    assert found == pytest.approx(0.0562698, abs=5e-8)
    assert 3.0**2 * found**2 / 1e-3**2 == pytest.approx(28496.6, abs=0.051)  # s to 3 sigma for 1 mHz, half the time


def test_purity() -> None:
    check = CHECKS["ee.dilution"]  # there the excess of b is signed as that of a
    for (ee_a, ee_b), expected in zip(check["inputs"]["ee"], check["expected"], strict=True):
        assert purity(number(ee_a), number(-ee_b)) == pytest.approx(expected, rel=check["tolerance"]["rel"])


def test_purity_by_fitting_mixtures() -> None:
    """Least-squares centres of two mixtures of unresolved lines differ by purity × splitting."""
    grid, splitting = np.linspace(-6.0, 6.0, 4001), 1e-3

    def line(centre: float) -> Array:
        return np.asarray(1.0 / (1.0 + 4.0 * (grid - centre) ** 2))

    def centre(excess: float) -> float:
        mixture = (1 + excess) / 2 * line(splitting / 2) + (1 - excess) / 2 * line(-splitting / 2)
        where = 0.0
        for _ in range(5):  # Gauss–Newton for the centre alone
            slope = (line(where + 1e-5) - line(where - 1e-5)) / 2e-5
            where += ((mixture - line(where)) * slope).sum() / (slope**2).sum()
        return where

    for own_a, own_b in ((0.9, 0.9), (0.9, 0.0), (0.8, 0.4), (0.9, -0.2)):
        seen = (centre(own_a) - centre(-own_b)) / splitting
        assert seen == pytest.approx(float(purity(number(own_a), number(own_b))), abs=2e-6)  # (splitting/width)^2


def test_first_live_time_is_a_cycle_on_each_arm() -> None:
    arm_a, arm_b = plain(1.0, 3.0), plain(1.0, 5.0)
    assert first_live_time(arm_a, arm_b, LINE, switching(live_fraction=0.25)) == pytest.approx(12.0)
    assert first_live_time(arm_a, arm_b, LINE, switching(live_fraction=0.5)) == pytest.approx(10.0)
    assert first_live_time(arm_a, arm_b, LINE, switching("simultaneous")) == pytest.approx(5.0)
    assert np.all(first_live_time(quoted("splitting"), quoted("splitting"), LINE, switching()) == 0.0)


def test_wall_time_of_a_quarter_of_the_calendar() -> None:
    """Statistics take four times the wall time; the sample lasts four times as long."""
    samples = Samples(mass=number(1.0), consumption=number(1e-6))
    found = scenario(schedule=OFFICE, samples=samples)
    assert found.first == pytest.approx(4 * 6.0)
    assert found.last == pytest.approx(4 * 2e6)
    assert found.variance(number(1000.0)) == pytest.approx(48.0 / 250.0, rel=1e-14)


def test_the_smaller_sample_ends_the_campaign() -> None:
    arm = plain(2.0, 3.0)
    big, small = (Samples(mass=number(m), consumption=number(1e-6)) for m in (1.0, 0.3))
    for pair in ((big, small), (small, big)):
        found = averaging_of(arm, arm, LINE, switching(), *pair, ROUND_THE_CLOCK, ())
        assert found.last == pytest.approx(0.3 / 1e-6 / 0.5)
    both = averaging_of(arm, arm, LINE, switching("simultaneous"), big, small, ROUND_THE_CLOCK, ())
    assert both.last == pytest.approx(0.3 / 1e-6)


MIXED = (
    systematic("offset", [[0.01], [0.05]], "never"),
    systematic("pressure", 0.08, "per reset", every=DAY),
    systematic("magnet", 0.2, "per reset", every=20 * DAY, of="one enantiomer"),
    systematic("counting", 0.3, "as 1/t", after=3600.0),
    systematic("ageing", 0.002, "grows", after=5 * DAY),
    systematic("tilt", 1e-6, "never", on="width", group="angle"),
    systematic("angle", 0.03, "never"),
    systematic("bend", 0.02, "per reset", every=3 * DAY, group="angle"),
)


def test_variance_is_the_formula_written_out() -> None:
    found = scenario(*MIXED, schedule=OFFICE)
    for days in (0.5, 4.0, 33.0, 400.0):
        t, live = days * DAY, days * DAY / 4
        resets = [max(1.0, t * 0.5 / DAY), max(1.0, t / (20 * DAY)), max(1.0, t * 0.5 / (3 * DAY))]
        expected = 48.0 / live + np.array([[0.01], [0.05]]) ** 2 + 0.08**2 / resets[0]
        expected = expected + 2 * 0.2**2 / resets[1] + 0.3**2 * 3600 / live + 0.002**2 * live / (5 * DAY)
        expected = expected + 0.03**2 + (0.012 + 0.02 / np.sqrt(resets[2])) ** 2
        assert found.variance(number(t)) == pytest.approx(expected, rel=1e-13)


def test_parts_are_named_and_add_up() -> None:
    found = scenario(*MIXED, schedule=OFFICE)
    walls = np.geomspace(60.0, 1e9, 50).reshape(-1, 1, 1)
    parts = found.parts(walls)
    names = ["offset", "pressure", "magnet", "counting", "ageing", "angle (group)", "angle"]
    assert list(parts) == ["statistics", "reference", *(f"systematics.{name}" for name in names)]
    assert sum(parts.values()) == pytest.approx(found.variance(walls), rel=1e-13)
    assert found.variance(walls).shape == (50, 2, 1)


def test_everything_stops_with_the_sample() -> None:
    samples = Samples(mass=number(1.0), consumption=number(1e-6))
    found = scenario(*MIXED, samples=samples)
    end = found.variance(found.last)
    assert found.variance(number(1e12)) == pytest.approx(end, rel=1e-15)
    assert found.variance(0.9 * found.last)[0, 0] != pytest.approx(end[0, 0], rel=1e-6)
    for name, part in found.parts(number(1e12)).items():
        assert part == pytest.approx(found.parts(found.last)[name], rel=1e-15)


def test_usable_after_both_arms_and_never_without_enough_sample() -> None:
    found = scenario()
    assert found.usable(np.array([5.9, 6.0, 7.0])).ravel().tolist() == [False, True, True]
    too_small = Samples(mass=number(1.0), consumption=number(1.0))  # gone after 2 s of live time
    assert not np.any(scenario(samples=too_small).usable(np.array([1.0, 6.0, np.inf])))


def test_systematics_on_the_scale_stand_apart() -> None:
    found = scenario(
        systematic("calibration", 0.01, "never", on="scale"),
        systematic("gain", 0.04, "per reset", every=DAY, on="scale"),
        systematic("offset", 0.5, "never"),
    )
    assert found.relative_variance(number(4 * DAY)) == pytest.approx(0.01**2 + 0.02**2, rel=1e-14)
    assert found.variance(number(4 * DAY)) == pytest.approx(48.0 / (4 * DAY) + 0.25, rel=1e-14)
    assert scenario().relative_variance(number(DAY)) == pytest.approx(0.0, abs=0)


def test_best_time_of_one_growing_entry_is_exact() -> None:
    """A/t + B t is least at sqrt(A/B), 2 sqrt(A B) there."""
    found = scenario(systematic("ageing", [[0.01], [0.2]], "grows", after=DAY))
    rise = np.array([[0.01], [0.2]]) ** 2 / DAY
    assert found.floor() == pytest.approx(2 * np.sqrt(48.0 * rise), rel=1e-12)
    # the variance is flat there: a relative doubt of 1e-6 in the time is 1e-12 in the variance
    assert found.best_time(number(1e12)) == pytest.approx(np.sqrt(48.0 / rise), rel=1e-6)
    early = 0.5 * np.sqrt(48.0 / rise)
    assert found.best_time(early) == pytest.approx(early, rel=1e-15)


@pytest.mark.parametrize("seed", range(6))
def test_best_variance_against_a_dense_grid(seed: int) -> None:
    """Random entries of every kind and group, twelve draws: no time up to the budget does better."""
    generator = np.random.default_rng(seed)
    entries = []
    for place in range(7):
        averages = ("never", "per reset", "per reset", "as 1/t", "grows", "grows", "per reset")[place]
        size = 10 ** generator.uniform(-3.0, -0.3, size=(12, 1))
        times = 10 ** generator.uniform(3.0, 7.0, size=(12, 1))
        key = {"per reset": "every", "never": "dof"}.get(averages, "after")
        group = ("x", None, None, None, None, "x", "x")[place] if seed % 2 else None
        entries.append(systematic(str(place), size, averages, group=group, **{key: times}))
    supply = Samples(mass=number(1.0), consumption=number(2e-8)) if seed == 3 else Samples()
    found = scenario(*entries, schedule=OFFICE, samples=supply)
    for budget in (1e4, 1e6, 1e9):
        end = np.minimum(budget, found.last)
        kinks = [1.0 / resets_per_second(one, OFFICE) for one, _ in found.entries if one.averages == "per reset"]
        grid = np.exp(np.linspace(np.log(found.first), np.log(end), 20_001)).reshape(-1, 1, 1)
        inside = [np.clip(kink, found.first, end)[None] for kink in kinks]
        least = np.min([found.variance(part).min(axis=0) for part in (grid, *inside)], axis=0)
        best = found.best_variance(number(budget))
        assert np.all(best <= least * (1 + 1e-12))
        # between grid points 1.5e-3 apart in ln t a convex sum of t^-1 ... t^1 sinks by 3e-7 at most
        assert np.all(best >= least * (1 - 1e-6))
        assert found.variance(found.best_time(number(budget))) == pytest.approx(best, rel=1e-15)


def test_best_variance_never_rises() -> None:
    found = scenario(*MIXED, schedule=OFFICE)
    walls = np.geomspace(30.0, 1e12, 400).reshape(-1, 1, 1)
    values = found.best_variance(walls)
    assert all(np.all(after <= before * (1 + 1e-12)) for before, after in pairwise(values))
    assert values[-1] == pytest.approx(found.floor(), rel=1e-12)


def test_without_growth_the_best_time_is_the_last() -> None:
    found = scenario(*(one for one in MIXED if one.averages != "grows"))
    walls = np.geomspace(30.0, 1e12, 40).reshape(-1, 1, 1)
    assert np.array_equal(found.best_variance(walls), found.variance(walls))
    # without end: what never averages is left, 0.012 Hz being 1e-6 of the width
    expected = np.array([[0.01], [0.05]]) ** 2 + 0.03**2 + 0.012**2
    assert found.floor() == pytest.approx(expected, rel=1e-12)


def test_no_end_and_no_size_give_no_nonsense() -> None:
    """Sizes of zero beside infinite times: plain numbers, and no floor."""
    found = scenario(
        systematic("ageing", 0.0, "grows", after=DAY),
        systematic("counting", 0.0, "as 1/t", after=DAY),
        systematic("both", 0.0, "grows", after=DAY, group="g"),
        systematic("too", 0.0, "as 1/t", after=DAY, group="g"),
    )
    assert found.variance(number(np.inf)) == pytest.approx(0.0, abs=0)
    assert np.all(found.variance(number(0.0)) == np.inf)
    assert found.best_variance(number(100.0)) == pytest.approx(0.48, rel=1e-9)


def test_degrees_of_freedom() -> None:
    """Welch–Satterthwaite by hand: statistics are certain, groups pool their doubt linearly."""
    t = 48.0 / 0.09  # statistics then are 0.09 Hz^2
    alone = scenario(systematic("offset", 0.4, "never", dof=8))
    assert alone.degrees_of_freedom(number(t)) == pytest.approx((0.09 + 0.16) ** 2 / (0.16**2 / 8), rel=1e-13)
    pair = [systematic(name, size, "never", dof=8, group="g") for name, size in (("a", 0.3), ("b", 0.1))]
    # each known to a quarter of itself: their sum to sqrt(0.3^2 + 0.1^2)/4, hence 8 × 0.4^2/0.1 = 12.8 degrees
    together = scenario(*pair)
    assert together.degrees_of_freedom(number(t)) == pytest.approx((0.09 + 0.16) ** 2 / (0.16**2 / 12.8), rel=1e-13)
    assert scenario(replace(pair[0], dof=None)).degrees_of_freedom(number(t)) == np.inf


def test_infinite_budget_leaves_the_systematics_alone() -> None:
    """All sizes known to 25 %: eight degrees, whatever the statistics were."""
    found = scenario(systematic("offset", 0.4, "never", dof=8))
    assert found.degrees_of_freedom(number(1e30)) == pytest.approx(8.0, rel=1e-12)
