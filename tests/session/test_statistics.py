"""Statistics of a run through the ledger: the same mean, gaps left out, uncertainties that hold."""

import json
import pickle
import tracemalloc

import numpy as np
import pytest

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.smoothing import smoothing_map
from fieldview.session import statistics
from fieldview.session.mean import mean_of
from fieldview.session.replay import Workbench
from fieldview.session.statistics import RunStatistics, run_statistics, statistics_of
from tests.compute.test_lag_window import ar1
from tests.session.runs import edited, vortex_frames

GRID = Grid(np.arange(12.0), np.arange(10.0))
STRESS = np.array([[0.09, -0.03], [-0.03, 0.04]])
SIGMA = 0.1


def turbulent_run(rng, count, *, phi=0.8, sigma=SIGMA, gaps=0.1):
    """Frames with these Reynolds stresses, AR(1) in time at every node, white noise on top."""
    nodes = GRID.shape[0] * GRID.shape[1]
    white = ar1(rng, count, 2 * nodes, phi).reshape(count, nodes, 2) * np.sqrt(1 - phi**2)
    flow = white @ np.linalg.cholesky(STRESS).T
    flow = (
        flow.reshape(count, *GRID.shape, 2) + [1.0, -0.5] + sigma * rng.normal(size=(count, *GRID.shape, 2))
    )
    flow[rng.random((count, *GRID.shape)) < gaps] = np.nan
    error = ErrorModel(sigma={"u": sigma, "v": sigma}, origin="given")
    return [
        Field(GRID, u=frame[..., 0], v=frame[..., 1], error=error, time=0.1 * number)
        for number, frame in enumerate(flow)
    ]


def deviations(run: RunStatistics, truth: dict[str, float], **options) -> dict[str, float]:
    """Root mean square over the nodes of (value - truth) / u."""
    maps = run.maps(**options)
    return {
        name: float(np.sqrt(np.mean(((maps[name].values - true) / maps[name].uncertainty) ** 2)))
        for name, true in truth.items()
    }


def test_statistics_of_a_known_field_lie_within_their_uncertainty():
    """The 120 nodes are independent: the root mean square of (value - truth) / u is 1 to 6.5 %, and the
    effective number of samples behind u is itself estimated."""
    run = statistics_of(turbulent_run(np.random.default_rng(1), 900))
    truth = {
        "mean_u": 1.0,
        "mean_v": -0.5,
        "std_u": np.sqrt(0.09 + SIGMA**2),
        "std_v": np.sqrt(0.04 + SIGMA**2),
        "reynolds_uu": 0.09 + SIGMA**2,
        "reynolds_uv": -0.03,
        "reynolds_vv": 0.04 + SIGMA**2,
        "tke": 0.065 + SIGMA**2,
        "skewness_u": 0.0,
        "kurtosis_v": 3.0,
    }
    for name, ratio in deviations(run, truth).items():
        assert 0.8 <= ratio <= 1.2, name


@pytest.mark.parametrize("count", [60, 200])
def test_a_short_run_has_hardly_smaller_uncertainties_than_it_should(count):
    """Some seven and twenty-two independent samples: few, and their number is itself estimated."""
    run = statistics_of(turbulent_run(np.random.default_rng(count), count))
    truth = {"mean_u": 1.0, "std_u": np.sqrt(0.09 + SIGMA**2), "reynolds_uv": -0.03, "tke": 0.065 + SIGMA**2}
    for name, ratio in deviations(run, truth).items():
        assert 0.7 <= ratio <= 1.5, name
    few = any("fewer than 10 independent samples" in remark for remark in run.maps()["mean_u"].remarks)
    assert few == (count == 60)


@pytest.mark.parametrize("frequency", [0.16, 0.013])
def test_a_flow_that_repeats_itself_gets_too_large_uncertainties_never_too_small(frequency):
    """Its correlation swings on beyond the first zero, and its mean settles as 1 / N, not as its root."""
    rng = np.random.default_rng(13)
    start = rng.uniform(0, 2 * np.pi, GRID.shape)
    run = RunStatistics()
    for number in range(100):
        turn = np.exp(1j * (2 * np.pi * frequency * number + start))
        noise = SIGMA * rng.normal(size=(2, *GRID.shape))
        run.add(Field(GRID, u=turn.real + noise[0], v=turn.imag + noise[1]))
    square = 0.5 + SIGMA**2
    truth = {
        "mean_u": 0.0,
        "std_u": np.sqrt(square),
        "reynolds_uv": 0.0,
        "reynolds_uu": square,
        "tke": square,
    }
    assert all(ratio < 1.1 for ratio in deviations(run, truth).values())


def test_memory_does_not_grow_with_the_frames():
    def peak(count):
        rng = np.random.default_rng(11)
        error = ErrorModel(sigma={"u": SIGMA, "v": SIGMA}, origin="given")
        tracemalloc.start()
        run = RunStatistics(lags=16)
        for _ in range(count):
            u, v = rng.normal(size=(2, 40, 50))
            run.add(Field(Grid(np.arange(50.0), np.arange(40.0)), u=u, v=v, error=error))
        run.maps()
        found = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return found

    assert peak(200) < 1.02 * peak(20)


def test_noise_is_taken_off_the_stresses():
    run = statistics_of(turbulent_run(np.random.default_rng(2), 1000))
    truth = {"reynolds_uu": 0.09, "reynolds_vv": 0.04, "reynolds_uv": -0.03, "tke": 0.065, "std_u": 0.3}
    for name, ratio in deviations(run, truth, subtract_noise=True).items():
        assert 0.75 <= ratio <= 1.25, name
    with_noise, without = run.maps(), run.maps(subtract_noise=True)
    shift = with_noise["reynolds_uu"].values - without["reynolds_uu"].values
    assert shift == pytest.approx(np.full(GRID.shape, SIGMA**2))
    assert "random errors taken off" in " ".join(without["reynolds_uu"].remarks)


def test_too_much_noise_leaves_negative_stresses_and_says_so():
    frames = turbulent_run(np.random.default_rng(3), 60)
    error = ErrorModel(sigma={"u": 0.35, "v": 0.01}, origin="given")
    maps = statistics_of([f.with_(error=error) for f in frames]).maps(subtract_noise=True)
    below = int((maps["reynolds_uu"].values < 0).sum())
    assert below > 0 and f"negative at {below} nodes" in " ".join(maps["reynolds_uu"].remarks)
    assert np.isnan(maps["std_u"].values).sum() == below


def test_noise_that_is_not_stated_cannot_be_taken_off():
    frames = [f.with_(error=ErrorModel()) for f in turbulent_run(np.random.default_rng(4), 20)]
    run = statistics_of(frames)
    assert run.maps()["reynolds_uu"].uncertainty is not None
    with pytest.raises(InputError, match="cannot be taken off the Reynolds stresses: no sigma is stated"):
        run.maps(subtract_noise=True)


def test_integral_time_scale():
    """AR(1) with phi = 0.8 at 10 Hz: 0.1 s x 4.5; noise in a share q of the variance: 0.1 s (4.5 - 4 q)."""
    run = statistics_of(turbulent_run(np.random.default_rng(5), 600, sigma=1e-9, gaps=0.0))
    scale = run.maps()["integral_time_u"]
    assert scale.unit(run.mean.units) == "s"
    assert np.mean(scale.values) == pytest.approx(0.45, rel=0.1)
    noisy = statistics_of(turbulent_run(np.random.default_rng(5), 600, sigma=0.3)).maps()["integral_time_u"]
    assert np.mean(noisy.values) == pytest.approx(0.1 * (0.5 + 4 * 0.5), rel=0.1)


def with_statuses(frames):
    rng = np.random.default_rng(9)
    changed = []
    for field in frames:
        status = np.array(field.status)
        status[rng.random(GRID.shape) < 0.2] = Status.REJECTED
        status[(rng.random(GRID.shape) < 0.2) & (status == Status.MEASURED)] = Status.FILLED
        status[:, 0] = Status.MASKED
        changed.append(field.with_(status=status))
    return changed


def test_the_mean_is_the_run_s_mean():
    frames = with_statuses(turbulent_run(np.random.default_rng(6), 30))
    found, wanted = statistics_of(frames).mean, mean_of(frames)
    assert (found.status == wanted.status).all() and found.notes == wanted.notes
    for name in "uv":
        np.testing.assert_allclose(getattr(found, name), getattr(wanted, name), rtol=1e-13)
        np.testing.assert_allclose(found.error.sigma[name], wanted.error.sigma[name], rtol=1e-13)
    assert found.time is None and not found.events and not found.channels


def test_filled_vectors_count_only_if_asked():
    frames = with_statuses(turbulent_run(np.random.default_rng(7), 30))
    without, with_them = statistics_of(frames), statistics_of(frames, filled=True)
    measured = sum((f.status == Status.MEASURED).astype(int) for f in frames)
    valid = sum(f.valid.astype(int) for f in frames)
    assert (without.count == measured).all() and (with_them.count == valid).all()
    assert (with_them.count.sum() > without.count.sum()) and "filled vectors are counted" in " ".join(
        with_them.remarks()
    )


def test_stretches_merge_to_the_whole():
    frames = with_statuses(turbulent_run(np.random.default_rng(8), 90))
    whole = RunStatistics()
    parts = [RunStatistics() for _ in range(4)]
    for number, field in enumerate(frames):
        part = parts[number * 4 // 90]
        for run in (whole, part):
            run.skip() if number in (0, 23, 40) else run.add(field)
    merged = parts[0]
    for part in parts[1:]:
        merged.merge(part)
    assert (merged.frames, merged.skipped) == (87, 3) == (whole.frames, whole.skipped)
    for name, entry in whole.maps(subtract_noise=True).items():
        other = merged.maps(subtract_noise=True)[name]
        np.testing.assert_allclose(other.values, entry.values, rtol=1e-10, atol=1e-10, err_msg=name)
        if entry.uncertainty is not None:
            np.testing.assert_allclose(other.uncertainty, entry.uncertainty, rtol=1e-8, err_msg=name)
    assert merged.clock.interval == pytest.approx(0.1)
    assert merged.mean.notes == whole.mean.notes


def test_a_fluctuation_is_a_frame_and_fluctuations_have_no_mean():
    frames = with_statuses(turbulent_run(np.random.default_rng(10), 25))
    run = statistics_of(frames)
    again = statistics_of([run.fluctuation(field) for field in frames])
    some = again.count > 0
    assert np.abs(again.mean.u[some]).max() < 1e-13
    np.testing.assert_allclose(
        again.maps()["reynolds_uv"].values, run.maps()["reynolds_uv"].values, rtol=1e-10
    )
    one = run.fluctuation(frames[3])
    assert one.time == frames[3].time and (one.status == frames[3].status)[some].all()


def test_a_session_s_run_and_its_derived_frames(tmp_path):
    session = edited(
        vortex_frames(tmp_path / "run", 12),
        error_model={"sigma": 0.004, "correlation_nodes": 1},
        ledger=[{"step": "median_test"}, {"step": "fill"}],
    )
    bench = Workbench(session)
    done = []
    run = run_statistics(bench, on_frame=done.append)
    assert done == list(range(12))
    wanted = bench.field("mean")
    np.testing.assert_allclose(run.mean.u, wanted.u, rtol=1e-12, equal_nan=True)
    fluctuation = bench.field(bench.frames("fluctuation:5")[0])
    there = fluctuation.valid
    np.testing.assert_allclose((fluctuation.v + wanted.v)[there], bench.field(5).v[there], atol=1e-15)
    rows = run.rows(subtract_noise=True, points=[(0.02, 0.016)])
    assert json.loads(json.dumps(rows, allow_nan=False)) == rows
    by_name = {row["name"]: row for row in rows}
    assert by_name["mean_u"]["unit"] == "m/s" and by_name["tke"]["unit"] == "m^2/s^2"
    assert by_name["mean_u"]["points"][0]["node"] == [8, 10]
    assert by_name["count"]["highest"] == 12.0
    with pytest.raises(InputError, match='frames "fluctuation": write a number'):
        bench.frames("fluctuation")


def test_smoothed_vectors_carry_the_noise_that_smoothing_leaves():
    """Frames of noise alone: smoothed or not, nothing is left once it is taken off."""
    rng = np.random.default_rng(12)
    error = ErrorModel(sigma={"u": SIGMA, "v": SIGMA}, origin="given")
    run = RunStatistics()
    for _ in range(300):
        u, v = SIGMA * rng.normal(size=(2, *GRID.shape))
        field = Field(GRID, u=u, v=v, error=error)
        change = smoothing_map(GRID, field.valid, method="gaussian", width=1.0)
        run.add(field.mapped(change, field.status))
    noisy, clean = run.maps(), run.maps(subtract_noise=True)
    assert noisy["reynolds_uu"].values.max() < 0.5 * SIGMA**2
    for name in ("reynolds_uu", "reynolds_vv", "tke"):
        assert abs(np.mean(clean[name].values)) < 0.05 * np.mean(noisy[name].values)


def test_a_bad_frame_is_skipped_if_it_is_told(tmp_path):
    session = vortex_frames(tmp_path / "run", 5)
    (tmp_path / "run" / "f2.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,1\n")
    told = []
    run = run_statistics(Workbench(session), on_skip=lambda frame, error: told.append(frame))
    assert told == [2] and run.frames == 4 and run.skipped == 1
    with pytest.raises(InputError):
        run_statistics(Workbench(session))


def test_no_frames_have_no_statistics():
    with pytest.raises(InputError, match="no frames to take a mean of"):
        RunStatistics().maps()


def test_a_run_in_stretches_is_the_same_to_the_last_bit_whoever_makes_them(monkeypatch, tmp_path):
    monkeypatch.setattr(statistics, "STRETCH", 4)
    bench = Workbench(
        edited(vortex_frames(tmp_path / "run", 11), error_model={"sigma": 0.004, "correlation_nodes": 1})
    )
    whole = run_statistics(bench, lags=5)
    pieces = [
        statistics.stretch_statistics(bench, numbers, filled=False, lags=5, on_skip=None)
        for numbers in reversed(statistics.stretches(list(range(11))))
    ]
    assert [piece.frames for piece in pieces] == [3, 4, 4]
    merged = RunStatistics(lags=5)
    for piece in reversed(pieces):
        merged.merge(pickle.loads(pickle.dumps(piece)))
    for name, entry in whole.maps(subtract_noise=True).items():
        other = merged.maps(subtract_noise=True)[name]
        assert np.array_equal(other.values, entry.values, equal_nan=True), name
    assert merged.rows() == whole.rows()
    straight = statistics_of([bench.field(number) for number in range(11)], lags=5)
    np.testing.assert_allclose(straight.maps()["tke"].values, whole.maps()["tke"].values, rtol=1e-12)
