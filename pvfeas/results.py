"""Results: plain, frozen, complete. Rendering sees these and nothing else.

Attributes carry the names of the JSON (schema version "1"); None is null. Times in s,
frequencies in Hz. error holds 95 % half-widths of the numerical integration, in the unit of
the number they belong to.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

SCHEMA_VERSION = "1"
Number = float | None


@dataclass(frozen=True)
class Moment:
    """A wall time."""

    value: float
    unit: str = "s"
    clock: str = "wall"


@dataclass(frozen=True)
class Warned:
    """A doubt that travels with the result."""

    code: str
    address: str
    message: str


@dataclass(frozen=True)
class Quantiles:
    """The distribution of one quantity over the draws, and its value with every input at its median."""

    unit: str
    q05: Number
    q16: Number
    q50: Number
    q84: Number
    q95: Number
    nominal: Number
    error: Mapping[str, Number] = field(default_factory=dict)


@dataclass(frozen=True)
class RequiredTime:
    """Time after which the goal is met; an unreachable draw counts as later than any time."""

    clock: str  # "wall" or "live"
    q05: Number
    q16: Number
    q50: Number
    q84: Number
    q95: Number
    nominal: Number
    reachable: float  # P(reachable ever)
    in_time: float  # P(required time <= budget)
    error: Mapping[str, Number]
    per_calculation: Mapping[str, Number] = field(default_factory=dict)  # median per theory member
    unit: str = "s"


@dataclass(frozen=True)
class Chance:
    """Probability of meeting the goal by the budget's wall time, averaged over the inputs."""

    within: Moment
    value: float
    error: float
    ceiling: float  # for unlimited wall time, the supply still counting
    nominal: float
    goal_met: bool | None  # chance >= power; None where no power was asked
    per_calculation: Mapping[str, float] = field(default_factory=dict)
    at_each: tuple[tuple[Moment, float, float], ...] = ()  # (within, chance, error), where a list was given


@dataclass(frozen=True)
class Significance:
    """|splitting seen| over sigma at the budget; surviving: what not knowing the systematics well leaves."""

    at: Moment
    q16: Number
    q50: Number
    q84: Number
    nominal: Number
    surviving: Number


@dataclass(frozen=True)
class Level:
    """Median over the draws and nominal value."""

    q50: Number
    nominal: Number


@dataclass(frozen=True)
class Sigma:
    """Standard uncertainty of the splitting seen at the budget, in parts; shares are nominal parts of sigma^2."""

    at: Moment
    unit: str
    total: Level
    statistical: Level
    reference: Level
    systematic: Level
    shares: Mapping[str, float]


@dataclass(frozen=True)
class Resolution:
    """What must be resolved: sigma of the splitting and of one line centre, and their fractions."""

    needed: Level
    needed_centre: Level
    of_frequency: Level | None
    of_fwhm: Level | None
    unit: str = "Hz"


@dataclass(frozen=True)
class Limit:
    """Median planned limit on |splitting| at the budget if there is no splitting."""

    confidence: float
    construction: str
    q50: Number
    unit: str = "Hz"


@dataclass(frozen=True)
class LinearTime:
    """Required time by the linear law of propagation (JCGM 100) on ln t, and whether it is adequate."""

    value: Number
    u_ln: Number
    adequate: bool | None


@dataclass(frozen=True)
class Contract:
    """The decision contract: everything that the word 'chance' rests on."""

    null: str
    threshold: Number  # sigma, as asked
    threshold_used: Number  # sigma, raised for trials and looks
    p: Number
    sides: int
    trials: int
    looks: int
    power: Number
    confidence: Number
    construction: str | None
    drawn: str
    unknown_after: str
    floor_declared: bool
    schedule_declared: bool


@dataclass(frozen=True)
class Limiting:
    """Which class of uncertainty limits the scenario at the budget; shares: of the draws."""

    name: str  # statistics | reference | systematics | supply
    shares: Mapping[str, float]


@dataclass(frozen=True)
class ScenarioResult:
    """Everything about one scenario."""

    name: str
    technique: str
    splitting: Quantiles
    signal: Quantiles
    centre_uncertainty: Quantiles | None
    sensitivity: Quantiles | None
    required_time: RequiredTime
    required_live_time: RequiredTime
    chance: Chance
    significance: Significance | None
    sigma: Sigma
    resolution: Resolution | None
    reach: Quantiles
    limit: Limit | None
    linear: LinearTime
    contract: Contract
    limiting: Limiting
    status: str  # reachable | unreachable
    reason: str
    not_applicable: tuple[str, ...] = ()


@dataclass(frozen=True)
class Assessment:
    """What `assess` answers."""

    question: Mapping[str, object]
    title: str
    sha256: str
    seed: int
    points: int  # points per replicate × replicates, per stratum
    method: str  # lattice | monte-carlo
    tolerance_met: bool
    warnings: tuple[Warned, ...]
    scenarios: tuple[ScenarioResult, ...]


@dataclass(frozen=True)
class Odds:
    """Probability that one scenario needs less wall time than another, drawn together."""

    first: str
    second: str
    first_sooner: float
    second_sooner: float
    neither: float  # both unreachable
    error: float
    nominal_ratio: Number  # required time of the second over that of the first, nominal


@dataclass(frozen=True)
class Difference:
    """One thing written differently: the text of each scenario, in the order of the scenarios."""

    key: str  # address without the scenario
    texts: tuple[str, ...]


@dataclass(frozen=True)
class Comparison:
    """What `compare` answers."""

    assessment: Assessment
    differences: tuple[Difference, ...]
    odds: tuple[Odds, ...]


@dataclass(frozen=True)
class SigmaCurve:
    """sigma of the splitting seen against wall time, nominal, with what the goal needs."""

    scenario: str
    unit: str
    wall_time: tuple[float, ...]
    total: tuple[float, ...]
    total_q16: tuple[float, ...]
    total_q84: tuple[float, ...]
    parts: Mapping[str, tuple[float, ...]]  # statistics, reference, each systematic
    floor: float | None  # what is left for unlimited time; None where sigma falls without end
    needed_q16: Number  # sigma that the goal needs for the predicted splitting: band and median
    needed_q50: Number
    needed_q84: Number
    needed_nominal: Number
    crossing: Number  # nominal required wall time
    first: float  # earliest usable wall time, nominal
    last: Number  # wall time at which the sample is used up, nominal


@dataclass(frozen=True)
class ChanceCurve:
    """Chance of meeting the goal against wall time."""

    scenario: str
    wall_time: tuple[float, ...]
    chance: tuple[float, ...]
    error: tuple[float, ...]
    ceiling: float
    budget: float
    at_budget: float
    power: Number


@dataclass(frozen=True)
class Curves:
    """What the figures of assess and compare show."""

    title: str
    goal: str  # in words: "detect at 5 sigma with 90 % power"
    sigma: tuple[SigmaCurve, ...]
    chance: tuple[ChanceCurve, ...]


@dataclass(frozen=True)
class InputRow:
    """One input as check shows it."""

    address: str
    text: str
    law: str
    status: str
    source: str


@dataclass(frozen=True)
class Understood:
    """What check understood of a study."""

    title: str
    rows: tuple[InputRow, ...]
    widths: tuple[str, ...]  # of each line that is composed: what makes it, what dominates
    exact: tuple[str, ...]
    assumed: tuple[str, ...]
    without_source: tuple[str, ...]
    warnings: tuple[Warned, ...]
