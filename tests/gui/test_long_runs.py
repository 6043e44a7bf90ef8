"""A run of a thousand frames opens without reading more than the frames it shows."""

import numpy as np

from fieldview.files import run as runs
from fieldview.session.models import RunSource, Session
from fieldview.session.store import save_session
from tests.gui.conftest import action, settle


def test_a_thousand_frames_open_without_being_read(tmp_path, open_window, monkeypatch, qtbot):
    axis, rng = np.arange(8) * 0.01, np.random.default_rng(0)
    for number in range(1000):
        u, v = rng.normal(size=(2, 8, 8))
        np.savez(tmp_path / f"f{number}.npz", x=axis, y=axis, u=u, v=v)
    source = {"files": ["f*.npz"], "reading": {"length_unit": "m", "velocity_unit": "m/s"}}
    session = Session(run=RunSource.model_validate(source)).in_folder(tmp_path)
    save_session(session, tmp_path / "long.session.json")
    opened, read = [], runs.read_contents
    monkeypatch.setattr(runs, "read_contents", lambda path: opened.append(path.name) or read(path))
    window = open_window(tmp_path / "long.session.json")
    assert window.desk.picture.run.frames == 1000
    assert set(opened) == {"f0.npz"}
    action(window, "frame.last").trigger()
    settle(qtbot, window)
    assert set(opened) == {"f0.npz", "f999.npz"}
