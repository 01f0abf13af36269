"""Starter studies: one commented study per technique, made from the declarations of the keys."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from pvfeas.errors import UsageError
from pvfeas.keys import Key
from pvfeas.line import COMPOSED, VOIGT
from pvfeas.schema import describe
from pvfeas.suggestions import did_you_mean
from pvfeas.techniques import TECHNIQUES
from pvfeas.vocabulary import keys_for

SCENARIO = "first"
WIDTH = 100  # of a comment line
GOAL_SHOWN = ("kind", "significance", "power", "within")
HEAD = """\
# A starter study for the technique "{kind}": {summary}.
# Every number below is an example: replace it, and say where yours comes from. A line that begins
# with "# key =" shows an optional key; take the "# " away to use it.
#
# How a quantity is written:
#   "60 kHz"                exact: nothing is known to be uncertain
#   "60(5) kHz"             normal, standard uncertainty in the last digits; also "60 ± 5 kHz", "60 kHz ± 8 %"
#   "2.0 +1.5/-0.7 Hz"      two-piece normal: median, and the 16 % and 84 % points
#   "2 Hz ×/ 1.5"           lognormal: median and factor; x/ will do for ×/
#   "1 .. 5 Hz"             uniform; "1 .. 5 Hz log" uniform in the logarithm
#   "@name", "@{scenario}.technique.excess_noise"   the same input once more: the same draw
#   {{ value = "60(5) kHz", source = "…", status = "measured", note = "…", demonstrated = "55 kHz" }}
#       status is measured, demonstrated, extrapolated or assumed
"""
SPLITTING = """\
# Predicted splitting nu(a) - nu(b) of the line, signed. It belongs to the "difference" itself, or to
# "one enantiomer", whose shift is half of it: of says which. Rival calculations stand instead of value
# as values = {{ HF = "0.9 Hz", B3LYP = "1.6 Hz" }}.
splitting = {{ value = "{size}", times = ["@theory"], of = "difference", source = "…", status = "assumed" }}
"""
SHARED = """\
# Quantities that several scenarios use. theory: what the calculations may be off by, as a factor.
[shared]
theory = "1 ×/ 1.6"
ee = "0.97(1)"
"""
CHILD = """\
# A second way to measure, which differs from the first in what is written here and in nothing else:
# [scenario.better]
# based_on = "{scenario}"
# technique = {{ {change} }}
# without = ["systematics.line_shape"]
"""
# The declarations' examples serve every technique; these fit one of them better.
SIZES = {"ramsey": "0.15 Hz", "free-decay": "0.15 Hz"}  # well inside the interrogation width
VALUES: Mapping[str, Mapping[str, str]] = {"ramsey": {"coherence_time": "1.5(3) s"}}
CHANGES = {"quoted": 'uncertainty = "0.3 Hz ×/ 1.5"', "ramsey": 'free_time = "0.5 s"', "scan": 'snr = "160 ×/ 1.5"',
    "two-point": 'snr = "160 ×/ 1.5"', "free-decay": 'snr = "10 ×/ 1.5"'}  # fmt: skip


def starter(technique: str) -> str:
    """The commented starter study of a technique, as TOML text.

    It loads without faults as it stands. Raises UsageError for a technique that does not exist.
    """
    if technique not in TECHNIQUES:
        hint = did_you_mean(technique, TECHNIQUES) or "choose one of them"
        raise UsageError(f"there is no technique {technique!r} (known: {', '.join(TECHNIQUES)}); {hint}")
    part = TECHNIQUES[technique]
    head = HEAD.format(kind=technique, summary=part.summary, scenario=SCENARIO)
    width = () if part.needs_width else ("fwhm", "profile")
    blocks = [
        f'{head}\ntitle = "A study to start from"',
        _table("goal", keys_for("goal"), shown=GOAL_SHOWN),
        SHARED.rstrip(),
        f"[scenario.{SCENARIO}]\n{SPLITTING.format(size=SIZES.get(technique, '1.2 Hz')).rstrip()}",
        _table(f"scenario.{SCENARIO}.line", keys_for("line"), hidden=("hwhm", *width, *COMPOSED, *VOIGT)),
        _table(
            f"scenario.{SCENARIO}.technique",
            keys_for("technique", technique),
            kind=technique,
            values=VALUES.get(technique),
        ),
        *_switching(technique),
        _table(f"scenario.{SCENARIO}.samples", keys_for("samples"), values={"ee_a": "@ee", "ee_b": "@ee"}),
        _table(
            f"scenario.{SCENARIO}.schedule", keys_for("schedule"),
            values={"hours_per_day": "10", "days_per_week": "5", "calibration_fraction": "0.2"},
        ),
        _systematics(),
        CHILD.format(scenario=SCENARIO, change=CHANGES.get(technique, "")).rstrip(),
    ]  # fmt: skip
    return "\n\n".join(blocks) + "\n"


def _switching(technique: str) -> list[str]:
    """The order of the enantiomers and the noise of the reference; a quoted uncertainty holds both."""
    place, keys = f"scenario.{SCENARIO}", keys_for("switching")
    if technique == "quoted":
        return [_table(f"{place}.switching", keys, hidden=("dwell", "live_fraction", "rejection"))]
    own = {name: key for name, key in keys_for("reference").items() if name != "name"}
    noise = {name: own[name] for name in ("kind", "allan")}
    return [
        _table(
            f"{place}.switching",
            keys,
            hidden=("live_fraction", "rejection"),
            values={"pattern": "ABBA", "dwell": "20 s", "dead_time": "1 s"},
        ),
        "# Frequency noise of the probe, each kind by itself. None declared: none is assumed.\n"
        + _table(f"{place}.reference.laser", own, shown=("kind", "allan", "at"), values={"at": "1 s"}),
        _table(f"{place}.reference.cavity", noise, values={"kind": "flicker", "allan": "0.4 Hz"}),
    ]


def _systematics() -> str:
    """One uncertainty that never averages, with every key shown, and one that is new at each reset."""
    keys = {name: key for name, key in keys_for("systematics").items() if name != "name"}
    place = f"scenario.{SCENARIO}.systematics"
    never = _table(f"{place}.line_shape", keys, shown=("size", "averages"), values={"size": "0.02 Hz ×/ 1.6"})
    reset = {name: keys[name] for name in ("size", "averages", "every")}
    again = {"size": "0.08 Hz ×/ 1.5", "averages": "per reset", "every": "1 d"}
    head = "# What does not average down like noise. None declared: no floor."
    return f"{head}\n{never}\n\n{_table(f'{place}.pressure', reset, values=again)}"


def _table(
    name: str,
    keys: Mapping[str, Key],
    *,
    kind: str = "",
    shown: tuple[str, ...] | None = None,
    hidden: tuple[str, ...] = (),
    values: Mapping[str, str] | None = None,
) -> str:
    """One table: required keys and those with an example or a value stand; the rest is commented out."""
    values = values or {}
    lines = [f"[{name}]"]
    if kind:
        lines.append(f'kind = "{kind}"')
    for key_name, key in keys.items():
        live = key.required or key_name in values or (bool(key.example) and key.default is None)
        if (shown is not None and key_name not in shown) or key_name in hidden:
            live = False
        lines += _comment(describe(key) + (f"; one of {', '.join(key.choices)}" if key.choices else ""))
        lines.append(f"{'' if live else '# '}{key_name} = {_written(key, values.get(key_name))}")
    return "\n".join(lines)


def _written(key: Key, value: str | None) -> str:
    """The value that is shown for a key, as TOML."""
    if key.sort == "pairs":
        return '[["1 s", "3 Hz"], ["10 s", "1 Hz"]]'
    if key.sort == "choices":
        return (
            "[" + ", ".join(f'"{one}"' for one in key.default or ()) + "]" if isinstance(key.default, tuple) else "[]"
        )
    shown = value or key.example or (key.default if key.default is not None else "")
    if isinstance(shown, bool):
        return str(shown).lower()
    if shown == "":
        shown = _anything(key)
    numeric = key.sort == "integer" or (key.sort == "quantity" and key.unit == "1" and _is_number(str(shown)))
    return str(shown) if numeric else f'"{shown}"'


def _anything(key: Key) -> str:
    """Something of the right kind where the declaration has no example."""
    if key.choices:
        return key.choices[0]
    if key.sort == "quantity":
        number = "10" if key.upper > 10 else f"{(key.lower + key.upper) / 2:g}"
        return number if key.unit == "1" else f"{number} {key.unit}"
    return "ABBA" if "order" in key.meaning else "10" if key.sort == "integer" else "…"


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def _comment(text: str) -> Iterator[str]:
    """A comment, wrapped."""
    line = "#"
    for word in text.split():
        if len(line) + len(word) + 1 > WIDTH:
            yield line
            line = "#  "
        line += f" {word}"
    yield line
