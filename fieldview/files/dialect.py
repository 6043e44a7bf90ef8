"""How a text file is written: encoding, delimiter, decimal sign, header. Found from its first lines."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

from fieldview.compute.errors import InputError

MISSING_WORDS = frozenset(
    [
        "",
        "nan",
        "na",
        "n/a",
        "null",
        "none",
        "nil",
        "-",
        "--",
        "---",
        "missing",
        "masked",
        "*",
        "?",
        "inf",
        "-inf",
    ]
)
COMMENT_MARKS = ("#", "%", "//", "!", '"#')
SAMPLE_LINES = 120
DELIMITERS = ("\t", ";", ",", " ")
NAMES_OF_DELIMITERS = {"\t": "tab", ";": "semicolon", ",": "comma", " ": "blanks"}

_NUMBER = r"[+-]?(?:\d+{d}?\d*|{d}\d+)(?:[eEdD][+-]?\d+)?"
_WORD = re.compile(r"[^\t;,]*[A-Za-z:][^\t;,]*")
_NUMBERS = {".": re.compile(_NUMBER.format(d=r"\.")), ",": re.compile(_NUMBER.format(d=","))}


@dataclass(frozen=True)
class Dialect:
    """How a table is written.

    Attributes
    ----------
    delimiter : str
        One of tab, semicolon, comma or blank (any number of blanks).
    decimal : str
        ``.`` or ``,``
    first_line : int
        Index of the first line of numbers.
    names, units : tuple
        One entry per column; a unit is None where the file says nothing.
    remarks : tuple of str
        The comment lines above the numbers, without their marks.
    """

    delimiter: str
    decimal: str
    first_line: int
    names: tuple[str, ...]
    units: tuple[str | None, ...]
    remarks: tuple[str, ...]

    def split(self, line: str) -> list[str]:
        """The cells of one line."""
        return _split(line, self.delimiter)


def decoded(raw: bytes, name: str) -> str:
    """Text of a file in UTF-8 with or without mark, UTF-16 or Windows-1252. InputError where it is none."""
    for mark, encoding in ((b"\xef\xbb\xbf", "utf-8-sig"), (b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16")):
        if raw.startswith(mark):
            return _decoded(raw, encoding, name)
    head = raw[:4000]
    if b"\0" in head:
        # UTF-16 without a mark has a zero in every second byte of plain letters and digits
        for start, encoding in ((1, "utf-16-le"), (0, "utf-16-be")):
            if head[start::2].count(0) > 0.9 * len(head[start::2]) and not head[1 - start :: 2].count(0):
                return _decoded(raw, encoding, name)
        raise InputError(f"{name}: is a binary file of no known kind; export it as text, NetCDF, HDF5 or NPZ")
    try:
        return raw.decode("utf-8")
    except UnicodeDecodeError:
        text = raw.decode("cp1252", errors="replace")
    odd = sum(1 for sign in text[:4000] if sign == "�" or (sign < " " and sign not in "\t\r\n\f"))
    if odd > 0.01 * min(len(text), 4000):
        raise InputError(f"{name}: is a binary file of no known kind; export it as text, NetCDF, HDF5 or NPZ")
    return text


def _decoded(raw: bytes, encoding: str, name: str) -> str:
    try:
        return raw.decode(encoding)
    except UnicodeDecodeError:
        raise InputError(
            f"{name}: begins as {encoding.upper()} text but does not go on so; export it again"
        ) from None


def find_dialect(lines: list[str], name: str) -> Dialect:
    """How the table in these first lines of a file is written.

    Raises InputError where no line holds two numbers or more.
    """
    best, best_score = None, (0, 0)
    for delimiter in DELIMITERS:
        for decimal in (".", ",") if delimiter != "," else (".",):
            score = _score(lines, delimiter, decimal)
            if score > best_score:
                best, best_score = (delimiter, decimal), score
    if best is None:
        raise InputError(f"{name}{_why_no_table(lines)}")
    delimiter, decimal = best
    width = _width(lines, delimiter, decimal)
    first = next(i for i, line in enumerate(lines) if _is_data(line, delimiter, decimal, width))
    above = lines[:first]
    names, units = _header(above, delimiter, width)
    remarks = tuple(_uncommented(line) for line in above if _is_comment(line))
    return Dialect(delimiter, decimal, first, names, units, remarks)


def is_number(cell: str, decimal: str = ".") -> bool:
    return _NUMBERS[decimal].fullmatch(cell.strip()) is not None


def _split(line: str, delimiter: str) -> list[str]:
    if delimiter == " ":
        return line.split()
    cells = [cell.strip().strip('"').strip() for cell in line.rstrip("\r\n").split(delimiter)]
    return cells


def _score(lines: list[str], delimiter: str, decimal: str) -> tuple[int, int]:
    """Number of lines that are rows of numbers of one width, and that width."""
    widths = Counter(_data_width(line, delimiter, decimal) for line in lines)
    widths.pop(0, None)
    return max(((count, width) for width, count in widths.items()), default=(0, 0))


def _width(lines: list[str], delimiter: str, decimal: str) -> int:
    return _score(lines, delimiter, decimal)[1]


def _data_width(line: str, delimiter: str, decimal: str) -> int:
    """Number of cells of a row of numbers; 0 where the line is none."""
    if not line.strip() or _is_comment(line):
        return 0
    cells = _split(line, delimiter)
    if len(cells) < 2:
        return 0
    numbers = sum(is_number(cell, decimal) for cell in cells)
    if numbers == 0:
        return 0
    others = [cell for cell in cells if not is_number(cell, decimal) and cell.lower() not in MISSING_WORDS]
    # a column of words may stand among the numbers, but a cell that holds a delimiter is none
    if others and (numbers < 2 or not all(_WORD.fullmatch(cell) for cell in others)):
        return 0
    return len(cells)


def _is_data(line: str, delimiter: str, decimal: str, width: int) -> bool:
    return _data_width(line, delimiter, decimal) == width


def _is_comment(line: str) -> bool:
    return line.lstrip().startswith(COMMENT_MARKS)


def _uncommented(line: str) -> str:
    return line.strip().lstrip('#%!/"').rstrip('"').strip()


def _header(above: list[str], delimiter: str, width: int) -> tuple[tuple[str, ...], tuple[str | None, ...]]:
    """Names and units from the lines over the numbers; the last that has a cell for every column."""
    rows = [_header_cells(line, delimiter, width) for line in above if line.strip()]
    while rows and rows[-1] is None and len(rows) > 1 and rows[-2] is not None:
        rows.pop()  # a ruler or remark between header and numbers
    names = rows[-1] if rows else None
    unit_row = None
    if names is not None and len(rows) > 1 and rows[-2] is not None and _is_unit_row(names):
        names, unit_row = rows[-2], names
    if names is None:
        return tuple(f"column {i}" for i in range(width)), (None,) * width
    found = [_name_and_unit(cell) for cell in names]
    if unit_row is not None:
        units = [_bare_unit(cell) or unit for cell, (_, unit) in zip(unit_row, found, strict=True)]
    else:
        units = [unit for _, unit in found]
    plain = [name or f"column {i}" for i, (name, _) in enumerate(found)]
    counted = Counter(plain)
    unique = [name if counted[name] == 1 else f"{name} ({i})" for i, name in enumerate(plain)]
    return tuple(unique), tuple(units)


def _header_cells(line: str, delimiter: str, width: int) -> list[str] | None:
    """The cells of a header line, which may be parted otherwise than the numbers; None if it is none."""
    text = _uncommented(line) if _is_comment(line) else line
    for parted in (delimiter, "\t", ",", ";"):
        if parted != " ":
            cells = _split(text, parted)
            if len(cells) == width + 1 and not cells[-1]:
                cells.pop()
            if len(cells) == width and any(cells):
                return cells
    # blanks part the names, but not a name from the unit behind it
    cells = re.findall(r"[^\s\[\](){}]+(?:\s*[\[({][^\])}]*[\])}])?|[\[({][^\])}]*[\])}]", text)
    return cells if len(cells) == width else None


def _name_and_unit(cell: str) -> tuple[str, str | None]:
    """``Vx [m/s]`` or ``Vx (m/s)`` is a name and a unit; so is ``x_mm``."""
    cell = cell.strip().strip('"')
    match = re.fullmatch(r"(.*?)\s*[\[({]([^\])}]*)[\])}]\s*", cell)
    if match:
        return match[1].strip(), match[2].strip()
    match = re.fullmatch(r"(x|y|u|v|w|vx|vy|vz|t|time)_([a-zµ]+(?:/s)?)", cell, re.IGNORECASE)
    if match and match[2].lower() in ("m", "mm", "cm", "um", "µm", "px", "m/s", "mm/s", "cm/s", "s", "ms"):
        return match[1], match[2]
    return cell, None


def _bare_unit(cell: str) -> str | None:
    return cell.strip().strip("[](){}").strip() or None


def _is_unit_row(cells: list[str]) -> bool:
    """Whether a line under the names gives units: brackets all along, or words that are units."""
    from fieldview.files.units import parse_unit

    filled = [cell for cell in cells if cell.strip()]
    if all(re.fullmatch(r"[\[({].*[\])}]", cell.strip()) for cell in filled):
        return True
    known = 0
    for cell in filled:
        try:
            known += parse_unit(_bare_unit(cell) or "").kind not in ("other",)
        except InputError:
            return False
    return known == len(filled) and known > 0


def _why_no_table(lines: list[str]) -> str:
    written = [line for line in lines if line.strip()]
    if not written:
        return ": is empty; measure or export it again"
    plain = [line for line in written if not _is_comment(line)]
    if any(is_number(line) or is_number(line, ",") for line in plain):
        return ": has one column only; a field needs at least x, y and one component"
    return ": has no line of numbers; a field needs columns of x, y and at least one component"
