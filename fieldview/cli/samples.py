"""Sample sessions and the schema of the session file."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated

import typer

from fieldview.cli.terminal import DONE, app
from fieldview.compute.errors import InputError


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
