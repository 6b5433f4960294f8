"""LibreOffice as the spreadsheet engine: where it is and which Python speaks to it."""
