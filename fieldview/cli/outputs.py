"""Commands that make something to hand on: figure, workbook and report."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from fieldview.cli.terminal import (
    DONE,
    WITH_REMARKS,
    Cluster,
    Frames,
    SessionFile,
    Workers,
    app,
    check_place,
    progress,
    say,
    write_text,
)
from fieldview.compute.errors import InputError

_KIND = "map, growth, around, profile, time, spectrum or convergence"


@app.command()
def figure(
    session: SessionFile,
    out: Annotated[Path, typer.Option("--out", help=".pdf, .svg, .png, .gif or .apng", metavar="FILE")],
    name: Annotated[
        str | None, typer.Option("--figure", help="A figure of the session; the first one if left out")
    ] = None,
    frame: Annotated[
        str | None,
        typer.Option("--frame", "--frames", help="One frame or several panels: 0, 0,6,12, mean, phase:4"),
    ] = None,
    kind: Annotated[str | None, typer.Option("--kind", help=_KIND)] = None,
    quantity: Annotated[
        str | None, typer.Option("--quantity", help="What is mapped, or read by the probe: vorticity, or u,v")
    ] = None,
    region: Annotated[str | None, typer.Option("--region", help="Region of a curve")] = None,
    width: Annotated[
        str | None, typer.Option("--width", help="one or two columns, or millimetres", metavar="WIDTH")
    ] = None,
    font: Annotated[float | None, typer.Option("--font", help="Size of the text in points")] = None,
    dpi: Annotated[int | None, typer.Option("--dpi", help="Dots per inch of pictures")] = None,
    caption: Annotated[
        Path | None, typer.Option("--caption", help="Write the caption to this text file", metavar="FILE")
    ] = None,
    rate: Annotated[float, typer.Option("--rate", help="Frames a second of a moving picture")] = 5.0,
) -> int:
    """A publication figure, a moving picture, and the caption to it."""
    from fieldview.publish.figures import animation, make

    check_place(out)
    check_place(caption)
    changed = {
        "frames": frame,
        "kind": kind,
        "quantities": None if quantity is None else tuple(part.strip() for part in quantity.split(",")),
        "region": region,
        "width_mm": None if width is None else _width(width),
        "font_pt": font,
        "dpi": dpi,
    }
    moving = out.suffix[1:].lower() in animation.ENDINGS
    if moving and frame is None:
        changed["frames"] = "0:"
    made = make(session, out, name, changed, say=say, progress=progress, rate=rate)
    if caption is not None:
        write_text(caption, made.caption())
    return WITH_REMARKS if made.remarks else DONE


@app.command()
def workbook(
    session: SessionFile,
    out: Annotated[Path, typer.Option("--out", help="An .xlsx file", metavar="FILE")],
    frames: Frames = None,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Regions, run check and statistics as a workbook, every number with its unit and uncertainty."""
    from fieldview.publish import sharing
    from fieldview.publish.workbook import write_workbook

    check_place(out)
    with sharing.workers(workers, cluster) as executor:
        remarks = write_workbook(session, out, frames, progress=progress, say=say, executor=executor)
    return WITH_REMARKS if remarks else DONE


@app.command()
def report(
    session: SessionFile,
    out: Annotated[Path, typer.Option("--out", help="An .html file", metavar="FILE")],
    frames: Frames = None,
    choices: Annotated[
        bool, typer.Option("--choices", help="Study what the analyst's choices do; takes its time")
    ] = False,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """The measurement report: everything that was done, measured and assumed, in one file."""
    from fieldview.publish import sharing
    from fieldview.publish.report import write_report

    check_place(out)
    with sharing.workers(workers, cluster) as executor:
        remarks = write_report(
            session, out, frames, choices=choices, progress=progress, say=say, executor=executor
        )
    return WITH_REMARKS if remarks else DONE


def _width(text: str) -> float:
    from fieldview.session.figures import WIDTHS

    if text in WIDTHS:
        return WIDTHS[text]
    try:
        return float(text)
    except ValueError:
        raise InputError(f"--width {text}: write one, two, or a width in millimetres") from None
