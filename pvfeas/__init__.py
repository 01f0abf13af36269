"""pvfeas: feasibility of measuring the parity-violating frequency difference between enantiomers.

    study = load_study("study.toml")
    answer = assess(problem_of(study))

Names are loaded when they are first used.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from pvfeas.compiler import problem_of
    from pvfeas.errors import Fault, PvfeasError, QuantityError, StudyError, UsageError
    from pvfeas.options import Options
    from pvfeas.questions.assess import assess
    from pvfeas.questions.compare import compare
    from pvfeas.questions.curves import curves
    from pvfeas.resolving import resolve
    from pvfeas.study import Study
    from pvfeas.studyfile import load_study

__version__ = "0.1.0"

_HOMES = {
    "Fault": "errors",
    "Options": "options",
    "PvfeasError": "errors",
    "QuantityError": "errors",
    "Study": "study",
    "StudyError": "errors",
    "UsageError": "errors",
    "assess": "questions.assess",
    "compare": "questions.compare",
    "curves": "questions.curves",
    "load_study": "studyfile",
    "problem_of": "compiler",
    "resolve": "resolving",
}

__all__ = [
    "Fault",
    "Options",
    "PvfeasError",
    "QuantityError",
    "Study",
    "StudyError",
    "UsageError",
    "assess",
    "compare",
    "curves",
    "load_study",
    "problem_of",
    "resolve",
]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(import_module(f"pvfeas.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'pvfeas' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted([*__all__, "__version__"])
