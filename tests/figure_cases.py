"""Studies whose figures are hard to draw: one invented study a difficulty."""

from __future__ import annotations

from pathlib import Path

from pvfeas.starters import starter

STUDIES = Path(__file__).resolve().parent.parent / "data" / "studies"
FLOOR = 'floor = { size = "20 mHz ×/ 1.5", averages = "never" }'
LONG = "the_first_apparatus_with_helium"
HARMLESS = "A title with $5 and $\\frac and 100 % of _signs_ {that} mean ^more elsewhere"


FOREIGN = "Молекула Ω, 分子, naïve ﬁgure, 🧪"


def goal(within: str, kind: str = 'kind = "detect"\nsignificance = 5\npower = 0.9') -> str:
    return f'[goal]\n{kind}\nwithin = "{within}"\n'


def ramsey(name: str, splitting: str = "0.5 Hz ×/ 1.6", systematics: str = FLOOR, mass: str = "1 g") -> str:
    return f"""
[scenario.{name}]
splitting = {{ value = "{splitting}", of = "difference" }}
samples = {{ mass = "{mass}", consumption = "4 mg/h" }}
[scenario.{name}.technique]
kind = "ramsey"
free_time = "20 ms"
contrast = 0.7
molecules = "300 ×/ 1.4"
idle_time = "10 ms"
[scenario.{name}.systematics]
{systematics}
"""


def quoted(name: str, splitting: str, uncertainty: str, after: str) -> str:
    return f"""
[scenario.{name}]
splitting = {{ value = "{splitting}", of = "difference" }}
technique = {{ kind = "quoted", uncertainty = "{uncertainty}", after = "{after}" }}
"""


def child(name: str, parent: str, change: str) -> str:
    return f'[scenario.{name}]\nbased_on = "{parent}"\n{change}\n'


def free(milliseconds: float) -> str:
    return f'technique = {{ free_time = "{milliseconds} ms" }}'


def systematic(name: str, ways: str) -> str:
    return f'[scenario.{name}.systematics.drift]\nsize = "30 mHz"\n{ways}\n'


def twelve() -> str:
    ways = ('averages = "never"', 'averages = "as 1/t", after = "1 d"')
    return "\n".join(
        f'uncertainty_of_part_{i} = {{ size = "{4 * i} mHz ×/ 1.5", {ways[i % 2]} }}' for i in range(1, 13)
    )


def alike(count: int) -> str:
    """Scenarios with long names whose curves lie all but on top of each other."""
    return "".join(child(f"way-{i}-{'of' * i}-doing_it", LONG, free(20 + i)) for i in range(1, count))


LONG_TITLE = f'title = "{"A title that goes on and on. " * 8}"\n'
CASES: dict[str, str] = {
    "five scenarios, long names and title": LONG_TITLE + goal("60 d") + ramsey(LONG) + alike(5),
    "unreachable": goal("30 d") + ramsey("x", splitting="1 mHz ×/ 1.6"),
    "unreachable beside reachable": goal("30 d")
    + ramsey("good")
    + child("hopeless", "good", 'splitting = { value = "1 mHz", of = "difference" }'),
    "no chance in time": goal("1 min") + ramsey("x", splitting="0.05 Hz ×/ 1.2", systematics=""),
    "no sigma will do": goal("60 d", 'kind = "measure"\nrelative_uncertainty = 0.05\npower = 0.9')
    + ramsey("x").replace("samples = {", "samples = { ee_a = 0.9, ee_b = 0.9, ee_known_to = 0.1,"),
    "met in the first pattern": goal("1 yr") + ramsey("x", splitting="5 Hz ×/ 1.1", systematics=""),
    "narrow": goal("1 h") + quoted("x", "1 Hz", "0.16 Hz", "1 h"),
    "wide": goal("100 yr") + quoted("x", "1 Hz ×/ 300", "0.1 Hz", "1 h"),
    "budget off the axis": goal("2000 yr") + quoted("x", "1 Hz ×/ 2", "0.1 Hz", "100 yr"),
    "everything off the axis": goal("9000 yr") + quoted("x", "1 Hz ×/ 2", "0.1 Hz", "9000 yr"),
    "milliseconds": goal("50 ms") + quoted("x", "100 kHz ×/ 1.3", "5 kHz", "3 ms"),
    "growing": goal("1 h")
    + quoted("x", "1 Hz", "0.16 Hz", "1 h")
    + systematic("x", 'averages = "grows"\nafter = "1 h"'),
    "twelve systematics": goal("30 d") + ramsey("x", systematics=twelve()),
    "microhertz": goal("30 d") + ramsey("x", splitting="3 µHz ×/ 2", systematics=""),
    "samples that end together": goal("60 d")
    + ramsey("first", mass="100 mg")
    + child("second", "first", 'samples = { mass = "106 mg" }')
    + child("third", "first", 'samples = { mass = "112 mg" }'),
    "sample that ends before the floor": goal("60 d") + ramsey("x", mass="8 mg"),
    "sign unknown": goal("60 d") + ramsey("x", splitting="0.1(3) Hz"),
    "exclude": goal("60 d", 'kind = "exclude"\nconfidence = 0.95\npower = 0.9') + ramsey("x"),
    "signs in the title": f"title = '{HARMLESS}'\n" + goal("2 h") + quoted("x", "1 Hz ×/ 1.5", "0.16 Hz", "1 h"),
    "one long word": f'title = "{"antidisestablishment" * 14}"\n'
    + goal("2 h")
    + quoted("x" * 60, "1 Hz", "0.1 Hz", "1 h"),
    "foreign letters": f'title = "{FOREIGN}"\n'
    + goal("2 h")
    + quoted("'größer'", "1 Hz", "0.16 Hz", "1 h")
    + child("'Ωmega'", "größer", 'technique = { after = "2 h" }'),
    "floor not reached": goal("1 h")
    + quoted("slow", "1 Hz", "0.16 Hz", "1 h")
    + systematic("slow", 'averages = "never"')
    + child("slower", "slow", 'technique = { after = "2 h" }'),
    **{f"starter {kind}": starter(kind) for kind in ("scan", "quoted", "ramsey")},
    **{one.stem: one.read_text(encoding="utf-8") for one in sorted(STUDIES.glob("*.toml"))},
}
