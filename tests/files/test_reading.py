"""Runs: frames, times, senses, channels, uncertainties, dimensions, and how lazily they are read."""

import numpy as np
import pytest

from fieldview.compute.field import Status
from fieldview.compute.quantities import quantity
from fieldview.compute.units import PIXEL
from fieldview.files import NeedsAnswer, expand, open_run, peek
from fieldview.files import run as run_module
from fieldview.files.reading import Reading
from tests.files.dialects import METRES, XX, YY, U, V, X, Y, rows, text

WHOLE_U, WHOLE_V = np.nan_to_num(U), np.nan_to_num(V)


def write_frames(folder, count=12):
    for number in range(count):
        (folder / f"f{number}.csv").write_text(text(rows(u=WHOLE_U + number, v=WHOLE_V)))


def test_files_come_in_natural_order(tmp_path):
    write_frames(tmp_path)
    (tmp_path / "notes.md").write_text("not data")
    names = [path.name for path in expand(["*.csv"], tmp_path)]
    assert names == [f"f{number}.csv" for number in range(12)]
    assert expand([tmp_path]) == expand(["*.csv"], tmp_path)
    assert [p.name for p in expand(["f3.csv", "f*.csv"], tmp_path)][:2] == ["f3.csv", "f0.csv"]
    run = open_run(["*.csv"], folder=tmp_path)
    assert run[10].u[0, 0] == pytest.approx(WHOLE_U[0, 0] + 10)
    assert run.frame_name(10) == "f10.csv"


def test_a_long_run_is_opened_without_reading_its_frames(tmp_path, monkeypatch):
    write_frames(tmp_path)
    opened = []
    read = run_module.read_contents
    monkeypatch.setattr(run_module, "read_contents", lambda path: opened.append(path.name) or read(path))
    run = open_run(["*.csv"], folder=tmp_path)
    assert len(run) == 12 and run.times == (None,) * 12
    assert opened == ["f0.csv"]
    run[7], run[7], run[3]
    assert opened == ["f0.csv", "f7.csv", "f3.csv"]
    for frame in range(12):
        run[frame]
    assert len(run._fields) == run_module.KEPT_FRAMES and len(run._layouts) <= run_module.KEPT_FILES


def test_frame_interval_and_pulse_separation_are_never_mixed(tmp_path):
    write_frames(tmp_path, 3)
    run = open_run(["*.csv"], Reading(frame_interval=0.08, pulse_separation=0.004), folder=tmp_path)
    assert run.times == (0, 0.08, 0.16) and run[2].time == 0.16
    assert np.array_equal(run[0].u, WHOLE_U)


def test_frames_in_one_file_are_told_apart_by_their_time(tmp_path):
    blocks = [np.column_stack([np.full(XX.size, 20.0 * k), rows(u=WHOLE_U + k, v=WHOLE_V)]) for k in range(3)]
    table = np.random.default_rng(0).permutation(np.vstack(blocks))
    (tmp_path / "a.csv").write_text(text(table, header="time [ms],x [m],y [m],u [m/s],v [m/s]"))
    run = open_run(["a.csv"], folder=tmp_path)
    assert len(run) == 3 and run.times == (0, 0.02, 0.04)
    assert np.array_equal(run[2].u, WHOLE_U + 2) and run[2].time == 0.04
    assert run.frame_name(1) == "a.csv [1]"
    (tmp_path / "b.csv").write_text(text(table, header="frame,x [m],y [m],u [m/s],v [m/s]"))
    numbered = open_run(["b.csv"], Reading(frame_interval=0.5), folder=tmp_path)
    assert numbered.times == (0, 0.5, 1.0) and np.array_equal(numbered[1].u, WHOLE_U + 1)


def test_a_frame_without_some_lines_is_placed_on_the_run_s_grid(tmp_path):
    (tmp_path / "f0.csv").write_text(text(rows(u=WHOLE_U, v=WHOLE_V)))
    fewer = rows(u=WHOLE_U, v=WHOLE_V)
    (tmp_path / "f1.csv").write_text(text(fewer[fewer[:, 0] > X[1]]))
    second = open_run(["f*.csv"], folder=tmp_path)[1]
    assert second.grid.shape == U.shape
    assert (second.status[:, :2] == Status.MISSING).all() and second.count(Status.MISSING) == 14
    assert np.array_equal(second.u[:, 2:], WHOLE_U[:, 2:])


@pytest.mark.parametrize("y_axis", ["up", "down"])
@pytest.mark.parametrize("v_positive", ["up", "down"])
def test_the_two_senses_are_separate(y_axis, v_positive, tmp_path):
    y, v = (YY if y_axis == "up" else -YY), (V if v_positive == "up" else -V)
    (tmp_path / "a.csv").write_text(text(rows(y=y, v=v)))
    run = open_run(["a.csv"], Reading(y_axis=y_axis, v_positive=v_positive), folder=tmp_path)
    assert np.array_equal(run[0].v, V, equal_nan=True) and np.array_equal(run.grid.y, Y)
    assert not any("is taken to" in note for note in run.notes)


def test_senses_not_stated_are_assumed_upward_and_said(tmp_path):
    (tmp_path / "a.csv").write_text(text(rows()))
    notes = open_run(["a.csv"], folder=tmp_path).notes
    assert any("y is taken to grow upward" in note for note in notes)
    assert any("v is taken to be positive upward" in note for note in notes)


def test_rows_downward_put_the_lattice_at_minus_the_row(tmp_path):
    pixels = text(rows(x=16 * XX, y=16 * YY), header="x [px],y [px],u [px],v [px]")
    (tmp_path / "a.csv").write_text(pixels)
    run = open_run(["a.csv"], Reading(y_axis="down", v_positive="down"), folder=tmp_path)
    assert run.units == PIXEL
    assert np.array_equal(run.grid.y, -16 * Y[::-1])
    assert np.array_equal(run[0].v, -V[::-1], equal_nan=True)


def test_stereo_data_with_uncertainties_and_channels(tmp_path):
    table = np.column_stack(
        [rows(u=WHOLE_U, v=WHOLE_V), *(np.ravel(c) for c in (XX * YY, 0.1 + XX**2, YY, XX))]
    )
    header = "x [m],y [m],u [m/s],v [m/s],w [m/s],sigma_u [mm/s],peak ratio,note"
    lines = text(table, header=header).replace("\n", ",good\n").replace("note,good", "note")
    (tmp_path / "a.csv").write_text(lines.replace("peak ratio,note", "peak ratio,temperature [degC],note"))
    field = open_run(["a.csv"], folder=tmp_path)[0]
    assert np.array_equal(field.w, XX * YY)
    assert np.allclose(field.error.sigma["u"], 1e-3 * (0.1 + XX**2), rtol=1e-14)
    assert field.error.origin == "from file"
    assert set(field.channels) == {"peak ratio", "temperature"}
    assert field.channel_units == {"peak ratio": "", "temperature": "degC"}
    ignoring = open_run(["a.csv"], Reading(ignore=("peak ratio", 7)), folder=tmp_path)
    assert set(ignoring[0].channels) == set()
    assert any('"note" holds words and is not read' in note for note in ignoring.notes)


def test_a_run_of_one_component_through_the_plane(tmp_path):
    table = np.column_stack([np.ravel(XX), np.ravel(YY), np.ravel(WHOLE_U)])
    (tmp_path / "a.csv").write_text(text(table, header="x [m],y [m],w [ft/min]"))
    field = open_run(["a.csv"], folder=tmp_path)[0]
    assert field.u is None and field.v is None
    assert np.allclose(field.w, WHOLE_U * 0.3048 / 60, rtol=1e-14)


@pytest.mark.parametrize(
    ("zero", "sense", "angle"),
    [("north", "towards", 90.0), ("north", "from", 270.0), ("x", "towards", 0.0), ("x", "from", 180.0)],
)
def test_a_flow_along_x_in_every_convention_of_direction(zero, sense, angle, tmp_path):
    table = rows(u=np.full_like(U, 2.0), v=np.full_like(U, angle))
    (tmp_path / "a.csv").write_text(text(table, header="x [m],y [m],speed [m/s],direction [deg]"))
    field = open_run(["a.csv"], Reading(direction_zero=zero, direction_sense=sense), folder=tmp_path)[0]
    assert np.allclose(field.u, 2.0) and np.allclose(field.v, 0.0, atol=1e-14)


def test_vectors_at_the_first_image_s_position_are_corrected_to_the_midpoint(tmp_path):
    # particles circle at rate Omega; a displacement found at p belongs to p + d/2
    omega, dt = 30.0, 0.004
    half = 0.5 * omega * dt
    z = XX + 1j * (YY - 1.75)
    found = 1j * omega * z / (1 - 1j * half)  # d = i Omega dt (p + d/2)
    (tmp_path / "a.csv").write_text(text(rows(u=found.real, v=found.imag)))
    reading = Reading(vector_position="first_image", pulse_separation=dt)
    raw = open_run(["a.csv"], folder=tmp_path)[0]
    divergence = quantity(raw, "divergence")
    # to first order the divergence is -Omega^2 dt
    assert np.nanmean(divergence) == pytest.approx(-(omega**2) * dt, rel=0.01)
    mended = open_run(["a.csv"], reading, folder=tmp_path)[0]
    assert np.allclose(quantity(mended, "divergence"), 0, atol=1e-6 * omega)
    assert np.allclose(quantity(mended, "vorticity"), 2 * omega, rtol=1e-6)
    with pytest.raises(NeedsAnswer, match="pulse_separation"):
        open_run(["a.csv"], Reading(vector_position="first_image"), folder=tmp_path)


def test_near_equal_coordinates_are_one_line(tmp_path):
    jitter = np.random.default_rng(1).choice([-0.001, 0, 0.001], size=XX.shape)
    (tmp_path / "a.csv").write_text(text(rows(x=np.round(XX + jitter, 3), u=WHOLE_U, v=WHOLE_V)))
    field = open_run(["a.csv"], folder=tmp_path)[0]
    assert field.grid.shape == U.shape and np.allclose(field.grid.x, X, atol=1e-3)
    assert np.array_equal(field.u, WHOLE_U)


def test_stretched_axes_are_kept_as_they_are(tmp_path):
    x = np.cumsum(1.4 ** np.arange(9))
    (tmp_path / "a.csv").write_text(text(rows(x=np.meshgrid(x, Y)[0])))
    assert np.array_equal(open_run(["a.csv"], folder=tmp_path).grid.x, x)


def test_dropped_rows_are_counted(tmp_path):
    table = np.vstack([rows(u=WHOLE_U, v=WHOLE_V), [[0.13, 1.07, 9.0, 9.0]], rows(u=WHOLE_U, v=WHOLE_V)[:2]])
    table = np.vstack([table, [[np.nan, 1.0, 1.0, 1.0]]])
    (tmp_path / "a.csv").write_text(text(table))
    run = open_run(["a.csv"], folder=tmp_path)
    assert np.array_equal(run[0].u, WHOLE_U)
    said = " ".join(run.notes)
    assert "1 row has no position and was dropped" in said
    assert "1 row lies off the grid and was dropped" in said
    assert "2 rows repeat nodes; the first of each was kept" in said


def test_netcdf_frames_times_and_further_dimensions(tmp_path):
    import xarray

    steps = np.arange(3)
    u = WHOLE_U + steps[:, None, None, None] + 10 * np.arange(2)[None, :, None, None]
    data = xarray.Dataset(
        {
            "u": (("time", "level", "y", "x"), u, {"units": "m/s"}),
            "v": (("time", "level", "y", "x"), np.broadcast_to(WHOLE_V, u.shape), {"units": "m/s"}),
        },
        {
            "x": ("x", X, {"units": "m"}),
            "y": ("y", Y, {"units": "m"}),
            "time": ("time", steps * 2.0, {"units": "minutes since 2020-02-02 00:00:00"}),
            "level": ("level", [0.5, 1.5], {"units": "m"}),
        },
    )
    data.to_netcdf(tmp_path / "a.nc", engine="h5netcdf")
    with pytest.raises(NeedsAnswer, match=r'choose an entry of "level" \(0 to 1\) under select'):
        open_run(["a.nc"], folder=tmp_path)
    for entry in (1, 1.5):
        run = open_run(["a.nc"], Reading(select={"level": entry}), folder=tmp_path)
        assert len(run) == 3 and run.times == (0, 120, 240)
        assert np.array_equal(run[2].u, WHOLE_U + 2 + 10)


def test_containers_with_frames(tmp_path):
    import h5py
    import scipy.io

    u, v = np.stack([WHOLE_U, WHOLE_U + 1]), np.stack([WHOLE_V, WHOLE_V])
    np.savez(tmp_path / "a.npz", x=X, y=Y, u=u, v=v)
    scipy.io.savemat(
        tmp_path / "b.mat", {"x": XX, "y": YY, "u": np.moveaxis(u, 0, -1), "v": np.moveaxis(v, 0, -1)}
    )
    with h5py.File(tmp_path / "c.h5", "w") as container:
        for name, values in (("x", X), ("y", Y), ("u", u), ("v", v)):
            container[name] = values
    for name in ("a.npz", "b.mat", "c.h5"):
        run = open_run([name], METRES, folder=tmp_path)
        assert len(run) == 2, name
        assert np.array_equal(run[1].u, WHOLE_U + 1) and np.array_equal(run[1].v, WHOLE_V)


def test_peek_says_what_would_be_read(tmp_path):
    spoiled = np.where(np.isnan(U), 9999.0, U)
    (tmp_path / "a.csv").write_text(text(rows(u=spoiled)))
    told = peek(tmp_path / "a.csv")
    assert [(c.name, c.unit, c.role) for c in told.columns] == [
        ("x", "m", "x"), ("y", "m", "y"), ("u", "m/s", "u"), ("v", "m/s", "v"),
    ]  # fmt: skip
    assert told.questions == () and told.frames == 1
    shown = told.text()
    for words in (
        "9 x 7 nodes",
        "spacing 0.25 m",
        '"u" is 9999 at 1 nodes',
        "up (assumed)",
        "strongest vorticity",
    ):
        assert words in shown, words
    assert told.first_rows[0] == ("x", "y", "u", "v")


def test_digests_are_by_path_relative_to_the_folder(tmp_path):
    import hashlib

    (tmp_path / "run").mkdir()
    (tmp_path / "run" / "a.csv").write_text(text(rows()))
    digests = open_run(["run/*.csv"], folder=tmp_path).digests()
    expected = hashlib.sha256((tmp_path / "run" / "a.csv").read_bytes()).hexdigest()
    assert digests == {"run/a.csv": f"sha256:{expected}"}
