"""The add-in: every cell function as a function of LibreOffice Calc, and what else lives inside LibreOffice.

`build.build()` gives the .oxt as bytes. Its root is the folder `parts/`, file by file as it stands there, and beside it
what `build.py` makes: the interface and the wizard's texts from the registry of cell functions, description.xml,
where.json, pythonpath/ with `sheetcal.cells` and `sheetcal.errors` unchanged, and META-INF/manifest.xml.

A further component of the add-in is added by putting its files into `parts/`, nothing else:

- NAME.py            the component, Python 3.9 syntax, standard library and uno (`g_ImplementationHelper` at its end);
- NAME.components    which implementation and services it offers (copy functions.components and change the names);
- *.xcu              configuration, as Addons.xcu (menus) or ProtocolHandler.xcu; *.xcs a schema of its own;
- *.idl              source of UNO types;
- any other file     (pictures, words) is carried along and found beside the component.

The manifest is written from the endings, see `manifest.KINDS`. Modules that several components share go into
`parts/pythonpath/`. Component files are run by LibreOffice's own Python: they never import the rest of sheetcal, but
start it as a process from what `where.json` at the root of the extension says:
{"python": interpreter, "sheetcal": folder to run `-m sheetcal` from or "", "version": version of sheetcal}.
"""
