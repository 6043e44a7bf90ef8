"""Opening the window, and the version."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Annotated

import typer

from fieldview import __version__
from fieldview.cli.terminal import app
from fieldview.compute.errors import InputError


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


def _has_display() -> bool:
    if os.environ.get("QT_QPA_PLATFORM") or not sys.platform.startswith("linux"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))
