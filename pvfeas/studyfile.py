"""Reading a study file: text to Study, with every problem at once."""

from __future__ import annotations

import re
import sys
import tomllib
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from pvfeas.errors import Fault, QuantityError, StudyError, UsageError
from pvfeas.faults import Faults
from pvfeas.inheritance import COMMAND_LINE, Leaf, Set, Tree, effective, leaf, own_tree, value_of_setting
from pvfeas.keys import Key
from pvfeas.positions import positions
from pvfeas.quantity import parse
from pvfeas.reading import Reader, _short
from pvfeas.scenarios import NAME, read_scenario
from pvfeas.study import Correlated, Scenario, Study, Written
from pvfeas.suggestions import did_you_mean, suggest
from pvfeas.vocabulary import SCENARIO, TOP, keys_for

LARGEST = 1_000_000  # bytes
MOST_SCENARIOS = 100
DEEPEST = 50  # tables and lists inside each other
TOO_LONG = ("a whole number of thousands of digits", "a number between 1e-300 and 1e300 is needed")
Settings = Sequence[tuple[str, str]]


def load_study(source: str | Path, settings: Settings = ()) -> Study:
    """Read a study from a path, from standard input ("-"), or from a text of several lines.

    settings: (address, value) pairs as given to --set. Raises StudyError with every problem.
    """
    if isinstance(source, str) and "\n" in source:
        return load_text(source, settings=settings)
    name = str(source)
    try:
        data = sys.stdin.buffer.read(LARGEST + 1) if name == "-" else _read(Path(name))
    except OSError as error:
        raise UsageError(f"{name} cannot be read: {(error.strerror or 'unknown').lower()}") from None
    file = "standard input" if name == "-" else name
    return load_text(_decoded(data, file), file, settings)


def _read(path: Path) -> bytes:
    with path.open("rb") as stream:
        return stream.read(LARGEST + 1)


def _decoded(data: bytes, file: str) -> str:
    if len(data) > LARGEST:
        raise StudyError([Fault(file, 0, "", "the file is larger than 1 MB", "a study is a short text")])
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise StudyError([Fault(file, line, "", "a byte that is not UTF-8", "save the file as UTF-8")]) from None
    return text


def load_text(text: str, file: str = "", settings: Settings = ()) -> Study:
    """Read a study from TOML text."""
    try:
        content = tomllib.loads(text)
        if depth(content) > DEEPEST:
            raise RecursionError
    except tomllib.TOMLDecodeError as error:
        raise StudyError([_syntax(str(error), text, file)]) from None
    except RecursionError:
        raise StudyError([Fault(file, 0, "", "tables or lists nested too deeply", "a study is flat")]) from None
    except ValueError:  # Python turns down whole numbers of more than a few thousand digits
        long = re.search(r"\d[\d_]{1000,}", text)
        line = text.count("\n", 0, long.start()) + 1 if long else 0
        raise StudyError([Fault(file, line, "", *TOO_LONG)]) from None
    return _load(content, Faults(file, positions(text)), settings)


def depth(content: Any) -> int:
    """How deep tables and lists are nested, found level by level."""
    level, deep = [content], 0
    while level and deep <= DEEPEST:
        deep += 1
        level = [
            inner
            for one in level
            if isinstance(one, dict | list)
            for inner in (one.values() if isinstance(one, dict) else one)
        ]
    return deep


def no_texts(content: Any) -> list[Any]:
    """The keys that are no texts, at any depth."""
    if isinstance(content, Mapping):
        return [key for key in content if not isinstance(key, str)] + [
            one for inner in content.values() for one in no_texts(inner)
        ]
    return [one for inner in content for one in no_texts(inner)] if isinstance(content, list) else []


def _syntax(message: str, text: str, file: str) -> Fault:
    """tomllib's complaint in our words, with a hint where quotes were forgotten."""
    line = 0
    if "(at line " in message:
        line = int(message.split("(at line ")[1].split(",")[0])
    elif "end of document" in message:
        line = text.rstrip("\n").count("\n") + 1
    said = message.split(" (at ")[0]
    source = text.splitlines()[line - 1] if 0 < line <= len(text.splitlines()) else ""
    values = [part.strip() for part in source.split("=")[1:]]
    unquoted = any(one[:1] == "@" or (one[:1].isdigit() and " " in one) for one in values)
    wanted = (
        'quantities with units stand in quotes: x = "5 Hz"'
        if unquoted and "quote" not in said
        else "see the TOML rules"
    )
    return Fault(file, line, "", f"this is not TOML: {said[:1].lower()}{said[1:]}", wanted)


def load_content(content: Mapping[str, Any], settings: Settings = ()) -> Study:
    """Read a study from nested dictionaries."""
    if depth(content) > DEEPEST:
        raise StudyError([Fault("", 0, "", "tables or lists nested too deeply", "a study is flat")])
    if wrong := no_texts(content):
        raise StudyError([Fault("", 0, "", f"the key {wrong[0]!r}", "keys are texts, as in a study file")])
    return _load(dict(content), Faults("", {}), settings)


def _load(content: dict[str, Any], faults: Faults, settings: Settings) -> Study:
    content = with_settings(content, settings, faults)
    reader = Reader(faults)
    for key in content:
        if key not in TOP:
            faults.at(
                (key,),
                key,
                f"the key {key!r} is not known here",
                did_you_mean(key, TOP) or f"known are {', '.join(TOP)}",
            )
    title = _title(content, faults)
    goal = read_goal(content, reader)
    shared = read_shared(content, reader)
    scenarios = read_scenarios(content, reader)
    study = Study(
        title=title, file=faults.file, goal=goal, shared=shared, scenario=scenarios,
        correlation=tuple(read_correlations(content, faults)),
    )  # fmt: skip
    from pvfeas.compiler import compile_study

    compile_study(study, faults)
    faults.stop_if_any()
    return study


def _title(content: Mapping[str, Any], faults: Faults) -> str:
    title = content.get("title", "")
    if not isinstance(title, str):
        faults.at(("title",), "title", _short(title), "a text in quotes is needed")
        return ""
    return title


def with_settings(content: dict[str, Any], settings: Settings, faults: Faults) -> dict[str, Any]:
    """The content with the values of --set in their places, before anything is inherited."""
    made: dict[str, Any] = _deep(content)
    for address, text in settings:
        parts = [part for part in address.split(".") if part]
        scenarios = made.get("scenario", {})
        known = ["goal", "shared", "title", *(scenarios if isinstance(scenarios, dict) else {})]
        if (len(parts) < 2 and address != "title") or not parts or parts[0] not in known:
            hint = did_you_mean(parts[0] if parts else "", known) or f"an address begins with one of {', '.join(known)}"
            if parts and parts[0] in known:
                hint = f"say which key of it: {parts[0]}.KEY"
            faults.add(0, address, "is no address of this study", hint, COMMAND_LINE)
            continue
        try:
            value = value_of_setting(text)
            if depth(value) > DEEPEST:
                raise RecursionError
        except tomllib.TOMLDecodeError:
            faults.add(0, address, f"{_short(text)} is not TOML", "check the brackets and quotes", COMMAND_LINE)
            continue
        except RecursionError:
            faults.add(0, address, "tables or lists nested too deeply", "a study is flat", COMMAND_LINE)
            continue
        except ValueError:
            faults.add(0, address, *TOO_LONG, COMMAND_LINE)
            continue
        path = parts if parts[0] in ("goal", "shared", "title") else ["scenario", *parts]
        _place(made, path, value)
    return made


def _deep(value: Any) -> Any:
    return {key: _deep(inner) for key, inner in value.items()} if isinstance(value, dict) else value


def _place(content: dict[str, Any], path: list[str], value: Any) -> None:
    here = content
    for step in path[:-1]:
        inner = here.get(step)
        if not isinstance(inner, dict):
            inner = {}
            here[step] = inner
        here = inner
    old = here.get(path[-1])
    if path[-1] == "splitting" and not isinstance(value, dict):
        of = old.get("of") if isinstance(old, dict) else None
        value = {"value": value, "status": "assumed", "source": "command line"} | ({"of": of} if of else {})
    plain = path == ["title"] or (len(path) == 3 and path[-1] in ("based_on", "without"))
    here[path[-1]] = value if plain else Set(value)


def _leaf(content: Any, path: tuple[str, ...], address: str, faults: Faults) -> Leaf:
    return leaf(content, address, faults.line_of(path), faults.file)


def read_goal(content: Mapping[str, Any], reader: Reader) -> dict[str, Any]:
    """The goal: plain numbers and words, the rules between them checked."""
    from pvfeas.goals import goal_faults, plain_numbers

    faults = reader.faults
    raw = content.get("goal")
    if raw is None:
        near = next((key for key in content if key not in TOP and did_you_mean(key, ["goal"])), None)
        if near is None:
            faults.add(1 if faults.lines else 0, "goal", "is missing", "a table [goal] with kind, within, … is needed")
        return {}
    if not isinstance(raw, dict):
        faults.at(("goal",), "goal", f"{_short(raw)} where a table belongs", "write [goal]")
        return {}
    keys = keys_for("goal")
    made: dict[str, Any] = {}
    absorbed: set[str] = set()
    for name, value in raw.items():
        leaf = _leaf(value, ("goal", name), f"goal.{name}", faults)
        if name not in keys:
            absorbed |= reader.unknown(name, leaf, keys, "goal", "")
        elif keys[name].sort == "quantity":
            made |= plain_numbers(name, leaf, keys[name], reader)
        else:
            found = reader.option(leaf, keys[name])
            made |= {} if found is None else {name: found}
    for name, key in keys.items():
        if key.required and name not in raw and name not in absorbed:
            faults.at(("goal",), f"goal.{name}", "is missing", _goal_hint(name, key))
    goal_faults(raw, made, absorbed, faults)
    return made


def _goal_hint(name: str, key: Key) -> str:
    if key.choices:
        return f"one of {', '.join(key.choices)} is needed"
    return f'write {name} = "{key.example}" ({key.meaning})'


def read_shared(content: Mapping[str, Any], reader: Reader) -> dict[str, Written]:
    """Shared quantities, in any unit."""
    raw, faults = content.get("shared", {}), reader.faults
    if not isinstance(raw, dict):
        faults.at(("shared",), "shared", f"{_short(raw)} where a table belongs", "write [shared]")
        return {}
    found = {}
    for name, value in raw.items():
        leaf = _leaf(value, ("shared", name), f"shared.{name}", faults)
        if not NAME.fullmatch(name):
            reader.complain(leaf, f"{_short(name)} cannot be referred to", "use letters, digits, _ and -")
            continue
        written = reader.quantity(leaf, Key("quantity", "shared", "*"))
        if written is not None:
            found[name] = written
    return found


def read_scenarios(content: Mapping[str, Any], reader: Reader) -> dict[str, Scenario]:
    """All scenarios with what they inherit."""
    raw, faults = content.get("scenario"), reader.faults
    if not isinstance(raw, dict) or not raw:
        near = next((key for key in content if key not in TOP and did_you_mean(key, ["scenario"])), None)
        if near is None:
            line = faults.line_of(("scenario",)) or (1 if faults.lines else 0)
            faults.add(line, "scenario", "there is no scenario", "write at least one table [scenario.NAME]")
        return {}
    if len(raw) > MOST_SCENARIOS:
        faults.at(("scenario",), "scenario", f"{len(raw)} scenarios", f"at most {MOST_SCENARIOS} are taken")
        return {}
    good = {name: value for name, value in raw.items() if _scenario_ok(name, value, raw, faults)}
    trees = {name: own_tree(name, value, faults.lines, faults.file) for name, value in good.items()}
    done = effective(trees, good, faults.at)
    found = {}
    for name, tree in done.items():
        if name in broken_line(trees, good):
            continue  # what it lacks cannot be known
        parent = done.get(tree.parent) if tree.parent != name else None
        scenario = read_scenario(tree, parent, trees[name], reader)
        if scenario is not None:
            found[name] = scenario
    return found


def broken_line(trees: Mapping[str, Tree], good: Mapping[str, Any]) -> set[str]:
    """Scenarios whose based_on (of themselves or further up) is wrong, misspelt or a circle."""
    broken = set()
    for name in trees:
        way, here = [name], name
        while True:
            content = good[here]
            if "based_on" not in content:
                if any(key not in SCENARIO and suggest(key, SCENARIO) == "based_on" for key in content):
                    broken.add(name)
                break
            here = content["based_on"]
            if not isinstance(here, str) or here not in trees or here in way:
                broken.add(name)
                break
            way.append(here)
    return broken


def _scenario_ok(name: str, value: Any, raw: Mapping[str, Any], faults: Faults) -> bool:
    path = ("scenario", name)
    if not name.replace("_", "a").replace("-", "a").isalnum() or name in ("shared", "goal", "scenario", "title"):
        faults.at(
            path, name, f"{_short(name)} cannot name a scenario", "use letters, digits, _ and -, not shared or goal"
        )
        return False
    if not isinstance(value, dict):
        faults.at(path, name, f"{_short(value)} where a table belongs", f"write [scenario.{name}]")
        return False
    for key in value:
        if key not in SCENARIO:
            faults.at(
                (*path, key),
                f"{name}.{key}",
                f"the key {key!r} is not known here",
                did_you_mean(key, SCENARIO) or f"known are {', '.join(SCENARIO)}",
            )
    based_on = value.get("based_on")
    if based_on is not None and (not isinstance(based_on, str) or based_on not in raw):
        others = [one for one in raw if one != name]
        hint = did_you_mean(str(based_on), others) or f"known scenarios are {', '.join(others) or 'none'}"
        faults.at((*path, "based_on"), f"{name}.based_on", f"{_short(based_on)} is no scenario", hint)
    dropped = value.get("without")
    if dropped is not None:
        if not isinstance(dropped, list) or not all(isinstance(one, str) for one in dropped):
            faults.at(
                (*path, "without"),
                f"{name}.without",
                _short(dropped),
                'a list of addresses is needed: ["systematics.NAME"]',
            )
        elif based_on is None and not any(suggest(key, SCENARIO) == "based_on" for key in value if key not in SCENARIO):
            faults.at(
                (*path, "without"), f"{name}.without", "without, but nothing is inherited", "give based_on, or drop it"
            )
    return True


def read_correlations(content: Mapping[str, Any], faults: Faults) -> list[Correlated]:
    """The correlations, their shape checked; what they tie is checked with the inputs."""
    raw = content.get("correlation", [])
    if not isinstance(raw, list):
        faults.at(("correlation",), "correlation", f"{_short(raw)} where tables belong", "write [[correlation]]")
        return []
    found = []
    for place, entry in enumerate(raw):
        path, address = ("correlation", str(place)), f"correlation[{place}]"
        if not isinstance(entry, dict):
            faults.at(path, address, _short(entry), "a table with between and rho is needed")
            continue
        for key in entry:
            if key not in ("between", "rho"):
                hint = did_you_mean(key, ("between", "rho")) or "known are between, rho"
                faults.at((*path, key), f"{address}.{key}", f"the key {key!r} is not known here", hint)
        between, rho = entry.get("between"), entry.get("rho")
        near = " ".join(key for key in entry if key not in ("between", "rho"))
        good = isinstance(between, list) and len(between) == 2 and all(isinstance(one, str) for one in between)
        if not good and not (between is None and did_you_mean(near, ("between",))):
            faults.at(
                (*path, "between"),
                f"{address}.between",
                "is missing" if between is None else _short(between),
                "a list of two addresses is needed",
            )
        number = float(rho) if isinstance(rho, int | float) and not isinstance(rho, bool) else None
        if number is None and not (rho is None and did_you_mean(near, ("rho",))):
            faults.at(
                (*path, "rho"),
                f"{address}.rho",
                "is missing" if rho is None else _short(rho),
                "a number between -1 and 1 is needed",
            )
        elif number is not None and not -1.0 < number < 1.0:
            faults.at(
                (*path, "rho"),
                f"{address}.rho",
                f"rho = {rho}",
                "a number between -1 and 1 is needed; for ±1 use one input",
            )
        elif number is not None and good and isinstance(between, list):
            found.append(
                Correlated(
                    between=(between[0], between[1]), rho=number, line=faults.line_of((*path, "between")), place=place
                )
            )
    return found


__all__ = ["QuantityError", "Tree", "load_content", "load_study", "load_text", "parse"]
