"""The numbers of a session as a workbook: regions, run check and statistics on sheets of their own."""

from __future__ import annotations

import datetime
import io
from collections.abc import Iterable, Iterator
from concurrent.futures import Executor
from dataclasses import dataclass
from pathlib import Path

import fieldview
from fieldview.compute.errors import InputError
from fieldview.files.writing import said_if_unwritable, write_whole
from fieldview.publish.figures.captions import uncertainty_statement
from fieldview.publish.measuring import Progress, measured_rows
from fieldview.publish.outputs import flat
from fieldview.publish.remarks import Remarks
from fieldview.publish.run_reports import checked, statistics_over
from fieldview.publish.tables import plain_text, table_rows
from fieldview.session.replay import Workbench
from fieldview.session.statistics import frame_numbers
from fieldview.session.store import load_session, session_digest

_DATE = datetime.datetime(1980, 1, 1)
"""When the workbook says it was made: the same session gives the same bytes."""

_WIDEST = 48
"""Of a column. [letters]"""


@dataclass(frozen=True)
class Sheet:
    """One sheet: its name, and rows of cells with the titles first."""

    name: str
    rows: Iterable[list]


def write_workbook(
    path: Path,
    out: Path,
    frames: str | None,
    *,
    progress: Progress,
    say,
    executor: Executor | None = None,
) -> bool:
    """Write the numbers of a session; True where there was anything to remark.

    Raises InputError where the session, the frames or the place cannot be used; nothing is written then.
    """
    if out.suffix.lower() != ".xlsx":
        raise InputError(f"{out}: the ending of a workbook must be .xlsx")
    bench = Workbench(load_session(path))
    remarks = Remarks(say, bench)
    numbers = frame_numbers(bench, frames)
    found = checked(bench, numbers, progress=progress, remark=remarks, executor=executor)
    run = statistics_over(bench, numbers, progress=progress, remark=remarks, executor=executor)
    sheets = [Sheet("about", _about(path, bench, numbers))]
    if bench.session.regions:
        rows = measured_rows(bench, numbers, remarks, executor, progress=progress)
        sheets.append(Sheet("regions", table_rows(rows)))
    sheets += [
        Sheet("run check", _of_dicts(found.rows())),
        Sheet("frames", _of_dicts(found.frame_rows())),
        Sheet("statistics", _of_dicts(run.rows())),
        Sheet("remarks", [["remark"], *([text] for text in run.remarks())]),
    ]
    content = workbook_bytes(sheets)
    with said_if_unwritable(out):
        write_whole(out, content)
    return bool(remarks)


def workbook_bytes(sheets: Iterable[Sheet]) -> bytes:
    """The sheets as an .xlsx file; text that looks like a formula is neutralised."""
    import xlsxwriter

    stream = io.BytesIO()
    options = {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False}
    with xlsxwriter.Workbook(stream, options | {"in_memory": True, "nan_inf_to_errors": False}) as book:
        book.set_properties({"created": _DATE, "author": "", "comments": f"Loopflux {fieldview.__version__}"})
        bold = book.add_format({"bold": True, "text_wrap": True, "valign": "top"})
        for sheet in sheets:
            page = book.add_worksheet(sheet.name)
            widths: dict[int, int] = {}
            for row, cells in enumerate(sheet.rows):
                for column, cell in enumerate(cells):
                    _put(page, row, column, cell, bold if row == 0 else None)
                    widths[column] = max(widths.get(column, 0), len(str(cell)))
            for column, letters in widths.items():
                page.set_column(column, column, min(max(letters + 1, 8), _WIDEST))
            page.freeze_panes(1, 0)
    return stream.getvalue()


def _put(page, row: int, column: int, cell, form) -> None:
    if cell is None or cell == "":
        return
    if isinstance(cell, bool):
        page.write_boolean(row, column, cell, form)
    elif isinstance(cell, int | float):
        page.write_number(row, column, cell, form)
    else:
        page.write_string(row, column, plain_text(str(cell)), form)


def _of_dicts(rows: Iterable[dict]) -> Iterator[list]:
    titles = None
    for row in map(flat, rows):
        if titles is None:
            titles = list(row)
            yield titles
        yield [row.get(title) for title in titles]


def _about(path: Path, bench: Workbench, numbers: list[int]) -> Iterator[list]:
    """What the numbers are of, and how sure."""
    session = bench.session
    yield ["what", "value"]
    yield ["title", session.title]
    yield ["session", path.name]
    yield ["session digest", session_digest(session)]
    yield ["frames", f"{len(numbers)} of {len(bench.run)}"]
    yield ["units", str(bench.units)]
    yield ["uncertainties", uncertainty_statement(bench.field(numbers[0]))]
    yield ["program", f"Loopflux {fieldview.__version__}"]
    for name, digest in bench.run.digests().items():
        yield [name, digest]
