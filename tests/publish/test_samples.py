"""Sample sessions: the committed files are the generators' output, the numbers those of the scenario."""

import math
from pathlib import Path

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.publish.samples import SAMPLES, fin_wake, hood_face, stirred_tank, write_sample
from fieldview.session.measure import measure, unanswered
from fieldview.session.replay import Workbench
from fieldview.session.store import load_session
from fieldview.shipped import shipped_folder

SHIPPED = shipped_folder("sample_sessions")


def sample(name: str):
    return load_session(SHIPPED / name / f"{name}.session.json")


@pytest.mark.parametrize("name", SAMPLES)
def test_the_committed_files_are_what_the_generator_writes(name, tmp_path):
    session = write_sample(name, tmp_path)
    written = {p.relative_to(tmp_path): p for p in tmp_path.rglob("*") if p.is_file()}
    shipped = {p.relative_to(SHIPPED): p for p in (SHIPPED / name).rglob("*") if p.is_file()}
    assert session == tmp_path / name / f"{name}.session.json"
    assert set(written) == set(shipped)
    for place, path in written.items():
        assert path.read_bytes() == shipped[place].read_bytes(), place


def test_they_are_small_and_say_that_they_are_invented():
    assert sum(path.stat().st_size for path in SHIPPED.rglob("*") if path.is_file()) < 4_000_000
    for name in SAMPLES:
        assert "invented" in sample(name).title


def test_a_taken_place_is_refused(tmp_path):
    (tmp_path / "hood_face").mkdir()
    with pytest.raises(InputError, match="hood_face: exists already"):
        write_sample("hood_face", tmp_path)


@pytest.mark.parametrize("name", SAMPLES)
def test_every_region_of_every_sample_has_an_answer(name):
    for row in measure(sample(name), "0:48:11"):
        assert unanswered(row) == []
    assert Workbench(sample(name)).changed_sources() == []


def circle_truth(flow, centre, radius) -> float:
    """Circulation round a circle of the flow itself, by the trapezoidal rule on 4000 points."""
    angle = np.linspace(0, 2 * np.pi, 4000, endpoint=False)
    u, v = flow(centre[0] + radius * np.cos(angle), centre[1] + radius * np.sin(angle))
    return float(np.mean(-u * np.sin(angle) + v * np.cos(angle)) * 2 * np.pi * radius)


def test_circulations_of_the_wake_are_those_of_its_vortices():
    session = sample("fin_wake")
    errors = []
    for row in measure(session, "0:48:4"):
        flow = fin_wake.flow(row["frame"])
        for region, found in zip(session.regions[:2], row["regions"], strict=False):
            gamma = found["circulation"]
            truth = circle_truth(flow, region.centre, region.radius)
            errors.append((gamma["value"] - truth) / gamma["uncertainty"]["combined"])
    assert 0.6 < math.sqrt(np.mean(np.square(errors))) < 1.5 and max(map(abs, errors)) < 3.5


def test_the_street_pushes_and_moves_as_it_says():
    upper = [v for v in fin_wake.vortices(0) if v[1] > 0]
    assert all(strength >= 0 for _, _, strength in upper)
    own = (
        fin_wake.CIRCULATION
        / (2 * fin_wake.SPACING)
        * math.tanh(math.pi * fin_wake.ROW_DISTANCE / fin_wake.SPACING)
    )
    # speed of a staggered street in its own flow (von Kármán)
    assert fin_wake.STREAM + own == pytest.approx(fin_wake.CONVECTION, abs=1e-3)
    assert fin_wake.SPACING == pytest.approx(0.115, abs=6e-4)
    assert fin_wake.FREQUENCY * fin_wake.HEAVE / fin_wake.STREAM == pytest.approx(0.30)


def test_the_noise_of_the_wake_is_the_stated_sigma():
    session = sample("fin_wake")
    bare = session.model_copy(update={"ledger": session.ledger[:2]})
    field = Workbench(bare).field(7)
    x, y = np.meshgrid(field.grid.x, field.grid.y)
    u, _ = fin_wake.seen_through_window(fin_wake.flow(7), x, y, fin_wake.WINDOW)
    rest = (field.u - u)[:, 8:]
    spread = 1.4826 * np.nanmedian(np.abs(rest - np.nanmedian(rest)))
    assert spread == pytest.approx(fin_wake.SIGMA, rel=0.1)
    inner = np.where(np.abs(rest) < 4 * spread, rest, np.nan)
    neighbours = np.nanmean(inner[:, 1:] * inner[:, :-1]) / np.nanmean(inner**2)
    assert neighbours == pytest.approx(0.5, abs=0.1)


def test_the_tank_gives_its_vortex_after_calibration():
    session = sample("stirred_tank")
    rows = measure(session)
    for region, name in zip(session.regions[:2], ("vortex", "core"), strict=True):
        truth = stirred_tank.CIRCULATION * -math.expm1(-((region.radius / stirred_tank.CORE) ** 2))
        for row in rows:
            gamma = next(r for r in row["regions"] if r["name"] == name)["circulation"]
            assert abs(gamma["value"] - truth) < 3 * gamma["uncertainty"]["combined"]
    field = Workbench(session).field(0)
    fastest = np.nanmax(np.hypot(field.u, field.v))
    assert fastest == pytest.approx(0.100, abs=0.004)


def test_the_hood_s_flow_is_that_of_the_face_between_the_outer_points():
    (row,) = measure(sample("hood_face"))
    found = row["regions"][0]["through_flow"]
    x = np.linspace(hood_face.X[0], hood_face.X[-1], 801)
    y = np.linspace(hood_face.Y[0], hood_face.Y[-1], 801)
    w = hood_face.face_velocity(*np.meshgrid(x, y))
    truth = float(np.trapezoid(np.trapezoid(w, x), y))
    assert abs(found["value"] - truth) < 2 * found["uncertainty"]["combined"]
    # 3 % and 0.02 m/s (k = 2) on 0.477 m² of 0.5 m/s
    area = row["regions"][0]["area"]["value"]
    assert found["uncertainty"]["systematic"] == pytest.approx(
        math.hypot(hood_face.GAIN * found["value"], hood_face.OFFSET * area), rel=0.1
    )
    assert any("local code" in warning for warning in row["regions"][0]["warnings"])
    # the rule of the traverse: mean of the points times the whole face
    measured = Workbench(sample("hood_face")).field(0).w
    assert measured.mean() * hood_face.WIDTH * hood_face.HEIGHT == pytest.approx(hood_face.FLOW, rel=0.06)


def test_generators_do_not_depend_on_where_they_are_called(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write_sample("hood_face", Path("a"))
    assert (tmp_path / "a/hood_face/hood_face.session.json").read_bytes() == (
        SHIPPED / "hood_face/hood_face.session.json"
    ).read_bytes()
