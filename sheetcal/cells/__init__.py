"""Cell functions: the arithmetic of a calorimetry sheet, one small function for each visible line.

Standard library only: this package also runs inside LibreOffice's Python.
"""
