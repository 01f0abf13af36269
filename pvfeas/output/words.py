"""Numbers and sentences as the tables show them."""

from __future__ import annotations

import math
import re
import textwrap
import unicodedata

from pvfeas.results import RequiredTime, ScenarioResult
from pvfeas.showing import digits, time_text, value_text

CAUTION = (
    "A planning estimate, not a safety review: lasers, high voltage, cryogens and toxic heavy-metal compounds are "
    "for local rules and qualified people to decide."
)
ASCII = {
    "σ": "sigma", "√": "sqrt ", "∞": "inf", "≥": ">=", "≤": "<=", "–": "-", "—": "-", "×": "x", "±": "+/-", "µ": "u",
    "μ": "u", "…": "...", "─": "-", "²": "^2", "°": "deg", "−": "-", "’": "'", "‘": "'", "“": '"', "”": '"',
}  # fmt: skip


def encodable(text: str, encoding: str) -> str:
    """The text with what the encoding cannot carry written in ASCII."""
    found: dict[str, str | int | None] = {
        sign: spelt for sign in set(text) if (spelt := _spelt(sign, encoding)) != sign
    }
    return text.translate(str.maketrans(found))


def _spelt(sign: str, encoding: str) -> str:
    if _carried(sign, encoding):
        return sign
    plain = unicodedata.normalize("NFKD", sign).encode("ascii", "ignore").decode()
    return ASCII.get(sign) or plain or "?"


def _carried(sign: str, encoding: str) -> bool:
    if sign.isascii():
        return True
    try:
        sign.encode(encoding)
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def steers(sign: str) -> bool:
    """Whether a character could steer a terminal or hide: controls, directions of writing, line separators."""
    return sign != "\n" and unicodedata.category(sign) in ("Cc", "Cf", "Cs", "Zl", "Zp")


def cleaned(text: str) -> str:
    """The text without control characters, which could steer a terminal."""
    return "".join("?" if steers(sign) else sign for sign in text)


def spelt_out(text: str) -> str:
    """A text of one line with control characters as Python writes them, such as \\x1b."""
    return "".join(repr(sign)[1:-1] if sign == "\n" or steers(sign) else sign for sign in text)


def escaped(text: str, encoding: str, language: str) -> str:
    """JSON or TOML ("json", "toml") that says the same without control characters and in what the encoding carries.

    Such characters stand in strings and quoted keys only, where both languages know escapes.
    """
    found: dict[str, str | int | None] = {
        sign: _escape(sign, language) for sign in set(text) if steers(sign) or not _carried(sign, encoding)
    }
    return text.translate(str.maketrans(found))


def _escape(sign: str, language: str) -> str:
    number = ord(sign)
    if number <= 0xFFFF:
        return f"\\u{number:04x}"
    if language == "toml":
        return f"\\U{number:08x}"
    high, low = divmod(number - 0x10000, 0x400)  # JSON writes a pair of surrogates
    return f"\\u{0xD800 + high:04x}\\u{0xDC00 + low:04x}"


def wrapped(text: str, width: int, hanging: str = "", first: str = "") -> str:
    """A paragraph in lines of at most width, words kept whole; first: what stands before the first line."""
    return textwrap.fill(
        " ".join(text.split()), width, initial_indent=first, subsequent_indent=hanging, break_long_words=False,
        break_on_hyphens=False,
    )  # fmt: skip


def short(text: str) -> str:
    """1.2e+14 as 1.2e14, 5.7e-07 as 5.7e-7."""
    return re.sub(r"e([+-])0*(\d)", lambda m: f"e{'-' if m[1] == '-' else ''}{m[2]}", text)


def share(value: float) -> str:
    """A probability in per cent; never 0 or 100 unless it is."""
    if value in (0.0, 1.0):
        return f"{100 * value:.0f} %"
    if value < 0.001:
        return "< 0.1 %"
    if value > 0.999:
        return "> 99.9 %"
    return f"{100 * value:.1f} %"


def asked(value: float) -> str:
    """A probability that was asked for, as short as it was written."""
    return f"{100 * value:.6g} %"


def exact_time(seconds: float) -> str:
    """A time that was written in the study, in the largest unit of which it is a whole number."""
    for unit, size in (("yr", 31557600.0), ("d", 86400.0), ("h", 3600.0), ("min", 60.0), ("s", 1.0)):
        many = seconds / size
        if 1.0 <= round(many) < 100_000 and abs(many - round(many)) < 1e-9 * many:
            return f"{round(many)} {unit}"
    number, unit = time_text(seconds).split(" ", 1)
    return f"{number.rstrip('0').rstrip('.') if '.' in number else number} {unit}"


def range_text(low: float | None, high: float | None, unit: str) -> str:
    """From low to high, with the unit once where both have the same; a time that never comes is "never"."""
    if low is None and high is None:
        return "never" if unit == "s" else "-"
    if unit == "s" or low is None or high is None:
        first, second = (
            value_text(low, unit) if unit != "s" else time_text(low),
            time_text(high) if unit == "s" else value_text(high, unit),
        )
        number, _, measure = first.partition(" ")
        return f"{number} – {second}" if measure and second.endswith(f" {measure}") else f"{first} – {second}"
    largest = max(abs(low), abs(high))
    number, _, measure = value_text(largest, unit).partition(" ")
    scale = 10.0 ** round(math.log10(largest / float(number))) if largest > 0 else 1.0
    return short(f"{digits(low / scale)} – {digits(high / scale)} {measure}".rstrip())


def error_text(error: float | None, value: float | None = None) -> str:
    """A numerical error in per cent, rounded up to one digit; relative to value where that is given."""
    if error is None or value == 0.0:
        return "-"
    percent = 100.0 * error / (1.0 if value is None else abs(value))
    if percent == 0.0:
        return "0 %"
    size = 10.0 ** math.floor(math.log10(percent))
    return f"{math.ceil(percent / size - 1e-9) * size:.1g} %" if percent >= 1e-4 else "< 0.0001 %"


def verdict(one: ScenarioResult) -> str:
    """The answer in a few sentences."""
    chance = one.chance
    goal = ""
    if chance.goal_met is not None and one.contract.power is not None:
        goal = f" (goal {asked(one.contract.power)}: {'met' if chance.goal_met else 'not met'})"
    said = f"{one.name}: chance {share(chance.value)} within {exact_time(chance.within.value)}{goal}."
    return f"{said} {_time_sentence(one.required_time)} {one.reason[:1].upper()}{one.reason[1:].rstrip('.')}."


def _time_sentence(times: RequiredTime) -> str:
    if times.q05 is None and times.reachable == 0.0:
        return "Required time: never, in no draw."
    if times.q50 is None:
        return f"Required time: never in {share(1.0 - times.reachable)} of the draws."
    return f"Required time: median {time_text(times.q50)}, 5–95 %: {range_text(times.q05, times.q95, 's')}."
