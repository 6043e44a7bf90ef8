"""Delimited text: read in any dialect, written in one of our own that reads back to the last bit."""

from __future__ import annotations

import gzip
import io
import re
import zlib
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.contents import ROWS, Contents, Variable
from fieldview.files.dialect import (
    COMMENT_MARKS,
    MISSING_WORDS,
    NAMES_OF_DELIMITERS,
    SAMPLE_LINES,
    Dialect,
    decoded,
    find_dialect,
    is_number,
)
from fieldview.files.writing import remarks_of, said_by_remarks, values_of, write_whole

SUFFIXES = (".csv", ".txt", ".dat", ".tsv", ".asc")
_HEAD_BYTES = 65_536


def read(path: Path) -> Contents:
    """The table in a text file, plain or compressed with gzip."""
    raw = _bytes_of(path)
    text = raw
    head = _head(raw, path.name)
    dialect = find_dialect(head[:SAMPLE_LINES] if len(head) > SAMPLE_LINES else head, path.name)
    if b"\0" in raw[:4000] or (not raw.isascii() and not _is_utf8(raw)):
        text = decoded(raw, path.name).encode()
    elif raw.startswith(b"\xef\xbb\xbf"):
        text = raw[3:]
    table = _table(text, dialect, path)
    stated = said_by_remarks(dialect.remarks)
    rows = [dialect.split(line) for line in head[dialect.first_line :][:8] if line.strip()]
    variables, notes = [], []
    for number, (name, unit) in enumerate(zip(dialect.names, dialect.units, strict=True)):
        column = table[number]
        samples = tuple(row[number] for row in rows[:3] if number < len(row))
        if column.dtype != object and np.isnan(column).all() and name == f"column {number}":
            continue  # what a delimiter at the end of every line leaves
        is_text = column.dtype == object
        if is_text and not _has_numbers(column, dialect.decimal):
            notes.append(f'the column "{name}" holds words and is not read')
        variables.append(
            Variable(
                name,
                unit,
                (ROWS,),
                (column.size,),
                _numbers_of(path, column, name, number, dialect),
                samples=samples,
                attributes={"text": is_text, "role": name if stated and name == "status" else None},
            )
        )
    _refuse_short_rows(path, table, dialect)
    kind = f"text, {NAMES_OF_DELIMITERS[dialect.delimiter]} between columns"
    kind += ", decimal comma" if dialect.decimal == "," else ""
    return Contents(
        path, kind, tuple(variables), tuple(notes), tuple(map(tuple, [dialect.names, *rows])), stated
    )


def write_csv(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as comma-separated text: x, y, components, status, uncertainties, channels, quantities.

    Positions are plane coordinates; what is not valid is left empty. The numbers are written with as many
    digits as it takes to read the same numbers back.
    """
    import pandas

    columns = {
        name: (np.ravel(values), unit) for name, (values, unit) in values_of(field, quantities).items()
    }
    table = pandas.DataFrame({name: values for name, (values, _) in columns.items()})
    header = ",".join(f"{name} [{unit}]" if name != "status" else name for name, (_, unit) in columns.items())
    text = "".join(f"# {line}\n" for line in remarks_of(field, attributes)) + header + "\n"
    text += table.to_csv(index=False, header=False, lineterminator="\n")
    write_whole(Path(path), text.encode())


def _bytes_of(path: Path) -> bytes:
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise InputError(f"{path}: cannot be read ({error.strerror}); check the path") from None
    if raw.startswith(b"\x1f\x8b"):
        try:
            raw = gzip.decompress(raw)
        except (OSError, EOFError, zlib.error):
            raise InputError(f"{path.name}: is cut off or not whole gzip data; fetch it again") from None
    return raw


def _head(raw: bytes, name: str) -> list[str]:
    """The first lines; a last line that is not whole is left out."""
    cut = raw[:_HEAD_BYTES]
    if len(raw) > _HEAD_BYTES:
        # an even number of bytes, and no sign of several bytes cut apart
        end = cut.rfind(b"\n")
        cut = cut[: end + 1] if end > 0 and b"\0" not in cut[:200] else cut
    return decoded(cut, name).splitlines()


def _is_utf8(raw: bytes) -> bool:
    try:
        raw.decode()
    except UnicodeDecodeError:
        return False
    return True


def _table(text: bytes, dialect: Dialect, path: Path) -> list[np.ndarray]:
    """Columns of the table: float arrays, or object arrays where there are words among the numbers."""
    import pandas

    start = _start_of_line(text, dialect.first_line)
    if max(text.find(b"D", start), text.find(b"d", start)) >= 0:
        text = text[:start] + re.sub(rb"(\d\.?)[dD]([+-]?\d)", rb"\1e\2", text[start:])
    # one sign is looked for before two: that is done at the speed of memory
    marks = [mark for mark in (b"#", b"%", b"!") if text.find(mark, start) >= 0]
    mark = next((mark.decode() for mark in marks if text.find(b"\n" + mark, start) >= 0), None)
    stream = io.BytesIO(text)
    stream.seek(start)
    try:
        frame = pandas.read_csv(
            stream,
            sep=r"\s+" if dialect.delimiter == " " else dialect.delimiter,
            decimal=dialect.decimal,
            header=None,
            names=range(len(dialect.names)),
            comment=mark,
            na_values=sorted(_words()),
            skipinitialspace=dialect.delimiter != " ",
            low_memory=False,
        )
    except (pandas.errors.ParserError, ValueError):
        _refuse_odd_rows(path, dialect)
        raise InputError(f"{path.name}: is no table that can be read; export it again") from None
    columns = []
    for number in range(len(dialect.names)):
        column = frame[number]
        plain = column.dtype.kind in "fiub"
        columns.append(column.to_numpy(float) if plain else column.to_numpy(object))
    return columns


def _start_of_line(text: bytes, line: int) -> int:
    start = 0
    for _ in range(line):
        start = text.find(b"\n", start) + 1
    return start


def _words() -> set[str]:
    words = {word for word in MISSING_WORDS if word not in ("inf", "-inf")}
    return words | {word.upper() for word in words} | {word.capitalize() for word in words}


def _has_numbers(column: np.ndarray, decimal: str) -> bool:
    return any(is_number(str(cell), decimal) for cell in column[:200])


def _numbers_of(path: Path, column: np.ndarray, name: str, number: int, dialect: Dialect):
    def fetch(_fixed) -> np.ndarray:
        if column.dtype != object:
            return np.where(np.isinf(column), np.nan, column) if np.isinf(column).any() else column
        _refuse_words(path, name, number, dialect)
        raise InputError(f'{path.name}: the column "{name}" holds words where numbers are wanted')

    return fetch


def _written_rows(path: Path, dialect: Dialect):
    """(line number, cells) of every row of the table, as it stands in the file."""
    lines = decoded(_bytes_of(path), path.name).splitlines()
    for number, line in enumerate(lines[dialect.first_line :], dialect.first_line + 1):
        if line.strip() and not line.lstrip().startswith(COMMENT_MARKS):
            yield number, dialect.split(line)


def _refuse_words(path: Path, name: str, column: int, dialect: Dialect) -> None:
    for line, cells in _written_rows(path, dialect):
        cell = cells[column] if column < len(cells) else ""
        if not is_number(cell, dialect.decimal) and cell.lower() not in MISSING_WORDS:
            raise InputError(
                f'{path.name}, line {line}: "{cell[:40]}" in the column "{name}" is no number; '
                "correct the line"
            )


def _refuse_odd_rows(path: Path, dialect: Dialect) -> None:
    width = len(dialect.names)
    for line, cells in _written_rows(path, dialect):
        if len(cells) > width and any(cells[width:]):
            raise InputError(
                f"{path.name}, line {line}: has {len(cells)} columns where the other lines have {width}; "
                "correct the line"
            )


def _refuse_short_rows(path: Path, table: list[np.ndarray], dialect: Dialect) -> None:
    """A row that ends early is no row with missing values: the file was cut off."""
    last = table[-1]
    empty = (
        np.array([cell is None or cell != cell for cell in last]) if last.dtype == object else np.isnan(last)
    )
    if not empty.any():
        return
    width = len(dialect.names)
    lacking = np.flatnonzero(empty)
    for row, (line, cells) in enumerate(_written_rows(path, dialect)):
        if row > lacking[-1]:
            return
        if len(cells) < width and (row == last.size - 1 or len(cells) < width - 1 or cells[-1:] != [""]):
            raise InputError(
                f"{path.name}, line {line}: has {len(cells)} of {width} columns, the file seems cut off; "
                "export it again or remove the line"
            )
