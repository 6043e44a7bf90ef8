"""The report of a session file, written."""

from __future__ import annotations

from concurrent.futures import Executor
from pathlib import Path

import fieldview
from fieldview.compute.errors import InputError
from fieldview.files.writing import said_if_unwritable, write_whole
from fieldview.publish.measuring import Progress, measured_rows
from fieldview.publish.remarks import Remarks
from fieldview.publish.report import gathering
from fieldview.publish.report.methods import CAUTIONS, methods_of
from fieldview.publish.run_reports import checked
from fieldview.publish.studies import choices_study
from fieldview.session.measure import chosen_frames
from fieldview.session.replay import Frame, Workbench
from fieldview.session.store import load_session, session_digest

CACHE_BYTES = 200_000_000

SHOWN = 8
"""Frames in the tables, spread over the run, where it is not said which."""


def write_report(
    path: Path,
    out: Path,
    frames: str | None,
    *,
    choices: bool,
    progress: Progress,
    say,
    executor: Executor | None = None,
) -> bool:
    """Write the report of a session; True where there was anything to remark.

    Parameters
    ----------
    path, out : Path
        Of the session and of the .html file.
    frames : str, optional
        Frames in the tables; some spread over the run if left out. The run check looks at all.
    choices : bool
        Whether to study what the analyst's choices do, which takes its time.

    Raises
    ------
    InputError
        The session, the run, the frames or the place cannot be used; nothing is written then.
    """
    if out.suffix.lower() not in (".html", ".htm"):
        raise InputError(f"{out}: the ending of a report must be .html")
    bench = Workbench(load_session(path), cache_bytes=CACHE_BYTES)
    text, remarks = report_text(
        bench, path.name, frames, choices=choices, progress=progress, say=say, executor=executor
    )
    with said_if_unwritable(out):
        write_whole(out, text.encode())
    return remarks


def report_text(
    bench: Workbench,
    name: str,
    frames: str | None,
    *,
    choices: bool,
    progress: Progress,
    say,
    executor: Executor | None = None,
) -> tuple[str, bool]:
    """The report as HTML, and whether there was anything to remark."""
    from jinja2 import Environment, PackageLoader, StrictUndefined

    session = bench.session
    remarks = Remarks(say, bench)
    changed = list(remarks.said)
    shown = _shown(bench, frames)
    field = bench.field(shown[0])
    everything = list(range(len(bench.run)))
    findings = checked(bench, everything, progress=progress, remark=remarks, executor=executor).rows()
    rows = []
    if session.regions:
        rows = list(measured_rows(bench, shown, remarks, executor, progress=progress))
    studies = []
    if choices:
        studies = [
            gathering.study_table(
                choices_study(bench, region.name, shown[0], progress=progress, executor=executor)
            )
            for region in session.regions
        ]
    page = Environment(
        loader=PackageLoader("fieldview.publish.report", ""), autoescape=True, undefined=StrictUndefined
    ).get_template("page.html")
    text = page.render(
        title=session.title or name,
        session_name=name,
        session_digest=session_digest(session),
        program=f"Loopflux {fieldview.__version__}",
        run=gathering.run_facts(bench),
        changed=changed,
        sources=list(bench.run.digests().items()),
        reading=gathering.reading_facts(session),
        notes=list(bench.run.notes),
        ledger=gathering.ledger_lines(bench, shown),
        frames_told=_told(bench, shown),
        derivative=gathering.derivative_title(session),
        line=session.line,
        error_statement=gathering.error_statement(field),
        errors=gathering.error_facts(bench, field),
        findings=findings,
        regions=gathering.region_tables(session, rows) if rows else [],
        regions_told=_told(bench, shown).capitalize() + ".",
        studies=studies,
        figures=gathering.report_figures(bench, shown),
        methods=methods_of(session),
        cautions=CAUTIONS,
        versions=gathering.versions(),
    )
    return text, bool(remarks)


def _shown(bench: Workbench, frames: str | None) -> list[Frame]:
    if frames is not None:
        return chosen_frames(bench, frames)
    count = len(bench.run)
    step = max(1, -(-count // SHOWN))
    return list(range(0, count, step))


def _told(bench: Workbench, shown: list[Frame]) -> str:
    if len(shown) == len(bench.run):
        return f"all {len(shown)} frames of the run" if len(shown) > 1 else "one frame of the run"
    return f"{len(shown)} of {len(bench.run)} frames: {', '.join(map(str, shown))}"
