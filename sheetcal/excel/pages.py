"""Pages: paper, direction, headers, what repeats, and where one page ends."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from openpyxl.worksheet.pagebreak import Break
from openpyxl.worksheet.worksheet import Worksheet

from sheetcal.excel.textfit import LEAST
from sheetcal.model import IssueRecord

PAPERS = {"A4": (9, 595.0, 842.0), "Letter": (1, 612.0, 792.0)}
SIDE, TOP, BOTTOM, BAND = 0.45, 0.65, 0.55, 0.28  # inches: margins, and where header and footer stand
LEAST_UPRIGHT = 0.66  # below this scale an upright page is too small to read: the sheet is turned
HEAD_ROWS = 3
SHARES = (1.0, 0.97, 0.94, 0.91, 0.88)  # how much a tab may be shrunk to save a page
Stretch = tuple[int, int, bool]  # first and last row that stay together, and whether they start a page


def points(columns: float) -> float:
    """The width in points of a column so many digits wide."""
    return (7.0 * columns + 5.0) * 0.75


def upright(record: IssueRecord, widths: Sequence[float]) -> bool:
    """Whether a tab with these column widths stays readable on an upright page."""
    return _scale(record, widths, True) >= LEAST_UPRIGHT


def _paper(record: IssueRecord) -> tuple[int, float, float]:
    return PAPERS.get(record.settings.get("paper", "A4"), PAPERS["A4"])


def _scale(record: IssueRecord, widths: Sequence[float], tall: bool) -> float:
    _, short, long = _paper(record)
    room = (short if tall else long) - 144.0 * SIDE
    return min(1.0, room / sum(points(one) for one in widths))


def room(record: IssueRecord, widths: Sequence[float], heads: float) -> float:
    """Points of rows that fit on one page below the repeated rows; 5 % are left for other programs' fonts."""
    tall = upright(record, widths)
    _, short, long = _paper(record)
    height = (long if tall else short) - 72.0 * (TOP + BOTTOM)
    return 0.95 * height / _scale(record, widths, tall) - heads


def set_up(sheet: Worksheet, record: IssueRecord, title: str, widths: Sequence[float]) -> None:
    """Paper, direction, width on one page, header with issue id and page, footer with the laboratory."""
    number, _, _ = _paper(record)
    setup = sheet.page_setup
    setup.paperSize = number
    setup.orientation = "portrait" if upright(record, widths) else "landscape"
    setup.fitToWidth, setup.fitToHeight = 1, 0
    sheet.sheet_format.defaultRowHeight = LEAST
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    margins = sheet.page_margins
    margins.left = margins.right = SIDE
    margins.top, margins.bottom, margins.header, margins.footer = TOP, BOTTOM, BAND, BAND
    sheet.print_options.horizontalCentered = True
    sheet.print_title_rows = f"1:{HEAD_ROWS}"
    _bands(sheet, record, title)


def one_block_a_page(sheet: Worksheet, record: IssueRecord, widths: Sequence[float], points_needed: float) -> None:
    """Shrink a tab until its tallest block with the heads fits on one page, unless it would get too small."""
    tall = upright(record, widths)
    _, short, long = _paper(record)
    height = 0.95 * ((long if tall else short) - 72.0 * (TOP + BOTTOM))
    scale = min(0.98 * _scale(record, widths, tall), height / points_needed)
    if scale >= LEAST_UPRIGHT:
        sheet.sheet_properties.pageSetUpPr.fitToPage = False
        sheet.page_setup.scale = int(100 * scale)


def on_one_page(sheet: Worksheet, record: IssueRecord, widths: Sequence[float], points_needed: float) -> bool:
    """Shrink a tab a little so that it fits on one page; False where it would get too small."""
    tall = upright(record, widths)
    _, short, long = _paper(record)
    height = 0.95 * ((long if tall else short) - 72.0 * (TOP + BOTTOM))
    fits = height / points_needed >= LEAST_UPRIGHT
    if fits:
        sheet.page_setup.fitToHeight = 1
    return fits


def _bands(sheet: Worksheet, record: IssueRecord, title: str) -> None:
    head, foot = sheet.oddHeader, sheet.oddFooter
    head.left.text = _plain(record.issue_id)
    head.center.text = _plain(title)
    head.right.text = _plain(f"{record.kind} {record.kind_version}, profile {record.profile} {record.profile_version}")
    foot.left.text = _plain(record.lab_name)
    foot.right.text = "page &P of &N"
    for part in (head.left, head.center, head.right, foot.left, foot.right):
        part.size, part.font = 8, "Arial,Regular"


def _plain(text: str) -> str:
    return text.replace("&", "&&")


def breaks(
    sheet: Worksheet,
    record: IssueRecord,
    widths: Sequence[float],
    stretches: Sequence[Stretch],
    heights: Mapping[int, float],
    heads: float,
) -> None:
    """Break pages between stretches of rows; a tab is shrunk a little where that saves a page.

    heights: points by row; heads: points of the repeated rows.
    """
    full = room(record, widths, 0.0)
    counts = {share: len(_breaks(stretches, heights, full / share - heads)) for share in SHARES}
    share = max(one for one in SHARES if counts[one] == min(counts.values()))
    if share < 1.0:
        sheet.sheet_properties.pageSetUpPr.fitToPage = False
        sheet.page_setup.scale = int(98 * share * _scale(record, widths, upright(record, widths)))
    for row in _breaks(stretches, heights, full / share - heads):
        sheet.row_breaks.append(Break(id=row))


def break_each(sheet: Worksheet, stretches: Sequence[Stretch]) -> None:
    """Break pages before each stretch but the first."""
    for first, _, _ in stretches[1:]:
        sheet.row_breaks.append(Break(id=first - 1))


def _breaks(stretches: Sequence[Stretch], heights: Mapping[int, float], space: float) -> list[int]:
    """The rows after which a page ends: where a stretch says that it starts one, or would not fit."""
    used, found = 0.0, []
    for number, (first, last, starts) in enumerate(stretches):
        need = sum(heights.get(row, LEAST) for row in range(first, last + 1))
        if number and (starts or used + need > space):
            found.append(first - 1)
            used = 0.0
        used += need + heights.get(last + 1, LEAST)
    return found
