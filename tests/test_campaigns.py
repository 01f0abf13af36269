"""Whole campaigns drawn from the study in plain NumPy: how often a claim is made, with and without a splitting.

Nothing of pvfeas's propagation is used: inputs are drawn with NumPy's generators, sigma comes from the formulas
of the techniques written out once more, an outcome x is drawn from N(signal, sigma) and the rule of the
claim is applied to it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest

from pvfeas.compiler import problem_of
from pvfeas.decision import rule_for
from pvfeas.options import Options
from pvfeas.questions.assess import assess
from pvfeas.results import ScenarioResult
from pvfeas.studyfile import load_study

CAMPAIGNS = 500_000
DAY, WEEK = 86400.0, 604800.0
Array = np.ndarray
Random = np.random.Generator


def lognormal(random: Random, median: float, factor: float) -> Array:
    return median * np.exp(np.log(factor) * random.standard_normal(CAMPAIGNS))


def beta(random: Random, mean: float, sd: float) -> Array:
    total = mean * (1.0 - mean) / sd**2 - 1.0
    return random.beta(mean * total, (1.0 - mean) * total, CAMPAIGNS)


def ramsey_noise(contrast: float, free_time: float, molecules: Array, idle_time: float) -> Array:
    """Variance × live time of the difference of alternating equal arms, Hz^2 s: 4 S^2."""
    return 4.0 * (free_time + idle_time) / (4.0 * molecules * (np.pi * contrast * free_time) ** 2)


@dataclass(frozen=True)
class Campaigns:
    """A study, and the same in plain NumPy: (signal seen, sigma) at the budget of every campaign."""

    study: str
    draw: Callable[[Random], tuple[Array, Array]]
    claim: Callable[[Array, Array, Array], Array]  # outcome, sigma, signal -> whether the goal is met


GOAL = '[goal]\nkind = "{kind}"\nwithin = "30 d"\n{more}\n'
RAMSEY = """
[scenario.x.technique]
kind = "ramsey"
free_time = "0.1 s"
idle_time = "50 ms"
contrast = 0.8
molecules = "200 ×/ 1.5"
"""


def detect(k: float, sides: int = 2) -> Callable[[Array, Array, Array], Array]:
    def claim(outcome: Array, sigma: Array, signal: Array) -> Array:
        return np.abs(outcome) > k * sigma if sides == 2 else outcome > k * sigma

    return claim


def noise_of(random: Random) -> Array:
    return ramsey_noise(0.8, 0.1, lognormal(random, 200.0, 1.5), 0.05)


def draw_plain(random: Random) -> tuple[Array, Array]:
    noise = noise_of(random)
    return lognormal(random, 0.4e-3, 2.0), np.sqrt(noise / (30 * DAY))


def draw_systematics(random: Random) -> tuple[Array, Array]:
    """Grouped never, per reset on working days, as 1/t; ee; schedule."""
    noise, splitting = noise_of(random), lognormal(random, 0.02, 1.6)
    share = 0.9 * (10 / 24) * (5 / 7) * 0.8  # calibration, hours, days, uptime
    live = 30 * DAY * share
    never = lognormal(random, 2e-3, 1.5) + 1e-3
    resets = max(1.0, 30.0 * 5 / 7)
    reset = lognormal(random, 6e-3, 1.4) / np.sqrt(resets)
    falling = 4e-3 * np.sqrt(3600.0 * 24 / live)
    sigma = np.sqrt(noise / live + never**2 + reset**2 + falling**2)
    factor = (beta(random, 0.9, 0.03) + 0.5) / 2.0
    return factor * splitting, sigma


def draw_grows(random: Random) -> tuple[Array, Array]:
    """A growing systematic: averaging stops where sigma is least."""
    noise, splitting = noise_of(random), lognormal(random, 4e-3, 1.6)
    growing = lognormal(random, 3e-3, 1.6) ** 2 / (5 * DAY)  # Hz^2 per s of live time
    best = np.minimum(np.sqrt(noise / growing), 30 * DAY)
    return splitting, np.sqrt(noise / best + growing * best)


def draw_supply(random: Random) -> tuple[Array, Array]:
    """The sample ends: mass of each enantiomer over what its arm uses in half of the live time."""
    noise, splitting = noise_of(random), lognormal(random, 0.5e-3, 1.7)
    mass, used = lognormal(random, 1.0, 1.3), lognormal(random, 5e-3, 1.4)  # g, g per hour
    live = np.minimum(30 * DAY, mass / used * 3600.0 / 0.5)
    return splitting, np.sqrt(noise / live)


def draw_correlated(random: Random) -> tuple[Array, Array]:
    """Splitting and molecules correlated by 0.6; two theories of unequal weight; simultaneous arms."""
    score = random.standard_normal((2, CAMPAIGNS))
    second = 0.6 * score[0] + np.sqrt(1.0 - 0.36) * score[1]
    scale = np.exp(np.log(1.5) * score[0])
    theory = np.where(random.uniform(size=CAMPAIGNS) < 0.25, 0.2e-3, 0.4e-3)
    molecules = 200.0 * np.exp(np.log(1.5) * second)
    noise = ramsey_noise(0.8, 0.1, molecules, 0.05) / 2.0  # 2 S^2
    return theory * scale, np.sqrt(noise / (30 * DAY))


def draw_quoted(random: Random) -> tuple[Array, Array]:
    """A normal splitting of either sign, another group's uncertainty, more noise than theirs."""
    splitting = random.normal(0.3, 0.4, CAMPAIGNS)
    sigma = lognormal(random, 0.5, 1.4) * 1.3 * np.sqrt(DAY / (30 * DAY))
    return splitting, sigma


def scenario(splitting: str, technique: str, more: str = "") -> str:
    return f'[scenario.x]\nsplitting = {{ {splitting}, of = "difference" }}\n{more}\n{technique}\n'


PLAIN = scenario('value = "0.4 mHz ×/ 2"', RAMSEY)
SYSTEMATICS = scenario(
    'value = "20 mHz ×/ 1.6"',
    RAMSEY,
    """
samples = { ee_a = "0.90(3)", ee_b = 0.5 }
schedule = { hours_per_day = 10, days_per_week = 5, calibration_fraction = 0.1, uptime = 0.8 }
[scenario.x.systematics]
one = { size = "2 mHz ×/ 1.5", averages = "never", group = "shape" }
two = { size = "1 mHz", averages = "never", group = "shape" }
pressure = { size = "6 mHz ×/ 1.4", averages = "per reset", every = "1 d" }
stray = { size = "4 mHz", averages = "as 1/t", after = "1 d" }
""",
)
GROWS = scenario(
    'value = "4 mHz ×/ 1.6"',
    RAMSEY,
    'systematics.drift = { size = "3 mHz ×/ 1.6", averages = "grows", after = "5 d" }\n',
)
SUPPLY = scenario(
    'value = "0.5 mHz ×/ 1.7"', RAMSEY, 'samples = { mass = "1 g ×/ 1.3", consumption = "5 mg/h ×/ 1.4" }\n'
)
CORRELATED = f"""
[shared]
scale = "1 ×/ 1.5"
[[correlation]]
between = ["shared.scale", "x.technique.molecules"]
rho = 0.6
[scenario.x]
switching = {{ mode = "simultaneous" }}
[scenario.x.splitting]
values = {{ one = "0.2 mHz", two = "0.4 mHz" }}
weights = [1, 3]
times = ["@scale"]
of = "difference"
{RAMSEY}
"""
QUOTED = scenario(
    'value = "0.3(4) Hz"',
    'technique = { kind = "quoted", uncertainty = "0.5 Hz ×/ 1.4", after = "1 d", excess_noise = 1.3 }\n',
)
Z95 = 1.959963984540054  # two-sided 95 %


def detecting(k: float, more: str = "") -> str:
    return GOAL.format(kind="detect", more=f"significance = {k}\npower = 0.9\n{more}")


CASES = {
    "detect": Campaigns(detecting(5) + PLAIN, draw_plain, detect(5.0)),
    "sign predicted": Campaigns(detecting(3, "sides = 1") + PLAIN, draw_plain, detect(3.0, 1)),
    "systematics": Campaigns(detecting(3) + SYSTEMATICS, draw_systematics, detect(3.0)),
    "grows": Campaigns(detecting(3) + GROWS, draw_grows, detect(3.0)),
    "supply": Campaigns(detecting(5) + SUPPLY, draw_supply, detect(5.0)),
    "correlated": Campaigns(detecting(5) + CORRELATED, draw_correlated, detect(5.0)),
    "both signs": Campaigns(detecting(3) + QUOTED, draw_quoted, detect(3.0)),
    "sign": Campaigns(
        GOAL.format(kind="sign", more="significance = 3\npower = 0.9") + QUOTED,
        draw_quoted,
        lambda outcome, sigma, signal: np.sign(signal) * outcome > 3.0 * sigma,
    ),
    "measure": Campaigns(
        GOAL.format(kind="measure", more="relative_uncertainty = 0.2") + PLAIN,
        draw_plain,
        lambda outcome, sigma, signal: sigma <= 0.2 * np.abs(signal),
    ),
    "exclude": Campaigns(
        GOAL.format(kind="exclude", more="power = 0.9") + PLAIN,
        draw_plain,
        lambda outcome, sigma, signal: np.abs(outcome - signal) + Z95 * sigma < np.abs(signal),
    ),
}  # exclude: without a splitting the outcome is the noise alone


def answer(text: str, tolerance: float = 0.3) -> ScenarioResult:
    return assess(problem_of(load_study(text)), Options(tolerance=tolerance)).scenarios[0]


@pytest.mark.parametrize("name", CASES)
def test_campaigns_make_the_predicted_share_of_claims(name: str) -> None:
    """Bound: three standard errors of the simulation, and the half-width that pvfeas states."""
    case, random = CASES[name], np.random.default_rng(20)
    signal, sigma = case.draw(random)
    met = case.claim(signal + sigma * random.standard_normal(CAMPAIGNS), sigma, signal)
    share, found = float(np.mean(met)), answer(case.study)
    standard_error = np.sqrt(share * (1.0 - share) / CAMPAIGNS)
    assert 0.02 < share < 0.98, "the case says nothing"
    assert abs(found.chance.value - share) < 3.0 * standard_error + found.chance.error


@pytest.mark.parametrize("name", ["detect", "systematics", "supply", "correlated"])
def test_required_time_within_the_budget(name: str) -> None:
    """Needed: s = (k + 1.2816) sigma at the budget, in the share of draws that pvfeas calls in time."""
    case, random = CASES[name], np.random.default_rng(21)
    signal, sigma = case.draw(random)
    k = 3.0 if name == "systematics" else 5.0
    share = float(np.mean(np.abs(signal) >= (k + 1.2815515655446004) * sigma))
    found = answer(case.study).required_time
    standard_error = np.sqrt(share * (1.0 - share) / CAMPAIGNS)
    assert abs(found.in_time - share) < 3.0 * standard_error + (found.error["in_time"] or 0.0)


@pytest.mark.parametrize(("sides", "expected"), [(2, 2 * 0.022750131948179), (1, 0.022750131948179)])
def test_campaigns_without_a_splitting_claim_as_often_as_stated(sides: int, expected: float) -> None:
    """2 sigma: Phi(-2) × sides (standard normal table), bound three standard errors; and pvfeas states it as p."""
    random = np.random.default_rng(22)
    _, sigma = draw_systematics(random)
    claimed = detect(2.0, sides)(sigma * random.standard_normal(CAMPAIGNS), sigma, np.zeros(CAMPAIGNS))
    rate = float(np.mean(claimed))
    assert abs(rate - expected) < 3.0 * np.sqrt(expected / CAMPAIGNS)
    found = answer(detecting(2, f"sides = {sides}") + SYSTEMATICS, tolerance=10.0)
    assert found.contract.p == pytest.approx(expected, rel=1e-9)


def test_chance_of_a_claim_without_a_splitting() -> None:
    """A splitting of practically nothing: the chance is the false-claim rate."""
    study = detecting(2) + scenario('value = "1e-12 Hz ×/ 1.5"', RAMSEY)
    found = answer(study, tolerance=0.1).chance
    assert found.error < 1e-4
    assert abs(found.value - 2 * 0.022750131948179) < found.error + 1e-6  # 1e-6: the splitting is not quite nothing


@pytest.mark.parametrize("looks", [5, 12])
def test_looks_keep_the_false_claim_rate(looks: int) -> None:
    """Equal instalments, a claim allowed after each: together they claim as often as one look at k sigma."""
    k = 2.0
    text = detecting(k, f"looks = {looks}") + PLAIN
    used = answer(text, tolerance=10.0).contract.threshold_used
    assert used is not None
    assert used > k
    random = np.random.default_rng(23)
    steps = np.cumsum(random.standard_normal((looks, CAMPAIGNS)), axis=0) / np.sqrt(np.arange(1, looks + 1))[:, None]
    rate = float(np.mean(np.max(np.abs(steps), axis=0) > used))
    expected = 2 * 0.022750131948179
    assert abs(rate - expected) < 3.0 * np.sqrt(expected / CAMPAIGNS)


def test_trials_keep_the_false_claim_rate() -> None:
    """Twenty lines tried, one of them claimed: the largest of twenty outcomes passes as often as one would at k."""
    problem = problem_of(load_study(detecting(2, "trials = 20") + PLAIN))
    random = np.random.default_rng(24)
    largest = np.max(np.abs(random.standard_normal((20, CAMPAIGNS // 5))), axis=0)
    rate = float(np.mean(largest > rule_for(problem.goal, 1.0).k))
    expected = 2 * 0.022750131948179
    assert abs(rate - expected) < 3.0 * np.sqrt(expected / (CAMPAIGNS // 5))
