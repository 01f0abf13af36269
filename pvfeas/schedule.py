"""From the calendar to live time, and how long the sample lasts."""

from __future__ import annotations

import numpy as np

from pvfeas.laws import Array
from pvfeas.tables import Samples, Schedule


def live_per_wall(schedule: Schedule) -> Array:
    """Live time over wall time.

    (1 - calibration_fraction) × hours_per_day/24 × days_per_week/7 × uptime. Dimensionless arrays.
    """
    working = (schedule.hours_per_day / 24.0) * (schedule.days_per_week / 7.0)
    return np.asarray((1.0 - schedule.calibration_fraction) * working * schedule.uptime)


def supply_live_time(samples: Samples, share: Array) -> Array:
    """Live time in s after which an arm's sample is used up; infinite where no supply was declared.

    mass/(consumption × share). share: the arm's part of the live time (1 where both arms run at once).
    """
    if samples.mass is None or samples.consumption is None:
        return np.full((1, 1), np.inf)
    return np.asarray(samples.mass / (samples.consumption * share))
