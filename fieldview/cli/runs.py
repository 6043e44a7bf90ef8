"""Commands on whole runs: check, stats and apply."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from fieldview.cli.terminal import (
    DONE,
    WITH_REMARKS,
    Cluster,
    Format,
    Frames,
    Out,
    SessionFile,
    Strict,
    Workers,
    app,
    check_format,
    check_place,
    point_of,
    print_text,
    progress,
    say,
)


@app.command()
def check(
    session: SessionFile,
    frames: Frames = None,
    format: Annotated[str, typer.Option("--format", help="table, csv (one line a frame) or json")] = "table",
    out: Out = None,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Say whether the run is good: shares, outliers, noise, jumps, stuck frames, drift."""
    from fieldview.publish import sharing
    from fieldview.publish.outputs import FORMATS
    from fieldview.publish.run_reports import check_report

    check_format(format, FORMATS)
    check_place(out)
    with sharing.workers(workers, cluster) as executor:
        text, remarks = check_report(session, frames, format, progress=progress, say=say, executor=executor)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def stats(
    session: SessionFile,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
    at: Annotated[
        list[str] | None,
        typer.Option("--at", help="Show the values at the node nearest to x,y too", metavar="X,Y"),
    ] = None,
    maps: Annotated[
        Path | None,
        typer.Option("--maps", help="Write every map to this file too", metavar="FILE"),
    ] = None,
    filled: Annotated[bool, typer.Option("--filled", help="Count filled vectors as samples")] = False,
    subtract_noise: Annotated[
        bool, typer.Option("--subtract-noise", help="Take the noise's variance off the stresses")
    ] = False,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Statistics over the frames: mean, deviation, stresses, skewness, kurtosis, with uncertainties."""
    from fieldview.publish import sharing
    from fieldview.publish.outputs import FORMATS
    from fieldview.publish.run_reports import statistics_report

    check_format(format, FORMATS)
    check_place(out)
    check_place(maps)
    with sharing.workers(workers, cluster) as executor:
        text, remarks = statistics_report(
            session,
            frames,
            format,
            filled=filled,
            subtract_noise=subtract_noise,
            points=[point_of(text) for text in at or ()],
            maps=maps,
            progress=progress,
            say=say,
            executor=executor,
        )
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def store(session: SessionFile) -> int:
    """Keep the run in one binary file beside the session, for quick scrubbing of large text runs."""
    from fieldview.publish.storing import store_run

    return WITH_REMARKS if store_run(session, progress=progress, say=say) else DONE


@app.command()
def apply(
    session: SessionFile,
    out: Annotated[Path, typer.Option("--out", help="Folder that the results go into", metavar="DIR")],
    frames: Frames = None,
    to: Annotated[str, typer.Option("--to", help="csv, nc, npz, h5, mat, vti or vtr")] = "csv",
    quantities: Annotated[
        str | None,
        typer.Option("--quantities", help="Derived quantities to write too, such as vorticity,speed"),
    ] = None,
    strict: Strict = False,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Write the cleaned field of every frame, the region table and a record of what was done."""
    from fieldview.publish import sharing
    from fieldview.publish.applying import apply_session

    names = [name.strip() for name in (quantities or "").split(",") if name.strip()]
    with sharing.workers(workers, cluster) as executor:
        remarks = apply_session(
            session,
            out,
            frames=frames,
            to=to,
            quantities=names,
            progress=progress,
            say=say,
            executor=executor,
            strict=strict,
        )
    return WITH_REMARKS if remarks else DONE
