"""A scenario on given draws: from expressions to the variance of the splitting seen against time."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from pvfeas.averaging import Averaging, averaging_of, purity, splitting_noise
from pvfeas.laws import Array
from pvfeas.problem import Draws, ScenarioProblem
from pvfeas.tables import Line, Samples
from pvfeas.techniques.base import Technique


@dataclass(frozen=True)
class Realisation:
    """Everything about a scenario but its splitting, at every point.

    factor: splitting seen over splitting. noise: variance of the splitting seen times live
    time, Hz^2 s. known_to: relative standard uncertainty of the factor that remains.
    """

    line: Line
    technique_a: Technique
    technique_b: Technique
    samples_a: Samples
    averaging: Averaging
    factor: Array
    noise: Array
    known_to: Array

    def relative_variance(self, wall: Array) -> Array:
        """Relative variance of the splitting that remains at the end: ee and systematics on the scale."""
        return np.asarray(self.known_to**2 + self.averaging.relative_variance(wall))


def realise(scenario: ScenarioProblem, draws: Draws, signal: Array | None = None) -> Realisation:
    """Evaluate a scenario on draws; signal (|splitting seen|, Hz) is needed by systematics on the signal only."""
    draws = scenario.with_width(draws)
    line = scenario.line.at(draws)
    technique_a, technique_b = scenario.technique_a.at(draws), scenario.technique_b.at(draws)
    switching, schedule = scenario.switching.at(draws), scenario.schedule.at(draws)
    samples_a, samples_b = scenario.samples_a.at(draws), scenario.samples_b.at(draws)
    systematics = tuple(template.at(draws) for template in scenario.systematics)
    references = tuple(template.at(draws) for template in scenario.references)
    factor = purity(samples_a.ee_a, samples_b.ee_b)
    with np.errstate(divide="ignore", invalid="ignore"):
        known_to = np.where(samples_a.ee_known_to == 0, 0.0, samples_a.ee_known_to / np.abs(factor))
    return Realisation(
        line=line,
        technique_a=technique_a,
        technique_b=technique_b,
        samples_a=samples_a,
        averaging=averaging_of(
            technique_a, technique_b, line, switching, samples_a, samples_b, schedule, systematics, references
        ),
        factor=factor,
        noise=splitting_noise(technique_a, technique_b, line, switching),
        known_to=np.asarray(known_to),
    )
