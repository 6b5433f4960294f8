"""Slips planted in fresh workbooks as people make them: one function a slip, from the slip itself.

Nothing here knows the checker: neither its signatures of causes nor its interpreter. What a slip must be called, in
which cell it must be found and which words its cause must hold is said beside it.
"""

from importlib import import_module

from sheetcal.planting.registry import Slip, Spot, every, slip, spread
from sheetcal.planting.sheet import Sheet, fresh

for _name in ("cells", "readings", "record", "formulas", "rewriting", "structure", "sight", "runs", "limits"):
    import_module(f"{__name__}.{_name}")

__all__ = ["Sheet", "Slip", "Spot", "every", "fresh", "slip", "spread"]
