"""Written fields: read back to the last bit, by general-purpose libraries too, whole or not at all."""

import os

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid, Placement
from fieldview.compute.quantities import quantity
from fieldview.compute.units import PIXEL
from fieldview.files import open_run
from fieldview.files.writers import ENDINGS, writer

WRITERS = {kind: writer(kind) for kind in ENDINGS}
READ_BACK = tuple(kind for kind in WRITERS if kind not in ("vti", "vtr"))
X, Y = np.array([0.1, 0.2, 0.35, 0.7]), np.array([-0.3, 0.1, 0.2])


EVEN = Grid(np.arange(4) * 0.1, np.arange(3) * 0.2)


def cleaned(**more) -> Field:
    """A field with every status, uncertainties and a channel."""
    rng = np.random.default_rng(5)
    u, v = rng.normal(size=(2, 3, 4)) / 3
    status = np.zeros((3, 4), np.uint8)
    status[0, 1], status[1, 2], status[2, 0], status[2, 3] = (
        Status.MISSING,
        Status.MASKED,
        Status.REJECTED,
        Status.FILLED,
    )
    parts = {
        "u": u,
        "v": v,
        "status": status,
        "time": 0.1 + 0.2,
        "channels": {"peak ratio": rng.normal(size=(3, 4))},
        "channel_units": {"peak ratio": "1"},
        "error": ErrorModel(sigma={"u": 0.1 / 3, "v": np.full((3, 4), 0.01)}, origin="given"),
    }
    return Field(Grid(X, Y), **(parts | more))


def written(field: Field, folder, kind: str, **more):
    if kind == "vti" and not all(field.grid.is_uniform):
        field = field.with_(grid=EVEN)
    path = folder / f"field.{kind}"
    WRITERS[kind](path, field, **more)
    return path


@pytest.mark.parametrize("kind", READ_BACK)
def test_a_field_reads_back_to_the_last_bit(kind, tmp_path):
    field = cleaned()
    path = written(field, tmp_path, kind, quantities={"vorticity": (quantity(field, "vorticity"), "1/s")})
    back = open_run([path])[0]
    for name in ("u", "v", "status"):
        assert np.array_equal(getattr(back, name), getattr(field, name), equal_nan=True), name
    assert back.grid.same_nodes(field.grid) and back.units == field.units and back.time == field.time
    valid = field.valid
    assert np.array_equal(back.error.sigma["u"][valid], np.full(valid.sum(), 0.1 / 3))
    assert np.array_equal(back.channels["peak ratio"], field.channels["peak ratio"])
    assert np.array_equal(back.channels["vorticity"], quantity(field, "vorticity"), equal_nan=True)
    assert open_run([path]).notes == ()


@pytest.mark.parametrize("kind", READ_BACK)
@settings(max_examples=25, deadline=None)
@given(values=arrays(float, (3, 4), elements=st.floats(-1e300, 1e300)))
def test_any_number_survives(kind, values, tmp_path_factory):
    folder = tmp_path_factory.mktemp("any")
    field = Field(Grid(X, Y), u=values, v=np.ones((3, 4)), w=-values)
    back = open_run([written(field, folder, kind)])[0]
    assert np.array_equal(back.u, values) and np.array_equal(back.w, -values)


@pytest.mark.parametrize("kind", WRITERS)
def test_the_same_field_gives_the_same_bytes(kind, tmp_path):
    one, two = tmp_path / "one", tmp_path / "two"
    one.mkdir(), two.mkdir()
    first = written(cleaned(), one, kind, attributes={"session": "sha256:12"}).read_bytes()
    assert written(cleaned(), two, kind, attributes={"session": "sha256:12"}).read_bytes() == first
    assert os.listdir(one) == [f"field.{kind}"]


@pytest.mark.parametrize("kind", READ_BACK)
def test_turned_axes_are_written_in_the_plane_and_found_again(kind, tmp_path):
    turned = Grid(X, Y, Placement().then(turn=0.4, about=0.2 + 0.1j, reflect="x"))
    field = cleaned().with_(grid=turned)
    back = open_run([written(field, tmp_path, kind)])[0]
    assert np.allclose(back.grid.nodes, turned.nodes, rtol=0, atol=1e-15)
    assert np.array_equal(back.u, field.u, equal_nan=True)


@pytest.mark.parametrize("kind", READ_BACK)
def test_pixel_fields_stay_pixels(kind, tmp_path):
    field = Field(Grid(X * 100, Y * 100), u=np.ones((3, 4)), v=np.zeros((3, 4)), units=PIXEL)
    assert open_run([written(field, tmp_path, kind)]).units == PIXEL


@pytest.mark.parametrize("kind", WRITERS)
def test_a_failed_write_leaves_nothing(kind, tmp_path, monkeypatch):
    def full_disk(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full_disk)
    with pytest.raises(OSError, match="No space left"):
        written(cleaned(), tmp_path, kind)
    assert os.listdir(tmp_path) == []


def test_pandas_reads_the_text(tmp_path):
    import pandas

    field = cleaned()
    table = pandas.read_csv(written(field, tmp_path, "csv"), comment="#")
    assert list(table) == [
        "x [m]", "y [m]", "u [m/s]", "v [m/s]", "status", "sigma_u [m/s]", "sigma_v [m/s]", "peak ratio [1]",
    ]  # fmt: skip
    assert np.array_equal(table["u [m/s]"].to_numpy().reshape(3, 4), field.u, equal_nan=True)
    assert table["u [m/s]"].isna().sum() == 3


def test_xarray_reads_the_netcdf_with_its_units_and_flags(tmp_path):
    import xarray

    field = cleaned()
    path = written(field, tmp_path, "nc", quantities={"vorticity": (quantity(field, "vorticity"), "1/s")})
    with xarray.open_dataset(path, engine="h5netcdf", decode_times=False) as data:
        assert data.attrs["Conventions"] == "CF-1.11"
        assert data["u"].dims == ("y", "x") and data["u"].attrs["units"] == "m s-1"
        assert data["vorticity"].attrs["units"] == "s-1"
        assert data["status"].attrs["flag_meanings"] == "measured missing masked rejected filled"
        assert list(data["status"].attrs["flag_values"]) == [0, 1, 2, 3, 4]
        assert data["status"].attrs["flag_values"].dtype == data["status"].dtype
        assert data["u"].attrs["ancillary_variables"] == "status sigma_u"
        assert np.array_equal(data["u"].values, field.u, equal_nan=True)
        assert np.array_equal(data["x"].values, X)
        assert all("units" in data[name].attrs for name in data.variables if name != "status")


def test_numpy_reads_the_npz(tmp_path):
    import json

    with np.load(written(cleaned(), tmp_path, "npz"), allow_pickle=False) as container:
        assert container["u"].shape == (3, 4) and np.array_equal(container["x"], X)
        assert json.loads(str(container["units"]))["u"] == "m/s"


def test_h5py_reads_the_hdf5_with_its_units(tmp_path):
    import h5py

    field = cleaned()
    path = written(field, tmp_path, "h5", quantities={"vorticity": (quantity(field, "vorticity"), "1/s")})
    with h5py.File(path) as container:
        assert container["u"].attrs["units"] == "m/s" and container["vorticity"].attrs["units"] == "1/s"
        assert np.array_equal(container["u"][:], field.u, equal_nan=True)
        assert np.array_equal(container["x"][:], X) and container["status"].dtype == np.uint8
        assert "status: 0 measured, 1 missing" in container.attrs["remarks"]


def test_scipy_reads_the_matlab_container(tmp_path):
    import scipy.io

    field = cleaned()
    taken = {"peak_ratio": (np.ones((3, 4)), "1"), "3 peaks": (np.zeros((3, 4)), "m")}
    held = scipy.io.loadmat(written(field, tmp_path, "mat", quantities=taken), simplify_cells=True)
    assert np.array_equal(held["u"], field.u, equal_nan=True) and np.array_equal(held["x"], X)
    assert held["units"]["u"] == "m/s" and held["units"]["c_3_peaks"] == "m"
    names = held["names"]
    assert names["peak_ratio"] == "peak ratio" and names["peak_ratio2"] == "peak_ratio"
    assert all(name.isidentifier() for name in names)


def arrays_of_vtk(path) -> tuple[dict[str, np.ndarray], dict[str, str], dict[str, str]]:
    """Arrays, units and the attributes of the grid, by Python's own XML parser."""
    from base64 import b64decode
    from xml.etree import ElementTree

    root = ElementTree.parse(path).getroot()
    found, units = {}, {}
    for node in root.iter("DataArray"):
        key = node.find("InformationKey")
        if key is not None:
            units[node.get("Name")] = key.text
        if node.get("format") == "ascii":
            found[node.get("Name")] = np.array([float(word) for word in node.text.split()])
            continue
        raw = b64decode(node.text)
        assert int.from_bytes(raw[:8], "little") == len(raw) - 8
        kind = {"Float64": "<f8", "UInt8": "u1"}[node.get("type")]
        found[node.get("Name")] = np.frombuffer(raw[8:], kind)
    return found, units, dict(root[0].attrib)


def test_vtk_files_hold_the_field(tmp_path):
    field = cleaned()
    arrays, units, grid = arrays_of_vtk(written(field, tmp_path, "vtr"))
    assert np.array_equal(arrays["u"].reshape(3, 4), field.u, equal_nan=True)
    assert np.array_equal(arrays["velocity"].reshape(3, 4, 3)[..., 1], field.v, equal_nan=True)
    assert np.array_equal(arrays["x"], X) and np.array_equal(arrays["y"], Y)
    assert arrays["TimeValue"] == field.time and units["velocity"] == "m/s" and units["x"] == "m"
    assert grid["WholeExtent"] == "0 3 0 2 0 0"


def test_vtk_image_data_holds_turned_axes_and_refuses_what_it_cannot(tmp_path):
    from fieldview.compute.errors import InputError

    for place in (Placement().then(turn=0.4, shift=1 + 2j), Placement().then(turn=0.4, reflect="x")):
        turned = Grid(EVEN.x, EVEN.y, place)
        path = written(cleaned().with_(grid=turned), tmp_path, "vti")
        _, _, grid = arrays_of_vtk(path)
        origin, step = ([float(word) for word in grid[key].split()] for key in ("Origin", "Spacing"))
        direction = np.array(grid["Direction"].split(), float).reshape(3, 3)
        iy, ix = np.indices(turned.shape)
        index = np.stack([ix * step[0], iy * step[1], 0 * ix])
        at = np.array(origin)[:, None, None] + np.tensordot(direction, index, axes=1)
        assert np.allclose(at[0] + 1j * at[1], turned.nodes, rtol=0, atol=1e-14)
        with pytest.raises(InputError, match=r"cannot hold turned axes; write image data"):
            WRITERS["vtr"](tmp_path / "a.vtr", cleaned().with_(grid=turned))
    with pytest.raises(InputError, match="evenly spaced axes; write rectilinear data"):
        WRITERS["vti"](tmp_path / "a.vti", cleaned())
