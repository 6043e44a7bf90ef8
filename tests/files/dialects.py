"""One field in many dialects of text and in every container, by general-purpose libraries or by hand."""

from __future__ import annotations

import gzip
import json
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from fieldview.files.reading import Reading

X = np.arange(9) * 0.25 - 0.5
Y = np.arange(7) * 0.25 + 1.0
XX, YY = np.meshgrid(X, Y)
U = np.round(np.sin(2 * XX) * np.cos(YY) + 0.3, 6)
V = np.round(0.5 * np.cos(XX) * YY - 0.2 * XX, 6)
GAP = (5, 7)
U[GAP] = V[GAP] = np.nan
"""A field of 9 x 7 nodes in m and m/s with one vector missing."""


@dataclass(frozen=True)
class Dialect:
    name: str
    file: str
    write: Callable[[Path], None]
    reading: Reading = field(default_factory=Reading)


def rows(x=XX, y=YY, u=U, v=V) -> np.ndarray:
    return np.column_stack([np.ravel(part) for part in (x, y, u, v)])


def text(
    table: np.ndarray,
    *,
    delimiter: str = ",",
    header: str = "x [m],y [m],u [m/s],v [m/s]",
    missing: str = "",
    number: Callable[[float], str] = repr,
    end: str = "\n",
) -> str:
    lines = [delimiter.join(missing if np.isnan(c) else number(float(c)) for c in row) for row in table]
    return end.join([*([header] if header else []), *lines]) + end


def comma_number(value: float) -> str:
    return repr(value).replace(".", ",")


def fortran_number(value: float) -> str:
    return f"{value:.8E}".replace("E", "D")


def _text(name: str, content: str, reading: Reading = Reading(), *, encoding="utf-8", file=None) -> Dialect:
    return Dialect(name, file or "a.txt", lambda path: path.write_bytes(content.encode(encoding)), reading)


def _shuffled() -> np.ndarray:
    return np.random.default_rng(3).permutation(rows())


def _with_extras() -> str:
    """Duplicates, a node left out where the vector is missing, a row without a position."""
    table = rows()
    table = table[~np.isnan(table[:, 2])]
    table = np.vstack([table, table[:1], [[np.nan, 1.0, 5.0, 5.0]]])
    return text(table, missing="nan")


def _speed_and_direction() -> str:
    direction = np.degrees(np.arctan2(-U, -V)) % 360  # where it comes from, clockwise from north
    table = rows(u=np.hypot(U, V), v=direction)
    return text(table, header="x [m],y [m],speed [m/s],direction [deg]", missing="NaN")


def _npz(path: Path) -> None:
    np.savez(path, X=X, Y=Y, U=U, V=V, units=json.dumps({"X": "m", "Y": "m", "U": "m/s", "V": "m/s"}))


def _npz_rows(path: Path) -> None:
    x, y, u, v = _shuffled().T
    np.savez(path, x=x, y=y, u=u, v=v)


def _matlab(path: Path) -> None:
    import scipy.io

    scipy.io.savemat(path, {"piv": {"x": XX, "y": YY, "u": U, "v": V}})


def _hdf5(path: Path) -> None:
    import h5py

    with h5py.File(path, "w") as container:
        group = container.create_group("run")
        for name, values, unit in (("x", X, "m"), ("y", Y, "m"), ("u", U, "m/s"), ("v", V, "m/s")):
            group[name] = values
            group[name].attrs["units"] = unit


def _hdf5_turned(path: Path) -> None:
    import h5py

    with h5py.File(path, "w") as container:
        container["x"], container["y"] = X[::-1], Y
        container["u"], container["v"] = U[:, ::-1].T, V[:, ::-1].T


def dataset(**more):
    import xarray

    return xarray.Dataset(
        {
            "eastward": (("lat_like", "lon_like"), U, {"standard_name": "x_wind", "units": "m s-1"}),
            "northward": (("lat_like", "lon_like"), V, {"standard_name": "y_wind", "units": "m s-1"}),
        },
        {
            "a": ("lon_like", X, {"standard_name": "projection_x_coordinate", "units": "m"}),
            "b": ("lat_like", Y, {"standard_name": "projection_y_coordinate", "units": "m"}),
        },
        **more,
    )


def _netcdf(path: Path) -> None:
    dataset().to_netcdf(path, engine="h5netcdf")


def _netcdf_classic(path: Path) -> None:
    dataset().to_netcdf(path, engine="scipy")


def _netcdf_packed(path: Path) -> None:
    packing = {"dtype": "int32", "scale_factor": 1e-6, "add_offset": 0.5, "_FillValue": -(2**31)}
    dataset().to_netcdf(path, engine="h5netcdf", encoding={"eastward": packing, "northward": packing})


def _gzipped(path: Path) -> None:
    path.write_bytes(gzip.compress(text(rows()).encode()))


METRES = Reading(length_unit="m", velocity_unit="m/s")

DIALECTS = (
    _text("comma", text(rows()), file="a.csv"),
    _text(
        "semicolon, decimal comma",
        text(rows(), delimiter=";", header="x [m];y [m];u [m/s];v [m/s]", number=comma_number),
    ),
    _text(
        "tab, decimal comma",
        text(
            rows(),
            delimiter="\t",
            header="x (m)\ty (m)\tu (m/s)\tv (m/s)",
            missing="NaN",
            number=comma_number,
        ),
    ),
    _text(
        "blanks, commented header",
        text(rows(), delimiter="   ", header="# x [m]  y [m]  u [m/s]  v [m/s]", missing="nan"),
    ),
    _text(
        "commented header, another delimiter",
        text(rows(), delimiter=" ", header="% x [m], y [m], u [m/s], v [m/s]", missing="---"),
    ),
    _text("units in a line of their own", text(rows(), header="x,y,u,v\n[m],[m],[m/s],[m/s]")),
    _text(
        "units without brackets",
        text(rows(), delimiter="\t", header="X\tY\tVx\tVy\nm\tm\tm s-1\tm s-1", missing="n/a"),
    ),
    _text("title and remarks", "Run 12, flume B\nmeasured on a Monday\n\n" + text(rows()) + "\n"),
    _text(
        "no header",
        text(rows(), header="", missing="NaN"),
        METRES.model_copy(update={"columns": {"x": 0, "y": 1, "u": 2, "v": 3}}),
    ),
    _text("byte order mark and CRLF", text(rows(), end="\r\n"), encoding="utf-8-sig"),
    _text("UTF-16", text(rows()), encoding="utf-16"),
    _text("UTF-16 without mark", text(rows()), encoding="utf-16-le"),
    _text("Windows-1252", "# Geschwindigkeit über Gitter, ±\n" + text(rows()), encoding="cp1252"),
    _text(
        "exponents with D",
        text(rows(), delimiter=" ", header="x[m] y[m] u[m/s] v[m/s]", missing="NaN", number=fortran_number),
    ),
    _text("sentinel", text(rows(), missing="9999"), Reading(missing=(9999,))),
    _text(
        "millimetres",
        text(rows(x=1e3 * XX, y=1e3 * YY, u=1e3 * U, v=1e3 * V), header="x [mm],y [mm],u [mm/s],v [mm/s]"),
    ),
    _text("any order", text(_shuffled(), missing="null")),
    _text("axes descending, y first", text(rows(XX.T[::-1], YY.T[::-1], U.T[::-1], V.T[::-1]))),
    _text("duplicates and rows without position", _with_extras()),
    _text("rows downward", text(rows(y=-YY, v=-V)), Reading(y_axis="down", v_positive="down")),
    _text("rows downward, v upward", text(rows(y=-YY)), Reading(y_axis="down", v_positive="up")),
    _text(
        "displacements",
        text(rows(u=U * 4, v=V * 4), header="x [m],y [m],dx [mm],dy [mm]"),
        Reading(pulse_separation=0.004),
    ),
    _text(
        "speed and direction", _speed_and_direction(), Reading(direction_zero="north", direction_sense="from")
    ),
    _text(
        "names given",
        text(rows(), header="links,hoch,eins,zwei"),
        METRES.model_copy(update={"columns": {"x": "links", "y": "hoch", "u": "eins", "v": "zwei"}}),
    ),
    Dialect("gzip", "a.csv.gz", _gzipped),
    Dialect("NPZ", "a.npz", _npz),
    Dialect("NPZ of rows", "a.npz", _npz_rows, METRES),
    Dialect("MATLAB", "a.mat", _matlab, METRES),
    Dialect("HDF5", "a.h5", _hdf5),
    Dialect("HDF5, [x, y] and descending", "a.h5", _hdf5_turned, METRES),
    Dialect("NetCDF 4", "a.nc", _netcdf),
    Dialect("NetCDF classic", "a.nc", _netcdf_classic),
    Dialect("NetCDF packed", "a.nc", _netcdf_packed),
)
