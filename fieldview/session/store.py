"""Session files: read with a clear word about every mistake, written whole or not at all."""

from __future__ import annotations

import hashlib
import json
import math
import os
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from fieldview.compute.errors import InputError
from fieldview.files.writing import said_if_unwritable, write_whole
from fieldview.session.models import FORMAT, VERSION, Session

MIGRATIONS: dict[int, Callable[[dict], dict]] = {}
"""For each older version the function that turns its document into the next version's."""


def load_session(path: str | Path) -> Session:
    """The session in a file; its folder is kept beside the value.

    Raises
    ------
    InputError
        The file cannot be read, is no session, is newer than this program, or has a wrong or unknown
        key; the message names the file, the place and the remedy.
    """
    path = Path(path)
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except OSError as error:
        raise InputError(f"{path}: cannot be read ({error.strerror}); check the path") from None
    except UnicodeDecodeError:
        raise InputError(f"{path}: is not UTF-8 text, so it is no session file") from None
    return parse_session(text, name=str(path)).in_folder(path.parent)


def parse_session(text: str, *, name: str = "session") -> Session:
    """The session written in ``text``; ``name`` is what errors call it."""
    try:
        document = json.loads(text, parse_constant=_no_constant, object_pairs_hook=_once)
    except json.JSONDecodeError as error:
        raise InputError(f"{name}, line {error.lineno}: is not valid JSON ({error.msg})") from None
    except (ValueError, RecursionError) as error:
        raise InputError(f"{name}: {error}") from None
    if not isinstance(document, dict) or document.get("format") != FORMAT:
        raise InputError(f'{name}: is no session file; it must say "format": "{FORMAT}"')
    try:
        return Session.model_validate(_migrated(document, name))
    except ValidationError as error:
        raise InputError(f"{name}: {_plain(error)}") from None


def save_session(session: Session, path: str | Path) -> None:
    """Write the session, whole or not at all; the run's paths are rewritten relative to the new file.

    Raises InputError where the file cannot be written.
    """
    path = Path(path)
    moved = _relative_to(session, path.parent)
    with said_if_unwritable(path):
        write_whole(path, dump_session(moved).encode())


def dump_session(session: Session) -> str:
    """The session as JSON text; the same session gives the same text."""
    document = session.model_dump(mode="json", exclude_none=True)
    if not session.figures:
        del document["figures"]
    return _laid_out(document) + "\n"


def session_digest(session: Session) -> str:
    """sha256 of the session's text."""
    return "sha256:" + hashlib.sha256(dump_session(session).encode()).hexdigest()


def stem_of(path: Path) -> str:
    """``wake`` of ``wake.session.json``: what is made of a session is called after it."""
    return path.name.removesuffix(".json").removesuffix(".session")


def schema() -> dict[str, Any]:
    """JSON Schema of the session file."""
    return Session.model_json_schema()


def _migrated(document: dict, name: str) -> dict:
    version = document.get("version")
    if not isinstance(version, int) or isinstance(version, bool):
        raise InputError(f"{name}: version is {version!r}; it must be a whole number, {VERSION} now")
    if version > VERSION:
        raise InputError(
            f"{name}: is of version {version}, this program knows up to {VERSION}; use a newer Loopflux"
        )
    while version < VERSION:
        if version not in MIGRATIONS:
            raise InputError(f"{name}: version {version} was never in use; versions start at 1")
        document = MIGRATIONS[version](document)
        version += 1
    return document


def _no_constant(word: str):
    raise ValueError(f"has the number {word}, which JSON does not know; write null or leave the key out")


def _once(pairs: list[tuple[str, Any]]) -> dict:
    entries = dict(pairs)
    if len(entries) < len(pairs):
        keys = [key for key, _ in pairs]
        twice = next(key for key in keys if keys.count(key) > 1)
        raise ValueError(f'has the key "{twice}" twice in one place; keep one')
    return entries


_WORDS = {
    "extra_forbidden": "is not a known key; correct or remove it",
    "missing": "is required but left out",
}


def _plain(error: ValidationError) -> str:
    """The first thing that is wrong, in one sentence with its place."""
    first = error.errors()[0]
    place = _place(first["loc"])
    if first["type"] == "union_tag_invalid":
        tag, known = first["ctx"]["tag"], first["ctx"]["expected_tags"].replace("'", "")
        return f'{place}: "{tag}" is not known; use one of {known}'
    if first["type"] == "union_tag_not_found":
        key = first["ctx"]["discriminator"].strip("'")
        return f"{place}.{key} is required but left out"
    word = _WORDS.get(first["type"])
    if word:
        return f"{place} {word}"
    if not place:
        return first["msg"].removeprefix("Value error, ")
    came = first["input"]
    message = re.sub(r" or instance of \w+", "", first["msg"].removeprefix("Value error, "))
    message = message.replace("dictionary", "object").replace("Tuple should", "list should")
    message = message.replace(" after validation", "")
    message = message[:1].lower() + message[1:]
    if isinstance(came, str | int | float | bool) or came is None:
        return f"{place} is {json.dumps(came)}: {message}"
    return f"{place}: {message}"


def _place(location: tuple) -> str:
    """ledger[2].threshold for ("ledger", 2, "median_test", "threshold"); union tags are left out."""
    from fieldview.session.regions import Region
    from fieldview.session.steps import STEP_MODELS

    tags = {model.model_fields["step"].default for model in STEP_MODELS}
    tags |= {model.model_fields["shape"].default for model in Region.__origin__.__args__}
    text = ""
    for before, part in zip((None, *location), location, strict=False):
        if isinstance(part, int):
            text += f"[{part}]"
        elif not ((part in tags and (isinstance(before, int) or before == "region")) or _is_type(part)):
            text += f".{part}" if text else part
    return text


def _is_type(part: str) -> bool:
    """Whether a part of an error's place is the name of a type tried, and no key of the file."""
    return "[" in part or part in {"float", "int", "str"} or part.startswith(("constrained", "literal"))


def _relative_to(session: Session, folder: Path) -> Session:
    if session.folder.resolve() == folder.resolve():
        return session.in_folder(folder)

    def moved(entry: str) -> str:
        absolute = os.path.abspath(session.folder / entry)
        return Path(os.path.relpath(absolute, folder.resolve())).as_posix()

    run = session.run.model_copy(
        update={
            "files": tuple(moved(entry) for entry in session.run.files),
            "store": None if session.run.store is None else moved(session.run.store),
            "digests": {moved(entry): digest for entry, digest in session.run.digests.items()},
        }
    )
    return session.model_copy(update={"run": run}).in_folder(folder)


def _laid_out(value: Any, indent: int = 0) -> str:
    """JSON with one entry a line, but what is short or made of numbers only kept on one line."""
    flat = json.dumps(value, ensure_ascii=False, allow_nan=False)
    if not isinstance(value, dict | list) or len(flat) + indent <= 100 or _numbers_only(value):
        return flat
    inner = " " * (indent + 1)
    if isinstance(value, dict):
        rows = [
            f"{inner}{json.dumps(key, ensure_ascii=False)}: {_laid_out(entry, indent + 1)}"
            for key, entry in value.items()
        ]
        return "{\n" + ",\n".join(rows) + "\n" + " " * indent + "}"
    return (
        "[\n"
        + ",\n".join(inner + _laid_out(entry, indent + 1) for entry in value)
        + "\n"
        + " " * indent
        + "]"
    )


def _numbers_only(value: Any) -> bool:
    if isinstance(value, list):
        return all(_numbers_only(entry) for entry in value)
    return isinstance(value, int | float) and math.isfinite(value)
