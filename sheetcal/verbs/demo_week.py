"""The demo week's workbooks: issued, filled, adopted, in the order in which the laboratory did it."""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from importlib import resources
from pathlib import Path

from sheetcal import verbs
from sheetcal.errors import BadInput
from sheetcal.inputs import read_lab
from sheetcal.model import Verdict
from sheetcal.verbs import adopting
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.workbook import open_workbook

ADOPTER = "HT"
CORRECTED = ("26436 J/g", "26429 J/g")
# What right workbooks still show, and so the verdict each must get (sound where none is named).
RIGHT = {
    "W2-coke": "hold", "W2-charcoal": "hold", "W3": "hold", "W5": "hold", "W6": "hold", "W8": "hold",
    "W10-unknown": "incomplete", "W11": "hold",
}  # fmt: skip


def demo_folder() -> Path:
    """Where the demonstration's inputs are: beside the package in a checkout, inside it in a wheel."""
    inside = Path(str(resources.files("sheetcal"))) / "demo"
    beside = Path(str(resources.files("sheetcal"))).parent / "workbooks" / "demo"
    for folder in (beside, inside):
        if (folder / "workbooks.csv").is_file():
            return folder
    raise BadInput("demo", "its input files are not installed", str(inside), "Install sheetcal again.")


def table(path: Path) -> list[dict[str, str]]:
    """The rows of a CSV file whose first lines may be comments."""
    lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


@dataclass
class Week:
    """The week in a folder: paths by workbook name, verdicts of the right workbooks."""

    folder: Path
    ids: dict[str, str] = field(default_factory=dict)
    verdicts: dict[str, Verdict] = field(default_factory=dict)

    def __post_init__(self) -> None:
        source = demo_folder()
        self.rows = {row["workbook"]: row for row in table(source / "workbooks.csv")}
        self.loggers = table(source / "loggers.csv")
        self.slips = table(source / "slips.csv")
        text = (source / "lab.toml").read_text("utf-8")
        self.lab.write_text(_without_calibrations(text), "utf-8")

    @property
    def lab(self) -> Path:
        """The lab file, which grows as calibrations are adopted."""
        return self.folder / "lab.toml"

    @property
    def register(self) -> Path:
        """The register of what was issued."""
        return self.folder / "register.sqlite"

    def filled(self, name: str) -> Path:
        """A right workbook."""
        return self.folder / "filled" / f"{name}.xlsx"

    def submitted(self, name: str) -> Path:
        """The workbook as it came back, slips and all."""
        return self.folder / "submitted" / f"{name}.xlsx"

    @property
    def right(self) -> bool:
        """Whether every right workbook got the verdict listed for it."""
        return all(one.verdict == RIGHT.get(name, "sound") for name, one in self.verdicts.items())

    def play(self) -> None:
        """Issue and fill every workbook; adopt each calibration as soon as it is sound."""
        for name, row in self.rows.items():
            self.issue(name, datetime.fromisoformat(row["issued"]), self.folder / "issued" / f"{name}.xlsx")
            self.fill(name, self.folder / "issued" / f"{name}.xlsx", self.filled(name))
            self.verdicts[name] = check_path(str(self.filled(name)), Against())
            if row["kind"] == "calibration":
                self._adopt(name)
        corrected = self.lab.read_text("utf-8").replace(*CORRECTED)
        (self.folder / "lab-corrected.toml").write_text(corrected, "utf-8")
        worklists = sorted((self.folder / "worklists").glob("W*.csv"))
        whole = [row for path in worklists for row in table(path) if not path.stem.endswith("F4")]
        _write_table(self.folder / "worklist.csv", whole)

    def issue(self, name: str, moment: datetime, out: Path, lab: Path | None = None) -> None:
        """Issue one workbook of the week as at a moment."""
        row = self.rows[name]
        verbs.issue(
            row["kind"],
            str(out),
            lab=str(lab or self.lab),
            worklist=str(self.folder / row["worklist"]) if row["worklist"] else None,
            runs=int(row["runs"]) if row["runs"] else None,
            spare=int(row["spare"]),
            calorimeter=row["calorimeter"],
            profile=row["profile"],
            job=f"demonstration, {name} (invented)",
            register=str(self.register),
            moment=moment,
        )
        self.ids[name] = open_workbook(out).parts.record.issue_id

    def fill(self, name: str, issued: Path, out: Path) -> None:
        """Fill one workbook from bench data, loggers and late analysis values, as the days went by."""
        row = self.rows[name]
        logs = [
            f"{one['run']}={self.folder / 'loggers' / one['file']}" for one in self.loggers if one["workbook"] == name
        ]
        steps: list[tuple[Path, list[str]]] = [
            (self._cited(self.folder / part), logs if number == 0 else [])
            for number, part in enumerate(row["data"].split())
        ]
        if row["kind"] == "fuel":
            steps.append((self.folder / "analysis.csv", []))
        current = issued
        for number, (data, log) in enumerate(steps):
            last = number == len(steps) - 1
            target = out if last else out.with_name(f".{name}-{number}.xlsx")
            verbs.fill(str(current), str(data), log=log, out=str(target), force=True)
            if current != issued:
                current.unlink()
            current = target

    def _cited(self, data: Path) -> Path:
        """The data file with the issue id of a workbook in place of its name, where a control is cited."""
        text = data.read_text("utf-8")
        for name, issue_id in self.ids.items():
            text = re.sub(rf"(control_ref,){re.escape(name)} (run\d+)", rf"\g<1>{issue_id} \2", text)
        data.write_text(text, "utf-8")
        return data

    def _adopt(self, name: str) -> None:
        """The laboratory head adopts a calibration after its last run."""
        parts = open_workbook(self.filled(name)).parts
        days = [value for one, value in parts.readings.items() if one.endswith(".date")]
        last = max(float(day) for day in days if isinstance(day, float | int))
        moment = datetime(1899, 12, 30) + timedelta(days=last, hours=16)
        if name == "W7":
            moment = moment.replace(hour=10, minute=40)
        adopting.run(str(self.filled(name)), str(self.lab), ADOPTER, moment)

    def lab_on(self, moment: datetime) -> Path:
        """The lab file as it stood at a moment: calibrations adopted later taken out."""
        text = self.lab.read_text("utf-8")
        head, *blocks = re.split(r"(?=^# adopted from workbook )", text, flags=re.M)
        kept = [block for block in blocks if _valid_from(block) <= moment]
        path = self.folder / ".lab-then.toml"
        path.write_text("".join([head, *kept]), "utf-8")
        read_lab(path)
        return path


def _valid_from(block: str) -> datetime:
    found = re.search(r"^valid_from = (\S+)", block, re.M)
    assert found is not None
    return datetime.fromisoformat(found.group(1))


def _without_calibrations(text: str) -> str:
    """The lab file before any calibration was adopted: the week earns its own."""
    return re.sub(r"^\[\[calibration\]\].*?(?=^\[|^#|\Z)", "", text, flags=re.M | re.S)


def _write_table(path: Path, rows: list[dict[str, str]]) -> None:
    columns = list(dict.fromkeys(name for row in rows for name in row))
    with path.open("w", encoding="utf-8", newline="") as stream:
        stream.write("# Invented data of the demonstration: no laboratory, client or sample of this kind exists.\n")
        writer = csv.DictWriter(stream, columns, restval="", lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)
