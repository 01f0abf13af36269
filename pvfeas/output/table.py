"""Results as tables for people: whole when piped, plain ASCII where the stream cannot do better."""

from __future__ import annotations

import io
from collections.abc import Callable, Sequence

from pvfeas.output.words import CAUTION, share, verdict
from pvfeas.results import Assessment, Comparison, Level, Quantiles, RequiredTime, ScenarioResult, Understood
from pvfeas.showing import digits, time_text, value_text

ASCII = str.maketrans({"σ": "s", "√": "sqrt ", "∞": "inf", "≥": ">=", "≤": "<=", "–": "-", "×": "x", "±": "+-", "µ": "u", "…": "..."})
Row = tuple[str, Callable[[ScenarioResult], str]]


def encodable(text: str, encoding: str) -> str:
    """The text, in ASCII where the encoding cannot carry it."""
    try:
        text.encode(encoding)
    except (UnicodeEncodeError, LookupError):
        return text.translate(ASCII).encode("ascii", "replace").decode()
    return text


def assessment_text(result: Assessment, width: int = 0, colour: bool = False) -> str:
    """Verdicts, the numbers, the contract, what to doubt. width 0: as wide as it needs to be."""
    parts = [result.title] if result.title else []
    parts += [verdict(one) for one in result.scenarios]
    parts.append(grid(["", *(one.name for one in result.scenarios)], rows_of(result.scenarios), width, colour))
    parts.append(contract_text(result))
    parts += [f"warning ({one.code}) {one.address}: {one.message}" for one in result.warnings]
    if not result.tolerance_met:
        parts.append("warning (tolerance): not every number met its tolerance; allow more with --maximum-points")
    parts.append(CAUTION)
    return "\n\n".join(part for part in parts if part) + "\n"


def rows_of(scenarios: Sequence[ScenarioResult]) -> list[list[str]]:
    """The rows of the big table; a row that says nothing for any scenario is left out."""
    rows = [[name, *(show(one) for one in scenarios)] for name, show in ROWS]
    return [row for row in rows if any(cell not in ("", "-") for cell in row[1:])]


def _spread(found: Quantiles | None) -> str:
    if found is None:
        return "-"
    if found.q16 == found.q84:
        return value_text(found.q50, found.unit)
    return f"{value_text(found.q50, found.unit)} ({value_text(found.q16, found.unit)} – {value_text(found.q84, found.unit)})"


def _time(found: RequiredTime, low: str, high: str) -> str:
    return f"{time_text(getattr(found, low))} – {time_text(getattr(found, high))}"


def _level(level: Level | None, unit: str = "Hz") -> str:
    return "-" if level is None else value_text(level.q50, unit)


def _fraction(level: Level | None) -> str:
    if level is None or not level.q50:
        return "-"
    return f"{level.q50:.2g}, 1 part in {digits(1.0 / level.q50, 2)}"


def _calculations(found: ScenarioResult) -> str:
    per = found.chance.per_calculation
    return "-" if not per else f"{share(min(per.values()))} – {share(max(per.values()))}"


def _shares(found: ScenarioResult) -> str:
    kept = sorted(found.sigma.shares.items(), key=lambda item: -item[1])
    return ", ".join(f"{name.removeprefix('systematics.')} {100 * part:.0f} %" for name, part in kept if part >= 0.005)


ROWS: tuple[Row, ...] = (
    ("technique", lambda one: one.technique),
    ("splitting, true (16–84 %)", lambda one: _spread(one.splitting)),
    ("splitting, seen (16–84 %)", lambda one: _spread(one.signal)),
    ("chance within budget", lambda one: f"{share(one.chance.value)} within {time_text(one.chance.within.value)}"),
    ("  range over calculations", _calculations),
    ("  for unlimited time", lambda one: share(one.chance.ceiling)),
    ("required time, median", lambda one: time_text(one.required_time.q50)),
    ("  16–84 %", lambda one: _time(one.required_time, "q16", "q84")),
    ("  5–95 %", lambda one: _time(one.required_time, "q05", "q95")),
    ("  inputs at their medians", lambda one: time_text(one.required_time.nominal)),
    ("  live time, median", lambda one: time_text(one.required_live_time.q50)),
    ("  reachable ever / in time", lambda one: f"{share(one.required_time.reachable)} / {share(one.required_time.in_time)}"),
    ("significance at budget", lambda one: "-" if one.significance is None or one.significance.q50 is None else f"{digits(one.significance.q50)} sigma"),
    ("  surviving doubt of sizes", lambda one: "-" if one.significance is None or one.significance.surviving is None else f"{digits(one.significance.surviving)} sigma"),
    ("sigma at budget", lambda one: _level(one.sigma.total, one.sigma.unit)),
    ("  statistical", lambda one: _level(one.sigma.statistical, one.sigma.unit)),
    ("  systematic", lambda one: _level(one.sigma.systematic, one.sigma.unit)),
    ("  parts of sigma^2", _shares),
    ("sigma needed, splitting", lambda one: "-" if one.resolution is None else _level(one.resolution.needed)),
    ("  of one line centre", lambda one: "-" if one.resolution is None else _level(one.resolution.needed_centre)),
    ("  of the width", lambda one: "-" if one.resolution is None else _fraction(one.resolution.of_fwhm)),
    ("  of the frequency", lambda one: "-" if one.resolution is None else _fraction(one.resolution.of_frequency)),
    ("line centre, one cycle", lambda one: _spread(one.centre_uncertainty)),
    ("sensitivity", lambda one: _spread(one.sensitivity)),
    ("reach at budget (16–84 %)", lambda one: _spread(one.reach)),
    ("limit if no splitting", lambda one: "-" if one.limit is None else f"{value_text(one.limit.q50, 'Hz')} ({100 * one.limit.confidence:.4g} %, {one.limit.construction})"),
    ("limited by", lambda one: one.limiting.name),
)


def contract_text(result: Assessment) -> str:
    """The decision contract in sentences; what differs between scenarios is said for each."""
    one = result.scenarios[0].contract
    said = [f"Decision: null hypothesis: {one.null}"]
    if one.threshold is not None and one.p is not None:
        raised = "" if one.threshold_used == one.threshold else f", raised to {digits(one.threshold_used or 0.0, 4)} sigma"
        said.append(f"threshold {digits(one.threshold)} sigma{raised} (p = {one.p:.2g}, {one.sides}-sided, trials {one.trials}, looks {one.looks})")
    if one.confidence is not None:
        said.append(f"confidence {100 * one.confidence:.4g} % by {one.construction}, {one.sides}-sided")
    if one.power is not None:
        said.append(f"goal met where the chance is at least {share(one.power)}")
    said.append(f"drawn: {one.drawn}; unknown after: {one.unknown_after}")
    without = [each.name for each in result.scenarios if not each.contract.floor_declared]
    said.append(f"no floor declared for {', '.join(without)}" if without else "floors declared")
    return "; ".join(said) + "."


def comparison_text(result: Comparison, width: int = 0, colour: bool = False) -> str:
    """The assessment side by side, what was written differently, and the odds."""
    names = [one.name for one in result.assessment.scenarios]
    parts = [assessment_text(result.assessment, width, colour).removesuffix(CAUTION + "\n").rstrip()]
    if result.differences:
        rows = [[one.key, *one.texts] for one in result.differences]
        parts.append("What differs:\n" + grid(["key", *names], rows, width, colour))
    rows = [
        [
            f"{one.first} : {one.second}", share(one.first_sooner), share(one.second_sooner), share(one.neither),
            "-" if one.nominal_ratio is None else f"{digits(one.nominal_ratio)}",
        ]
        for one in result.odds
    ]  # fmt: skip
    header = ["pair", "first sooner", "second sooner", "neither ever", "time ratio, nominal"]
    parts.append("Odds, drawn together (time ratio: second over first):\n" + grid(header, rows, width, colour))
    return "\n\n".join([*parts, CAUTION]) + "\n"


def understood_text(found: Understood, width: int = 0, colour: bool = False) -> str:
    """What check understood."""
    rows = [[one.address, one.text, one.law, one.status or "-", one.source or "-"] for one in found.rows]
    parts = [found.title] if found.title else []
    parts.append(grid(["input", "as written", "understood", "status", "source"], rows, width, colour))
    for name, listed in (("exact", found.exact), ("assumed or extrapolated", found.assumed), ("without source", found.without_source)):
        parts.append(f"{name}: {', '.join(listed) if listed else 'none'}")
    parts += [f"warning ({one.code}) {one.address}: {one.message}" for one in found.warnings]
    return "\n\n".join(parts) + "\n"


def grid(header: Sequence[str], rows: Sequence[Sequence[str]], width: int, colour: bool) -> str:
    """A table whose columns line up; no cell is ever cut."""
    from rich import box
    from rich.console import Console
    from rich.table import Table

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, header_style="bold" if colour else "")
    for place, name in enumerate(header):
        table.add_column(name, overflow="fold", no_wrap=width == 0 or place == 0)
    for row in rows:
        table.add_row(*(str(cell).replace("[", "\\[") for cell in row))
    stream = io.StringIO()
    console = Console(
        file=stream, width=width or 100_000, force_terminal=colour, no_color=not colour, highlight=False, legacy_windows=False
    )
    console.print(table)
    return "\n".join(line.rstrip() for line in stream.getvalue().splitlines())
