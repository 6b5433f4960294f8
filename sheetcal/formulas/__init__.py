"""From a cell function's body to the text of a spreadsheet formula."""
