"""VTK XML files of one field: image data on even axes, rectilinear data on any.

Source: "VTK XML file formats" of the VTK documentation (from memory): DataArray elements in base64, each with
the length of its bytes in front; units as the information key UNITS_LABEL.
"""

from __future__ import annotations

import base64
from collections.abc import Iterator, Mapping
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.files.writing import remarks_of, values_of, write_whole

_TYPES = {"f8": "Float64", "u1": "UInt8", "i8": "Int64"}


def write_image(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as image data (.vti), turned and mirrored axes as its Direction.

    Raises InputError for axes that are not evenly spaced.
    """
    grid = field.grid
    if not all(grid.is_uniform):
        raise InputError(f"{path}: image data needs evenly spaced axes; write rectilinear data, .vtr")
    place = grid.placement
    origin = place.to_plane(complex(grid.x[0], grid.y[0]))
    along_x = place.factor
    along_y = place.factor * (-1j if place.mirrored else 1j)
    spacing = [
        float((axis[-1] - axis[0]) / (axis.size - 1)) if axis.size > 1 else 1.0 for axis in (grid.x, grid.y)
    ]
    # one axis of the lattice in each column; the third keeps the frame right-handed or not
    direction = [along_x.real, along_y.real, 0, along_x.imag, along_y.imag, 0, 0, 0, 1]
    head = (
        f'<ImageData WholeExtent="{_extent(field)}" Origin="{_row([origin.real, origin.imag, 0.0])}" '
        f'Spacing="{_row([*spacing, 1.0])}" Direction="{_row(direction)}">'
    )
    _write(path, "ImageData", head, [], field, quantities, attributes)


def write_rectilinear(
    path: str | Path,
    field: Field,
    *,
    quantities: Mapping[str, tuple[np.ndarray, str]] | None = None,
    attributes: Mapping[str, str] | None = None,
) -> None:
    """Write one field as rectilinear data (.vtr).

    Raises InputError where the axes were turned or mirrored, which rectilinear data cannot hold.
    """
    grid = field.grid
    if not grid.placement.is_identity:
        raise InputError(f"{path}: rectilinear data cannot hold turned axes; write image data, .vti")
    axes = (("x", grid.x), ("y", grid.y), ("z", np.zeros(1)))
    coordinates = ["<Coordinates>"]
    coordinates += [_array(name, axis, field.units.length) for name, axis in axes]
    coordinates.append("</Coordinates>")
    head = f'<RectilinearGrid WholeExtent="{_extent(field)}">'
    _write(path, "RectilinearGrid", head, coordinates, field, quantities, attributes)


def _write(path, kind: str, head: str, coordinates: list[str], field: Field, quantities, attributes) -> None:
    remarks = "\n".join(remarks_of(field, attributes)).replace("--", "- -")
    lines = [
        '<?xml version="1.0"?>',
        f"<!--\n{escape(remarks)}\n-->",
        f'<VTKFile type="{kind}" version="1.0" byte_order="LittleEndian" header_type="UInt64">',
        head,
        *_time(field),
        f'<Piece Extent="{_extent(field)}">',
        '<PointData Scalars="status" Vectors="velocity">',
        *_point_data(field, quantities),
        "</PointData>",
        *coordinates,
        "</Piece>",
        f"</{kind}>",
        "</VTKFile>\n",
    ]
    write_whole(Path(path), "\n".join(lines).encode())


def _time(field: Field) -> Iterator[str]:
    if field.time is not None:
        yield "<FieldData>"
        yield (
            '<DataArray type="Float64" Name="TimeValue" NumberOfTuples="1" format="ascii">'
            f"{float(field.time)!r}</DataArray>"
        )
        yield "</FieldData>"


def _point_data(field: Field, quantities) -> Iterator[str]:
    """The velocity as vectors, and every array of the field by its name."""
    zero = np.zeros(field.grid.shape)
    parts = [zero if part is None else part for part in (field.u, field.v, field.w)]
    yield _array("velocity", np.stack(parts, axis=-1), field.units.velocity, components=3)
    for name, (values, unit) in values_of(field, quantities).items():
        if name not in ("x", "y"):
            yield _array(name, values, unit)


def _array(name: str, values: np.ndarray, unit: str, *, components: int = 1) -> str:
    values = np.asarray(values)
    kind = "u1" if values.dtype.kind in "ub" and values.dtype.itemsize == 1 else "f8"
    content = np.ascontiguousarray(values, f"<{kind}").tobytes()
    coded = base64.b64encode(len(content).to_bytes(8, "little") + content).decode()
    many = f' NumberOfComponents="{components}"' if components > 1 else ""
    key = (
        '<InformationKey name="UNITS_LABEL" location="vtkDataArray">' + escape(unit) + "</InformationKey>"
        if unit
        else ""
    )
    opening = f'<DataArray type="{_TYPES[kind]}" Name={quoteattr(name)}{many} format="binary">'
    return f"{opening}{coded}{key}</DataArray>"


def _extent(field: Field) -> str:
    ny, nx = field.grid.shape
    return f"0 {nx - 1} 0 {ny - 1} 0 0"


def _row(numbers) -> str:
    return " ".join(repr(float(number)) for number in numbers)
