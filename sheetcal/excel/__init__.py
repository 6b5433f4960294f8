"""Workbooks as files: gate and reader (standard library), writer and fill (openpyxl). Imports nothing."""
