"""The tables and keys of a study file, as declared by the parts, and the keys that are yet to come."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from pvfeas.keys import Key, keys_of
from pvfeas.tables import Goal, Line, Reference, Samples, Schedule, Switching, Systematic
from pvfeas.techniques import TECHNIQUES

PARTS: dict[str, type] = {"line": Line, "switching": Switching, "samples": Samples, "schedule": Schedule}
TOP = ("title", "goal", "shared", "scenario", "correlation")
SCENARIO = (
    "based_on", "without", "splitting", "line", "technique", "switching", "samples", "schedule", "reference",
    "systematics", "arm_b",
)  # fmt: skip
HWHM = Key("quantity", "half width at half maximum, doubled", "Hz", lower=0.0, lower_open=True)
ALTERNATIVES: tuple[frozenset[str], ...] = (frozenset({"fwhm", "hwhm"}), frozenset({"molecules", "rate"}))
SPLITTING = Key("quantity", "predicted splitting nu(a) - nu(b), signed", "Hz", required=True)

LATER = "is planned for a later version of pvfeas"
LATER_KEYS: dict[str, tuple[str, ...]] = {
    "scan": ("modulation",),
}  # fmt: skip
LATER_KINDS = ("doublet", "parity-evolution")
LATER_CHOICES = {"detection": ("1f", "2f", "3f")}


def keys_for(table: str, kind: str = "") -> Mapping[str, Key]:
    """The keys of a table of a scenario, of one systematic, or of the goal."""
    if table == "technique":
        return keys_of(TECHNIQUES[kind])
    if table == "systematics":
        keys = dict(keys_of(Systematic))
        if kind not in ("", "hertz", "signal"):
            keys["size"] = replace(keys["size"], unit="1", example="1e-3 ×/ 1.5")
        return keys
    if table == "reference":
        return keys_of(Reference)
    if table == "goal":
        return keys_of(Goal)
    keys = dict(keys_of(PARTS[table]))
    return keys | {"hwhm": HWHM} if table == "line" else keys


def later_keys(table: str, kind: str = "") -> tuple[str, ...]:
    """Keys that a table will know one day."""
    return LATER_KEYS.get(kind if table == "technique" else table, ())
