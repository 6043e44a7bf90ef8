"""What must never be loaded: the command line and the package stay free of Qt and of heavy libraries."""

import json
import subprocess
import sys

import pytest

from tests.session.runs import edited, vortex_frames
from tests.session.test_measure import MODEL, REGIONS


def loaded_by(code: str) -> set[str]:
    """Top-level modules that are loaded after running this code in a fresh interpreter."""
    report = "import sys, json; print(json.dumps(sorted({m.split('.')[0] for m in sys.modules})))"
    done = subprocess.run(
        [sys.executable, "-c", f"{code}\n{report}"], capture_output=True, text=True, check=True
    )
    return set(json.loads(done.stdout.splitlines()[-1]))


QT = {"PySide6", "pyqtgraph", "shiboken6"}


def test_the_package_and_help_load_nothing_heavy():
    heavy = QT | {"pandas", "xarray", "matplotlib", "pint", "h5py"}
    assert not heavy & loaded_by("import fieldview, fieldview.session.store, fieldview.files")
    assert not (heavy | {"numpy", "scipy"}) & loaded_by("from fieldview import cli; cli.run(['--help'])")


def test_measure_loads_no_qt_and_no_plotting(tmp_path):
    from fieldview.session.store import save_session

    path = tmp_path / "a.session.json"
    save_session(edited(vortex_frames(tmp_path, 1), regions=REGIONS, error_model=MODEL), path)
    loaded = loaded_by(f"from fieldview import cli; assert cli.run(['measure', {str(path)!r}]) == 0")
    assert not (QT | {"matplotlib"}) & loaded


def test_public_names_are_found_and_others_are_not():
    import fieldview

    assert {"load_session", "evaluate", "measure", "quantity", "InputError"} <= set(dir(fieldview))
    assert callable(fieldview.measure)
    with pytest.raises(AttributeError, match="no attribute 'nonsense'"):
        fieldview.nonsense  # noqa: B018
