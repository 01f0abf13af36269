"""The exam that every technique goes through; a new one is added by its file and its entry in TECHNIQUES.

Numbers come from the declared keys: the example, else the default. An alternative key without
either stays absent.
"""

from __future__ import annotations

import dataclasses
import pickle
import re
from typing import Any

import numpy as np

from pvfeas.keys import Key, keys_of
from pvfeas.tables import Line
from pvfeas.techniques import Technique

FWHM = 12e3  # Hz
UNITS = {"": 1.0, "Hz": 1.0, "kHz": 1e3, "s": 1.0, "ms": 1e-3, "µs": 1e-6, "h": 3600.0, "1/s": 1.0, "FWHM": FWHM}
# How a quantity grows when every frequency is multiplied by lambda and every time divided by it.
POWERS = {"Hz": 1, "s": -1, "1/s": 1, "1": 0}
SHAPE = (4, 37)
LINE = Line(frequency=np.asarray(29.1e12), profile="lorentzian", fwhm=np.asarray(FWHM))


def nominal(kind: type[Technique], **changed: Any) -> Technique:
    """The technique at the values that its keys show."""
    values = {name: _shown(key) for name, key in keys_of(kind).items() if key.sort == "quantity"}
    return kind(**({name: value for name, value in values.items() if value is not None} | changed))


def _shown(key: Key) -> np.ndarray | None:
    text = key.example or key.default
    if text is None:
        return None
    assert isinstance(text, str)
    number = re.match(r"[0-9.]+", text)
    assert number, f"an example starts with a number, not {text!r}"
    digits_in_brackets = re.sub(r"\([0-9]+\)|×/ *[0-9.]+", "", text)
    unit = digits_in_brackets.split()[1] if len(digits_in_brackets.split()) > 1 else ""
    return np.asarray(float(number[0]) * UNITS[unit])


def quantities(technique: Technique) -> dict[str, np.ndarray]:
    """The numbers of a technique by key."""
    keys = keys_of(type(technique))
    found = {name: getattr(technique, name) for name, key in keys.items() if key.sort == "quantity"}
    return {name: value for name, value in found.items() if value is not None}


def drawn(technique: Technique, seed: int, shape: tuple[int, ...] = SHAPE) -> Technique:
    """Every number but the exact ones spread by 3 % within its bounds."""
    random, keys = np.random.default_rng(seed), keys_of(type(technique))
    moved = {}
    for name, value in quantities(technique).items():
        key = keys[name]
        spread = value * np.exp(0.03 * random.standard_normal(shape))
        moved[name] = np.clip(spread, key.lower, key.upper)
    return dataclasses.replace(technique, **moved)


def results(technique: Technique, line: Line) -> dict[str, np.ndarray]:
    """What a technique says, by verb."""
    found = {
        "cycle_time": technique.cycle_time(line),
        "centre_variance": technique.centre_variance(line),
        "interrogation_width": technique.interrogation_width(line),
    }
    return {verb: np.asarray(value) for verb, value in found.items() if value is not None}


def exam(kind: type[Technique], **changed: Any) -> None:
    """Everything that holds for any technique; changed: other options or numbers than those shown."""
    technique = nominal(kind, **changed)
    _declared(kind)
    _sound(technique)
    _broadcasts(technique)
    _elementwise(technique)
    _scales(technique)
    _pickles(technique)


def _declared(kind: type[Technique]) -> None:
    assert kind.__doc__
    assert kind.summary
    assert dataclasses.is_dataclass(kind)
    assert kind.__dataclass_params__.frozen  # type: ignore[attr-defined]
    for name, key in keys_of(kind).items():
        assert len(key.meaning) > 5, name
        assert key.meaning[-1] not in ".;,", name
        assert key.lower < key.upper, name
        if key.sort == "quantity":
            assert key.unit in POWERS, f"{name}: say in POWERS how {key.unit} scales"
            assert not (key.required and key.default), name
        if key.sort in ("choice", "choices"):
            defaults = key.default if isinstance(key.default, tuple) else (key.default,)
            assert set(defaults) <= set(key.choices), name
    assert {field.name for field in dataclasses.fields(kind)} == set(keys_of(kind))


def _sound(technique: Technique) -> None:
    for verb, value in results(technique, LINE).items():
        assert value.shape == (), verb
        assert np.isfinite(value), verb
        assert value > 0, verb
    assert technique.warnings(LINE) == ()
    assert isinstance(technique.states_splitting, bool)
    assert technique.arms in (1, 2)


def _broadcasts(technique: Technique) -> None:
    """One number as draws, all numbers as draws, and the line's width as draws."""
    alone = results(technique, LINE)
    for name, value in quantities(technique).items():
        one = dataclasses.replace(technique, **{name: np.full(SHAPE, value)})
        for verb, found in results(one, LINE).items():
            assert found.shape in ((), SHAPE), (name, verb)
            assert set(found.ravel().tolist()) == {float(alone[verb])}, (name, verb)
    line = dataclasses.replace(LINE, fwhm=FWHM * np.exp(0.1 * np.random.default_rng(2).standard_normal(SHAPE)))
    for verb, found in results(drawn(technique, 1), line).items():
        assert found.shape == SHAPE, verb
        assert np.all(found > 0), verb
    for verb, found in results(technique, line).items():
        assert np.broadcast_shapes(found.shape, SHAPE) == SHAPE, verb


def _elementwise(technique: Technique) -> None:
    """The bytes of an element are those it has alone, in another block, in reversed order."""
    whole = drawn(technique, 3)
    before = {name: value.copy() for name, value in quantities(whole).items()}
    width = FWHM * np.exp(0.1 * np.random.default_rng(5).standard_normal(SHAPE))
    answers = results(whole, dataclasses.replace(LINE, fwhm=width))
    rows, column = (slice(1, 2), slice(None)), (slice(None), slice(5, 6))
    for index in (rows, column, (2, slice(None, None, -1)), (3, slice(9, 20)), (1, 1)):
        part = dataclasses.replace(whole, **{name: value[index] for name, value in before.items()})
        for verb, found in results(part, dataclasses.replace(LINE, fwhm=width[index])).items():
            assert found.tobytes() == np.ascontiguousarray(answers[verb][index]).tobytes(), (verb, index)
    for name, value in quantities(whole).items():
        assert value.tobytes() == before[name].tobytes(), f"{name} was changed"


def _scales(technique: Technique) -> None:
    """Excess noise multiplies the amplitude; units of frequency and time are free."""
    line, keys = dataclasses.replace(LINE, fwhm=np.full(SHAPE, FWHM)), keys_of(type(technique))
    start = drawn(technique, 4)
    answers = results(start, line)
    louder = results(dataclasses.replace(start, excess_noise=2.0 * start.excess_noise), line)
    for verb, factor in (("cycle_time", 1.0), ("centre_variance", 4.0), ("interrogation_width", 1.0)):
        if verb in answers:
            np.testing.assert_allclose(louder[verb], factor * answers[verb], rtol=1e-12)
    factor = 8.0  # a power of two, so that only functions round
    moved = {name: value * factor ** POWERS[keys[name].unit] for name, value in quantities(start).items()}
    wider = Line(frequency=np.asarray(29.1e12 * factor), profile=line.profile, fwhm=np.full(SHAPE, FWHM * factor))
    found = results(dataclasses.replace(start, **moved), wider)
    for verb, power in (("cycle_time", -1), ("centre_variance", 2), ("interrogation_width", 1)):
        if verb in answers:
            np.testing.assert_allclose(found[verb], factor**power * answers[verb], rtol=1e-11)


def _pickles(technique: Technique) -> None:
    copy = pickle.loads(pickle.dumps(technique))
    assert type(copy) is type(technique)
    for verb, found in results(copy, LINE).items():
        assert found.tobytes() == results(technique, LINE)[verb].tobytes()
    assert dataclasses.replace(technique).kind == technique.kind
