"""From the calendar to live time, and the sample's end."""

from __future__ import annotations

import numpy as np
import pytest

from pvfeas.schedule import live_per_wall, supply_live_time
from pvfeas.tables import Samples, Schedule

HOUR = 3600.0
MILLIGRAM, GRAM = 1e-6, 1e-3


def a_schedule(hours: float = 24.0, days: float = 7.0, calibration: float = 0.0, uptime: float = 1.0) -> Schedule:
    return Schedule(
        hours_per_day=np.asarray(hours),
        days_per_week=np.asarray(days),
        calibration_fraction=np.asarray(calibration),
        uptime=np.asarray(uptime),
    )


def test_round_the_clock_is_all_live() -> None:
    assert live_per_wall(a_schedule()) == 1.0


def test_fractions_of_the_calendar_multiply() -> None:
    assert live_per_wall(a_schedule(10, 5, 0.2)) == pytest.approx(5 / 21, rel=1e-15)  # 10/24 × 5/7 × 4/5, by hand


@pytest.mark.parametrize(
    ("hours", "days", "calibration", "uptime"), [(10, 5, 0.2, 0.75), (6, 7, 0.5, 1.0), (24, 3, 0, 0.5)]
)
def test_hour_by_hour_count(hours: int, days: int, calibration: float, uptime: float) -> None:
    calendar = np.arange(4 * 7 * 24)  # four weeks
    working = (calendar % 24 < hours) & (calendar // 24 % 7 < days)
    hour_by_hour = np.where(working, (1.0 - calibration) * uptime, 0.0).sum() / len(calendar)
    assert live_per_wall(a_schedule(hours, days, calibration, uptime)) == pytest.approx(hour_by_hour, rel=1e-13)


def test_draws_broadcast() -> None:
    draws = Schedule(
        hours_per_day=np.array([[6.0], [12.0]]),
        days_per_week=np.array([[7.0, 3.5, 1.75]]),
        calibration_fraction=np.asarray(0.0),
        uptime=np.asarray(1.0),
    )
    assert live_per_wall(draws) == pytest.approx(np.array([[1 / 4, 1 / 8, 1 / 16], [1 / 2, 1 / 4, 1 / 8]]), rel=1e-15)


def test_supply_counts_the_live_time_of_its_own_arm() -> None:
    samples = Samples(mass=np.asarray(2 * GRAM), consumption=np.asarray(8 * MILLIGRAM / HOUR))
    assert supply_live_time(samples, np.asarray(1.0)) == pytest.approx(250 * HOUR, rel=1e-14)  # both arms at once
    assert supply_live_time(samples, np.asarray(0.5)) == pytest.approx(500 * HOUR, rel=1e-14)
    assert supply_live_time(samples, np.asarray(0.25)) == pytest.approx(1000 * HOUR, rel=1e-14)


@pytest.mark.parametrize("samples", [Samples(), Samples(mass=np.asarray(1.0)), Samples(consumption=np.asarray(1.0))])
def test_undeclared_supply_never_ends(samples: Samples) -> None:
    assert np.all(np.isinf(supply_live_time(samples, np.asarray(0.5))))
