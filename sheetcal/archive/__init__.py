"""Archives: what a changed constant moves, workbook by workbook along the chain of calibrations."""
