"""Issue, check and recompute calorimetry worksheets."""

__version__ = "0.1.0"
