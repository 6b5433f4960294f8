"""What can be wrong with a submitted workbook, one concern a module; each adds findings to a case."""
