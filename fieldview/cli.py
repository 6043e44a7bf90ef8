"""The ``loopflux`` command: parse, call, print.

Results go to stdout, talk to stderr. Exit status: 0 done; 1 done, but a requested value is null, a frame was
skipped or a source has changed; 2 bad request or bad input, one plain sentence on stderr, nothing written.
"""

from __future__ import annotations

import json
import os
import sys
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Annotated

import typer

from fieldview import __version__
from fieldview.compute.errors import InputError

DONE, WITH_REMARKS, REFUSED, STOPPED = 0, 1, 2, 130

# typer brings a parser of its own or uses one beside it; either way its usage errors have this base
UsageError = typer.BadParameter.__base__

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
        "--frames", help="Frames by number: 3, 0:100:5 or 0,4,8; mean, or fluctuation:3", metavar="WHICH"
    ),
]

Out = Annotated[
    Path | None, typer.Option("--out", help="Write to this file instead of stdout", metavar="FILE")
]
Strict = Annotated[bool, typer.Option("--strict", help="End at the first frame that cannot be read")]
Workers = Annotated[int, typer.Option("--workers", help="Processes that share the frames", metavar="N")]
Cluster = Annotated[
    str | None,
    typer.Option("--cluster", help="Scheduler of a dask cluster that shares the frames", metavar="ADDRESS"),
]


def main(arguments: list[str] | None = None) -> None:
    """Run the command and leave with its exit status."""
    sys.exit(run(sys.argv[1:] if arguments is None else list(arguments)))


def run(arguments: list[str]) -> int:
    """Run the command with these arguments; returns the exit status."""
    known = {command.name or command.callback.__name__ for command in app.registered_commands}
    options = ("--help", "--version")
    if not arguments or (arguments[0] not in known and arguments[0] not in options):
        arguments = ["open", *arguments]
    try:
        status = app(arguments, prog_name="loopflux", standalone_mode=False)
    except InputError as error:
        return _refuse(str(error))
    except UsageError as error:
        return _refuse(_usage(error))
    except (KeyboardInterrupt, typer.Abort):
        _say("stopped; what was finished is whole, the rest was not begun")
        return STOPPED
    except BrokenPipeError:
        # whoever reads our output has had enough; nothing is wrong
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    return status if isinstance(status, int) else DONE


@app.callback(invoke_without_command=True)
def _top(
    version: Annotated[bool, typer.Option("--version", help="Print the version and leave")] = False,
) -> None:
    if version:
        print(f"loopflux {__version__}")


@app.command(hidden=True)
def open(paths: Annotated[list[str] | None, typer.Argument(metavar="SESSION or FILES")] = None) -> int:
    """Open the window on a session, or on the files or the folder of a run."""
    paths = paths or []
    for path in paths:
        if path.startswith("-"):
            raise InputError(f"{path} is no option; loopflux --help lists what there is")
        if not Path(path).exists() and not any(sign in path for sign in "*?["):
            raise InputError(
                f"{path}: is neither a command nor a file that exists; loopflux --help lists the commands"
            )
    example = paths[0] if paths and paths[0].endswith(".json") else "SESSION"
    remedy = f"on a machine without a display use: loopflux measure {example}"
    if not _has_display():
        raise InputError(f"there is no display to open the window on; {remedy}")
    try:
        from fieldview.gui.app import run as run_window
    except ImportError as error:
        raise InputError(
            f"the window cannot be opened, Qt lacks a library of the system ({error}); {remedy}"
        ) from None
    return run_window(paths)


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
    format: Annotated[str, typer.Option("--format", help="table, csv or json")] = "table",
    out: Out = None,
    strict: Strict = False,
    workers: Workers = 1,
    cluster: Cluster = None,
) -> int:
    """Measure every region on every frame, with uncertainties."""
    from fieldview.publish import sharing
    from fieldview.publish.measuring import FORMATS, measurement

    if format not in FORMATS:
        raise InputError(f"--format {format} is not known; use {', '.join(FORMATS)}")
    _check_place(out)
    with sharing.workers(workers, cluster) as executor:
        done = measurement(
            session, frames, format, progress=_progress, say=_say, executor=executor, strict=strict
        )
    with done.text as text:
        if out is None:
            for block in iter(lambda: text.read(1 << 20), ""):
                sys.stdout.write(block)
            sys.stdout.flush()
        else:
            _write(out, text.read())
    return WITH_REMARKS if done.remarks else DONE


@app.command()
def check(
    session: SessionFile,
    frames: Frames = None,
    format: Annotated[str, typer.Option("--format", help="table, csv (one line a frame) or json")] = "table",
    out: Out = None,
) -> int:
    """Say whether the run is good: shares, outliers, noise, jumps, stuck frames, drift."""
    from fieldview.publish.run_reports import FORMATS, check_report

    if format not in FORMATS:
        raise InputError(f"--format {format} is not known; use {', '.join(FORMATS)}")
    _check_place(out)
    text, remarks = check_report(session, frames, format, progress=_progress, say=_say)
    _print(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def stats(
    session: SessionFile,
    frames: Frames = None,
    format: Annotated[str, typer.Option("--format", help="table, csv or json")] = "table",
    out: Out = None,
    at: Annotated[
        list[str] | None,
        typer.Option("--at", help="Show the values at the node nearest to x,y too", metavar="X,Y"),
    ] = None,
    maps: Annotated[
        Path | None,
        typer.Option("--maps", help="Write every map to this .csv, .nc or .npz file", metavar="FILE"),
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
    from fieldview.publish.run_reports import FORMATS, statistics_report

    if format not in FORMATS:
        raise InputError(f"--format {format} is not known; use {', '.join(FORMATS)}")
    _check_place(out)
    _check_place(maps)
    with sharing.workers(workers, cluster) as executor:
        text, remarks = statistics_report(
            session,
            frames,
            format,
            filled=filled,
            subtract_noise=subtract_noise,
            points=[_point(text) for text in at or ()],
            maps=maps,
            progress=_progress,
            say=_say,
            executor=executor,
        )
    _print(text, out)
    return WITH_REMARKS if remarks else DONE


@app.command()
def apply(
    session: SessionFile,
    out: Annotated[Path, typer.Option("--out", help="Folder that the results go into", metavar="DIR")],
    frames: Frames = None,
    to: Annotated[str, typer.Option("--to", help="csv, nc or npz")] = "csv",
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
            progress=_progress,
            say=_say,
            executor=executor,
            strict=strict,
        )
    return WITH_REMARKS if remarks else DONE


@app.command()
def sample(
    where: Annotated[
        list[str],
        typer.Argument(
            help="Which sample (all if left out), and the folder to write it to", metavar="[NAME] DIR"
        ),
    ],
) -> int:
    """Write a sample run with its session: fin_wake, stirred_tank or hood_face."""
    from fieldview.publish.samples import SAMPLES, write_sample

    if not 1 <= len(where) <= 2:
        raise InputError("sample takes a name and a folder, or a folder alone")
    *chosen, folder = where
    if chosen and chosen[0] not in SAMPLES:
        raise InputError(f"there is no sample {chosen[0]}; there are {', '.join(SAMPLES)}")
    if not chosen and folder in SAMPLES:
        raise InputError(f"name the folder too: loopflux sample {folder} DIR")
    for name in chosen or SAMPLES:
        print(write_sample(name, Path(folder)))
    return DONE


@app.command()
def schema() -> int:
    """Print the JSON Schema of the session file."""
    from fieldview.session.store import schema as session_schema

    print(json.dumps(session_schema(), indent=1))
    return DONE


def _check_place(path: Path | None) -> None:
    if path is not None and not path.absolute().parent.is_dir():
        raise InputError(f"{path}: its folder does not exist; make it first")


def _point(text: str) -> tuple[float, float]:
    try:
        x, y = (float(part) for part in text.split(","))
    except ValueError:
        raise InputError(
            f"--at {text}: write a point as x,y in the session's units, such as 0.1,0.02"
        ) from None
    return x, y


def _print(text: str, out: Path | None) -> None:
    if out is None:
        sys.stdout.write(text)
    else:
        _write(out, text)


def _has_display() -> bool:
    if os.environ.get("QT_QPA_PLATFORM") or not sys.platform.startswith("linux"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def _write(path: Path, text: str) -> None:
    from fieldview.files.writing import write_whole

    try:
        write_whole(path, text.encode())
    except OSError as error:
        raise InputError(f"{path}: cannot be written ({error.strerror}); choose another place") from None


def _progress(frames: Iterable, what: str, total: int) -> Iterator:
    """The frames, with a bar on stderr where that is a terminal."""
    if not sys.stderr.isatty() or total < 2:
        yield from frames
        return
    from rich.console import Console
    from rich.progress import track

    yield from track(frames, description=what, total=total, console=Console(stderr=True), transient=True)


def _say(sentence: str) -> None:
    print(f"loopflux: {sentence}", file=sys.stderr)


def _refuse(sentence: str) -> int:
    _say(" ".join(sentence.split()))
    return REFUSED


def _usage(error: UsageError) -> str:
    """What is wrong with the command line, in one sentence."""
    text = error.format_message().strip().rstrip(".")
    command = error.ctx.command_path if error.ctx is not None else "loopflux"
    command = command.removesuffix(" open")
    return f"{text[:1].lower()}{text[1:]}; {command} --help shows how it is used"
