"""What every written field holds, and files that are whole or not there."""

from __future__ import annotations

import os
import re
import tempfile
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Placement

STATUS_MEANINGS = ("measured", "missing", "masked", "rejected", "filled")
"""Words for the status codes 0 to 4."""

_LONGEST = 60
"""Letters of an identifier; MATLAB allows 63."""

_FIRST_REMARK = "loopflux field 1"


def values_of(
    field: Field, quantities: Mapping[str, tuple[np.ndarray, str]] | None = None
) -> dict[str, tuple[np.ndarray, str]]:
    """Every array (ny, nx) of a written field with its unit, by name, in order.

    x, y, components, status, the components' standard uncertainties, channels, quantities.
    """
    nodes = field.grid.nodes
    length, velocity = field.units.length, field.units.velocity
    values = {"x": (nodes.real, length), "y": (nodes.imag, length)}
    values |= {name: (part, velocity) for name, part in field.components.items()}
    values["status"] = (field.status, "1")
    for name in field.components:
        sigma = uncertainty_of(field, name)
        if sigma is not None:
            values[f"sigma_{name}"] = (sigma, velocity)
    for name, channel in field.channels.items():
        values.setdefault(_plain(name), (channel, field.channel_units.get(name) or ""))
    for name, (quantity, unit) in (quantities or {}).items():
        values.setdefault(_plain(name), (quantity, unit))
    return values


def uncertainty_of(field: Field, component: str) -> np.ndarray | None:
    """Standard uncertainty (ny, nx) of a component as it is now, filling and smoothing included."""
    if field.error.sigma is None or component not in field.error.sigma:
        return None
    if field.maps or field.error.turn != 1:
        from fieldview.compute.quantities import quantity_map

        return quantity_map(field, component).uncertainty
    sigma = field.error.sigma_of(component, field.grid.shape)
    return np.where(field.valid, sigma, np.nan)


def remarks_of(field: Field, attributes: Mapping[str, str] | None) -> list[str]:
    """What a text file says above its columns."""
    codes = ", ".join(f"{code} {word}" for code, word in enumerate(STATUS_MEANINGS))
    remarks = [_FIRST_REMARK, f"status: {codes}"]
    if field.time is not None:
        remarks.append(f"time: {field.time!r} s")
    place = field.grid.placement
    if not place.is_identity:
        numbers = (place.factor.real, place.factor.imag, place.shift.real, place.shift.imag)
        shown = " ".join(repr(float(number)) for number in numbers)
        remarks.append(f"axes: {shown} {'mirrored' if place.mirrored else 'direct'}")
    remarks += [f"{key}: {_plain(str(value))}" for key, value in (attributes or {}).items()]
    return remarks


def identifiers(names: Iterable[str]) -> dict[str, str]:
    """An identifier for every name, no two the same."""
    found: dict[str, str] = {}
    for name in names:
        plain = re.sub(r"\W", "_", name, flags=re.ASCII)[:_LONGEST]
        plain = plain if plain[:1].isalpha() else f"c_{plain}"
        place = 1
        while plain in found.values():
            place += 1
            plain = f"{plain.rstrip('0123456789')}{place}"
        found[name] = plain
    return found


def said_by_remarks(remarks: Iterable[str]) -> dict:
    """Time and placement from the remarks of a file that we wrote; empty for any other."""
    remarks = list(remarks)
    if _FIRST_REMARK not in remarks:
        return {}
    stated: dict = {"own": True}
    for remark in remarks:
        if match := re.fullmatch(r"time: (\S+) s", remark):
            stated["time"] = float(match[1])
        if match := re.fullmatch(r"axes: (\S+) (\S+) (\S+) (\S+) (mirrored|direct)", remark):
            a, b, c, d = (float(match[i]) for i in range(1, 5))
            stated["placement"] = Placement(complex(a, b), complex(c, d), match[5] == "mirrored")
    return stated


def write_whole(path: Path, content: bytes) -> None:
    """Write a file under a temporary name beside it, then rename: never half a file under its own name."""
    _written_whole(path, (content,))


def write_lines(path: Path, lines: Iterable[str]) -> None:
    """The same for lines of text as they come, so that memory does not grow with their number."""
    _written_whole(path, (f"{line}\n".encode() for line in lines))


def _written_whole(path: Path, chunks: Iterable[bytes]) -> None:
    with whole_file(path) as temporary, temporary.open("wb") as stream:
        stream.writelines(chunks)
        stream.flush()
        os.fsync(stream.fileno())


@contextmanager
def whole_file(path: Path) -> Iterator[Path]:
    """A temporary name beside the file to be written; it takes the file's own name when all went well."""
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
    os.close(handle)
    temporary = Path(name)
    try:
        yield temporary
        # mkstemp makes private files; what we write is as readable as any other new file
        umask = os.umask(0)
        os.umask(umask)
        temporary.chmod(0o666 & ~umask)
        os.replace(temporary, path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


@contextmanager
def said_if_unwritable(path: Path) -> Iterator[None]:
    """Whatever the system has against writing a file, as one sentence: an InputError."""
    try:
        yield
    except OSError as error:
        why = error.strerror or error
        raise InputError(f"{path}: cannot be written ({why}); choose another place") from None


def _plain(text: str) -> str:
    """A name or remark that fits one cell or line of a text file."""
    return re.sub(r"[\s,\[\]\"]+", " ", text).strip()
