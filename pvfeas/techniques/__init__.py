"""The techniques: the one list that names them."""

from __future__ import annotations

from pvfeas.techniques.base import Technique
from pvfeas.techniques.quoted import Quoted
from pvfeas.techniques.ramsey import Ramsey
from pvfeas.techniques.scan import Scan

TECHNIQUES: dict[str, type[Technique]] = {one.kind: one for one in (Quoted, Ramsey, Scan)}

__all__ = ["TECHNIQUES", "Technique"]
