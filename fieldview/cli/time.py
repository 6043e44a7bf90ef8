"""Commands on a run over its time: series, cycle, modes and correlate."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from fieldview.cli.terminal import (
    DONE,
    WITH_REMARKS,
    Format,
    Frames,
    Out,
    SessionFile,
    app,
    check_format,
    check_place,
    point_of,
    print_text,
    progress,
    say,
)
from fieldview.compute.errors import InputError

Maps = Annotated[Path | None, typer.Option("--maps", help="Write the maps to this file too", metavar="FILE")]
Filled = Annotated[bool, typer.Option("--filled", help="Count filled vectors as samples")]


def _request(session: Path, frames: str | None, format: str, out: Path | None, maps: Path | None = None):
    from fieldview.publish.outputs import FORMATS
    from fieldview.publish.time_reports import Request

    check_format(format, FORMATS)
    check_place(out)
    check_place(maps)
    return Request(session, frames, format, progress, say)


@app.command()
def series(
    session: SessionFile,
    at: Annotated[
        str | None,
        typer.Option("--at", help="Where a probe is, in the session's units", metavar="X,Y"),
    ] = None,
    quantity: Annotated[str, typer.Option("--quantity", help="What the probe reads")] = "speed",
    region: Annotated[str | None, typer.Option("--region", help="A region in place of a probe")] = None,
    number: Annotated[str, typer.Option("--number", help="Which number of the region")] = "circulation",
    band: Annotated[
        str | None,
        typer.Option("--band", help="Look for the dominant frequency between these", metavar="LOW,HIGH"),
    ] = None,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """A probe or a region over time: mean, time scale, spectrum, dominant frequency, Strouhal number."""
    from fieldview.publish.time_reports import series_report

    request = _request(session, frames, format, out)
    if (at is None) == (region is None):
        raise InputError("series needs either a probe, --at X,Y, or a region, --region NAME")
    text, remarks = series_report(
        request,
        point=None if at is None else point_of(at),
        quantity=quantity,
        region=region,
        number=number,
        band=None if band is None else _band(band),
    )
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def cycle(
    session: SessionFile,
    bins: Annotated[int, typer.Option("--bins", help="Bins of the cycle")] = 8,
    filled: Filled = False,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """The bins of a phase average: frames, width, jitter and what the average smears away."""
    from fieldview.publish.time_reports import cycle_report

    text, remarks = cycle_report(_request(session, frames, format, out), bins, filled=filled)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def modes(
    session: SessionFile,
    count: Annotated[int, typer.Option("--count", help="Modes to keep")] = 10,
    filled: Filled = False,
    maps: Maps = None,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """Proper orthogonal decomposition by snapshots: energy shares, coefficients, modes as maps."""
    from fieldview.publish.time_reports import modes_report

    request = _request(session, frames, format, out, maps)
    text, remarks = modes_report(request, count, filled=filled, maps=maps)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def correlate(
    session: SessionFile,
    at: Annotated[str, typer.Option("--at", help="The reference, x,y in the session's units", metavar="X,Y")],
    first: Annotated[str, typer.Option("--first", help="Component at the reference")] = "u",
    second: Annotated[
        str | None, typer.Option("--second", help="Component elsewhere; the same if left out")
    ] = None,
    maps: Maps = None,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """Two-point correlation about a node, and the integral lengths it has along the axes."""
    from fieldview.publish.time_reports import correlation_report

    request = _request(session, frames, format, out, maps)
    text, remarks = correlation_report(request, point=point_of(at), first=first, second=second, maps=maps)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


def _band(text: str) -> tuple[float, float]:
    try:
        low, high = (float(part) for part in text.split(","))
    except ValueError:
        raise InputError(f"--band {text}: write two frequencies as LOW,HIGH, such as 1,3") from None
    return low, high
