"""The techniques: the one list that names them."""

from __future__ import annotations

from pvfeas.techniques.base import Technique
from pvfeas.techniques.free_decay import FreeDecay
from pvfeas.techniques.quoted import Quoted
from pvfeas.techniques.ramsey import Ramsey
from pvfeas.techniques.scan import Scan
from pvfeas.techniques.two_point import TwoPoint

TECHNIQUES: dict[str, type[Technique]] = {one.kind: one for one in (Quoted, Ramsey, Scan, TwoPoint, FreeDecay)}

__all__ = ["TECHNIQUES", "Technique"]
