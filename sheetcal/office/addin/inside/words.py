"""What is said inside the sheet, in English and German. What the checker itself says comes as it says it."""

from __future__ import annotations

from typing import Any

TEXTS: dict[str, dict[str, Any]] = {
    "en": {
        "tab": "Findings",
        "sound": "Sound: nothing to put right.",
        "hold": "Hold it: {counts}.",
        "reject": "Not right: {counts}.",
        "incomplete": "Not complete: {missing}{counts}.",
        "unreadable": "Cannot be checked: {message}.",
        "stop": "STOP: {message}.",
        "missing 1": "1 reading is missing",
        "missing": "{n} readings are missing",
        "error 1": "1 error",
        "error": "{n} errors",
        "warning 1": "1 warning",
        "warning": "{n} warnings",
        "note 1": "1 note",
        "note": "{n} notes",
        "and": ", ",
        "Error": "Error",
        "Warning": "Warning",
        "Note": "Note",
        "do stop": "Stop. Do not go on before this is settled.",
        "do reject": "Put it right before anything is reported.",
        "do hold": "Report nothing until this is settled.",
        "do correct": "Correct the cell.",
        "do note": "",
        "found": "found {found}",
        "expected": "expected {expected}",
        "about": "Not certain: one sound worksheet in {n} looks like this.",
        "cause": "Cause: {text}",
        "do": "Do: {text}",
        "head": ("No.", "Cell", "Severity", "What was found", "Likely cause", "What to do"),
        "as of": "As the worksheet stood at {time}. Witnesses: {witnesses}.",
        "not checked": "Not looked at: {text}.",
        "looks": "number formats, colours, filters and pictures (check the saved file for those)",
        "changed": "It was changed since then: check again.",
        "checking": "The worksheet is being checked. You can go on working.",
        "marking": "The cells are being marked.",
        "already": "A check of this worksheet is running already.",
        "step put": "sheetcal: marks",
        "step off": "sheetcal: remove the marks",
        "removed": "The marks are removed.",
        "no marks": "There are no marks of sheetcal in this worksheet.",
        "no findings": "There is no finding to go to. Check the worksheet first.",
        "of": "{n} of {all}: {place}",
        "list": "Show the list",
        "next": "Next finding",
        "remove": "Remove the marks",
        "unmarked": "Not marked: the tabs {tabs} are locked with a password.",
        "read-only": "The worksheet is open for reading only: nothing is marked in it.",
        "no list": "The list of tabs is locked with a password: go through the findings with Next finding.",
        "hidden": "The tab is hidden.",
        "no place": "sheetcal was not found: the add-in does not know where it is installed.",
        "not found": "sheetcal was not found at {detail}: it was moved or removed.",
        "install": "Install it again, then run: sheetcal office install",
        "failed": "The check failed: {detail}.",
        "too long": "The check took longer than {detail} s and was stopped.",
        "too large": "The document is too large to be a worksheet of ours.",
        "again": "Try again; if it fails again, save the worksheet and run: sheetcal check FILE",
    },
    "de": {
        "tab": "Befunde",
        "sound": "In Ordnung: nichts zu berichtigen.",
        "hold": "Zurückhalten: {counts}.",
        "reject": "Nicht in Ordnung: {counts}.",
        "incomplete": "Unvollständig: {missing}{counts}.",
        "unreadable": "Kann nicht geprüft werden: {message}.",
        "stop": "HALT: {message}.",
        "missing 1": "1 Ablesung fehlt",
        "missing": "{n} Ablesungen fehlen",
        "error 1": "1 Fehler",
        "error": "{n} Fehler",
        "warning 1": "1 Warnung",
        "warning": "{n} Warnungen",
        "note 1": "1 Hinweis",
        "note": "{n} Hinweise",
        "and": ", ",
        "Error": "Fehler",
        "Warning": "Warnung",
        "Note": "Hinweis",
        "do stop": "Halt. Nicht weitermachen, bevor dies geklärt ist.",
        "do reject": "Vor jedem Bericht berichtigen.",
        "do hold": "Nichts berichten, bis dies geklärt ist.",
        "do correct": "Die Zelle berichtigen.",
        "do note": "",
        "found": "gefunden {found}",
        "expected": "erwartet {expected}",
        "about": "Nicht sicher: eins von {n} richtigen Blättern sieht auch so aus.",
        "cause": "Ursache: {text}",
        "do": "Zu tun: {text}",
        "head": ("Nr.", "Zelle", "Schwere", "Was gefunden wurde", "Mögliche Ursache", "Was zu tun ist"),
        "as of": "Stand des Blatts um {time}. Zeugen: {witnesses}.",
        "not checked": "Nicht angesehen: {text}.",
        "looks": "Zahlenformate, Farben, Filter und Bilder (dafür die gespeicherte Datei prüfen)",
        "changed": "Seither geändert: noch einmal prüfen.",
        "checking": "Das Blatt wird geprüft. Sie können weiterarbeiten.",
        "marking": "Die Zellen werden markiert.",
        "already": "Dieses Blatt wird schon geprüft.",
        "step put": "sheetcal: Markierungen",
        "step off": "sheetcal: Markierungen entfernen",
        "removed": "Die Markierungen sind entfernt.",
        "no marks": "In diesem Blatt sind keine Markierungen von sheetcal.",
        "no findings": "Es gibt keinen Befund zum Anspringen. Erst das Blatt prüfen.",
        "of": "{n} von {all}: {place}",
        "list": "Liste zeigen",
        "next": "Nächster Befund",
        "remove": "Markierungen entfernen",
        "unmarked": "Nicht markiert: die Tabellen {tabs} sind mit Kennwort gesperrt.",
        "read-only": "Das Blatt ist nur zum Lesen geöffnet: es wird nichts markiert.",
        "no list": "Die Tabellenliste ist mit Kennwort gesperrt: die Befunde mit Nächster Befund durchgehen.",
        "hidden": "Die Tabelle ist ausgeblendet.",
        "no place": "sheetcal wurde nicht gefunden: die Erweiterung weiß nicht, wo es installiert ist.",
        "not found": "sheetcal wurde unter {detail} nicht gefunden: es wurde verschoben oder entfernt.",
        "install": "Neu installieren, dann aufrufen: sheetcal office install",
        "failed": "Die Prüfung ist gescheitert: {detail}.",
        "too long": "Die Prüfung dauerte länger als {detail} s und wurde beendet.",
        "too large": "Das Dokument ist zu groß für ein Blatt von uns.",
        "again": "Noch einmal versuchen; sonst das Blatt speichern und aufrufen: sheetcal check DATEI",
    },
}


class Words:
    """The texts of one language; English where it has none."""

    def __init__(self, language: str) -> None:
        self._texts = TEXTS.get(language.partition("-")[0], TEXTS["en"])

    def say(self, key: str, **parts: object) -> str:
        """A text with its parts put in."""
        return str(self._texts[key]).format(**parts)

    def counted(self, key: str, number: int) -> str:
        """`1 error`, `3 errors`."""
        return self.say(f"{key} 1" if number == 1 else key, n=number)

    @property
    def head(self) -> tuple[str, ...]:
        """The columns of the list."""
        return tuple(self._texts["head"])


def list_names() -> tuple[str, ...]:
    """The names the tab with the list may have."""
    return tuple(texts["tab"] for texts in TEXTS.values())
