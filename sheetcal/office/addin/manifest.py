"""META-INF/manifest.xml and description.xml: what the extension manager reads of the add-in."""

from __future__ import annotations

from collections.abc import Collection
from xml.sax.saxutils import quoteattr

IDENTIFIER = "org.sheetcal.addin"
KINDS = {
    ".idl": "application/vnd.sun.star.uno-typelibrary;type=RDB",
    ".components": "application/vnd.sun.star.uno-components",
    ".xcu": "application/vnd.sun.star.configuration-data",
    ".xcs": "application/vnd.sun.star.configuration-schema",
}
HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'


def manifest(paths: Collection[str]) -> str:
    """The manifest of the files at the extension's root: types first, then schemas, components, settings."""
    order = [".idl", ".xcs", ".components", ".xcu"]
    rows = [
        f" <manifest:file-entry manifest:full-path={quoteattr(path)} manifest:media-type={quoteattr(KINDS[ending])}/>\n"
        for ending in order
        for path in sorted(paths)
        if path.endswith(ending)
    ]
    space = 'xmlns:manifest="http://openoffice.org/2001/manifest"'
    return f"{HEAD}<manifest:manifest {space}>\n{''.join(rows)}</manifest:manifest>\n"


def description(version: str, names: dict[str, str], publisher: str = "sheetcal") -> str:
    """description.xml; `names` is what the extension manager shows, by language."""
    shown = "".join(f'  <name lang="{language}">{name}</name>\n' for language, name in names.items())
    return (
        f'{HEAD}<description xmlns="http://openoffice.org/extensions/description/2006"\n'
        ' xmlns:d="http://openoffice.org/extensions/description/2006"\n'
        ' xmlns:l="http://libreoffice.org/extensions/description/2011">\n'
        f' <identifier value="{IDENTIFIER}"/>\n <version value="{version}"/>\n'
        f" <display-name>\n{shown} </display-name>\n"
        ' <dependencies>\n  <l:LibreOffice-minimal-version value="7.0" d:name="LibreOffice 7.0"/>\n </dependencies>\n'
        "</description>\n"
    )
