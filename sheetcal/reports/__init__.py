"""Verdicts as text and JSON; no arithmetic beyond rounding for display."""
