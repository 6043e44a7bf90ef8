"""Window, Python and command line give the same numbers for the same session, to the last bit."""

import json
import subprocess
import sys

import pytest

import fieldview as lf
from fieldview.publish.samples import SAMPLES
from fieldview.shipped import shipped_folder
from tests.gui.conftest import settle


@pytest.mark.parametrize("name", SAMPLES)
def test_the_samples_measure_the_same_everywhere(name, open_window, qtbot):
    path = shipped_folder("sample_sessions") / name / f"{name}.session.json"
    session = lf.load_session(path)
    window = open_window(path)
    settle(qtbot, window)
    shown = [window.desk.picture.measured_of(region).row for region in window.session.regions]
    in_python = lf.measure(session, frames=[0])
    command = [sys.executable, "-m", "fieldview", "measure", str(path), "--frames", "0", "--format", "json"]
    printed = json.loads(subprocess.run(command, capture_output=True, text=True, check=True).stdout)
    assert json.loads(json.dumps(in_python)) == printed["frames"]
    # the caution on through-plane flows belongs to the row as well
    assert json.loads(json.dumps(shown)) == printed["frames"][0]["regions"]
