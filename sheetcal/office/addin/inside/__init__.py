"""Check from inside the sheet: runs in LibreOffice's own Python, standard library and uno only, 3.9 syntax.

The component `parts/check.py` hands a command to `session`. A session takes a copy of the open document's cells
(`reading`), writes it as a workbook (`snapshot`), lets the checker judge it in a process of its own (`asking`), and
shows what it says: a bar over the sheet (`bar`), comments and styles (`marks`), a tab with the list (`listing`).
"""
