"""What all commands share: the app, options, exit statuses, and talking to the terminal.

Results go to stdout, talk to stderr. Exit status: 0 done; 1 done, but a requested value is null, a frame was
skipped or a source has changed; 2 bad request or bad input, one plain sentence on stderr, nothing written.
"""

from __future__ import annotations

import sys
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Annotated

import typer

from fieldview.compute.errors import InputError

DONE, WITH_REMARKS, REFUSED, STOPPED = 0, 1, 2, 130

app = typer.Typer(
    name="loopflux",
    help="Circulation, flux and their uncertainty from measured two-dimensional velocity fields. "
    "With a session or files instead of a command, the window opens on them.",
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    no_args_is_help=False,
)

SessionFile = Annotated[Path, typer.Argument(help="A session file, NAME.session.json", metavar="SESSION")]
Frames = Annotated[
    str | None,
    typer.Option(
        "--frames",
        help="Frames by number: 3, 0:100:5 or 0,4,8; mean, fluctuation:3, or phase:8 for averages by phase",
        metavar="WHICH",
    ),
]

Format = Annotated[str, typer.Option("--format", help="table, csv or json")]
Out = Annotated[
    Path | None, typer.Option("--out", help="Write to this file instead of stdout", metavar="FILE")
]
Strict = Annotated[bool, typer.Option("--strict", help="End at the first frame that cannot be read")]
Workers = Annotated[int, typer.Option("--workers", help="Processes that share the frames", metavar="N")]
Cluster = Annotated[
    str | None,
    typer.Option("--cluster", help="Scheduler of a dask cluster that shares the frames", metavar="ADDRESS"),
]


def check_format(format: str, known: Iterable[str]) -> None:
    """Refuse a --format that is not known."""
    if format not in known:
        raise InputError(f"--format {format} is not known; use {', '.join(known)}")


def check_place(path: Path | None) -> None:
    """Refuse a file whose folder does not exist, before the work begins."""
    if path is not None and not path.absolute().parent.is_dir():
        raise InputError(f"{path}: its folder does not exist; make it first")


def point_of(text: str) -> tuple[float, float]:
    """The point that --at names."""
    try:
        x, y = (float(part) for part in text.split(","))
    except ValueError:
        raise InputError(
            f"--at {text}: write a point as x,y in the session's units, such as 0.1,0.02"
        ) from None
    return x, y


def print_text(text: str, out: Path | None) -> None:
    """To stdout, or whole to a file."""
    if out is None:
        sys.stdout.write(text)
    else:
        write_text(out, text)


def write_text(path: Path, text: str) -> None:
    """Write a file whole or not at all."""
    from fieldview.files.writing import said_if_unwritable, write_whole

    with said_if_unwritable(path):
        write_whole(path, text.encode())


def progress(frames: Iterable, what: str, total: int) -> Iterator:
    """The frames, with a bar on stderr where that is a terminal."""
    if not sys.stderr.isatty() or total < 2:
        yield from frames
        return
    from rich.console import Console
    from rich.progress import track

    yield from track(frames, description=what, total=total, console=Console(stderr=True), transient=True)


def say(sentence: str) -> None:
    """A sentence to stderr."""
    print(f"loopflux: {sentence}", file=sys.stderr)
