"""The add-in: every cell function as a function of LibreOffice Calc, and what else lives inside LibreOffice.

`build.build()` gives the .oxt as bytes. Its root is the folder `parts/`, file by file as it stands there, and beside it
what `build.py` makes: the interface and the wizard's texts from the registry of cell functions, description.xml,
where.json, pythonpath/ with `sheetcal.cells`, `sheetcal.errors` and `inside/` unchanged, and META-INF/manifest.xml.

A further component of the add-in is added by putting its files into `parts/`, nothing else:

- NAME.py            the component, Python 3.9 syntax, standard library and uno (`g_ImplementationHelper` at its end);
- NAME.components    which implementation and services it offers (copy functions.components and change the names);
- *.xcu              configuration, as Addons.xcu (menus) or ProtocolHandler.xcu; *.xcs a schema of its own;
- *.idl              source of UNO types;
- any other file     (pictures, words) is carried along and found beside the component.

The manifest is written from the endings, see `manifest.KINDS`. A component stays small (LibreOffice compiles it at
every start); its modules go into `inside/` and are imported as `sheetcal.office.addin.inside.NAME`, after the component
has put pythonpath/ beside it in front of `sys.path` as functions.py does. Of sheetcal only `cells`, `errors` and
`inside` are there: for anything else a component starts sheetcal as a process, from what `where.json` at the root of
the extension says: {"python": interpreter, "sheetcal": folder to run `-m sheetcal` from or "", "version": sheetcal's}.
"""
