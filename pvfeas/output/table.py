"""Results as text for people: verdicts, tables in 80 columns, the decision contract, doubts."""

from __future__ import annotations

from collections.abc import Sequence

from pvfeas.output.grid import fits, grid
from pvfeas.output.provenance import line
from pvfeas.output.rows import table_rows
from pvfeas.output.words import CAUTION, asked, cleaned, error_text, share, short, verdict, wrapped
from pvfeas.results import Assessment, Comparison, Contract, Difference, Odds, Understood, Warned
from pvfeas.showing import digits

WIDTH = 80
MOST = 100  # columns of running text, however wide the terminal


def assessment_text(result: Assessment, width: int = WIDTH, colour: bool = False) -> str:
    """Verdicts, the numbers, the contract, what to doubt."""
    return _joined([*_body(result, width, colour), *_end(result, width)])


def comparison_text(result: Comparison, width: int = WIDTH, colour: bool = False) -> str:
    """The assessment side by side, what was written differently, and the odds."""
    parts = _body(result.assessment, width, colour)
    names = [one.name for one in result.assessment.scenarios]
    if result.differences:
        parts.append(f"What differs:\n\n{_differences(names, result.differences, width, colour)}")
    parts.append(_odds(result.odds, width, colour))
    return _joined([*parts, *_end(result.assessment, width)])


def understood_text(found: Understood, width: int = WIDTH, colour: bool = False) -> str:
    """What check understood: each input with its law, status and source, and the lists of what to doubt."""
    text = min(width, MOST)
    parts = [wrapped(found.title, text)] if found.title else []
    for one in found.rows:
        said = "; ".join(each for each in (one.law, one.status, f"source: {one.source}" if one.source else "") if each)
        parts.append(
            f"{wrapped(f'{one.address} = {one.text}', text, '  ')}\n    {wrapped(said, max(text - 4, 20), '    ')}"
        )
    rows = "\n".join(parts[1:] if found.title else parts)
    parts = [*parts[: 1 if found.title else 0], rows, *(wrapped(one, text, "  ") for one in found.widths)]
    for name, listed in (
        ("exact", found.exact),
        ("assumed or extrapolated", found.assumed),
        ("without source", found.without_source),
    ):
        parts.append(wrapped(f"{name} ({len(listed)}): {', '.join(listed) if listed else 'none'}", text, "  "))
    parts += warning_lines(found.warnings, text)
    return _joined(parts)


def warning_lines(warnings: Sequence[Warned], width: int) -> list[str]:
    """Doubts, one a paragraph; one that holds for several addresses is said once."""
    places: dict[tuple[str, str], list[str]] = {}
    for one in warnings:
        places.setdefault((one.code, one.message), []).append(one.address)
    return [
        wrapped(
            f"warning ({code}): {', '.join(filter(None, where))}: {said}"
            if any(where)
            else f"warning ({code}): {said}",
            width,
            "  ",
        )
        for (code, said), where in places.items()
    ]


def doubts(result: Assessment, width: int) -> list[str]:
    """The warnings of an assessment, and numbers that did not meet their tolerance."""
    found = warning_lines(result.warnings, width)
    if not result.tolerance_met:
        worst = error_text(max(one.chance.error for one in result.scenarios))
        said = f"warning (tolerance): not every number met its tolerance with {result.points} points"
        found.append(wrapped(f"{said} (chances are known to {worst}); allow more with --maximum-points", width, "  "))
    return found


def _joined(parts: Sequence[str]) -> str:
    return cleaned_but_colour("\n\n".join(part for part in parts if part)) + "\n"


def cleaned_but_colour(text: str) -> str:
    """Without control characters other than the codes of our own bold headers."""
    return "\x1b[1m".join(
        "\x1b[0m".join(cleaned(piece) for piece in part.split("\x1b[0m")) for part in text.split("\x1b[1m")
    )


def _body(result: Assessment, width: int, colour: bool) -> list[str]:
    text = min(width, MOST)
    parts = [wrapped(result.title, text)] if result.title else []
    parts += [wrapped(verdict(one), text, "  ") for one in result.scenarios]
    names = [one.name for one in result.scenarios]
    parts.append(grid(["", *names], table_rows(result.scenarios), width, colour))
    return parts


def _end(result: Assessment, width: int) -> list[str]:
    text = min(width, MOST)
    return [
        *(wrapped(said, text, "  ") for said in contracts(result)),
        *doubts(result, text),
        wrapped(line(result.question, result.points, result.sha256), text, "  "),
        wrapped(CAUTION, text),
    ]


def contracts(result: Assessment) -> list[str]:
    """The decision contract in sentences; once for all scenarios that share it."""
    shared: dict[str, list[str]] = {}
    for one in result.scenarios:
        shared.setdefault(contract_text(one.contract), []).append(one.name)
    if len(shared) == 1:
        said = [f"Decision: {next(iter(shared))}."]
    else:
        said = [f"Decision ({', '.join(names)}): {text}." for text, names in shared.items()]
    return [f"{' '.join(said)} {_declared(result)}"] if len(said) == 1 else [*said, _declared(result)]


def contract_text(one: Contract) -> str:
    """One decision contract."""
    said = [f"null hypothesis: {one.null}"]
    if one.threshold is not None and one.p is not None:
        raised = ""
        if one.threshold_used is not None and one.threshold_used != one.threshold:
            raised = f", raised to {digits(one.threshold_used, 4)} sigma for trials and looks"
        said.append(f"threshold {one.threshold:.6g} sigma (p = {short(f'{one.p:.2g}')}){raised}")
    if one.confidence is not None:
        said.append(f"confidence {asked(one.confidence)}, limit by {one.construction}")
    said.append(f"sides {one.sides}, trials {one.trials}, looks {one.looks}")
    if one.power is not None:
        said.append(f"goal met where the chance is at least {asked(one.power)}")
    return "; ".join([*said, f"drawn: {one.drawn}", f"unknown after: {one.unknown_after}"])


def _declared(result: Assessment) -> str:
    floor = [one.name for one in result.scenarios if not one.contract.floor_declared]
    schedule = [one.name for one in result.scenarios if not one.contract.schedule_declared]
    first = f"No floor declared for {', '.join(floor)}: sigma falls without end there" if floor else "Floors declared"
    second = f"; no schedule declared for {', '.join(schedule)}: 24 h a day, 7 d a week" if schedule else ""
    return f"{first}{second}."


def _differences(names: Sequence[str], found: Sequence[Difference], width: int, colour: bool) -> str:
    header, rows = ["", *names], [[one.key, *one.texts] for one in found]
    if fits(header, rows, width):
        return grid(header, rows, width, colour)
    longest, text_width = max(len(name) for name in names), min(width, MOST)
    listed = []
    for one in found:
        listed.append(one.key)
        for name, text in zip(names, one.texts, strict=True):
            if longest <= width // 3:
                listed.append(wrapped(text, text_width, " " * (longest + 4), f"  {name.ljust(longest)}  "))
            else:
                listed += [f"  {name}", wrapped(text, text_width, " " * 6, " " * 6)]
    return "\n".join(listed)


def _odds(odds: Sequence[Odds], width: int, colour: bool) -> str:
    rows = [row for one in odds for row in _pair(one, width)]
    header = ["pair", "first sooner", "second sooner", "neither", "error", "time ratio"]
    said = wrapped(
        "Odds of the smaller required time, drawn together (neither: both unreachable; time ratio: second over first, "
        "inputs at their medians):", min(width, MOST),
    )  # fmt: skip
    return f"{said}\n\n{grid(header, rows, width, colour)}"


def _pair(one: Odds, width: int) -> list[list[str]]:
    """The row of a pair; two rows where the names are long."""
    cells = [
        share(one.first_sooner), share(one.second_sooner), share(one.neither), error_text(one.error),
        "-" if one.nominal_ratio is None else short(digits(one.nominal_ratio)),
    ]  # fmt: skip
    label = f"{one.first} : {one.second}"
    if len(label) <= width // 3:
        return [[label, *cells]]
    return [[f"{one.first} :", *[""] * len(cells)], [f"  {one.second}", *cells]]
