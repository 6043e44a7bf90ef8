"""A run store gives the frames of its sources to the last bit, and is not used where it no longer fits."""

import os
import shutil

import numpy as np
import pytest

from fieldview import cli
from fieldview.compute.errors import InputError
from fieldview.files import Reading, UnreadableFrame, open_run
from fieldview.files.stored import StoredRun, write_store
from fieldview.session.measure import measure
from fieldview.session.store import load_session, save_session
from tests.session.runs import CIRCLE, edited, vortex_frames, write_frame

READING = Reading.model_validate({"frame_interval": 0.1})


@pytest.fixture
def folder(tmp_path):
    """Four frames with gaps, a channel and standard uncertainties; the third is broken."""
    rng = np.random.default_rng(0)
    x, y = np.arange(9) * 0.01, np.arange(7) * 0.01
    for number in range(4):
        u, v, level = rng.normal(size=(3, 7, 9))
        u[number, 3] = np.nan
        more = {"peak/ratio [1]": level, "sigma_u [m/s]": np.full(u.shape, 0.01 * (number + 1))}
        write_frame(tmp_path / f"f{number}.csv", u, v, x=x, y=y, **more)
    (tmp_path / "f2.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    return tmp_path


def stored(folder) -> StoredRun:
    run = open_run(["f*.csv"], READING, folder=folder)
    told = write_store(run, folder / "a.store.h5")
    assert len(told) == 1 and "frame 2 cannot be read" in told[0] and "f2.csv" in told[0]
    return open_run(["f*.csv"], READING, folder=folder, store="a.store.h5")


def test_frames_from_the_store_are_those_of_the_sources(folder):
    kept, run = stored(folder), open_run(["f*.csv"], READING, folder=folder)
    assert isinstance(kept, StoredRun) and len(kept) == len(run) == 4
    assert kept.times == run.times and kept.units == run.units and kept.notes == run.notes
    assert kept.grid.same_nodes(run.grid) and kept.digests() == run.digests()
    for number in (0, 1, 3):
        one, other = kept[number], run[number]
        assert kept.frame_name(number) == run.frame_name(number) and one.time == other.time
        for name in ("u", "v", "status"):
            np.testing.assert_array_equal(getattr(one, name), getattr(other, name))
        np.testing.assert_array_equal(one.channels["peak/ratio"], other.channels["peak/ratio"])
        assert dict(one.channel_units) == dict(other.channel_units)
        np.testing.assert_array_equal(one.error.sigma["u"], other.error.sigma["u"])
        assert one.error.origin == other.error.origin
    for which in (kept, run):
        with pytest.raises(UnreadableFrame, match=r"f2\.csv"):
            which[2]
    with pytest.raises(IndexError):
        kept[4]


def test_a_store_is_not_used_where_it_no_longer_fits(folder):
    stored(folder)

    def opened(reading=READING, files="f*.csv"):
        return open_run([files], reading, folder=folder, store="a.store.h5")

    def refused(run, why):
        assert not isinstance(run, StoredRun) and why in run.notes[-1] and "not used" in run.notes[-1]

    refused(opened(Reading()), "read in another way")
    refused(opened(files="f[01].csv"), "other files")
    shutil.copy(folder / "f1.csv", folder / "again")
    os.replace(folder / "again", folder / "f1.csv")
    assert isinstance(opened(), StoredRun), "the same content under a new time of change is the same"
    text = (folder / "f1.csv").read_text()
    (folder / "f1.csv").write_text(text.replace("0.01", "0.02", 1))
    refused(opened(), "f1.csv has changed")
    (folder / "f1.csv").write_text(text)
    whole = (folder / "a.store.h5").read_bytes()
    (folder / "a.store.h5").write_bytes(whole[: len(whole) // 2])
    refused(opened(), "damaged")
    (folder / "a.store.h5").unlink()
    refused(opened(), "is not there")


def test_a_store_is_whole_or_not_there(folder):
    run = open_run(["f*.csv"], READING, folder=folder)

    def stop(number):
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write_store(run, folder / "a.store.h5", on_frame=stop)
    assert not list(folder.glob("*store*")) and not list(folder.glob(".a.store*"))
    with pytest.raises(InputError, match="cannot be written"):
        write_store(run, folder / "nowhere" / "a.store.h5")


def test_the_command_makes_a_store_that_changes_no_number(tmp_path, capfd):
    session = edited(vortex_frames(tmp_path, 3), regions=[CIRCLE])
    path = tmp_path / "v.session.json"
    save_session(session, path)
    before = measure(load_session(path))
    assert cli.run(["store", str(path)]) == 0
    assert load_session(path).run.store == "v.store.h5" and (tmp_path / "v.store.h5").is_file()
    assert measure(load_session(path)) == before
    (tmp_path / "f1.csv").write_text((tmp_path / "f0.csv").read_text())
    assert measure(load_session(path)) != before
    assert cli.run(["store", str(tmp_path / "none.session.json")]) == 2
    capfd.readouterr()


def test_a_saved_session_keeps_its_way_to_the_store(tmp_path):
    (tmp_path / "run").mkdir()
    (tmp_path / "elsewhere").mkdir()
    session = edited(vortex_frames(tmp_path / "run", 2), regions=[CIRCLE])
    save_session(session, tmp_path / "run/v.session.json")
    assert cli.run(["store", str(tmp_path / "run/v.session.json")]) == 0
    save_session(load_session(tmp_path / "run/v.session.json"), tmp_path / "elsewhere/v.session.json")
    moved = load_session(tmp_path / "elsewhere/v.session.json")
    assert moved.run.store == "../run/v.store.h5"
