"""Checking a submitted workbook: formulas run again, balances written from the physics, findings, a verdict.

Imports neither the cell functions nor their translator, so that agreement with them means something.
"""
