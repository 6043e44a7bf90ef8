"""The run check finds what was put into a run, says it with its number, and leaves a good run alone."""

import json

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.units import METRIC, PIXEL
from fieldview.session.check import run_check
from fieldview.session.findings import FINE, LOOK, SERIOUS, UNKNOWN
from fieldview.session.models import Session
from fieldview.session.replay import Workbench
from fieldview.session.statistics import statistics_of
from tests.session.runs import vortex_frames

GRID = Grid(np.arange(24.0) * 16, np.arange(20.0) * 16)
SIGMA = 0.1
DISC = {"shape": "circle", "centre": [200, 160], "radius": 42}


class FramesInMemory:
    """A run as the workbench sees it."""

    def __init__(self, frames, units=PIXEL):
        self.frames, self.units = frames, units

    def __len__(self):
        return len(self.frames)

    def __getitem__(self, number):
        if isinstance(self.frames[number], InputError):
            raise self.frames[number]
        return self.frames[number]


def swirl(count=30, *, sigma=SIGMA, seed=1, change=lambda number, u, v: None, grid=GRID, units=PIXEL):
    """Frames of a slow large swirl on a stream, displacements of several pixels, with white noise."""
    rng = np.random.default_rng(seed)
    frames = []
    for number in range(count):
        arm = (grid.nodes - grid.nodes.mean()) / np.abs(grid.nodes).max()
        turn = 1 + 0.1 * np.sin(2 * np.pi * number / 40)
        u = 5.3 - 6 * turn * arm.imag + sigma * rng.normal(size=grid.shape)
        v = 6 * turn * arm.real + sigma * rng.normal(size=grid.shape)
        change(number, u, v)
        frames.append(Field(grid, u=u, v=v, units=units, time=0.1 * number))
    return frames


def checked(frames, *, ledger=(), sigma=SIGMA, units=PIXEL, **options):
    session = Session.model_validate(
        {
            "run": {"files": ["held in memory"]},
            "ledger": list(ledger),
            "error_model": {} if sigma is None else {"sigma": sigma, "correlation_nodes": 1},
        }
    )
    return run_check(Workbench(session, run=FramesInMemory(frames, units)), **options)


def finding(check, item):
    return next(found for found in check.findings if found.item == item)


def test_a_good_run_is_left_alone_and_every_verdict_has_its_number():
    check = checked(swirl(), ledger=[{"step": "median_test", "threshold": 4.0}])
    assert {found.item: found.concern for found in check.findings if found.concern != FINE} == {}
    for found in check.findings:
        assert found.value is not None and np.isfinite(found.value)
        assert (len(found.verdict) > 25 and any(c.isdigit() for c in found.verdict)) or found.value == 0
    rows = check.rows()
    assert json.loads(json.dumps(rows, allow_nan=False)) == rows
    frame_rows = check.frame_rows()
    assert json.loads(json.dumps(frame_rows, allow_nan=False)) == frame_rows and len(frame_rows) == 30


def test_three_ways_find_the_noise_that_is_there():
    check = checked(swirl(sigma=0.2), sigma=0.2)
    for name in "uv":
        for way in ("neighbours", "frames", "divergence"):
            assert check.sigma[way][name] == pytest.approx(0.2, rel=0.1), way
        assert check.resolved[name]
    assert check.divergence_ratio == pytest.approx(1, abs=0.1)


@pytest.mark.parametrize("stated", [0.02, 0.5])
def test_a_wrong_sigma_is_found_out(stated):
    check = checked(swirl(sigma=0.1), sigma=stated)
    noise = finding(check, "noise of u")
    assert noise.concern == LOOK and "do not agree" in noise.verdict
    divergence = finding(check, "divergence")
    assert divergence.concern == LOOK and divergence.value == pytest.approx(0.1 / stated, rel=0.1)
    assert ("too small" in divergence.verdict) == (stated < 0.1)


def test_without_a_sigma_the_estimates_stand_alone():
    check = checked(swirl(), sigma=None)
    assert "stated" not in check.sigma and finding(check, "noise of u").concern == FINE
    divergence = finding(check, "divergence")
    assert divergence.concern == UNKNOWN and "no sigma is stated" in divergence.verdict
    assert divergence.value == pytest.approx(SIGMA, rel=0.1) and divergence.unit == "px/pulse"


def test_a_flow_unresolved_in_time_makes_its_way_an_upper_bound():
    def shake(number, u, v):
        u += np.random.default_rng(number).normal() * 2

    check = checked(swirl(change=shake))
    assert not check.resolved["u"] and check.sigma["frames"]["u"] > 5 * SIGMA
    noise = finding(check, "noise of u")
    assert "upper bound" in noise.verdict and noise.concern == FINE


@pytest.mark.parametrize(("share", "concern"), [(0.15, FINE), (0.4, LOOK), (0.8, SERIOUS)])
def test_peak_locking(share, concern):
    """A share of the displacement's distance from whole pixels taken away."""

    def lock(number, u, v):
        for part in (u, v):
            part -= share * np.sin(2 * np.pi * part) / (2 * np.pi)

    check = checked(swirl(sigma=0.05, change=lock), sigma=0.05)
    found = finding(check, "peak locking of u")
    # for d = x - a sin(2 pi x)/(2 pi) with x spread evenly, the mean of cos(2 pi d) is J1(a) (Bessel)
    from scipy.special import j1

    assert found.value == pytest.approx(j1(share), abs=max(4 * found.uncertainty, 0.03))
    assert found.concern == concern
    histogram = check.locking["u"].fractions
    assert histogram.sum() == check.locking["u"].count == 30 * GRID.shape[0] * GRID.shape[1]
    if share == 0.8:
        assert histogram[18:22].sum() > 2 * (histogram[:2].sum() + histogram[-2:].sum())


def test_displacements_of_one_size_tell_nothing_of_locking():
    frames = [f.with_(u=f.u * 0 + 3 + 0.1 * f.v / 8) for f in swirl()]
    found = finding(checked(frames), "peak locking of u")
    assert found.concern == UNKNOWN and "cannot be told" in found.verdict


def test_velocities_in_metres_have_no_pixels_to_lock_to():
    check = checked(swirl(units=METRIC), units=METRIC)
    assert not check.locking
    assert "no displacements in pixels" in finding(check, "peak locking").verdict


def test_shares_count_outliers_gaps_and_masks_apart():
    def spoil(number, u, v):
        u[3, 4] = 60.0
        u[:, 0] = np.nan
        if number == 7:
            u[:15] = np.nan

    ledger = [
        {"step": "mask", "region": DISC, "keep": "outside"},
        {"step": "range_test", "u": [-30, 30]},
        {"step": "fill"},
    ]
    check = checked(swirl(change=spoil), ledger=ledger)
    look = check.frames[0]
    inside = int((np.abs(GRID.nodes - (200 + 160j)) < 42).sum())
    assert look.masked == inside and look.nodes == GRID.nodes.size - inside
    assert look.rejected == 1 and look.missing == 20 and look.measured == look.nodes - 21
    # in frame 7 the node is missing
    assert check.rejected[3, 4] == pytest.approx(29 / 30) and np.nansum(check.rejected > 0.5) == 1
    assert np.isnan(check.rejected[10, 12])
    outliers = finding(check, "outliers")
    assert (
        outliers.nodes == ((3, 4),)
        and outliers.concern == LOOK
        and "1 node in more than half" in outliers.verdict
    )
    measured = finding(check, "share measured")
    assert measured.concern == SERIOUS and measured.frames == (7,) and "frame 7" in measured.verdict


def test_a_jump_is_found():
    def jump(number, u, v):
        if number >= 12:
            u += 3.0

    found = finding(checked(swirl(change=jump)), "jumps")
    assert found.frames == (12,) and found.concern == LOOK and "first frame 12" in found.verdict


def test_a_stuck_frame_is_found():
    frames = swirl()
    frames[9] = frames[8].with_(time=0.9)
    found = finding(checked(frames), "stuck frames")
    assert found.frames == (9,) and found.value == 1.0 and found.concern == SERIOUS


def test_stuck_vectors_are_found():
    def stick(number, u, v):
        u[5, 6], v[5, 6] = 0.0, 0.0
        rng = np.random.default_rng(number)
        u[9, 2], v[9, 2] = 0.02 * rng.normal(size=2)

    found = finding(checked(swirl(change=stick)), "stuck vectors")
    assert found.nodes == ((5, 6), (9, 2)) and found.concern == LOOK and "2 vectors" in found.verdict


def test_a_drift_is_found_within_its_uncertainty():
    def drifting(number, u, v):
        u += 0.02 * number

    found = finding(checked(swirl(change=drifting)), "drift of u")
    assert found.concern == LOOK and found.value == pytest.approx(0.02 * 29, abs=3 * found.uncertainty)
    assert finding(checked(swirl()), "drift of v").concern == FINE


def test_too_few_frames_are_said():
    check = checked(swirl(2))
    assert finding(check, "jumps").concern == UNKNOWN and finding(check, "drift of u").concern == UNKNOWN
    assert finding(check, "stuck frames").concern == FINE
    assert json.dumps(check.rows(), allow_nan=False)


def test_a_bad_frame_is_told_and_counted():
    frames = swirl(12)
    frames[4] = InputError("f4.csv, line 3: three numbers where four were expected")
    told = []
    check = checked(frames, on_skip=lambda number, error: told.append(number))
    assert told == [4] and check.skipped[0][0] == 4
    assert "1 frame could not be read" in finding(check, "share measured").verdict
    with pytest.raises(InputError, match="line 3"):
        checked(frames)


def test_one_component_through_the_plane():
    rng = np.random.default_rng(3)
    grid = Grid(np.arange(9.0), np.arange(7.0))
    frames = [Field(grid, w=0.5 + 0.02 * rng.normal(size=grid.shape)) for _ in range(25)]
    check = checked(frames, sigma=0.02, units=METRIC)
    assert "divergence" not in check.sigma and finding(check, "divergence").concern == UNKNOWN
    assert finding(check, "noise of w").concern == FINE


def test_a_run_on_disk(tmp_path):
    bench = Workbench(vortex_frames(tmp_path / "run", 10))
    done = []
    check = run_check(bench, "0:8", on_frame=done.append)
    assert done == list(range(8)) and len(check.frames) == 8
    assert check.unit == "m/s" and check.sigma["neighbours"]["u"] == pytest.approx(0.004, rel=0.25)


@pytest.mark.filterwarnings("error")
@pytest.mark.parametrize("shape", [(1, 9), (1, 1), (3, 1)])
@pytest.mark.parametrize("count", [1, 2, 30])
def test_small_grids_and_short_runs_have_verdicts_too(shape, count):
    rng = np.random.default_rng(1)
    grid = Grid(np.arange(float(shape[1])), np.arange(float(shape[0])))
    frames = []
    for _ in range(count):
        w = rng.normal(size=shape)
        w.flat[0] = np.nan
        frames.append(Field(grid, w=w))
    check = checked(frames, sigma=None, units=METRIC)
    assert json.dumps([check.rows(), check.frame_rows()], allow_nan=False)
    assert finding(check, "share measured").value == pytest.approx(1 - 1 / w.size)
    if count == 30 and shape == (3, 1):
        assert "cannot be told without a noise level" in finding(check, "stuck vectors").verdict
    statistics = statistics_of(frames)
    rows = statistics.rows(points=[(0, 0)])
    assert json.dumps(rows, allow_nan=False) and rows[0]["points"][0]["value"] == 0.0
    assert statistics.mean.count(Status.MISSING) == 1
