"""Commands that repeat a measurement: choices, compare and repeats."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from fieldview.cli.terminal import (
    DONE,
    WITH_REMARKS,
    Cluster,
    Format,
    Out,
    SessionFile,
    Workers,
    app,
    check_format,
    check_place,
    print_text,
    progress,
    say,
)

OneFrame = Annotated[str, typer.Option("--frame", help="A number, mean, or phase:8:0", metavar="WHICH")]


def _output(format: str, out: Path | None):
    from fieldview.publish.outputs import FORMATS
    from fieldview.publish.study_reports import Output

    check_format(format, FORMATS)
    check_place(out)
    return Output(format, progress, say)


@app.command()
def choices(
    session: SessionFile,
    region: Annotated[str | None, typer.Option("--region", help="One region; all if left out")] = None,
    frame: OneFrame = "0",
    format: Format = "table",
    out: Out = None,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """How much of a number is the analyst: regions under every combination of defensible choices."""
    from fieldview.publish import sharing
    from fieldview.publish.study_reports import choices_report

    output = _output(format, out)
    with sharing.workers(workers, cluster) as executor:
        text, remarks = choices_report(session, region, frame, output, executor=executor)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def compare(
    first: Annotated[Path, typer.Argument(help="Session of the first frame, and of the regions")],
    second: Annotated[Path, typer.Argument(help="Session of the second frame; may be the same")],
    frame: OneFrame = "0",
    other: Annotated[
        str | None,
        typer.Option("--other", help="Frame of the second, else as --frame", metavar="WHICH"),
    ] = None,
    beyond: Annotated[
        float, typer.Option("--beyond", help="Count what differs by more than so many u", metavar="K")
    ] = 2.0,
    shared_calibration: Annotated[
        bool, typer.Option("--shared-calibration", help="Systematic errors are the same in both")
    ] = False,
    maps: Annotated[
        Path | None, typer.Option("--maps", help="Write the difference to this file", metavar="FILE")
    ] = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """Two frames side by side: difference with uncertainty, node by node and region by region."""
    from fieldview.publish.study_reports import comparison_report

    output = _output(format, out)
    check_place(maps)
    text, remarks = comparison_report(
        first,
        second,
        (frame, frame if other is None else other),
        output,
        coverage_factor=beyond,
        shared_calibration=shared_calibration,
        maps=maps,
    )
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def repeats(
    sessions: Annotated[
        list[Path], typer.Argument(help="Three or more sessions of the same thing, or one run of repeats")
    ],
    frames: Annotated[
        str | None,
        typer.Option(
            "--frames",
            help="Frame of every session (its mean if left out), or the frames of a single one",
            metavar="WHICH",
        ),
    ] = None,
    format: Format = "table",
    out: Out = None,
) -> int:
    """Does the scatter of repeats agree with the stated uncertainty: Type A and Birge ratio."""
    from fieldview.publish.study_reports import repeats_report

    output = _output(format, out)
    chosen = frames if frames is not None else "mean" if len(sessions) > 1 else "0:"
    text, remarks = repeats_report(sessions, chosen, output)
    print_text(text, out)
    return WITH_REMARKS if remarks else DONE
