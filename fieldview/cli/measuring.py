"""Commands on single frames: peek and measure."""

from __future__ import annotations

import sys
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
    progress,
    say,
    write_text,
)


@app.command()
def peek(
    files: Annotated[list[Path], typer.Argument(help="Data files")],
    session: Annotated[
        Path | None, typer.Option("--session", help="Read as this session says", metavar="SESSION")
    ] = None,
) -> int:
    """Say how files would be read: columns, units, senses, grid, gaps, doubts."""
    from fieldview.files import expand
    from fieldview.files import peek as look

    reading = None
    if session is not None:
        from fieldview.session.store import load_session

        reading = load_session(session).run.reading
    told = [look(path, reading) for path in expand(files)]
    print("\n".join(one.text() for one in told), end="")
    return WITH_REMARKS if any(one.questions for one in told) else DONE


@app.command()
def measure(
    session: SessionFile,
    frames: Frames = None,
    format: Format = "table",
    out: Out = None,
    strict: Strict = False,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Measure every region on every frame, with uncertainties."""
    from fieldview.publish import sharing
    from fieldview.publish.measuring import FORMATS, measurement

    check_format(format, FORMATS)
    check_place(out)
    with sharing.workers(workers, cluster) as executor:
        done = measurement(
            session, frames, format, progress=progress, say=say, executor=executor, strict=strict
        )
    with done.text as text:
        if out is None:
            for block in iter(lambda: text.read(1 << 20), ""):
                sys.stdout.write(block)
            sys.stdout.flush()
        else:
            write_text(out, text.read())
    return WITH_REMARKS if done.remarks else DONE
