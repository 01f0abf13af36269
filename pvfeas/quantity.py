"""A quantity as people write it: the grammar of texts and tables.

Texts: 60 kHz; 60(5) kHz; 60 ± 5 kHz; 60 kHz ± 8 %; 2.0 +1.5/-0.7 Hz; 2 Hz ×/ 1.5; 1 .. 5 Hz; 1 .. 5 Hz log;
@name. The number is read by this grammar, the unit by pvfeas.units.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, field
from decimal import Decimal
from typing import Any

from pvfeas.errors import QuantityError
from pvfeas.laws import Exact, Law, Lognormal, LogUniform, Normal, TwoPiece, Uniform
from pvfeas.units import NO_UNIT, TABLES, any_unit, dimension_of, tidy, unit_factor, wanted

LONGEST = 1000  # characters
MOST, LEAST = 1e300, 1e-300  # sizes of numbers
# possessive: a wrong text of any length is refused at once; a point before a point belongs to ".."
NUMBER = r"[+-]?(?:\d++(?:\.(?!\.)\d*+)?+|\.\d++)"
EXPONENT = r"(?:[eE][+-]?\d{1,3}+)?+"
VALUE = rf"{NUMBER}{EXPONENT}"
UNIT = r"(?!log\b)[^\d\s+±].*?|1/.*?|"
BRACKET = re.compile(rf"(?P<number>{NUMBER})\((?P<spread>\d+\.?\d*|\.\d+)\)(?P<exponent>{EXPONENT})\s*(?P<unit>{UNIT})")
PLUS_MINUS = re.compile(
    rf"(?P<value>{VALUE})\s*(?P<unit>{UNIT})\s*(?:±|\+/-|\+-)\s*(?P<spread>{VALUE})\s*(?P<other>{UNIT})"
)
TWO_PIECE = re.compile(rf"(?P<value>{VALUE})\s*\+\s*(?P<plus>{VALUE})\s*/\s*-\s*(?P<minus>{VALUE})\s*(?P<unit>{UNIT})")
FACTOR = re.compile(rf"(?P<value>{VALUE})\s*(?P<unit>{UNIT})\s*(?:×/|x/|\*/)\s*(?P<factor>{VALUE})")
RANGE = re.compile(
    rf"(?P<low>{VALUE})\s*(?P<first>{UNIT})\s*\.\.\s*(?P<high>{VALUE})\s*(?P<unit>{UNIT})(?P<log>\s+log)?"
)
SINGLE = re.compile(rf"(?P<value>{VALUE})\s*(?P<unit>{UNIT})")
REFERENCE = re.compile(r"@(?P<name>[\w-][\w.-]*)")
FORMS = 'write for example "60 kHz", "60(5) kHz", "60 ± 5 kHz", "2 Hz ×/ 1.5", "1 .. 5 Hz" or "@name"'


@dataclass(frozen=True)
class Scale:
    """A factor (with/from)^exponent."""

    with_: Quantity
    from_: Quantity
    exponent: Quantity


@dataclass(frozen=True)
class Quantity:
    """A quantity as written and as understood.

    law: in canonical units (dimensionless where along_line: in FWHM of the line), None for a
    reference or an ensemble. members: rival calculations by name. times and scale multiply.
    """

    written: Any
    law: Law | None = None
    reference: str = ""
    along_line: bool = False
    relative: bool = False
    times: tuple[Quantity, ...] = ()
    scale: tuple[Scale, ...] = ()
    members: tuple[tuple[str, Quantity], ...] = ()
    weights: tuple[float, ...] = ()
    group: str = ""
    discrepancy: Quantity | None = None
    source: str = ""
    note: str = ""
    status: str = ""
    demonstrated: Quantity | None = None
    extra: tuple[tuple[str, Any], ...] = ()
    dimension: tuple[tuple[str, float], ...] | None = field(default=None, compare=False)

    @classmethod
    def __get_pydantic_core_schema__(cls, source: Any, handler: Any) -> Any:
        """In the study model a quantity is taken as it is: its own grammar has read it."""
        from pydantic_core import core_schema

        return core_schema.is_instance_schema(cls)

    @property
    def text(self) -> str:
        """The value as written, for tables."""
        if isinstance(self.written, dict):
            inner = self.written.get("value")
            if inner is None:
                return "{" + ", ".join(self.written) + "}"
            return f"{inner} {self.written['unit']}" if "unit" in self.written else str(inner)
        return str(self.written)


Dimension = tuple[tuple[str, float], ...]
FWHM: Dimension = (("FWHM", 1.0),)


class Canonical:
    """What units a number is read in: one canonical unit, FWHM too, or anything (parts of products).

    behind: the unit that a table gives apart from its value.
    """

    def __init__(self, unit: str, along_line: bool = False, behind: str = "") -> None:
        self.unit = unit
        self.along_line = along_line
        self.behind = tidy(behind)

    def factor(self, text: str) -> tuple[float, bool, Dimension | None]:
        """Factor, whether it is FWHM, and the dimension where that is open."""
        if text and self.behind:
            raise QuantityError(f"a unit in the value and {self.behind!r} in unit", "write the unit once")
        text = text or self.behind
        if self.unit == "*":
            factor, dimension = any_unit(text)
            return factor, False, dimension
        if self.along_line and text.strip().upper() == "FWHM":
            return 1.0, True, FWHM
        return unit_factor(text, self.unit), False, dimension_of(self.unit) if self.unit in TABLES else None

    def factors(self, one: str, other: str) -> tuple[float, float, bool, Dimension | None]:
        """The factors of two numbers of one quantity; a number without a unit has that of its partner."""
        first, second = self.factor(one or other), self.factor(other or one)
        if first[1:] != second[1:]:
            raise QuantityError(f"{one!r} beside {other!r}", "both numbers need units of one kind")
        return first[0], *second


def _clean(text: str) -> str:
    """Single spaces, whatever they were."""
    return " ".join(tidy(text).split())


def _number(text: str, factor: float = 1.0) -> float:
    """The number times the factor of its unit, both inside the range of what can be computed with."""
    value = float(text)
    if Decimal(text) and not all(LEAST <= abs(one) <= MOST for one in (value, value * factor)):
        raise QuantityError(f"{text} is out of any range", "a number between 1e-300 and 1e300 is needed")
    return value * factor


def parse_text(text: str, canonical: Canonical) -> Quantity:
    """Read one text. QuantityError with what was found and what would be right."""
    if len(text) > LONGEST:
        raise QuantityError(f"a text of {len(text)} characters", f"a quantity has at most {LONGEST}")
    clean = _clean(text)
    if not clean:
        raise QuantityError("an empty text", FORMS)
    if clean.startswith("@"):
        match = REFERENCE.fullmatch(clean)
        if match is None:
            raise QuantityError(f'"{text}" is no reference', 'a reference reads "@name" or "@scenario.table.key"')
        if canonical.behind:
            raise QuantityError(f'"{text}" with a unit', "a reference has its own: drop unit")
        return Quantity(text, reference=match["name"])
    if re.search(r"\d,\d", clean):
        raise QuantityError(f'"{text}" has a comma', "write the decimal point as a point and no thousands separators")
    for pattern, reader in READERS:
        match = pattern.fullmatch(clean)
        if match is not None:
            law, along, dimension = _told(reader, match, canonical, text)
            return Quantity(text, law=law, along_line=along, dimension=dimension)
    raise QuantityError(f'"{text}" cannot be read', _why(clean))


Read = tuple[Law, bool, Dimension | None]
Reader = Callable[[re.Match[str], Canonical], Read]


def _told(reader: Reader, match: re.Match[str], canonical: Canonical, text: str) -> Read:
    """What the reader finds; its complaints quote the whole text."""
    try:
        return reader(match, canonical)
    except QuantityError as error:
        if error.found == NO_UNIT:
            raise QuantityError(f'"{text}" has no unit', error.wanted) from None
        said = error.found if text in error.found else f'in "{text}", {error.found}'
        raise QuantityError(said, error.wanted) from None


def _why(text: str) -> str:
    if re.search(r"\b(nan|inf)\b", text, re.IGNORECASE):
        return "a finite number is needed"
    if not re.match(r"[+-]?\.?\d", text):
        return f"a quantity begins with a number; {FORMS}"
    if re.search(r"[eE][+-]?\d{4,}", text):
        return "a number between 1e-300 and 1e300 is needed"
    return FORMS


def _exact(match: re.Match[str], canonical: Canonical) -> Read:
    factor, along, dimension = canonical.factor(match["unit"])
    return Exact(_number(match["value"], factor)), along, dimension


def _bracket(match: re.Match[str], canonical: Canonical) -> Read:
    factor, along, dimension = canonical.factor(match["unit"])
    number, spread = match["number"], match["spread"]
    power = Decimal("1" + (match["exponent"] or ""))
    decimals = len(number.partition(".")[2])
    unit = Decimal(1) if "." in spread else Decimal(1).scaleb(-decimals)
    sd = _number(str(Decimal(spread) * unit * power), factor)
    return Normal(_number(str(Decimal(number) * power), factor), _spread(sd, match[0])), along, dimension


def _spread(sd: float, text: str) -> float:
    if sd <= 0.0:
        raise QuantityError(f'the spread in "{text}" is not positive', "leave an exact value without a spread")
    if not sd < 1e300:
        raise QuantityError("the spread is out of any range", "a number between 1e-300 and 1e300 is needed")
    return sd


def _plus_minus(match: re.Match[str], canonical: Canonical) -> Read:
    first, other = match["unit"], match["other"]
    if other == "%" and not first and canonical.behind in ("", "%") and canonical.unit in ("1", "*"):
        raise QuantityError(f'"{match[0]}" can be read in two ways', 'write "80(6)" or "5 % ± 1 %"')
    if other == "%" and first != "%":
        factor, along, dimension = canonical.factor(first)
        value = _number(match["value"], factor)
        sd = _spread(abs(value) * _number(match["spread"]) / 100.0, match[0])
        return Normal(value, sd, relative=True), along, dimension
    factor, inner, along, dimension = canonical.factors(first, other)
    sd = _spread(_number(match["spread"], inner), match[0])
    return Normal(_number(match["value"], factor), sd), along, dimension


def _two_piece(match: re.Match[str], canonical: Canonical) -> Read:
    factor, along, dimension = canonical.factor(match["unit"])
    minus, plus = (_spread(_number(match[side], factor), match[0]) for side in ("minus", "plus"))
    return TwoPiece(_number(match["value"], factor), minus, plus), along, dimension


def _factor(match: re.Match[str], canonical: Canonical) -> Read:
    factor, along, dimension = canonical.factor(match["unit"])
    value, spread = _number(match["value"], factor), _number(match["factor"])
    if value == 0.0:
        raise QuantityError(f'"{match[0]}" spreads zero by a factor', "a factor needs a median other than zero")
    if spread <= 1.0:
        raise QuantityError(
            f'the factor {match["factor"]} in "{match[0]}"', "a factor above 1 is needed, such as ×/ 1.5"
        )
    return Lognormal(value, spread), along, dimension


def _range(match: re.Match[str], canonical: Canonical) -> Read:
    inner, factor, along, dimension = canonical.factors(match["first"], match["unit"])
    low, high = _number(match["low"], inner), _number(match["high"], factor)
    if low >= high:
        raise QuantityError(f'the range "{match[0]}" does not rise', "write the smaller end first")
    if match["log"]:
        if low <= 0.0:
            raise QuantityError(f'the logarithmic range "{match[0]}" touches zero', "both ends must be positive")
        return LogUniform(low, high), along, dimension
    return Uniform(low, high), along, dimension


READERS = (
    (RANGE, _range),
    (TWO_PIECE, _two_piece),
    (PLUS_MINUS, _plus_minus),
    (FACTOR, _factor),
    (BRACKET, _bracket),
    (SINGLE, _exact),
)


def parse(written: Any, unit: str, along_line: bool = False, splitting: bool = False, behind: str = "") -> Quantity:
    """Read a quantity as it stands in a study: a text, a number, a table.

    unit: the canonical unit, "*" for any; along_line: FWHM is allowed; splitting: the table may say `of`;
    behind: the unit where it stands apart from the value.
    """
    from pvfeas.quantity_table import parse_table

    canonical = Canonical(unit, along_line, behind)
    if isinstance(written, Quantity):
        return written
    if isinstance(written, bool):
        raise QuantityError(f"{str(written).lower()} is no quantity", wanted(unit))
    if isinstance(written, int) and abs(written) > MOST:
        raise QuantityError("a whole number above 1e300", "a number between 1e-300 and 1e300 is needed")
    if isinstance(written, int | float) and not behind:
        if unit not in ("1", "*"):
            raise QuantityError(f"the number {written} has no unit", wanted(unit) + ", in quotes")
        if not abs(written) <= MOST:
            raise QuantityError(f"{written} is no finite number", "a finite number is needed")
        return Quantity(written, law=Exact(float(written)), dimension=())
    if isinstance(written, int | float | str):
        return parse_text(str(written), canonical)
    if isinstance(written, dict):
        return parse_table(written, canonical, splitting)
    raise QuantityError(f"{type(written).__name__} is no quantity", FORMS)
