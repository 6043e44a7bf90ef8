"""The ``loopflux`` command: parse, call, print. One module for each group of commands."""

from __future__ import annotations

import os
import sys

import typer

# each registers its commands
from fieldview.cli import measuring, opening, outputs, runs, samples, studies, time  # noqa: F401
from fieldview.cli.terminal import DONE, REFUSED, STOPPED, app, say
from fieldview.compute.errors import InputError

__all__ = ["main", "run"]

# typer brings a parser of its own or uses one beside it; either way its usage errors have this base
UsageError = typer.BadParameter.__base__


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
        say("stopped; what was finished is whole, the rest was not begun")
        return STOPPED
    except BrokenPipeError:
        # whoever reads our output has had enough; nothing is wrong
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    return status if isinstance(status, int) else DONE


def _refuse(sentence: str) -> int:
    say(" ".join(sentence.split()))
    return REFUSED


def _usage(error: UsageError) -> str:
    """What is wrong with the command line, in one sentence."""
    text = error.format_message().strip().rstrip(".")
    command = error.ctx.command_path if error.ctx is not None else "loopflux"
    command = command.removesuffix(" open")
    return f"{text[:1].lower()}{text[1:]}; {command} --help shows how it is used"
