"""The sheet kinds: data files, the frozen form the checker compares with, and the layout rule."""

from __future__ import annotations

from sheetcal.kinds.frozen import load, names, versions
from sheetcal.kinds.layout import Skeleton, skeleton

__all__ = ["Skeleton", "load", "names", "skeleton", "versions"]
